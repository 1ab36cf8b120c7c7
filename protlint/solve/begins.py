"""Where a limiter begins: the last crossing, as the drive rises, of nine tenths of what it gives without the shunt."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from protlint.solve.crossing import balance
from protlint.solve.devices import Array, IntArray
from protlint.solve.locus import Conditions
from protlint.solve.stage import Stage, Sweep, run_stage

LIMITING_SHARE = 0.9
LEAST_SHARE_OF_HOLDS = 0.05
"""A crossing below this share of holds is leakage, not limiting."""

_FINE_SHARES = np.linspace(0.0, 1.0, 7)
_FINE_ROUNDS = 2
_BEYOND = 3.0
"""How many times its range a drive is let rise past its on end where only the crossing's own spread is wanted."""


@dataclass(frozen=True, slots=True)
class Begins:
    """Crossings by condition: drive voltage and output current, NaN where there is none, and the inner voltages there with
    the shunt in and taken out (ports, 2, conditions)."""

    drive_V: Array
    output_A: Array
    inner: Array


def begins_nominal(stage: Stage, conditions: Conditions, sweep: Sweep) -> Begins:
    """Find the crossings of nominal conditions, one an ambient, in the drive's sweep, and refine them locally."""
    holds_A = sweep.current(0)[-1]
    count = len(holds_A)
    lane = np.arange(count)
    drive_V = np.repeat(sweep.drive_V[:, None], count, axis=1)
    with_A, without_A, inner = sweep.current(0), sweep.current(1), sweep.inner()
    row = _last_crossing(with_A, without_A, holds_A)
    exists = row >= 0
    for _ in range(_FINE_ROUNDS):
        row = np.maximum(row, 0)
        low, high = drive_V[row, lane], drive_V[row + 1, lane]
        drive_V = low + _FINE_SHARES[:, None] * (high - low)
        start = inner[:, :, row, lane][:, :, None] * (1.0 - _FINE_SHARES[:, None])
        start = start + inner[:, :, row + 1, lane][:, :, None] * _FINE_SHARES[:, None]
        with_A, without_A, inner = _with_and_without(stage, conditions, drive_V, start)
        row = _last_crossing(with_A, without_A, holds_A)
        exists &= row >= 0
    row = np.maximum(row, 0)
    over = with_A - LIMITING_SHARE * without_A
    first, second = over[row, lane], over[row + 1, lane]
    part = np.where(exists, first / np.where(first == second, 1.0, first - second), np.nan)
    output_A = with_A[row, lane] + part * (with_A[row + 1, lane] - with_A[row, lane])
    real = output_A > LEAST_SHARE_OF_HOLDS * holds_A
    at_V = drive_V[row, lane] + part * (drive_V[row + 1, lane] - drive_V[row, lane])
    return Begins(np.where(real, at_V, np.nan), np.where(real, output_A, np.nan), inner[:, :, row, lane])


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
            found[lost] = balance(
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


def _with_and_without(stage: Stage, conditions: Conditions, drive_V: Array, start: Array) -> tuple[Array, Array, Array]:
    """Run drives (points, conditions); return the output currents with and without the shunt, each (points, conditions), and
    the inner voltages (ports, 2, points, conditions), as which ``start`` comes."""
    points, count = drive_V.shape
    spread = conditions.pick(np.tile(np.arange(count), 2 * points))
    run = run_stage(
        stage,
        spread.ambient_K,
        drive_V=np.tile(drive_V.ravel(), 2),
        shunt_in=np.repeat([1.0, 0.0], points * count),
        start=start.reshape(len(start), -1),
    )
    current = run.output_A.reshape(2, points, count)
    return current[0], current[1], run.operating.inner.reshape(-1, 2, points, count)


def _last_crossing(with_A: Array, without_A: Array, holds_A: Array) -> IntArray:
    """Return the lower row of the last interval with a crossing, -1 where there is none (conditions,)."""
    over = with_A > LIMITING_SHARE * without_A
    enough = np.maximum(with_A[:-1], with_A[1:]) > LEAST_SHARE_OF_HOLDS * holds_A
    rows = np.arange(len(with_A) - 1)[:, None]
    last: IntArray = np.where((over[:-1] != over[1:]) & enough, rows, -1).max(axis=0)
    return last
