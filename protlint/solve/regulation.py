"""What a stage does whose drive nothing takes away: it regulates."""

from __future__ import annotations

import numpy as np

from protlint.solve.nominal import Nominal
from protlint.solve.solution import Regulates
from protlint.solve.stage import Run, Stage, run_stage

COMPLIANCE_SHARE = 0.95
"""The current is still regulated where this share of it is left."""

_STEP_V_SHARE = 0.01
_STEP_K = 1.0


def regulation(stage: Stage, nominal: Nominal, ambient: int) -> Regulates | None:
    """Return the regulated current and what moves it at one ambient (an index), or None where it was not solved.

    The supply's change is that of the drive's on end together with every net that is held at the same voltage: they are one
    supply.
    """
    current_A = float(nominal.holds_A[ambient])
    if not np.isfinite(current_A) or current_A <= 0.0:
        return None
    return Regulates(
        current_A=current_A,
        per_supply_volt=_by_supply(stage, nominal.short, ambient) / current_A,
        per_kelvin=_by_temperature(stage, nominal.short, ambient) / current_A,
        compliance_V=_compliance(stage, nominal, ambient),
    )


def _by_supply(stage: Stage, short: Run, ambient: int) -> float:
    """Return the change of current per supply volt, A/V, by central difference."""
    supply_V = float(short.lanes.known_V[-1, ambient])
    step_V = _STEP_V_SHARE * max(abs(supply_V), 1.0)
    known_V = np.repeat(short.lanes.known_V[:, [ambient]], 2, axis=1)
    known_V[np.isclose(known_V[:, 0], supply_V)] += step_V * np.array([-1.0, 1.0])
    run = run_stage(
        stage,
        np.full(2, short.lanes.ambient_K[ambient]),
        known_V=known_V,
        start=short.operating.inner[:, [ambient]],
    )
    low, high = run.output_A
    return float((high - low) / (2.0 * step_V))


def _by_temperature(stage: Stage, short: Run, ambient: int) -> float:
    """Return the change of current per kelvin, A/K, by central difference."""
    ambient_K = short.lanes.ambient_K[ambient] + _STEP_K * np.array([-1.0, 1.0])
    low, high = run_stage(stage, ambient_K, start=short.operating.inner[:, [ambient]]).output_A
    return float((high - low) / (2.0 * _STEP_K))


def _compliance(stage: Stage, nominal: Nominal, ambient: int) -> float:
    """Return the least voltage from the output to the net its current goes to that keeps 95 % of the current."""
    mine = nominal.loci.of(ambient)
    voltage, current = nominal.loci.output_V[mine], nominal.loci.output_A[mine]
    enough = np.flatnonzero(current >= COMPLIANCE_SHARE * nominal.holds_A[ambient])
    last = int(enough[-1]) if len(enough) else 0
    at_V = float(voltage[last])
    if last + 1 < len(mine) and current[last] != current[last + 1]:
        part = (current[last] - COMPLIANCE_SHARE * nominal.holds_A[ambient]) / (current[last] - current[last + 1])
        at_V += float(part * (voltage[last + 1] - voltage[last]))
    known_A = nominal.short.operating.known_A[:-2, ambient] * stage.way
    far_V = float(nominal.short.lanes.known_V[int(np.argmin(known_A)), ambient]) if len(known_A) else 0.0
    return abs(at_V - far_V)
