"""The ranges of begins, holds, carries and most: every figure at the worst that all spreads can do together.

Signs are found with the figures taken at a few probing output voltages; what is printed for carries and most is then taken
from whole loci at the corners found.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from protlint.solve.begins import begins_near
from protlint.solve.corners import extremes
from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import PASS_V, Conditions, greatest, least_working, run_at, trace, working_edges
from protlint.solve.nominal import Nominal
from protlint.solve.stage import Run, Stage, pass_power, pass_voltage

KINDS = ("begins", "holds", "carries", "most")

_CORNER_ROUNDS = 5
_MOST_PROBES = (-0.06, -0.015, 0.0, 0.015, 0.06)
"""Where the greatest current is looked for around its nominal place, in shares of the locus."""


@dataclass(frozen=True, slots=True)
class Ranges:
    """Ranges by kind, each (2, ambients), low then high, NaN where there is none; the corners of holds (axes, 2 ambients),
    low ends first; and the runs, one lane an ambient, at the high corner of holds: into the short, and at the point of
    greatest pass dissipation."""

    by_kind: dict[str, Array]
    holds_corner: Array
    high_short: Run
    high_worst: Run


def find_ranges(stage: Stage, nominal: Nominal) -> Ranges:
    """Find all ranges of a stage."""
    ambients = len(nominal.holds_A)
    figures = np.concatenate((nominal.begins.output_A, nominal.holds_A, nominal.carries_A, nominal.most_A))
    existing = np.flatnonzero(np.isfinite(figures))
    probe = _probe(stage, nominal)
    corner, found = extremes(lambda at, which: probe(at, existing[which]), figures[existing], len(stage.axes))
    ends = np.full((2, len(figures)), np.nan)
    ends[:, existing] = found.reshape(2, -1)
    corners = np.zeros((2, len(stage.axes), len(figures)))
    corners[:, :, existing] = corner.reshape(len(stage.axes), 2, -1).swapaxes(0, 1)
    by_kind = {kind: ends[:, place * ambients : (place + 1) * ambients].copy() for place, kind in enumerate(KINDS)}
    holds = corners[:, :, ambients : 2 * ambients]
    carries, most = corners[:, :, 2 * ambients : 3 * ambients], corners[:, :, 3 * ambients :]

    # whole loci at the corners: carries low and high, most low and high, holds high
    every = np.concatenate((*carries, *most, holds[1]), axis=1)
    conditions = Conditions(np.tile(nominal.conditions.ambient_K, 5), every)
    start = np.tile(nominal.short.operating.inner, 5)
    short = run_at(stage, conditions, None, start)
    loci = trace(stage, conditions, short, _CORNER_ROUNDS)
    if stage.network.circuit.output_V is None:
        loci = working_edges(stage, conditions, loci)
        for place in range(2 * ambients):
            end, ambient = divmod(place, ambients)
            index = least_working(loci, place)
            if np.isfinite(nominal.carries_A[ambient]) and index is not None:
                by_kind["carries"][end, ambient] = loci.output_A[index]
    for place in range(2 * ambients):
        end, ambient = divmod(place, ambients)
        index = greatest(loci, 2 * ambients + place)
        if index is not None:
            by_kind["most"][end, ambient] = loci.output_A[index]
    nominal_of = dict(zip(KINDS, figures.reshape(4, -1), strict=True))
    for kind, pair in by_kind.items():
        pair[0] = np.fmin(pair[0], nominal_of[kind])
        pair[1] = np.fmax(pair[1], nominal_of[kind])
    by_kind["most"][1] = np.fmax(by_kind["most"][1], by_kind["holds"][1])
    high = np.arange(4 * ambients, 5 * ambients)
    return Ranges(
        by_kind=by_kind,
        holds_corner=np.concatenate((holds[0], holds[1]), axis=1),
        high_short=run_at(stage, conditions.pick(high), None, short.operating.inner[:, high]),
        high_worst=_hottest(stage, conditions, short, high, loci.owner, loci.output_V, loci.inner),
    )


def _hottest(
    stage: Stage, conditions: Conditions, short: Run, chosen: IntArray, owner: IntArray, output_V: Array, inner: Array
) -> Run:
    """Return the run at each chosen condition's point of greatest pass dissipation."""
    mine = np.flatnonzero(np.isin(owner, chosen))
    run = run_at(stage, conditions.pick(owner[mine]), output_V[mine], inner[:, mine])
    power = np.nan_to_num(pass_power(stage, run), nan=-np.inf)
    at_V, start = short.output_V[chosen].copy(), short.operating.inner[:, chosen].copy()
    for column, condition in enumerate(chosen):
        lanes = np.flatnonzero(owner[mine] == condition)
        if len(lanes):
            top = mine[lanes[int(np.argmax(power[lanes]))]]
            at_V[column], start[:, column] = output_V[top], inner[:, top]
    return run_at(stage, conditions.pick(chosen), at_V, start)


def _probe(stage: Stage, nominal: Nominal) -> Callable[[Array, IntArray], Array]:
    """Return the function of corners (axes, lanes) and figures (lanes,) that ``extremes`` works with.

    Figures are numbered kind by kind in the order of ``KINDS``, ambient by ambient.
    """
    ambients = len(nominal.holds_A)
    functions = (_begins, _holds, _carries, _most)

    def evaluate(corner: Array, figure: IntArray) -> Array:
        result = np.full(len(figure), np.nan)
        for kind, function in enumerate(functions):
            lanes = np.flatnonzero(figure // ambients == kind)
            if len(lanes):
                ambient = figure[lanes] % ambients
                conditions = Conditions(nominal.conditions.ambient_K[ambient], corner[:, lanes])
                result[lanes] = function(stage, nominal, conditions, ambient)
        return result

    return evaluate


def _begins(stage: Stage, nominal: Nominal, conditions: Conditions, ambient: IntArray) -> Array:
    begins = nominal.begins
    return begins_near(stage, conditions, begins.drive_V[ambient], begins.inner[:, :, ambient], nominal.holds_A[ambient])


def _holds(stage: Stage, nominal: Nominal, conditions: Conditions, ambient: IntArray) -> Array:
    return run_at(stage, conditions, None, nominal.short.operating.inner[:, ambient]).output_A


def _carries(stage: Stage, nominal: Nominal, conditions: Conditions, ambient: IntArray) -> Array:
    """At the working voltage; else the least of the short, the nominal place, and where the pass device is down to 2 V."""
    assert nominal.carry is not None
    at_V, start = nominal.carry_V[ambient], nominal.carry.operating.inner[:, ambient]
    run = run_at(stage, conditions, at_V, start)
    if stage.network.circuit.output_V is not None:
        return np.maximum(run.output_A, 0.0)
    found = [np.where(pass_voltage(stage, run) >= PASS_V, run.output_A, np.inf)]
    for _ in range(2):
        # the pass voltage follows the output volt by volt
        at_V = at_V - stage.way * (pass_voltage(stage, run) - PASS_V)
        run = run_at(stage, conditions, at_V, run.operating.inner)
    found.append(run.output_A)
    short = run_at(stage, conditions, None, nominal.short.operating.inner[:, ambient])
    found.append(np.where(pass_voltage(stage, short) >= PASS_V, short.output_A, np.inf))
    least: Array = np.fmin.reduce(found)
    return least


def _most(stage: Stage, nominal: Nominal, conditions: Conditions, ambient: IntArray) -> Array:
    short_V = nominal.short.output_V[ambient]
    span = np.array([np.ptp(nominal.loci.output_V[nominal.loci.of(place)]) for place in range(len(nominal.holds_A))])[
        ambient
    ]
    places = (0.0,) if (nominal.most_V[ambient] == short_V).all() else _MOST_PROBES
    start = nominal.short.operating.inner[:, ambient]
    found = [run_at(stage, conditions, None, start).output_A]
    if places != (0.0,):
        count = len(ambient)
        probes = np.concatenate([nominal.most_V[ambient] - stage.way * share * span for share in places])
        run = run_at(stage, conditions.pick(np.tile(np.arange(count), len(places))), probes, np.tile(start, len(places)))
        found += list(run.output_A.reshape(len(places), count))
    most: Array = np.fmax.reduce(found)
    return most
