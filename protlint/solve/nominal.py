"""The nominal figures of a stage at every ambient: the held short, the locus, where the limiter begins."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from protlint.solve.begins import Begins, begins_nominal
from protlint.solve.constants import KELVIN
from protlint.solve.devices import Array
from protlint.solve.locus import Conditions, Loci, greatest, least_working, run_at, trace, working_edges
from protlint.solve.stage import Run, Stage, run_stage


@dataclass(frozen=True, slots=True)
class Nominal:
    """Nominal figures, one condition an ambient.

    ``short`` and ``unlimited`` are the runs into the short with the shunt in and taken out; ``carry`` and
    ``carry_unlimited`` the same at the output voltages ``carry_V``, None where no such voltage is known (a single ambient
    may still have none: NaN). ``most_V`` and ``most_A`` are the greatest of each locus.
    """

    conditions: Conditions
    short: Run
    unlimited: Run
    loci: Loci
    begins: Begins
    carry_V: Array
    carry: Run | None
    carry_unlimited: Run | None
    most_V: Array
    most_A: Array

    @property
    def holds_A(self) -> Array:
        """Holds at every ambient."""
        return self.short.output_A

    @property
    def carries_A(self) -> Array:
        """Carries at every ambient, NaN where unknown; nothing is carried where current would flow the other way."""
        if self.carry is None:
            return np.full(len(self.holds_A), np.nan)
        return np.where(np.isnan(self.carry_V), np.nan, np.maximum(self.carry.output_A, 0.0))


def held_short(stage: Stage, ambients_degC: Sequence[float]) -> tuple[Run, Run]:
    """Run the short at every ambient with the shunt in, then taken out."""
    ambient_K = np.array(ambients_degC) + KELVIN
    return run_stage(stage, ambient_K), run_stage(stage, ambient_K, shunt_in=np.zeros(len(ambient_K)))


def solve_nominal(stage: Stage, short: Run, unlimited: Run) -> Nominal:
    """Solve the rest of the nominal figures from the held shorts."""
    conditions = Conditions(short.lanes.ambient_K)
    ambients = range(short.lanes.count)
    circuit = stage.network.circuit
    loci = trace(stage, conditions, short)
    if circuit.output_V is not None:
        carry_V = np.full(len(ambients), circuit.output_V)
    elif circuit.ground_leg:
        carry_V = np.full(len(ambients), np.nan)
    else:
        loci = working_edges(stage, conditions, loci)
        places = [least_working(loci, ambient) for ambient in ambients]
        carry_V = np.array([np.nan if place is None else loci.output_V[place] for place in places])
    carry = carry_unlimited = None
    if not np.isnan(carry_V).all():
        at_V = np.where(np.isnan(carry_V), short.output_V, carry_V)
        carry = run_at(stage, conditions, at_V, short.operating.inner)
        absent = np.zeros(len(ambients))
        carry_unlimited = run_stage(
            stage, conditions.ambient_K, output_V=at_V, shunt_in=absent, start=unlimited.operating.inner
        )
    tops = [greatest(loci, ambient) for ambient in ambients]
    return Nominal(
        conditions=conditions,
        short=short,
        unlimited=unlimited,
        loci=loci,
        begins=begins_nominal(stage, conditions, short.output_A),
        carry_V=carry_V,
        carry=carry,
        carry_unlimited=carry_unlimited,
        most_V=np.array([np.nan if top is None else loci.output_V[top] for top in tops]),
        most_A=np.array([np.nan if top is None else loci.output_A[top] for top in tops]),
    )
