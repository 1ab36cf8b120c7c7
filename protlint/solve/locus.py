"""The locus: output current against output voltage with the drive full on, kinks resolved.

A *condition* is an ambient with a corner. Loci of several conditions are solved side by side: their points stand in one
long batch, sorted by condition and then from the short to where the pass device runs out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from protlint.solve.devices import Array, IntArray
from protlint.solve.stage import Run, Stage, pass_voltage, run_stage, short_voltage

RUN_OUT_SHARE = 1e-3
"""The pass device has run out where this share of the greatest current is left."""
PASS_V = 2.0
"""What a pass device needs to be working, where no working output voltage is stated."""
LEAST_POINTS = 41

_KINK_SHARE = 1e-3
_ROUNDS = 3
_PARTS = np.array([0.25, 0.5, 0.75])


@dataclass(frozen=True, slots=True)
class Conditions:
    """Ambients in kelvin (conditions,) and corners (axes, conditions), None for nominal."""

    ambient_K: Array
    corner: Array | None = None

    def pick(self, which: IntArray) -> Conditions:
        """Return some of the conditions, repeats allowed."""
        return Conditions(self.ambient_K[which], None if self.corner is None else self.corner[:, which])


@dataclass(frozen=True, slots=True)
class Loci:
    """The points of all loci: whose condition each is, output voltage and current, least pass voltage, inner voltages; and
    (condition, output voltage) of the points that were not solved and are not among them."""

    owner: IntArray
    output_V: Array
    output_A: Array
    pass_V: Array
    inner: Array
    lost: tuple[tuple[int, float], ...] = ()

    def of(self, condition: int) -> IntArray:
        """Return the indices of one condition's points, from the short outwards."""
        return np.flatnonzero(self.owner == condition)


def run_at(stage: Stage, conditions: Conditions, output_V: Array | None, start: Array | None) -> Run:
    """Run conditions with the drive full on and the output in the short (None, NaN) or at given voltages (conditions,)."""
    return run_stage(stage, conditions.ambient_K, corner=conditions.corner, output_V=output_V, start=start)


def trace(stage: Stage, conditions: Conditions, start: Array, rounds: int = _ROUNDS) -> tuple[Loci, Array]:
    """Trace the loci of conditions; return them and the inner voltages of the even grid (ports, points, conditions).

    From the short towards the end of the output's reach in which the pass voltage falls: upwards where current flows out of
    the stage, else downwards. Where three points in a row bend by more than 0.1 % of the greatest current, both intervals
    are divided by four, up to ``rounds`` times. ``start`` are inner voltages to begin with, as those returned; one point may
    stand for all.
    """
    count = len(conditions.ambient_K)
    near = short_voltage(stage, conditions.corner, count)
    far = np.full(count, _reach_end(stage, near))
    owner = np.repeat(np.arange(count), LEAST_POINTS)
    share = np.tile(np.linspace(0.0, 1.0, LEAST_POINTS), count)
    begin = np.broadcast_to(start, (len(start), LEAST_POINTS, count)).swapaxes(1, 2).reshape(len(start), -1)
    found = _solve(stage, conditions, owner, near[owner] + share * (far - near)[owner], begin)
    grid = found.inner.reshape(len(start), count, LEAST_POINTS).swapaxes(1, 2)
    for _ in range(rounds):
        left = _bends(found, share)
        if not len(left):
            break
        parts = np.repeat(left, len(_PARTS))
        part = np.tile(_PARTS, len(left))
        between = share[parts] + part * (share[parts + 1] - share[parts])
        whose = found.owner[parts]
        begin = found.inner[:, parts] + part * (found.inner[:, parts + 1] - found.inner[:, parts])
        added = _solve(stage, conditions, whose, near[whose] + between * (far - near)[whose], begin)
        share = np.concatenate((share, between))
        order = np.lexsort((share, np.concatenate((found.owner, whose))))
        share, found = share[order], _merged(found, added, order)
    return _until_run_out(found), grid


def fill(stage: Stage, conditions: Conditions, loci: Loci) -> Loci:
    """Halve the widest intervals of a single condition's locus until it has at least 41 points."""
    while 2 <= len(loci.owner) < LEAST_POINTS:
        widths = np.abs(np.diff(loci.output_V))
        left = np.sort(np.argsort(-widths, kind="stable")[: LEAST_POINTS - len(loci.owner)])
        middle = 0.5 * (loci.output_V[left] + loci.output_V[left + 1])
        added = _solve(stage, conditions, loci.owner[left], middle, loci.inner[:, left])
        after = np.concatenate((np.arange(len(loci.owner), dtype=np.float64), left + 0.5))
        loci = _merged(loci, added, np.argsort(after, kind="stable"))
    return loci


def working_edges(stage: Stage, conditions: Conditions, loci: Loci) -> Loci:
    """Add to each locus the point where the pass device is down to 2 V, where there is one."""
    step = np.flatnonzero((loci.owner[:-1] == loci.owner[1:]) & (loci.pass_V[:-1] >= PASS_V) & (loci.pass_V[1:] < PASS_V))
    if not len(step):
        return loci
    part = (loci.pass_V[step] - PASS_V) / (loci.pass_V[step] - loci.pass_V[step + 1])
    at_V = loci.output_V[step] + part * (loci.output_V[step + 1] - loci.output_V[step])
    added = _solve(stage, conditions, loci.owner[step], at_V, loci.inner[:, step])
    # the pass voltage is not quite straight in between; the edge belongs to the working points by definition
    added = Loci(added.owner, added.output_V, added.output_A, np.full(len(step), PASS_V), added.inner)
    after = np.concatenate((np.arange(len(loci.owner), dtype=np.float64), step + 0.5))
    return _merged(loci, added, np.argsort(after, kind="stable"))


def least_working(loci: Loci, condition: int) -> int | None:
    """Return the index of the least current that leaves the pass device 2 V, or None where none does."""
    working = [index for index in loci.of(condition) if loci.pass_V[index] >= PASS_V]
    return min(working, key=lambda index: (float(loci.output_A[index]), int(index))) if working else None


def greatest(loci: Loci, condition: int) -> int | None:
    """Return the index of the greatest current, or None where nothing was solved."""
    mine = loci.of(condition)
    return int(mine[np.argmax(loci.output_A[mine])]) if len(mine) else None


def _reach_end(stage: Stage, near: Array) -> float:
    """Return where the output can go at most, in the direction in which the pass voltage falls."""
    circuit = stage.network.circuit
    low, high = circuit.output_reach_V
    if low >= high:
        voltages = [value for limits in circuit.held.values() for value in (limits.low, limits.high)]
        low, high = min(voltages), max(voltages)
    return max(high, float(near.max())) if stage.way < 0.0 else min(low, float(near.min()))


def _solve(stage: Stage, conditions: Conditions, owner: IntArray, output_V: Array, start: Array) -> Loci:
    run = run_at(stage, conditions.pick(owner), output_V, start)
    return Loci(owner, output_V, run.output_A, pass_voltage(stage, run), run.operating.inner)


def _merged(first: Loci, second: Loci, order: IntArray) -> Loci:
    return Loci(
        np.concatenate((first.owner, second.owner))[order],
        np.concatenate((first.output_V, second.output_V))[order],
        np.concatenate((first.output_A, second.output_A))[order],
        np.concatenate((first.pass_V, second.pass_V))[order],
        np.concatenate((first.inner, second.inner), axis=1)[:, order],
        first.lost,
    )


def _bends(loci: Loci, share: Array) -> IntArray:
    """Return the left ends of the intervals to halve."""
    current = np.nan_to_num(loci.output_A)
    scale = _scale(loci)
    middle = np.arange(1, len(share) - 1)
    inside = (loci.owner[middle - 1] == loci.owner[middle]) & (loci.owner[middle] == loci.owner[middle + 1])
    middle = middle[inside]
    before, after = share[middle] - share[middle - 1], share[middle + 1] - share[middle]
    straight = (current[middle - 1] * after + current[middle + 1] * before) / (before + after)
    bent = np.abs(current[middle] - straight) > _KINK_SHARE * scale[loci.owner[middle]]
    # beyond the run-out nothing is kept, so nothing needs resolving
    bent &= current[middle - 1] > RUN_OUT_SHARE * scale[loci.owner[middle]]
    flagged = np.zeros(len(share), dtype=bool)
    flagged[middle[bent] - 1] = True
    flagged[middle[bent]] = True
    return np.flatnonzero(flagged)


def _scale(loci: Loci) -> Array:
    scale = np.zeros(int(loci.owner.max()) + 1 if len(loci.owner) else 0)
    np.maximum.at(scale, loci.owner, np.nan_to_num(loci.output_A))
    return scale


def _until_run_out(loci: Loci) -> Loci:
    """Drop what lies beyond the first point with (almost) no current left, and points that were not solved, noting these."""
    scale = _scale(loci)
    solved = np.isfinite(loci.output_A)
    keep, wanted = solved.copy(), np.ones(len(solved), dtype=bool)
    for condition in range(len(scale)):
        mine = np.flatnonzero((loci.owner == condition) & keep)
        spent = np.flatnonzero(loci.output_A[mine] <= RUN_OUT_SHARE * scale[condition])
        if len(spent):
            keep[mine[spent[0] + 1 :]] = False
            wanted[(loci.owner == condition) & (np.arange(len(wanted)) > mine[spent[0]])] = False
    missed = np.flatnonzero(wanted & ~solved)
    lost = tuple(zip(loci.owner[missed].tolist(), loci.output_V[missed].tolist(), strict=True))
    return Loci(loci.owner[keep], loci.output_V[keep], loci.output_A[keep], loci.pass_V[keep], loci.inner[:, keep], lost)
