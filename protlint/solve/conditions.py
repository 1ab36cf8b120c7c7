"""A circuit under stated conditions: any drive, the output held anywhere or left open, the supplies on or off.

What ``protlint.solve.answers`` works out is the limiter at work. This is for the states around it: the drive at its off
end, an output that something else holds up, a supply that has gone.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from protlint.solve.circuit import Circuit
from protlint.solve.constants import KELVIN
from protlint.solve.corners import axes_of, held_voltages, variation
from protlint.solve.dc import solve_lanes
from protlint.solve.devices import Array
from protlint.solve.lanes import Lanes, Variation, known_voltages
from protlint.solve.memo import canonical, renamed_point
from protlint.solve.network import Network, compile_network
from protlint.solve.solution import Point
from protlint.solve.stage import Run, Stage, points

NOWHERE = "nothing holds the output"
"""The node that stands for the output's holder where the output is open."""


@dataclass(frozen=True, slots=True)
class Condition:
    """What a circuit is put under: the ambient, the drive's voltage, the output's (None: open), whether the supplies are on
    or all at 0 V, whether the shunt is in, and where every axis of ``protlint.solve.corners`` lies (empty: nominal)."""

    ambient_degC: float
    drive_V: float
    output_V: float | None
    supplied: bool = True
    shunt_in: bool = True
    corner: tuple[float, ...] = ()


Row = tuple[Point | None, ...]
"""Points side by side, None where one was not solved."""


@dataclass(slots=True)
class Known:
    """Points of one review by canonical circuit and what was asked of it, with the device names they were solved under."""

    kept: dict[object, tuple[tuple[str, ...], tuple[Row, ...]]] = field(default_factory=dict)

    def rows(self, circuit: Circuit, asked: object, solve: Callable[[], tuple[Row, ...]]) -> tuple[Row, ...]:
        """Return what ``solve`` gives, worked out once for all equal circuits that the same is asked of, whatever their
        names; ``asked`` names no node and no device."""
        key, (names, _) = canonical(circuit, ())
        if (key, asked) not in self.kept:
            self.kept[key, asked] = (names, solve())
        then, rows_then = self.kept[key, asked]
        if then == names:
            return rows_then
        called = dict(zip(then, names, strict=True))
        return tuple(tuple(None if point is None else renamed_point(point, called) for point in row) for row in rows_then)


def solve_under(circuit: Circuit, conditions: Sequence[Condition], known: Known | None = None) -> Row:
    """Return the operating point under every condition, None where none was found.

    ``Point.output_A`` is the current into the circuit at the output; ``Point.output_V`` the output's voltage also where it
    is open. With ``known`` an equal circuit, whatever its names, is solved once.

    Raises
    ------
    CircuitError
        Where the circuit cannot be solved at all, or has no open output that could be.
    """
    if known is None:
        return _solve_all(circuit, conditions)
    return known.rows(circuit, tuple(conditions), lambda: (_solve_all(circuit, conditions),))[0]


def _solve_all(circuit: Circuit, conditions: Sequence[Condition]) -> Row:
    found: dict[int, Point] = {}
    for is_open in (False, True):
        chosen = [place for place, one in enumerate(conditions) if (one.output_V is None) == is_open]
        if chosen:
            network = compile_network(replace(circuit, output=NOWHERE) if is_open else circuit)
            solved = _solve(network, circuit.output, [conditions[place] for place in chosen])
            found |= {place: point for place, point in zip(chosen, solved, strict=True) if point is not None}
    return tuple(found.get(place) for place in range(len(conditions)))


def _solve(network: Network, output: str, conditions: Sequence[Condition]) -> list[Point | None]:
    axes = axes_of(network)
    corner = np.array([one.corner or (0.0,) * len(axes) for one in conditions]).reshape(len(conditions), -1).T
    ambient_K = np.array([one.ambient_degC + KELVIN for one in conditions])
    held_V, _ = held_voltages(network, axes, corner)
    supplied = np.array([float(one.supplied) for one in conditions])
    output_V = np.array([0.0 if one.output_V is None else one.output_V for one in conditions])
    drive_V = np.array([one.drive_V for one in conditions])
    lanes = Lanes(
        ambient_K,
        known_voltages(held_V * supplied, output_V, drive_V),
        np.array([float(one.shunt_in) for one in conditions]),
        variation(network, axes, corner, ambient_K) if corner.any() else Variation(),
    )
    operating = solve_lanes(network, lanes)
    at_output: Array = operating.node_V[network.nodes.index(output)] if output in network.nodes else output_V
    run = Run(lanes, operating, at_output, operating.output_A)
    stage = Stage(network, (), network.circuit.shorts[0], 1, 1.0, ())
    solved = iter(points(stage, run, [lane for lane in range(len(conditions)) if operating.converged[lane]]))
    return [next(solved) if converged else None for converged in operating.converged.tolist()]
