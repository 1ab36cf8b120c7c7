"""The drive at which a stage gives a stated share of what it gives without its shunt: both circuits and the drive at once.

Two copies of the circuit, one with the shunt and one without, share one drive voltage d. Linearised at inner voltages,
everything is a straight line in d: node voltages x + d y, output currents a + d b. What is asked of the output currents
gives the next d, and with it Newton's step of both copies.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from protlint.solve.dc import CLOSE_V, companions, evaluate, fold, inner_step, limited, linear_part, through
from protlint.solve.devices import Array, Source
from protlint.solve.elimination import eliminate, product
from protlint.solve.lanes import Lanes, Parameters, parameters
from protlint.solve.locus import Conditions
from protlint.solve.network import Network
from protlint.solve.stage import Stage, stage_lanes

_APPROACH = 3
"""Steps that first bring the copy without shunt to the nominal crossing's current: the limiter starts near there."""
_STEPS = 24
_LONGEST_SHARE = 0.2
_CREEP_SHARE = 0.05
_CLOSE_SHARE = 1e-6


@dataclass(frozen=True, slots=True)
class _Pair:
    """The linear parts of both copies, side by side, and their slopes by the drive voltage."""

    network: Network
    p: Parameters
    matrix: Array
    right: Array
    outer_V: Array
    right_slope: Array
    outer_slope: Array
    fixed_V: Array
    drive_slope: Array


def balance(
    stage: Stage,
    conditions: Conditions,
    *,
    share: float,
    from_V: Array,
    from_A: Array | None,
    start: Array,
    limits_V: tuple[float | Array, float | Array],
    drive_limit: float = 1.0,
) -> tuple[Array, Array, Array]:
    """Find where the output current with the shunt falls to ``share`` of that without.

    Returns drive voltages and output currents, NaN where none is found, and the inner voltages there. All arrays are
    (conditions,) but inner voltages, (ports, 2, conditions) with the shunt and without. The drive begins at ``from_V``,
    where a nominal stage gives ``from_A`` (None: the start is near enough); ``limits_V`` are its off end and the farthest it
    may rise; ``drive_limit`` multiplies the greatest current of a limited drive.
    """
    count = len(from_V)
    off, end = limits_V
    onward, span = np.sign(np.subtract(end, off)), np.abs(np.subtract(end, off))
    low_V, high_V = np.minimum(off, end), np.maximum(off, end)
    approach = 0 if from_A is None else _APPROACH
    both = conditions.pick(np.tile(np.arange(count), 2))
    lanes = stage_lanes(
        stage, both.ambient_K, corner=both.corner, drive_V=np.zeros(2 * count), shunt_in=np.repeat([1.0, 0.0], count)
    )
    with np.errstate(all="ignore"):
        pair = _pair(stage.network, lanes, drive_limit)
        work, drive_V = start.reshape(len(start), -1).copy(), from_V.copy()
        settled = np.zeros(count, dtype=bool)
        output_A = np.full(count, np.nan)
        for step in range(_STEPS):
            line, slope, advance = _linearised(pair, work)
            a, b = (stage.way * value.reshape(2, count) for value in (line, slope))
            over, over_slope = a[0] - share * a[1], b[0] - share * b[1]
            if step < approach and from_A is not None:
                wanted = (from_A / share - a[1]) / b[1]
            else:
                # short of the limiter's onset the excess still grows with the drive: the crossing lies further on
                falling = onward * over_slope < 0.0
                wanted = np.where(falling, -over / over_slope, drive_V + onward * _CREEP_SHARE * span)
            change = np.clip(wanted - drive_V, -_LONGEST_SHARE * span, _LONGEST_SHARE * span)
            drive_V = np.clip(drive_V + change, low_V, high_V)
            new = limited(pair.network, pair.p, work, advance(np.tile(drive_V, 2)))
            moved = np.abs(new - work).max(axis=0, initial=0.0).reshape(2, count).max(axis=0)
            work = np.nan_to_num(new)
            if step >= approach:
                settled = falling & (moved < CLOSE_V) & (np.abs(wanted - drive_V) < _CLOSE_SHARE * span)
                output_A = a[0] + b[0] * drive_V
                if settled.all():
                    break
    found_V, found_A = np.where(settled, drive_V, np.nan), np.where(settled, output_A, np.nan)
    return found_V, found_A, work.reshape(start.shape)


def _pair(network: Network, lanes: Lanes, drive_limit: float) -> _Pair:
    """Prepare both copies; ``lanes`` have the drive at 0 V."""
    p = parameters(network, lanes)
    records = [
        replace(record, limit_A=record.limit_A * drive_limit) if isinstance(record, Source) else record
        for record in p.records
    ]
    p = replace(p, records=tuple(records))
    matrix, right, outer_V = linear_part(network, p, lanes.known_V, 0.0)
    drive_slope = np.zeros_like(lanes.known_V)
    drive_slope[-1] = 1.0
    _, right_slope, outer_slope = linear_part(network, p, drive_slope, 0.0)
    return _Pair(network, p, matrix, right, outer_V, right_slope, outer_slope, lanes.known_V, drive_slope)


def _linearised(pair: _Pair, work: Array) -> tuple[Array, Array, Callable[[Array], Array]]:
    """Return the output current at no drive voltage and its slope (lanes,), and the function of drive voltages (lanes,) that
    gives the next inner voltages."""
    network = pair.network
    folded = [fold(one) for one in evaluate(network, pair.p, work)]
    port_V, companion, conductance = companions(network, folded, pair.outer_V)
    companion_slope = through(network, folded, pair.outer_slope)
    ports, _ = network.port_parts
    beside = np.flatnonzero(network.resistor_incidence[:, network.output])
    of_unknown, of_known = (part[beside] for part in network.resistor_parts)
    system = pair.matrix + product(network.scatter, conductance)
    sides = np.stack(
        (pair.right - product(ports.T, companion), pair.right_slope - product(ports.T, companion_slope)), axis=1
    )
    solved = eliminate(network.pattern, system, sides)

    def at_output(node_V: Array, known_V: Array, port_A: Array) -> Array:
        through_A = port_A + through(network, folded, product(ports, node_V))
        at_ports: Array = network.incidence[:, network.output] @ through_A
        drops = product(of_unknown, node_V) + product(of_known, known_V)
        at_resistors: Array = network.resistor_incidence[beside, network.output] @ (pair.p.conductance[beside] * drops)
        return at_ports + at_resistors

    def advance(drive_V: Array) -> Array:
        across = product(ports, solved[:, 0] + drive_V * solved[:, 1]) + pair.outer_V + drive_V * pair.outer_slope
        return work + inner_step(network, folded, across - port_V)

    line = at_output(solved[:, 0], pair.fixed_V, companion)
    slope = at_output(solved[:, 1], pair.drive_slope, companion_slope)
    return line, slope, advance
