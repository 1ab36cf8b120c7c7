"""Where a limiter begins: the last crossing, as the drive rises, of nine tenths of what it gives without the shunt."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import Conditions
from protlint.solve.stage import Stage, run_stage

LIMITING_SHARE = 0.9
LEAST_SHARE_OF_HOLDS = 0.05
"""A crossing below this share of holds is leakage, not limiting."""

_COARSE_POINTS = 33
_FINE_POINTS = 7
_FINE_ROUNDS = 2
_SEARCHES = 14
_BEYOND = 3.0
"""How many times its range a drive is let rise past its on end where only the crossing's own spread is wanted."""


@dataclass(frozen=True, slots=True)
class Begins:
    """Crossings by condition: drive voltage and output current, NaN where there is none, and the inner voltages there with
    the shunt in and taken out (ports, 2, conditions)."""

    drive_V: Array
    output_A: Array
    inner: Array


def begins_nominal(stage: Stage, conditions: Conditions, holds_A: Array) -> Begins:
    """Find the crossings of nominal conditions on a locally refined grid over the drive's range."""
    off, on = drive_ends(stage)
    count = len(holds_A)
    if off == on:
        return Begins(np.full(count, np.nan), np.full(count, np.nan), np.zeros((stage.network.ports, 2, count)))
    lane = np.arange(count)
    low, high = np.full(count, off), np.full(count, on)
    share = np.linspace(0.0, 1.0, _COARSE_POINTS)
    start: Array | None = None
    exists = np.ones(count, dtype=bool)
    for _ in range(1 + _FINE_ROUNDS):
        drive_V = low + share[:, None] * (high - low)
        with_A, without_A, inner = _with_and_without(stage, conditions, drive_V, start)
        interval = _last_crossing(with_A, without_A, holds_A)
        exists &= interval >= 0
        row = np.maximum(interval, 0)
        low, high = drive_V[row, lane], drive_V[row + 1, lane]
        start = inner[:, :, row, lane]
        share = np.linspace(0.0, 1.0, _FINE_POINTS)
    over = with_A - LIMITING_SHARE * without_A
    first, second = over[row, lane], over[row + 1, lane]
    part = np.where(exists, first / np.where(first == second, 1.0, first - second), np.nan)
    output_A = with_A[row, lane] + part * (with_A[row + 1, lane] - with_A[row, lane])
    real = output_A > LEAST_SHARE_OF_HOLDS * holds_A
    assert start is not None
    return Begins(np.where(real, low + part * (high - low), np.nan), np.where(real, output_A, np.nan), start)


def begins_near(stage: Stage, conditions: Conditions, from_V: Array, start: Array, scale_A: Array) -> Array:
    """Return the output currents (conditions,) at the crossings nearest to given drives, NaN where none is found.

    The drive may rise past its on end, so that a corner in which the drive gives out a little earlier still shows where the
    limiter itself would begin. Newton's method between bounds; ``start`` (ports, 2, conditions) and ``from_V`` come from the
    nominal crossing, ``scale_A`` are currents that an error is judged by.
    """
    off, on = drive_ends(stage)
    span = on - off
    rise = np.clip((from_V - off) / span, 0.0, 1.0)
    below, above = np.zeros_like(rise), np.full_like(rise, 1.0 + _BEYOND)
    result = np.full(len(rise), np.nan)
    active = np.arange(len(rise))
    start = start.copy()
    nudge = 1e-3
    for _ in range(_SEARCHES):
        here = rise[active]
        drive_V = off + span * np.stack((here, here + nudge))
        with_A, without_A, inner = _with_and_without(stage, conditions.pick(active), drive_V, start[:, :, active])
        start[:, :, active] = inner[:, :, 0]
        over = (with_A - LIMITING_SHARE * without_A) / scale_A[active]
        slope = (over[1] - over[0]) / nudge
        result[active] = with_A[0]
        below[active] = np.where(over[0] > 0.0, here, below[active])
        above[active] = np.where(over[0] > 0.0, above[active], here)
        # short of the limiter's onset the excess still grows with the drive: there the way is up, whatever the slope says
        step = np.clip(over[0] / np.maximum(np.abs(slope), 1e-9), -0.2, 0.2)
        step = np.where((over[0] > 0.0) & (slope > 0.0), 0.1, step)
        new = here + step
        outside = (new <= below[active]) | (new >= above[active])
        new = np.where(outside, 0.5 * (below[active] + above[active]), new)
        rise[active] = new
        lost = np.isnan(over[0]) | (below[active] > 0.999 * (1.0 + _BEYOND))
        result[active[lost]] = np.nan
        active = active[~lost & ((np.abs(over[0]) > 1e-5) | (slope > 0.0))]
        if not len(active):
            break
    result[active] = np.nan
    return np.where(result > LEAST_SHARE_OF_HOLDS * scale_A, result, np.nan)


def drive_ends(stage: Stage) -> tuple[float, float]:
    """Return the drive's off and on ends, usual values."""
    drive = stage.network.circuit.drive
    ends = (drive.low_V.usual, drive.high_V.usual)
    return ends[1 - stage.on_end], ends[stage.on_end]


def _with_and_without(
    stage: Stage, conditions: Conditions, drive_V: Array, start: Array | None
) -> tuple[Array, Array, Array]:
    """Run drives (points, conditions); return the output currents with and without the shunt, each (points, conditions), and
    the inner voltages (ports, 2, points, conditions). ``start`` is (ports, 2, conditions)."""
    points, count = drive_V.shape
    which = np.tile(np.arange(count), 2 * points)
    begin = None
    if start is not None:
        begin = np.broadcast_to(start[:, :, None, :], (len(start), 2, points, count)).reshape(len(start), -1)
    spread = conditions.pick(which)
    run = run_stage(
        stage,
        spread.ambient_K,
        corner=spread.corner,
        drive_V=np.tile(drive_V.ravel(), 2),
        shunt_in=np.repeat([1.0, 0.0], points * count),
        start=begin,
    )
    current = run.output_A.reshape(2, points, count)
    return current[0], current[1], run.operating.inner.reshape(-1, 2, points, count)


def _last_crossing(with_A: Array, without_A: Array, holds_A: Array) -> IntArray:
    """Return the lower row of the last interval with a crossing, -1 where there is none (conditions,)."""
    over = with_A > LIMITING_SHARE * without_A
    enough = np.maximum(with_A[:-1], with_A[1:]) > LEAST_SHARE_OF_HOLDS * holds_A
    crossing = (over[:-1] != over[1:]) & enough
    rows = np.arange(len(crossing))[:, None]
    last: IntArray = np.where(crossing, rows, -1).max(axis=0)
    return last
