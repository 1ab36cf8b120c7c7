"""The solver's answers about one limiter as plain data, the part of a report that is numbers.

Every key is always there; what was not worked out is null.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from protlint.report.shape import Document
from protlint.solve.solution import Currents, Loop, Point

if TYPE_CHECKING:
    from protlint.pipeline import ReviewedLimiter

SIGNIFICANT_DIGITS = 6

MODE_DIGITS = 3
"""Of natural frequencies: of a stiff circuit's fastest ones numerical libraries agree on no more."""

CURRENTS = ("begins_A", "holds_A", "carries_A", "most_A", "unlimited_A", "shunt_A", "pass_A")

RANGES = ("begins_range_A", "holds_range_A", "carries_range_A", "most_range_A")

LOOP = (
    "least_damping", "at_Hz", "worst_damping", "low_frequency_gain", "crossover_Hz", "phase_margin_deg", "own_damping",
)  # fmt: skip

WORST = ("damping", "at_Hz", "ambient_degC", "wiring_H")

STEP = ("settles", "delay_s", "peak_A", "pass_energy_J")

STATE = ("current_A", "voltage_V", "power_W", "control_A", "control_V")


def answers(item: ReviewedLimiter, ambients_degC: Sequence[float]) -> Document:
    """Return what was worked out for a limiter; an unsolved one has a row of nulls for each ambient."""
    solution = item.solution
    rows = [_currents(row) for row in solution.currents]
    formula, fails, advice = item.formula, item.if_a_part_fails, solution.advice
    return {
        "currents": rows or [_currents(_unsolved(ambient)) for ambient in ambients_degC],
        "locus": [{"output_V": rounded(point.output_V), "holds_A": rounded(point.output_A)} for point in solution.locus],
        "regulates": taken(solution.regulates, "current_A", "per_supply_volt", "per_kelvin", "compliance_V"),
        "loop": _loop(solution.loop),
        "step": taken(solution.step, *STEP) or dict.fromkeys(STEP),
        "held_short": _point(solution.held_short),
        "worst_point": _point(solution.worst_point),
        "sensitivities": [taken(row, "device", "parameter", "relative") for row in solution.sensitivities],
        "formula": None
        if formula is None
        else {
            **taken(formula, "name", "formula", "figure_A", "solved_A", "difference", "put_right_A"),
            "inputs": [{"symbol": symbol, "value": rounded(value)} for symbol, value in formula.inputs.items()],
            "fails": [taken(one, "assumption", "figure_A", "explains") for one in formula.fails],
        },
        "if_a_part_fails": None
        if fails is None
        else {
            "rows": [taken(row, "parts", "role", "how", "output_A", "of_holds") for row in fails.rows],
            "fuses": list(fails.fuses),
        },
        "start_up": taken(item.start_up, "starts", "lasts_s", "pass_energy_J", "pass_peak_W"),
        "advice": None
        if advice is None
        else {
            **taken(advice, "own_damping", "worst_damping", "enough", "costs"),
            "effects": [taken(one, "part", "base_stop", "own_damping", "worst_damping") for one in advice.effects],
            "fits": [taken(fit, "place", "farad", "instead_of", "own_damping", "worst_damping") for fit in advice.fits],
        },
        "short": solution.short,
        "shorts": [{"net": one.node, "holds_A": [rounded(value) for value in one.holds_A]} for one in solution.shorts],
        "not_solved": solution.not_solved,
    }


def rounded(value: float | None, digits: int = SIGNIFICANT_DIGITS) -> float | None:
    """Return a number of so many significant digits, or None where it is not finite."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{value:.{digits}g}") + 0.0


def taken(value: object, *names: str) -> Any:
    """Return the named fields of a dataclass as plain data, or None for None."""
    return None if value is None else {name: plain(getattr(value, name)) for name in names}


def plain(value: Any) -> Any:
    """Return a number rounded, a tuple as a list, a mapping as a dict, anything else as it is."""
    if isinstance(value, float):
        return rounded(value)
    if isinstance(value, Mapping):
        return {key: plain(item) for key, item in value.items()}
    if isinstance(value, Iterable) and not isinstance(value, str):
        return [plain(item) for item in value]
    return value


def _currents(row: Currents) -> Document:
    return {
        "ambient_degC": row.ambient_degC,
        **taken(row, *CURRENTS),
        "limited_by": {"short": row.limited_by_short, "output": row.limited_by_output},
        **{name: _ends(getattr(row, name)) for name in RANGES},
    }


def _unsolved(ambient_degC: float) -> Currents:
    return Currents(ambient_degC, None, None, None, None, None, None, None, None, None)


def _loop(loop: Loop | None) -> Document:
    if loop is None:
        return {**dict.fromkeys(LOOP), "worst": None, "worst_without_wiring": None, "natural": []}
    return {
        **taken(loop, *LOOP),
        "worst": taken(loop.worst, *WORST),
        "worst_without_wiring": taken(loop.worst_without_wiring, *WORST),
        "natural": [
            {"at_Hz": rounded(at_Hz, MODE_DIGITS), "damping": rounded(damping, MODE_DIGITS)}
            for at_Hz, damping in loop.natural
        ],
    }


def _point(point: Point | None) -> Document | None:
    if point is None:
        return None
    devices = [{"device": name, **taken(state, *STATE)} for name, state in point.states.items()]
    return {"output_V": rounded(point.output_V), "output_A": rounded(point.output_A), "devices": devices}


def _ends(ends: tuple[float, float] | None) -> list[float] | None:
    if ends is None:
        return None
    low, high = (rounded(end) for end in ends)
    return None if low is None or high is None else [low, high]
