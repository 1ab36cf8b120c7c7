"""Whether a circuit can be solved at all: its voltages and its drive make sense, no link joins two supplies, nothing floats.

Each ``check_`` function raises :class:`CircuitError` with the reason where it cannot.
"""

from __future__ import annotations

from collections.abc import Sequence

from protlint.joining import joined
from protlint.solve.circuit import Circuit, Device
from protlint.solve.parameters import CircuitError

LINK_AT_MOST_OHM = 1e-3
"""A resistor up to this joins its two nets as a link does."""

GREATEST_V = 1e5
"""A net that is held further from 0 V than this is a slip of the pen."""


def check_ends(circuit: Circuit) -> None:
    """Check that voltages, drive and shorts make sense and that the limiter's devices are there."""
    drive, reach_V = circuit.drive, circuit.output_reach_V
    if not all(abs(value) <= GREATEST_V for value in reach_V):
        raise CircuitError(f"an output that reaches from {reach_V[0]:g} V to {reach_V[1]:g} V makes no sense")
    if circuit.output_V is not None and not abs(circuit.output_V) <= GREATEST_V:
        raise CircuitError(f"a working output voltage of {circuit.output_V:g} V makes no sense")
    if circuit.output == drive.node:
        raise CircuitError(f"the drive and the output are one net, {circuit.output}")
    if not circuit.shorts or any(node not in circuit.held for node in circuit.shorts):
        raise CircuitError("no held net a short could tie the output to")
    ends = [
        *circuit.held.items(),
        (f"the drive's low end at {drive.node}", drive.low_V),
        (f"its high end at {drive.node}", drive.high_V),
    ]
    for name, ends_V in ends:
        if not (
            all(abs(value) <= GREATEST_V for value in (ends_V.low, ends_V.usual, ends_V.high))
            and ends_V.low <= ends_V.usual <= ends_V.high
        ):
            raise CircuitError(f"{name}: {ends_V.low:g} V, {ends_V.usual:g} V, {ends_V.high:g} V make no range")
    if not 0.0 <= drive.resistance_ohm <= 1e12:
        raise CircuitError(f"the drive's resistance of {drive.resistance_ohm:g} ohm makes no sense")
    if drive.current_A is not None and not 0.0 < drive.current_A <= 1e4:
        raise CircuitError(f"a drive that gives {drive.current_A:g} A at most drives nothing")
    names = {device.name for device in circuit.devices}
    missing = [name for name in (*circuit.shunt, *circuit.pass_devices, *circuit.sense) if name not in names]
    if missing:
        raise CircuitError(f"{missing[0]} is not among the circuit's devices")


def check_links(
    conducting: Sequence[Device], models: dict[str, dict[str, float]], known: Sequence[str], circuit: Circuit
) -> None:
    """Check that no links join two nets that are held at their own voltages."""
    links = [
        (device.nodes[0], device.nodes[1])
        for device in conducting
        if device.kind == "inductor" or (device.kind == "resistor" and models[device.name]["R"] <= LINK_AT_MOST_OHM)
    ]
    lowest = joined(links)
    by_root: dict[str, str] = {}
    for node in known:
        if node not in lowest:
            continue
        other = by_root.setdefault(lowest[node], node)
        if other == node:
            continue
        both_held = other in circuit.held and node in circuit.held
        if not both_held or circuit.held[other].usual != circuit.held[node].usual:
            raise CircuitError(f"{other} and {node} are joined by a link though each is held at its own voltage")


def check_floating(conducting: Sequence[Device], unknown: Sequence[str], known: Sequence[str], driven: str | None) -> None:
    """Check that a path for direct current leads from every unknown node with a semiconductor to a known one."""
    paths: list[tuple[str, str]] = []
    for device in conducting:
        first, *others = device.nodes
        if device.kind in ("nmos", "pmos"):
            others = others[1:]
        paths += [(first, other) for other in others]
    paths += [(node, known[0]) for node in known]
    if driven is not None:
        paths.append((driven, known[0]))
    lowest = joined(paths)
    anchored = lowest[known[0]]
    active = {
        node: device.name for device in conducting if device.kind not in ("resistor", "inductor") for node in device.nodes
    }
    for node in unknown:
        if lowest.get(node) != anchored and node in active:
            raise CircuitError(f"net {node} at {active[node]} hangs on nothing: no path holds its voltage")
