"""Where a limiter begins: the last crossing, as the drive rises, of nine tenths of what it gives without the shunt."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve.crossing import balance
from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import Conditions
from protlint.solve.stage import Stage, Sweep, run_stage

LIMITING_SHARE = 0.9
LEAST_SHARE_OF_HOLDS = 0.05
"""A crossing below this share of holds is leakage, not limiting."""

LEAST_TOP = 0.8
"""A top of the share below this cannot hide a crossing between two points of the sweep."""

_FINE_POINTS, _TOP_POINTS = 9, 17
_BEYOND = 3.0
"""How many times its range a drive is let rise past its on end where only the crossing's own spread is wanted."""


@dataclass(frozen=True, slots=True)
class Begins:
    """Crossings by condition: drive voltage and output current, NaN where there is none, and the inner voltages there with
    the shunt in and taken out (ports, 2, conditions)."""

    drive_V: Array
    output_A: Array
    inner: Array


def nowhere(begins: Begins) -> Begins:
    """Return crossings that are none: a latch trips instead."""
    none = np.full_like(begins.output_A, np.nan)
    return Begins(none, none, begins.inner)


@dataclass(frozen=True, slots=True)
class _Grid:
    """Drive voltages and output currents with and without the shunt (points, conditions), and inner voltages (ports, 2,
    points, conditions)."""

    drive_V: Array
    with_A: Array
    without_A: Array
    inner: Array

    def pick(self, which: IntArray) -> _Grid:
        """Return some of the conditions."""
        return _Grid(self.drive_V[:, which], self.with_A[:, which], self.without_A[:, which], self.inner[..., which])

    def replaced(self, which: IntArray, others: _Grid) -> _Grid:
        """Return the grid with some of its conditions taken from another."""
        result = _Grid(self.drive_V.copy(), self.with_A.copy(), self.without_A.copy(), self.inner.copy())
        result.drive_V[:, which], result.with_A[:, which] = others.drive_V, others.with_A
        result.without_A[:, which], result.inner[..., which] = others.without_A, others.inner
        return result

    def between(self, low: IntArray, high: IntArray, points: int) -> _Grid:
        """Return a grid of so many points between two rows of each condition, by straight lines between the two."""
        lane = np.arange(self.drive_V.shape[1])
        share = np.linspace(0.0, 1.0, points)[:, None]

        def line(values: Array) -> Array:
            result: Array = (
                values[..., low, lane][..., None, :] * (1.0 - share) + values[..., high, lane][..., None, :] * share
            )
            return result

        return _Grid(line(self.drive_V), line(self.with_A), line(self.without_A), line(self.inner))


def begins_nominal(stage: Stage, conditions: Conditions, sweep: Sweep) -> Begins:
    """Find the crossings of nominal conditions, one an ambient, in the drive's sweep, and refine them.

    Where the share of the unlimited current has a top just below nine tenths between the sweep's points, a finer sweep there
    shows whether it rises above in between.
    """
    holds_A = sweep.current(0)[-1]
    coarse = _Grid(
        np.repeat(sweep.drive_V[:, None], len(holds_A), axis=1), sweep.current(0), sweep.current(1), sweep.inner()
    )
    bracket, exists = _bracket(coarse, _last_crossing(coarse, holds_A))
    top = _last_top(coarse, holds_A)
    hidden = np.flatnonzero(top > _last_crossing(coarse, holds_A))
    if len(hidden):
        around = coarse.pick(hidden).between(top[hidden] - 1, top[hidden] + 1, _TOP_POINTS)
        finer = _run(stage, conditions.pick(hidden), around)
        there, found = _bracket(finer, _last_crossing(finer, holds_A[hidden]))
        exists[hidden] |= found
        bracket = bracket.replaced(hidden[found], there.pick(np.flatnonzero(found)))
    fine = _run(stage, conditions, bracket.between(np.zeros_like(top), np.ones_like(top), _FINE_POINTS))
    last, found = _bracket(fine, _last_crossing(fine, holds_A))
    exists &= found
    over = last.with_A - LIMITING_SHARE * last.without_A
    part = np.where(exists, over[0] / np.where(over[0] == over[1], 1.0, over[0] - over[1]), 0.0)
    straight_V = last.drive_V[0] + part * (last.drive_V[1] - last.drive_V[0])
    straight_A = last.with_A[0] + part * (last.with_A[1] - last.with_A[0])
    found_V, found_A, inner = balance(
        stage,
        conditions,
        share=LIMITING_SHARE,
        from_V=straight_V,
        from_A=None,
        start=last.inner[:, :, 0] + part * (last.inner[:, :, 1] - last.inner[:, :, 0]),
        limits_V=(last.drive_V[0], last.drive_V[1]),
    )
    lost = np.isnan(found_A)
    drive_V, output_A = np.where(lost, straight_V, found_V), np.where(lost, straight_A, found_A)
    real = exists & (output_A > LEAST_SHARE_OF_HOLDS * holds_A)
    return Begins(np.where(real, drive_V, np.nan), np.where(real, output_A, np.nan), inner)


def begins_near(stage: Stage, conditions: Conditions, nominal: Begins, ambient: IntArray) -> Array:
    """Return the output currents (conditions,) at the crossings that belong to nominal ones (by index), NaN where lost.

    The drive may rise past its on end, and give more than its greatest current, so that a corner in which the drive gives
    out a little earlier still shows where the limiter itself would begin.
    """
    off, on = drive_ends(stage)
    found = np.full(len(ambient), np.nan)
    for drive_limit in (1.0, 1.0 + _BEYOND) if stage.network.limited_drive else (1.0,):
        lost = np.flatnonzero(np.isnan(found))
        if len(lost):
            _, found[lost], _ = balance(
                stage,
                conditions.pick(lost),
                share=LIMITING_SHARE,
                from_V=nominal.drive_V[ambient[lost]],
                from_A=nominal.output_A[ambient[lost]],
                start=nominal.inner[:, :, ambient[lost]],
                limits_V=(off, on + _BEYOND * (on - off)),
                drive_limit=drive_limit,
            )
    return np.where(found > LEAST_SHARE_OF_HOLDS * nominal.output_A[ambient], found, np.nan)


def drive_ends(stage: Stage) -> tuple[float, float]:
    """Return the drive's off and on ends, usual values."""
    drive = stage.network.circuit.drive
    ends = (drive.low_V.usual, drive.high_V.usual)
    return ends[1 - stage.on_end], ends[stage.on_end]


def _run(stage: Stage, conditions: Conditions, guess: _Grid) -> _Grid:
    """Run the drives of a grid, starting from its inner voltages."""
    points, count = guess.drive_V.shape
    spread = conditions.pick(np.tile(np.arange(count), 2 * points))
    run = run_stage(
        stage,
        spread.ambient_K,
        drive_V=np.tile(guess.drive_V.ravel(), 2),
        shunt_in=np.repeat([1.0, 0.0], points * count),
        start=guess.inner.reshape(len(guess.inner), -1),
    )
    current = run.output_A.reshape(2, points, count)
    return _Grid(guess.drive_V, current[0], current[1], run.operating.inner.reshape(guess.inner.shape))


def _bracket(grid: _Grid, row: IntArray) -> tuple[_Grid, NDArray[np.bool_]]:
    """Return the two points of each condition's crossing (of its last interval where there is none), and where one is."""
    exists = row >= 0
    row = np.where(exists, row, len(grid.drive_V) - 2)
    return grid.between(row, row + 1, 2), exists


def _last_crossing(grid: _Grid, holds_A: Array) -> IntArray:
    """Return the lower row of the last interval with a crossing, -1 where there is none (conditions,)."""
    over = grid.with_A > LIMITING_SHARE * grid.without_A
    enough = np.maximum(grid.with_A[:-1], grid.with_A[1:]) > LEAST_SHARE_OF_HOLDS * holds_A
    return _last_row((over[:-1] != over[1:]) & enough)


def _last_top(grid: _Grid, holds_A: Array) -> IntArray:
    """Return the row of the last top of the share that lies below nine tenths, -1 where there is none (conditions,)."""
    share = grid.with_A / grid.without_A
    below = (share[1:-1] < LIMITING_SHARE) & (share[1:-1] > LEAST_TOP)
    top = (share[1:-1] >= share[:-2]) & (share[1:-1] >= share[2:]) & (grid.with_A[2:] > LEAST_SHARE_OF_HOLDS * holds_A)
    row = _last_row(below & top)
    return np.where(row >= 0, row + 1, -1)


def _last_row(marked: NDArray[np.bool_]) -> IntArray:
    last: IntArray = np.where(marked, np.arange(len(marked))[:, None], -1).max(axis=0)
    return last
