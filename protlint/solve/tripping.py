"""Where a latch trips: the most that a stage passes before its shunt fires and takes the drive away for good.

The drive rises from its off end, every point started from the one before, for as long as the output current rises with it
and the junctions of shunt and latch follow without a jump. Where the current falls, or no such state is left, the latch has
taken over; steps before that get smaller and smaller. A drive that reaches its on end has not made it trip.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve.corners import held_voltages
from protlint.solve.devices import Array
from protlint.solve.locus import Conditions
from protlint.solve.stage import LEAST_OUTPUT_A, Run, Stage, run_stage

_FIRST_STEP, _LEAST_STEP = 1.0 / 16.0, 1e-7
"""Steps of the drive, as shares of its whole way."""
_GROWS, _SHRINKS = 2.0, 0.25
_MOST_STEPS, _FLAT_SHARE = 400, 1e-4
_LARGEST_MOVE_V, _ASLEEP_V = 0.04, 0.2
"""What moves a junction farther in one step may have left the state it came from; below the second none does anything."""


@dataclass(frozen=True, slots=True)
class Tripping:
    """How far the drive rises before the latch takes over, by condition: as a share of its way, 1 where it does not; the
    output current there, NaN where not solved; inner voltages there, in the first state after it, and with the drive off."""

    drive: Array
    output_A: Array
    inner: Array
    after: Array
    off: Array

    @property
    def trips(self) -> NDArray[np.bool_]:
        """Whether the latch trips at all (conditions,)."""
        tripped: NDArray[np.bool_] = (self.drive < 1.0) & np.isfinite(self.output_A)
        return tripped


def raise_drive(stage: Stage, conditions: Conditions, output_V: Array, off: Array | None = None) -> Tripping:
    """Raise the drive until the latch trips, the output held at voltages (conditions,), NaN in the short; ``off`` are inner
    voltages to begin with."""
    count = len(output_V)
    drive, step = np.zeros(count), np.full(count, _FIRST_STEP)
    run = run_with(stage, conditions, output_V, drive, off, insist=True)
    output_A, inner = run.output_A.copy(), run.operating.inner.copy()
    first, after, junctions = inner.copy(), inner.copy(), _junctions(stage)
    going = np.isfinite(output_A)
    for _ in range(_MOST_STEPS):
        lanes = np.flatnonzero(going)
        if not len(lanes):
            break
        onward = np.minimum(drive[lanes] + step[lanes], 1.0)
        run = run_with(stage, conditions.pick(lanes), output_V[lanes], onward, inner[:, lanes])
        now_V, then_V = run.operating.inner[junctions], inner[junctions][:, lanes]
        moves_V = np.abs(np.maximum(now_V, _ASLEEP_V) - np.maximum(then_V, _ASLEEP_V)).max(axis=0)
        follows = np.isfinite(run.output_A) & (moves_V < _LARGEST_MOVE_V)
        rises = follows & (run.output_A >= output_A[lanes] - LEAST_OUTPUT_A)
        at_top = follows & ~rises & (run.output_A > (1.0 - _FLAT_SHARE) * output_A[lanes])
        up, down = lanes[rises], lanes[~rises]
        drive[up], output_A[up], inner[:, up] = onward[rises], run.output_A[rises], run.operating.inner[:, rises]
        after[:, down] = run.operating.inner[:, ~rises]
        step[up] = np.minimum(step[up] * _GROWS, _FIRST_STEP)
        step[down] *= _SHRINKS
        going[lanes] = (drive[lanes] < 1.0) & (step[lanes] >= _LEAST_STEP) & ~at_top
    return Tripping(drive, output_A, inner, np.where(drive < 1.0, after, inner), first)


def _junctions(stage: Stage) -> list[int]:
    """Return the rows of the base-emitter voltages of shunt and latch among the inner voltages."""
    circuit = stage.network.circuit
    names = {*circuit.shunt, *circuit.latch}
    group = next(group for group in stage.network.groups if group.family == "bipolar")
    return [group.rows.start + place for place, device in enumerate(group.devices) if device.name in names]


def run_with(
    stage: Stage, conditions: Conditions, output_V: Array, drive: Array, start: Array | None, *, insist: bool = False
) -> Run:
    """Run conditions with the drive at shares of its way (conditions,), from a start; ``insist`` as for ``run_stage``."""
    corner = conditions.corner
    axes = () if corner is None else stage.axes
    _, ends_V = held_voltages(stage.network, axes, np.zeros((0, len(drive))) if corner is None else corner)
    off_V, on_V = ends_V[1 - stage.on_end], ends_V[stage.on_end]
    return run_stage(
        stage,
        conditions.ambient_K,
        corner=corner,
        output_V=output_V,
        drive_V=off_V + drive * (on_V - off_V),
        start=start,
        insist=insist,
    )
