"""The ranges of begins, holds, carries and most: every figure at the worst that all spreads can do together.

Signs are found with the figures taken at a few probing output voltages; what is printed for carries and most is then taken
from whole loci at the corners found.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve.begins import begins_near
from protlint.solve.corners import extremes
from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import PASS_V, Conditions, Loci, greatest, least_working, run_at, trace, working_edges
from protlint.solve.nominal import Nominal, carried
from protlint.solve.stage import Run, Stage, pass_voltage, short_voltage

KINDS = ("begins", "holds", "carries", "most")

_CORNER_ROUNDS = 2
_MOST_PROBES = (-0.25, -0.12, -0.06, -0.03, -0.015, 0.0, 0.015, 0.03, 0.06, 0.12, 0.25)
"""Where the greatest current is looked for around its nominal place, in shares of the locus."""
_EDGE_V, _EDGE_STEPS = 0.02, 4
"""How near to its least working voltage the pass device has to be for the edge's current, and how often to try."""
_ROUNDING = 1e-6
"""Ends are rounded outwards by this share, so that what lies on them lies within."""


@dataclass(frozen=True, slots=True)
class Ranges:
    """Ranges by kind, each (2, ambients), low then high, NaN where there is none; the corners of holds (2, axes, ambients),
    low then high; and at the high corner of holds the run into the short, one lane an ambient, and the run along the locus
    with each lane's ambient (an index)."""

    by_kind: dict[str, Array]
    holds_corner: Array
    high_short: Run
    high_locus: Run
    high_owner: IntArray


def find_ranges(stage: Stage, nominal: Nominal, *, only_holds: bool = False) -> Ranges:
    """Find all ranges of a stage, or those of holds alone."""
    ambients = len(nominal.holds_A)
    figures = np.stack((nominal.begins.output_A, nominal.holds_A, nominal.carries_A, nominal.most_A))
    if only_holds:
        figures[[kind != "holds" for kind in KINDS]] = np.nan
    # where the locus is greatest in the short itself, what moves most is what moves holds
    in_short = (nominal.most_V == nominal.short.output_V) & (not only_holds)
    existing = np.flatnonzero(np.isfinite(np.concatenate((figures[:3], np.where(in_short, np.nan, figures[3])[None]))))
    probe = _probe(stage, nominal)
    corner, found = extremes(lambda at, which: probe(at, existing[which]), figures.ravel()[existing], len(stage.axes))
    ends = np.full((2, figures.size), np.nan)
    ends[:, existing] = found.reshape(2, len(existing))
    corners = np.zeros((2, len(stage.axes), figures.size))
    corners[:, :, existing] = corner.reshape(len(stage.axes), 2, len(existing)).swapaxes(0, 1)
    of_most, of_holds = 3 * ambients + np.flatnonzero(in_short), ambients + np.flatnonzero(in_short)
    ends[:, of_most], corners[:, :, of_most] = ends[:, of_holds], corners[:, :, of_holds]
    by_kind = {kind: ends.reshape(2, len(KINDS), -1)[:, place].copy() for place, kind in enumerate(KINDS)}
    _, holds, carries, most = (corners[:, :, place * ambients : (place + 1) * ambients] for place in range(len(KINDS)))

    wanted = (holds[1],) if only_holds else (*carries, *most, holds[1])
    conditions = Conditions(np.tile(nominal.conditions.ambient_K, len(wanted)), np.concatenate(wanted, axis=1))
    loci, grid = trace(stage, conditions, np.tile(nominal.grid, len(wanted)), _CORNER_ROUNDS)
    at_edge = stage.network.circuit.output_V is None and nominal.carry is not None
    if at_edge:
        loci = working_edges(stage, conditions, loci)
    if at_edge and not only_holds:
        least = _from_loci(loci, least_working, 0, ambients, by_kind["carries"])
        by_kind["carries"] = carried(least, nominal.most_A)
    if not only_holds:
        by_kind["most"] = _from_loci(loci, greatest, 2 * ambients, ambients, by_kind["most"])
    for kind, value in zip(KINDS, figures, strict=True):
        by_kind[kind] = np.stack((np.fmin(by_kind[kind][0], value), np.fmax(by_kind[kind][1], value)))
    by_kind["most"][1] = np.fmax(by_kind["most"][1], by_kind["holds"][1])
    by_kind = {kind: np.stack((low * (1.0 - _ROUNDING), high * (1.0 + _ROUNDING))) for kind, (low, high) in by_kind.items()}
    first = len(conditions.ambient_K) - ambients
    high = np.arange(first, first + ambients)
    along = np.flatnonzero(np.isin(loci.owner, high))
    locus = run_at(stage, conditions.pick(loci.owner[along]), loci.output_V[along], loci.inner[:, along])
    return Ranges(
        by_kind=by_kind,
        holds_corner=holds,
        high_short=run_at(stage, conditions.pick(high), None, grid[:, 0, high]),
        high_locus=locus,
        high_owner=loci.owner[along] - first,
    )


def _from_loci(loci: Loci, choose: Callable[[Loci, int], int | None], first: int, ambients: int, known: Array) -> Array:
    """Return the chosen current of each locus from ``first`` on, low ends then high ends, where a figure is known."""
    result = known.copy()
    for place in range(2 * ambients):
        end, ambient = divmod(place, ambients)
        index = choose(loci, first + place)
        if index is not None and np.isfinite(known[end, ambient]):
            result[end, ambient] = loci.output_A[index]
    return result


def _probe(stage: Stage, nominal: Nominal) -> Callable[[Array, IntArray], Array]:
    """Return the function of corners (axes, lanes) and figures (lanes,) that ``extremes`` works with.

    Figures are numbered kind by kind in the order of ``KINDS``, ambient by ambient.
    """
    ambients = len(nominal.holds_A)

    def evaluate(corner: Array, figure: IntArray) -> Array:
        kind, ambient = divmod(figure, ambients)
        conditions = Conditions(nominal.conditions.ambient_K[ambient], corner)
        result = np.full(len(figure), np.nan)
        begins = np.flatnonzero(kind == 0)
        if len(begins):
            result[begins] = begins_near(stage, conditions.pick(begins), nominal.begins, ambient[begins])
        static = np.flatnonzero(kind > 0)
        if len(static):
            result[static] = _static(stage, nominal, conditions.pick(static), kind[static], ambient[static])
        return result

    return evaluate


def _static(stage: Stage, nominal: Nominal, conditions: Conditions, kind: IntArray, ambient: IntArray) -> Array:
    """Return holds, carries and most of conditions, all from one run at a few output voltages each.

    Carries without a stated working voltage is the least of the short, the nominal place, and the place where the pass
    device is down to 2 V; most the greatest around its nominal place.
    """
    circuit = stage.network.circuit
    holds, carries, most = (np.flatnonzero(kind == place) for place in (1, 2, 3))
    at_edge = circuit.output_V is None
    in_short = nominal.short.operating.inner
    at_carry = in_short if nominal.carry is None else nominal.carry.operating.inner
    probes = [(holds, np.full(len(holds), np.nan), in_short), (carries, nominal.carry_V[ambient[carries]], at_carry)]
    if at_edge:
        probes.append((carries, np.full(len(carries), np.nan), in_short))
    probes.append((most, np.full(len(most), np.nan), in_short))
    for share in _MOST_PROBES:
        near_V, within = _beside_most(stage, nominal, share)
        lanes = most[within[ambient[most]]]
        probes.append((lanes, near_V[ambient[lanes]], nominal.most_inner))
    owner = np.concatenate([lanes for lanes, _, _ in probes])
    at_V = np.concatenate([voltage for _, voltage, _ in probes])
    # a corner's locus starts at its own short: what lies beyond it is not of the locus
    short_V = short_voltage(stage, conditions.corner, len(kind))[owner]
    at_V = np.where((kind[owner] == 3) & (stage.way * (at_V - short_V) > 0.0), np.nan, at_V)
    start = np.concatenate([inner[:, ambient[lanes]] for lanes, _, inner in probes], axis=1)
    run = run_at(stage, conditions.pick(owner), at_V, start)
    result = np.full(len(kind), np.nan)
    result[holds] = run.output_A[: len(holds)]
    np.fmax.at(result, owner[kind[owner] == 3], run.output_A[kind[owner] == 3])
    if not at_edge:
        result[carries] = carried(run.output_A[len(holds) : len(holds) + len(carries)], nominal.most_A[ambient[carries]])
        return result
    pass_V = pass_voltage(stage, run)
    working = np.where(pass_V >= PASS_V, run.output_A, np.nan)
    np.fmin.at(result, owner[kind[owner] == 2], working[kind[owner] == 2])
    if len(carries):
        first = np.arange(len(holds), len(holds) + len(carries))
        least = np.fmin(result[carries], _edge(stage, conditions.pick(carries), run.pick(first)))
        result[carries] = carried(least, nominal.most_A[ambient[carries]])
    return result


def _beside_most(stage: Stage, nominal: Nominal, share: float) -> tuple[Array, NDArray[np.bool_]]:
    """Return the output voltages a share of each locus beyond its greatest current, and whether the locus reaches there."""
    voltages = [nominal.loci.output_V[nominal.loci.of(place)] for place in range(len(nominal.holds_A))]
    low, high = (
        np.array([end(one, initial=limit) for one in voltages]) for end, limit in ((np.min, np.inf), (np.max, -np.inf))
    )
    near_V: Array = nominal.most_V - stage.way * share * (high - low)
    return near_V, (low <= near_V) & (near_V <= high)


def _edge(stage: Stage, conditions: Conditions, run: Run) -> Array:
    """Return the currents where the pass device is down to 2 V, from runs nearby, by the secant method."""
    output_V, output_A = run.output_V.copy(), run.output_A.copy()
    miss_V = pass_voltage(stage, run) - PASS_V
    inner = run.operating.inner.copy()
    # to begin with, the pass voltage follows the output volt by volt
    slope = np.full(len(output_V), stage.way)
    low_V, high_V = run.lanes.known_V.min(axis=0), run.lanes.known_V.max(axis=0)
    far = np.flatnonzero(np.abs(miss_V) > _EDGE_V)
    for _ in range(_EDGE_STEPS):
        if not len(far):
            break
        step_V = np.clip(output_V[far] - miss_V[far] * slope[far], low_V[far], high_V[far]) - output_V[far]
        output_V[far] += step_V
        run = run_at(stage, conditions.pick(far), output_V[far], inner[:, far])
        new_V = pass_voltage(stage, run) - PASS_V
        change = new_V - miss_V[far]
        slope[far] = np.where(
            np.abs(change) > 1e-6, np.clip(step_V / np.where(change == 0.0, 1.0, change), -2.0, 2.0), slope[far]
        )
        miss_V[far], output_A[far], inner[:, far] = new_V, run.output_A, run.operating.inner
        far = far[np.abs(new_V) > _EDGE_V]
    return output_A
