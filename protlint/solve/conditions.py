"""A circuit under stated conditions: any drive, the output held anywhere or left open, the supplies on or off.

What ``protlint.solve.answers`` works out is the limiter at work. This is for the states around it: the drive at its off
end, an output that something else holds up, a supply that has gone.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from protlint.solve.circuit import Circuit
from protlint.solve.constants import KELVIN
from protlint.solve.dc import solve_lanes
from protlint.solve.devices import Array
from protlint.solve.lanes import Lanes, known_voltages
from protlint.solve.locus import Conditions, run_at, trace
from protlint.solve.memo import canonical
from protlint.solve.network import Network, compile_network
from protlint.solve.solution import Point
from protlint.solve.stage import Run, Stage, points, sweep_stage

NOWHERE = "nothing holds the output"
"""The node that stands for the output's holder where the output is open."""


@dataclass(frozen=True, slots=True)
class Condition:
    """What a circuit is put under: the ambient, the drive's voltage, the output's (None: open), and whether the supplies
    are on, at their usual voltage, or all at 0 V; and whether the shunt is in."""

    ambient_degC: float
    drive_V: float
    output_V: float | None
    supplied: bool = True
    shunt_in: bool = True


@dataclass(slots=True)
class Known:
    """Points of one review by canonical circuit and conditions, with the device names they were solved under."""

    kept: dict[object, tuple[tuple[str, ...], tuple[Point | None, ...]]] = field(default_factory=dict)


def solve_under(circuit: Circuit, conditions: Sequence[Condition], known: Known | None = None) -> tuple[Point | None, ...]:
    """Return the nominal operating point under every condition, None where none was found.

    ``Point.output_A`` is the current into the circuit at the output; ``Point.output_V`` the output's voltage also where it
    is open. With ``known`` an equal circuit, whatever its names, is solved once.

    Raises
    ------
    CircuitError
        Where the circuit cannot be solved at all, or has no open output that could be.
    """
    if known is None:
        return _solve_all(circuit, conditions)
    key, (names, _) = canonical(circuit, ())
    asked = (key, tuple(conditions))
    if asked not in known.kept:
        known.kept[asked] = (names, _solve_all(circuit, conditions))
    then, points_then = known.kept[asked]
    if then == names:
        return points_then
    called = dict(zip(then, names, strict=True))
    return tuple(
        None if point is None else replace(point, states={called.get(name, name): one for name, one in point.states.items()})
        for point in points_then
    )


def _solve_all(circuit: Circuit, conditions: Sequence[Condition]) -> tuple[Point | None, ...]:
    found: dict[int, Point] = {}
    for is_open in (False, True):
        chosen = [place for place, one in enumerate(conditions) if (one.output_V is None) == is_open]
        if chosen:
            network = compile_network(replace(circuit, output=NOWHERE) if is_open else circuit)
            solved = _solve(network, circuit.output, [conditions[place] for place in chosen])
            found |= {place: point for place, point in zip(chosen, solved, strict=True) if point is not None}
    return tuple(found.get(place) for place in range(len(conditions)))


def _solve(network: Network, output: str, conditions: Sequence[Condition]) -> list[Point | None]:
    held = [network.circuit.held[node].usual for node in network.held]
    held_V = np.array([[volts * one.supplied for one in conditions] for volts in held]).reshape(len(held), len(conditions))
    output_V = np.array([0.0 if one.output_V is None else one.output_V for one in conditions])
    drive_V = np.array([one.drive_V for one in conditions])
    lanes = Lanes(
        np.array([one.ambient_degC + KELVIN for one in conditions]),
        known_voltages(network, held_V, output_V, drive_V),
        np.array([float(one.shunt_in) for one in conditions]),
    )
    operating = solve_lanes(network, lanes)
    at_output: Array = operating.node_V[network.nodes.index(output)] if output in network.nodes else output_V
    run = Run(lanes, operating, at_output, operating.output_A)
    stage = Stage(network, (), network.circuit.shorts[0], 1, 1.0, ())
    solved = iter(points(stage, run, [lane for lane in range(len(conditions)) if operating.converged[lane]]))
    return [next(solved) if converged else None for converged in operating.converged.tolist()]


def locus_at_corner(
    circuit: Circuit, short: str, ambients_degC: Sequence[float], corner: Mapping[str, float]
) -> tuple[tuple[Point, ...], ...]:
    """Return the locus at every ambient with every spread where ``corner`` puts it (``device.parameter`` to -1 ... +1).

    Points stand from the short outwards.

    Raises
    ------
    CircuitError
        Where the circuit cannot be solved, or its drive turns nothing on.
    """
    network = compile_network(circuit)
    count = len(ambients_degC)
    stage, sweep = sweep_stage(network, short, ambients_degC, count // 2)
    positions = np.array([corner.get(f"{axis.device}.{axis.parameter}", 0.0) for axis in stage.axes])
    conditions = Conditions(np.array(ambients_degC) + KELVIN, np.repeat(positions[:, None], count, axis=1))
    loci, _ = trace(stage, conditions, sweep.full_drive(0).operating.inner[:, None, :])
    run = run_at(stage, conditions.pick(loci.owner), loci.output_V, loci.inner)
    return tuple(points(stage, run, loci.of(place).tolist()) for place in range(count))
