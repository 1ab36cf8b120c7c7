"""A circuit's resistors alone: what they look like from a node, and what lies behind a node towards a supply."""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping

import numpy as np

from protlint.solve.circuit import Circuit, Device
from protlint.solve.parameters import LINK_OHM

LEAK_S = 1e-12
"""From every node to 0 V, so that what hangs on nothing has a voltage."""


def thevenin(
    circuit: Circuit, positive: str, negative: str, *, known_V: Mapping[str, float], injected_A: Mapping[str, float]
) -> tuple[float, float]:
    """Return open-circuit voltage and resistance seen between two nodes with every device but the resistors taken out.

    Thevenin's theorem, by nodal analysis. ``known_V`` are nodes held at a voltage, ``injected_A`` currents into nodes.
    """
    resistors = [device for device in circuit.devices if device.kind in ("resistor", "inductor")]
    nodes = list(dict.fromkeys([positive, negative, *(node for device in resistors for node in device.nodes)]))
    unknown = {node: place for place, node in enumerate(node for node in nodes if node not in known_V)}
    matrix = LEAK_S * np.eye(len(unknown))
    right = np.array([[injected_A.get(node, 0.0), 0.0] for node in unknown]).reshape(len(unknown), 2)
    for device in resistors:
        conductance = 1.0 / _ohm(device)
        for node, other in (device.nodes, device.nodes[::-1]):
            if node in unknown:
                matrix[unknown[node], unknown[node]] += conductance
                if other in unknown:
                    matrix[unknown[node], unknown[other]] -= conductance
                else:
                    right[unknown[node], 0] += conductance * known_V[other]
    for node, current_A in ((positive, 1.0), (negative, -1.0)):
        if node in unknown:
            right[unknown[node], 1] += current_A
    solved = np.linalg.solve(matrix, right)

    def at(node: str, case: int) -> float:
        if node in unknown:
            return float(solved[unknown[node], case])
        return known_V[node] if case == 0 else 0.0

    return at(positive, 0) - at(negative, 0), at(positive, 1) - at(negative, 1)


def behind(circuit: Circuit, node: str, known_V: Mapping[str, float]) -> tuple[float, float] | None:
    """Return the voltage of the nearest known node that resistors lead to, and their resistance together; None if none."""
    queue, seen = deque([(node, 0.0)]), {node}
    while queue:
        here, ohm = queue.popleft()
        if here in known_V:
            return known_V[here], ohm
        for device in circuit.devices:
            if device.kind in ("resistor", "inductor") and here in device.nodes:
                other = device.nodes[1] if device.nodes[0] == here else device.nodes[0]
                if other not in seen:
                    seen.add(other)
                    queue.append((other, ohm + _ohm(device)))
    return None


def _ohm(device: Device) -> float:
    return max(device.model.get("R", LINK_OHM), LINK_OHM)
