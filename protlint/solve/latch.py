"""A latch's figures: what it trips at, and what it passes before and afterwards (``protlint.solve.tripping``)."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from protlint.solve.constants import KELVIN
from protlint.solve.corners import extremes
from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import PASS_V, Conditions, run_at
from protlint.solve.solution import Currents, Solution
from protlint.solve.stage import Stage, Sweep, pass_voltage, points, short_voltage
from protlint.solve.tripping import Tripping, raise_drive, run_with

_SHARES = (0.0, 0.3, 0.6, 0.9)
"""Places between the short and the farthest the output can go, where no working output voltage is stated."""
_TRIPPED_SHARE = 0.5
"""A latch that leaves more than this of what it trips at has not taken the drive away."""
_ROUNDING = 1e-6
"""Ends are rounded outwards by this share, so that what lies on them lies within."""


def settle(stage: Stage, sweep: Sweep) -> Sweep:
    """Return the sweep with its on end, shunt in, where the latch stands once the drive has risen to there."""
    conditions = Conditions(sweep.full_drive(0).lanes.ambient_K)
    tripping = raise_drive(stage, conditions, np.full(sweep.ambients, np.nan))
    run = run_at(stage, conditions, None, tripping.after)
    whole = sweep.run
    first = (len(sweep.drive_V) - 1) * sweep.ambients
    lanes = np.arange(first, first + sweep.ambients)
    operating = replace(
        whole.operating,
        inner=_put(whole.operating.inner, lanes, run.operating.inner),
        node_V=_put(whole.operating.node_V, lanes, run.operating.node_V),
        known_A=_put(whole.operating.known_A, lanes, run.operating.known_A),
        converged=_put(whole.operating.converged, lanes, run.operating.converged),
    )
    return replace(sweep, run=replace(whole, operating=operating, output_A=_put(whole.output_A, lanes, run.output_A)))


@dataclass(frozen=True, slots=True)
class Trips:
    """Where a latch trips with everything at its usual value: the ambients and output voltages looked at, place by place,
    each at every ambient; the short (NaN) is the first place."""

    conditions: Conditions
    output_V: Array
    tripping: Tripping


def find_trips(stage: Stage, ambients_degC: Sequence[float]) -> Trips:
    """Raise the drive in the short and at the working output, or where none is stated at several places."""
    places_V = _places(stage, len(ambients_degC))
    conditions = Conditions(np.tile(np.array(ambients_degC) + KELVIN, len(places_V)))
    output_V = places_V.ravel()
    return Trips(conditions, output_V, raise_drive(stage, conditions, output_V))


def always_trips(trips: Trips, holds_A: Array) -> bool:
    """Tell whether the latch trips and stays on at every ambient, each with its holds: then no other figure is as of a
    limiter without a latch."""
    short = zip(trips.tripping.trips.tolist(), trips.tripping.output_A.tolist(), holds_A.tolist(), strict=False)
    return all(_stays(*one) for one in short)


def _stays(tripped: bool, trips_A: float, holds_A: float) -> bool:
    """Tell whether a latch trips, and takes the drive away."""
    return tripped and holds_A <= _TRIPPED_SHARE * trips_A


def with_trips(stage: Stage, solution: Solution, trips: Trips) -> Solution:
    """Return a latch's solution with begins where it trips in the short, carries and most what it passes before it trips.

    Holds stays what it passes afterwards. Where the latch does not stay on there is no begins, and the rest is as of a
    limiter without a latch.
    """
    circuit, rows, stated = stage.network.circuit, solution.currents, stage.network.circuit.output_V is not None
    ambients = len(rows)
    conditions, output_V, tripping = trips.conditions, trips.output_V, trips.tripping
    run = run_with(stage, conditions, output_V, tripping.drive, tripping.inner)
    working = np.isnan(output_V) | stated | (pass_voltage(stage, run) >= PASS_V)
    passes_A = np.where(working, tripping.output_A, np.nan).reshape(-1, ambients)
    first, index = int(stated), np.arange(ambients)
    of_carries = (first + _best(passes_A[first:], np.nanargmin)) * ambients + index
    of_most = _best(passes_A, np.nanargmax) * ambients + index
    wanted = np.unique(np.concatenate((index, of_carries, of_most)))
    ends = np.full((2, passes_A.size), np.nan)
    ends[:, wanted] = _ranges(stage, conditions, output_V, tripping, wanted)
    known = stated or not circuit.ground_leg
    changed = [
        _changed(row, tripping, ends, place, int(of_carries[place]) if known else None, int(of_most[place]))
        for place, row in enumerate(rows)
    ]
    usual = ambients // 2
    tripped = points(stage, run, [int(of_carries[usual])]) if known and changed[usual].begins_A is not None else ()
    return replace(
        solution,
        currents=tuple(changed),
        at_carry=tripped[0] if tripped else solution.at_carry,
        regulates=None,
        not_checked=solution.not_checked + _untripped(changed),
    )


def _changed(row: Currents, tripping: Tripping, ends: Array, begins: int, carries: int | None, most: int) -> Currents:
    """Return a row of currents with its figures from where they stand in ``tripping``."""

    def figure(place: int) -> float | None:
        return float(tripping.output_A[place]) if np.isfinite(tripping.output_A[place]) else None

    def pair(place: int) -> tuple[float, float] | None:
        return (float(ends[0, place]), float(ends[1, place])) if np.isfinite(ends[:, place]).all() else None

    trips_A = figure(begins)
    if trips_A is None or row.holds_A is None or not _stays(bool(tripping.trips[begins]), trips_A, row.holds_A):
        return replace(row, begins_A=None, begins_range_A=None)
    most_A, most_range = max(figure(most) or 0.0, row.holds_A), pair(most)
    for other in (row.holds_range_A, pair(carries) if carries is not None else None):
        if most_range is not None and other is not None:
            most_range = (max(most_range[0], other[0]), max(most_range[1], other[1]))
    changed = replace(row, begins_A=trips_A, begins_range_A=pair(begins), most_A=most_A, most_range_A=most_range)
    if carries is None:
        return changed
    by = "limiter" if tripping.trips[carries] else row.limited_by_output
    return replace(changed, carries_A=figure(carries), carries_range_A=pair(carries), limited_by_output=by)


def _untripped(rows: Sequence[Currents]) -> tuple[tuple[str, str], ...]:
    """Say at which ambients the latch does not stay on, or may not; no part is named, as equal circuits share the words."""
    never = [f"{row.ambient_degC:g} degC" for row in rows if row.begins_A is None]
    may_not = [
        f"{row.ambient_degC:g} degC"
        for row in rows
        if row.begins_range_A is not None
        and row.holds_range_A is not None
        and row.holds_range_A[1] > _TRIPPED_SHARE * row.begins_range_A[1]
    ]
    wants = "a drive that makes the latch trip and keeps it on"
    told = [f"{wants}: as it is stated it does not, at {', '.join(never)}"] if never else []
    told += [f"{wants} over every spread: at worst it does not, at {', '.join(may_not)}"] if may_not else []
    return tuple(("begins", one) for one in told)


def _ranges(stage: Stage, conditions: Conditions, output_V: Array, tripping: Tripping, wanted: IntArray) -> Array:
    """Return the low and the high ends of what passes untripped at the conditions wanted (2, wanted)."""

    def evaluate(corner: Array, which: IntArray) -> Array:
        place = wanted[which]
        at = Conditions(conditions.ambient_K[place], corner)
        return raise_drive(stage, at, output_V[place], tripping.off[:, place]).output_A

    nominal = tripping.output_A[wanted]
    _, found = extremes(evaluate, nominal, len(stage.axes))
    low, high = found.reshape(2, len(wanted))
    return np.stack((np.fmin(low, nominal) * (1.0 - _ROUNDING), np.fmax(high, nominal) * (1.0 + _ROUNDING)))


def _places(stage: Stage, ambients: int) -> Array:
    """Return the output voltages to look at (places, ambients), the short (NaN) first."""
    circuit = stage.network.circuit
    short = np.full((1, ambients), np.nan)
    if circuit.output_V is not None:
        return np.concatenate((short, np.full((1, ambients), circuit.output_V)))
    near = short_voltage(stage, None, ambients)
    low_V, high_V = circuit.output_reach_V
    far = high_V if stage.way < 0.0 else low_V
    return np.concatenate((short, *[(near + share * (far - near))[None] for share in _SHARES[1:]]))


def _best(values: Array, choose: Callable[..., IntArray]) -> IntArray:
    """Return the row of each column's least or greatest value, the first where there is none."""
    return choose(np.where(np.isfinite(values).any(axis=0), values, 0.0), axis=0)


def _put(values: NDArray[Any], lanes: IntArray, new: NDArray[Any]) -> NDArray[Any]:
    result = values.copy()
    result[..., lanes] = new
    return result
