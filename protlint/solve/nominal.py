"""The nominal figures of a stage at every ambient: the held short, the locus, where the limiter begins."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from protlint.solve.begins import Begins, begins_nominal
from protlint.solve.devices import Array
from protlint.solve.locus import RUN_OUT_SHARE, Conditions, Loci, greatest, least_working, trace, working_edges
from protlint.solve.stage import Run, Stage, Sweep, run_stage


@dataclass(frozen=True, slots=True)
class Nominal:
    """Nominal figures, one condition an ambient.

    ``short`` and ``unlimited`` are the runs into the short with the shunt in and taken out; ``carry`` and
    ``carry_unlimited`` the same at the output voltages ``carry_V``, None where no such voltage is known (a single ambient
    may still have none: NaN). ``grid`` are the inner voltages of the loci's even grid; ``most_V`` and ``most_A`` the
    greatest of each locus, ``most_inner`` the inner voltages there (ports, ambients).
    """

    conditions: Conditions
    short: Run
    unlimited: Run
    begins: Begins
    loci: Loci
    grid: Array
    carry_V: Array
    carry: Run | None
    carry_unlimited: Run | None
    most_V: Array
    most_A: Array
    most_inner: Array

    @property
    def holds_A(self) -> Array:
        """Holds at every ambient."""
        return self.short.output_A

    @property
    def carries_A(self) -> Array:
        """Carries at every ambient, NaN where unknown."""
        if self.carry is None:
            return np.full(len(self.holds_A), np.nan)
        return np.where(np.isnan(self.carry_V), np.nan, carried(self.carry.output_A, self.most_A))


def carried(output_A: Array, most_A: Array) -> Array:
    """Return output currents, 0 where less than a thousandth of the most is left or current flows the other way."""
    return np.where(output_A > RUN_OUT_SHARE * most_A, output_A, 0.0)


def solve_nominal(stage: Stage, sweep: Sweep) -> Nominal:
    """Solve the nominal figures from the drive's sweep."""
    short, unlimited = sweep.full_drive(0), sweep.full_drive(1)
    conditions = Conditions(short.lanes.ambient_K)
    ambients = range(sweep.ambients)
    circuit = stage.network.circuit
    loci, grid = trace(stage, conditions, short.operating.inner[:, None])
    begin = short.operating.inner
    if circuit.output_V is not None:
        carry_V = np.full(sweep.ambients, circuit.output_V)
    elif circuit.ground_leg:
        carry_V = np.full(sweep.ambients, np.nan)
    else:
        loci = working_edges(stage, conditions, loci)
        places = [least_working(loci, ambient) for ambient in ambients]
        begin = _inner_at(loci, places, short)
        carry_V = np.array([np.nan if place is None else loci.output_V[place] for place in places])
    carry = carry_unlimited = None
    if not np.isnan(carry_V).all():
        run = run_stage(
            stage,
            np.tile(conditions.ambient_K, 2),
            output_V=np.tile(carry_V, 2),
            shunt_in=np.repeat([1.0, 0.0], sweep.ambients),
            start=np.concatenate((begin, unlimited.operating.inner), axis=1),
        )
        first = np.arange(sweep.ambients)
        carry, carry_unlimited = run.pick(first), run.pick(first + sweep.ambients)
    tops = [greatest(loci, ambient) for ambient in ambients]
    return Nominal(
        conditions=conditions,
        short=short,
        unlimited=unlimited,
        begins=begins_nominal(stage, conditions, sweep),
        loci=loci,
        grid=grid,
        carry_V=carry_V,
        carry=carry,
        carry_unlimited=carry_unlimited,
        most_V=np.array([np.nan if top is None else loci.output_V[top] for top in tops]),
        most_A=np.array([np.nan if top is None else loci.output_A[top] for top in tops]),
        most_inner=_inner_at(loci, tops, short),
    )


def _inner_at(loci: Loci, places: Sequence[int | None], short: Run) -> Array:
    """Return the inner voltages at one place of each locus, or in the short where there is none (ports, ambients)."""
    inner = short.operating.inner.copy()
    for ambient, place in enumerate(places):
        if place is not None:
            inner[:, ambient] = loci.inner[:, place]
    return inner
