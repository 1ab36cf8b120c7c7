"""What the output passes when one of the limiter's parts has failed: open, or short from end to end.

Each failure is the circuit with that part taken out, or bridged; solved into the short with the drive at its on end, as
drawn, at usual ambient.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from protlint.solve.circuit import Circuit, Device
from protlint.solve.conditions import Condition, Known, solve_under
from protlint.solve.parameters import CircuitError

BRIDGE_OHM = 0.01
"""What a shorted part leaves."""


@dataclass(frozen=True, slots=True)
class Failure:
    """One part failed: its role and device name, ``open`` or ``short``, and the output current into the short.

    ``output_A`` is positive the limiter's way, None where the circuit so left could not be solved.
    """

    role: str
    device: str
    how: str
    output_A: float | None


def failures(
    circuit: Circuit,
    *,
    stops: Sequence[str],
    on_V: float,
    short_V: float,
    sources: bool,
    ambient_degC: float,
    known: Known | None = None,
) -> tuple[Failure, ...]:
    """Return what the output passes with each sense resistance, shunt device and base stop failed in turn.

    ``stops`` are the base stops' device names, ``on_V`` the drive's on end, ``sources`` whether the output current flows out
    of the stage.
    """
    found = []
    for role, device, how in _ways(circuit, stops):
        condition = Condition(ambient_degC, on_V, short_V)
        try:
            point = solve_under(_failed(circuit, device, how), [condition], known)[0]
        except CircuitError:
            point = None
        output_A = None if point is None else (-point.output_A if sources else point.output_A)
        found.append(Failure(role, device.name, how, output_A))
    return tuple(found)


def _ways(circuit: Circuit, stops: Sequence[str]) -> Iterator[tuple[str, Device, str]]:
    by_name: Mapping[str, Device] = {device.name: device for device in circuit.devices}
    for role, names, hows in (
        ("sense", circuit.sense, ("open", "short")),
        ("shunt", circuit.shunt, ("open", "short")),
        ("base_stop", stops, ("open",)),
    ):
        for name in names:
            for how in hows:
                yield role, by_name[name], how


def _failed(circuit: Circuit, failed: Device, how: str) -> Circuit:
    """Return the circuit with a device taken out; in its place, where it is short, a bridge between its outer terminals."""
    devices = tuple(device for device in circuit.devices if device.name != failed.name)
    if how == "short":
        bridge = Device(failed.name, "resistor", (failed.nodes[0], failed.nodes[-1]), {"R": BRIDGE_OHM})
        devices += (bridge,)
    left = {device.name for device in devices}
    return replace(
        circuit,
        devices=devices,
        shunt=tuple(name for name in circuit.shunt if name in left and name != failed.name),
        sense=tuple(name for name in circuit.sense if name in left),
    )
