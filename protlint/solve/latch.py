"""A latch's figures: what it trips at, what it passes before and afterwards. Where it trips is found in ``tripping``."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from protlint.solve.constants import KELVIN
from protlint.solve.corners import extremes
from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import Conditions, run_at
from protlint.solve.solution import Currents, Point, Solution
from protlint.solve.stage import Stage, Sweep, points, short_voltage
from protlint.solve.thyristor import ANODE
from protlint.solve.tripping import HeldBase, Tripping, find, hold_base, refine, scan

_SHARES = (0.0, 0.3, 0.6, 0.9)
"""Places between the short and the farthest the output can go, where no working output voltage is stated."""
_TRIPPED_SHARE = 0.5
"""A latch that leaves more than this of what it trips at has not taken the drive away."""
_ROUNDING = 1e-6
"""Ends are rounded outwards by this share, so that what lies on them lies within."""


def settle(stage: Stage, sweep: Sweep) -> Sweep:
    """Return the sweep with its on end, shunt in, where the latch stands once the drive has risen to there.

    Raises
    ------
    CircuitError
        Where the shunt's emitter is on no net whose voltage is known.
    """
    held = hold_base(stage)
    short = sweep.full_drive(0)
    conditions = Conditions(short.lanes.ambient_K)
    plane = scan(held, conditions, np.full(sweep.ambients, np.nan))
    last = plane.injected_A[:, -1]
    start = short.operating.inner.copy()
    for ambient in range(sweep.ambients):
        rises = np.flatnonzero((last[:-1, ambient] <= 0.0) & (last[1:, ambient] > 0.0))
        if len(rises):
            start[:, ambient] = plane.inner[:, rises[0] + 1, -1, ambient]
    run = run_at(stage, conditions, None, start)
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


def with_trips(stage: Stage, solution: Solution) -> Solution:
    """Return a latch's solution with begins where it trips in the short, carries and most what it passes before it trips.

    Holds stays what it passes afterwards. Where the latch does not stay on there is no begins, and the rest is as of a
    limiter without a latch.
    """
    held, circuit, rows = hold_base(stage), stage.network.circuit, solution.currents
    ambients = len(rows)
    ambient_K = np.array([row.ambient_degC for row in rows]) + KELVIN
    places_V = _places(stage, ambients)
    conditions = Conditions(np.tile(ambient_K, len(places_V)))
    output_V = places_V.ravel()
    folds = find(held, conditions, output_V)
    passes_A = folds.output_A.reshape(len(places_V), ambients)
    known = circuit.output_V is not None or not circuit.ground_leg
    first = 1 if circuit.output_V is not None else 0
    working = passes_A[first:] if known else np.full_like(passes_A, np.nan)
    index = np.arange(ambients)
    of_begins = index
    of_carries = (first + _best(working, np.nanargmin)) * ambients + index
    of_most = _best(passes_A, np.nanargmax) * ambients + index
    wanted = np.unique(np.concatenate((of_begins, of_carries, of_most)))
    wanted = wanted[np.isfinite(folds.output_A[wanted])]
    ends = np.full((2, folds.output_A.size), np.nan)
    if len(wanted):
        ends[:, wanted] = _ranges(held, conditions, output_V, folds, wanted)
    changed = []
    for ambient, row in enumerate(rows):
        begins, carries, most = (int(of[ambient]) for of in (of_begins, of_carries, of_most))
        changed.append(_changed(row, folds.output_A, ends, begins, carries if known else None, most))
    usual = ambients // 2
    at_carry = _point(held, folds, int(of_carries[usual])) if known else None
    return replace(
        solution,
        currents=tuple(changed),
        at_carry=at_carry or solution.at_carry,
        regulates=None,
        not_checked=tuple(solution.not_checked) + _untripped(stage, changed),
    )


def _changed(row: Currents, passes_A: Array, ends: Array, begins: int, carries: int | None, most: int) -> Currents:
    """Return a row of currents with the places of its figures among the folds put in."""

    def figure(place: int | None) -> float | None:
        return float(passes_A[place]) if place is not None and np.isfinite(passes_A[place]) else None

    def pair(place: int | None) -> tuple[float, float] | None:
        if place is None or not np.isfinite(ends[:, place]).all():
            return None
        return float(ends[0, place]), float(ends[1, place])

    trips_A = figure(begins)
    if trips_A is None or row.holds_A is None or row.holds_A > _TRIPPED_SHARE * trips_A:
        return replace(row, begins_A=None, begins_range_A=None)
    trips = figure(carries) is not None
    most_A, most_range = max(figure(most) or 0.0, row.holds_A or 0.0), pair(most)
    if most_range is not None and row.holds_range_A is not None:
        most_range = (max(most_range[0], row.holds_range_A[0]), max(most_range[1], row.holds_range_A[1]))
    return replace(
        row,
        begins_A=trips_A,
        begins_range_A=pair(begins),
        carries_A=figure(carries) if trips else row.carries_A,
        carries_range_A=pair(carries) if trips else row.carries_range_A,
        most_A=most_A,
        most_range_A=most_range,
        limited_by_output="limiter" if trips else row.limited_by_output,
    )


def _untripped(stage: Stage, rows: Sequence[Currents]) -> tuple[tuple[str, str], ...]:
    names = " and ".join(name.removesuffix(ANODE) for name in stage.network.circuit.latch)
    never = [f"{row.ambient_degC:g} degC" for row in rows if row.begins_A is None]
    may_not = [
        f"{row.ambient_degC:g} degC"
        for row in rows
        if row.begins_range_A is not None
        and row.holds_range_A is not None
        and row.holds_range_A[1] > _TRIPPED_SHARE * row.begins_range_A[1]
    ]
    wants = f"a drive that makes {names} trip and keeps it on"
    told = [f"{wants}: as it is stated it does not, at {', '.join(never)}"] if never else []
    told += [f"{wants} over every spread: at worst it does not, at {', '.join(may_not)}"] if may_not else []
    return tuple(("begins", one) for one in told)


def _ranges(held: HeldBase, conditions: Conditions, output_V: Array, folds: Tripping, wanted: IntArray) -> Array:
    """Return the low and the high ends of folds (2, wanted)."""

    def evaluate(corner: Array, which: IntArray) -> Array:
        place = wanted[which]
        at = Conditions(conditions.ambient_K[place], corner)
        return refine(held, at, output_V[place], folds.pick(place)).output_A

    nominal = folds.output_A[wanted]
    _, found = extremes(evaluate, nominal, len(held.stage.axes))
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


def _point(held: HeldBase, folds: Tripping, place: int) -> Point | None:
    if folds.run is None or not np.isfinite(folds.output_A[place]):
        return None
    found = points(held.stage, folds.run, [place])
    return found[0] if found else None


def _put(values: NDArray[Any], lanes: IntArray, new: NDArray[Any]) -> NDArray[Any]:
    result = values.copy()
    result[..., lanes] = new
    return result
