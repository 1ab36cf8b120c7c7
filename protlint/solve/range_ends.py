"""The ends of what is stated as a range: supplies and drive, every one at its low and its high end, in all combinations.

Spreads of parts are the corners' affair, which follow one figure. Here another figure asks for its own worst end: the
voltage that a junction blocks, the heat of a pass device, what a resistor across a supply takes.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np

from protlint.quantities import format_quantity
from protlint.solve.circuit import Circuit
from protlint.solve.conditions import Known
from protlint.solve.constants import KELVIN
from protlint.solve.corners import DRIVE_ENDS, Axis, axes_of, held_voltages
from protlint.solve.locus import Conditions, run_at, trace
from protlint.solve.network import compile_network
from protlint.solve.solution import Point
from protlint.solve.stage import points, sweep_stage

MOST_COMBINED = 4
"""Of more ranges the widest are combined, 16 ways; the others stay where they are."""


@dataclass(frozen=True, slots=True)
class Ends:
    """One combination: the positions of all axes of the circuit, the voltages that come of them, and the ends in words.

    ``held_V`` is by held node, ``low_V`` and ``high_V`` are the drive's two ends. ``words`` follow what was solved:
    `` (+24V at its high end, 26.4 V)``; they are empty where nothing is stated as a range.
    """

    corner: tuple[float, ...]
    held_V: Mapping[str, float]
    low_V: float
    high_V: float
    words: str


def positions(axes: Sequence[Axis], at: Mapping[str, float]) -> tuple[float, ...]:
    """Return where all axes lie, from ``device.parameter`` to a position from -1 to 1; the rest is nominal."""
    return tuple(at.get(f"{axis.device}.{axis.parameter}", 0.0) for axis in axes)


def range_ends(
    circuit: Circuit, at: Mapping[str, float] | None = None, *, drive: Collection[str] = DRIVE_ENDS
) -> tuple[tuple[Ends, ...], tuple[str, ...]]:
    """Return every combination of the ends of a circuit's stated ranges, a single one where it has none; and the nets whose
    range is left where it is.

    ``at`` says where the other spreads lie, as for :func:`positions`; ``drive`` which of the drive's two ends is asked for.

    Raises
    ------
    CircuitError
        Where the circuit cannot be solved at all.
    """
    network = compile_network(circuit)
    axes = axes_of(network)
    ranged = [place for place, axis in enumerate(axes) if axis.place == "held" or axis.parameter in drive]
    ranged.sort(key=lambda place: axes[place].low - axes[place].high)
    turned, kept = sorted(ranged[:MOST_COMBINED]), ranged[MOST_COMBINED:]
    sides = list(product((-1.0, 1.0), repeat=len(turned)))
    corner = np.repeat(np.array(positions(axes, at or {}))[:, None], len(sides), axis=1)
    corner[turned] = np.array(sides).reshape(len(sides), len(turned)).T
    held_V, ends_V = held_voltages(network, axes, corner)
    usual_V = {node: limits.usual for node, limits in circuit.held.items()}
    ends = tuple(
        Ends(
            corner=tuple(corner[:, lane].tolist()),
            held_V={**usual_V, **dict(zip(network.held, held_V[:, lane].tolist(), strict=True))},
            low_V=float(ends_V[0, lane]),
            high_V=float(ends_V[1, lane]),
            words=_words([axes[place] for place in turned], side),
        )
        for lane, side in enumerate(sides)
    )
    return ends, tuple(axes[place].device for place in kept)


def loci_at(
    circuit: Circuit, short: str, ambients_degC: Sequence[float], corners: Sequence[tuple[float, ...]], known: Known
) -> tuple[tuple[tuple[Point, ...], ...], ...]:
    """Return the locus at every corner (the positions of all axes) and every ambient, each from the short outwards.

    Points that were not solved are left out. ``known`` keeps them for equal circuits.

    Raises
    ------
    CircuitError
        Where the circuit cannot be solved, or its drive turns nothing on.
    """
    count = len(ambients_degC)
    asked = ("loci", tuple(circuit.held).index(short), tuple(ambients_degC), tuple(corners))
    rows = known.rows(circuit, asked, lambda: _trace(circuit, short, ambients_degC, corners))
    found = [tuple(point for point in row if point is not None) for row in rows]
    return tuple(tuple(found[first : first + count]) for first in range(0, len(found), count))


def _trace(
    circuit: Circuit, short: str, ambients_degC: Sequence[float], corners: Sequence[tuple[float, ...]]
) -> tuple[tuple[Point, ...], ...]:
    """Return the loci corner by corner, each at every ambient."""
    network = compile_network(circuit)
    count = len(ambients_degC)
    stage, sweep = sweep_stage(network, short, ambients_degC, count // 2, drives=2)
    corner = np.repeat(np.array(corners).reshape(len(corners), -1).T, count, axis=1)
    conditions = Conditions(np.tile(np.array(ambients_degC) + KELVIN, len(corners)), corner)
    loci, _ = trace(stage, conditions, np.tile(sweep.full_drive(0).operating.inner, len(corners))[:, None, :])
    run = run_at(stage, conditions.pick(loci.owner), loci.output_V, loci.inner)
    return tuple(points(stage, run, loci.of(place).tolist()) for place in range(count * len(corners)))


def _words(axes: Sequence[Axis], side: Sequence[float]) -> str:
    told = []
    for axis, position in zip(axes, side, strict=True):
        volts, end = (axis.high, "high") if position > 0.0 else (axis.low, "low")
        if axis.place == "held":
            told.append(f"{axis.device} at its {end} end, {format_quantity(volts, 'V')}")
        else:
            told.append(f"the drive's {axis.parameter.removesuffix('_V')} end at {format_quantity(volts, 'V')}")
    return f" ({' and '.join(told)})" if told else ""
