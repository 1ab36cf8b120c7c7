"""The sense resistance that meets what the board needs, found by solving the circuit again with preferred values."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import replace

from protlint.checks.case import Case
from protlint.checks.heat import overload_times, rating_to_fit_W, resistor_rating
from protlint.quantities import format_quantity
from protlint.quantities.series import within
from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit
from protlint.solve.solution import Solution

REACH = 1.15
"""How far beyond the window that goes as 1 / R preferred values are tried; the solved circuit decides."""

MOST_TRIES = 8


def sense_remedy(case: Case) -> str | None:
    """Return what sense resistance to fit, or the plain statement that none will do; None where it cannot be told.

    The limit goes nearly as 1 / R, so carry bounds the resistance from above and cap from below. Values of E24 inside that
    window, then of E96, are solved over all corners until one meets both.
    """
    circuit = case.circuit
    sense = [device for device in circuit.devices if device.name in circuit.sense]
    if not sense or case.solution.not_solved is not None:
        return None
    now_ohm = sense[0].model["R"]
    carries_A, most_A = least_carries_A(case.solution), greatest_most_A(case.solution)
    if carries_A is None or most_A is None:
        return None
    carry_A, cap_A = case.needs.carry_A, case.needs.cap_A
    upper_ohm = now_ohm * carries_A / carry_A if carry_A else None
    lower_ohm = now_ohm * most_A / cap_A if cap_A else None
    if carries_A <= 0.0 or most_A <= 0.0:
        return "no sense value meets it: at the working output the stage passes nothing, whatever the sense resistance"
    if upper_ohm is not None and lower_ohm is not None and lower_ohm > upper_ohm * REACH:
        return _no_value(case, carries_A, most_A)
    for value_ohm in _candidates(lower_ohm, upper_ohm):
        solution = resolve(case, value_ohm / now_ohm)
        if meets(solution, carry_A, cap_A):
            return _fit(case, value_ohm, len(sense)) + _rated(case, value_ohm, solution)
    return _no_value(case, carries_A, most_A)


def _candidates(lower_ohm: float | None, upper_ohm: float | None) -> Sequence[float]:
    """Return preferred values to try, the likeliest first: the middle of the window, or its one known end."""
    if lower_ohm is not None and upper_ohm is not None:
        middle_ohm = (lower_ohm * upper_ohm) ** 0.5
        low_ohm, high_ohm = lower_ohm / REACH, upper_ohm * REACH
    elif upper_ohm is not None:
        low_ohm, high_ohm, middle_ohm = upper_ohm / REACH**2, upper_ohm * REACH, upper_ohm
    elif lower_ohm is not None:
        low_ohm, high_ohm, middle_ohm = lower_ohm / REACH, lower_ohm * REACH**2, lower_ohm
    else:
        return ()
    tried: list[float] = []
    for series in ("E24", "E96"):
        values = [value for value in within(low_ohm, high_ohm, series) if value not in tried]
        tried += sorted(values, key=lambda value: abs(value / middle_ohm - 1.0))[:MOST_TRIES]
    return tried


def resolve(case: Case, factor: float) -> Solution:
    """Solve the case's circuit again with its sense resistance multiplied by ``factor``."""
    return solve_again(case, with_resistance(case.circuit, case.circuit.sense, factor))


def solve_again(case: Case, circuit: Circuit) -> Solution:
    """Solve a changed circuit at the case's ambients."""
    return solve(circuit, case.limits.ambient_degC, memo=case.solved)


def meets(solution: Solution, carry_A: float | None, cap_A: float | None) -> bool:
    """Tell whether a solution carries ``carry_A`` and stays under ``cap_A`` over all corners and ambients."""
    carries_A, most_A = least_carries_A(solution), greatest_most_A(solution)
    if carries_A is None or most_A is None:
        return False
    return (carry_A is None or carries_A >= carry_A) and (cap_A is None or most_A <= cap_A)


def least_carries_A(solution: Solution) -> float | None:
    """Return the low end of carries at its worst ambient, or None where any ambient has none."""
    ends = [row.carries_range_A[0] for row in solution.currents if row.carries_range_A is not None]
    return min(ends) if ends and len(ends) == len(solution.currents) else None


def greatest_most_A(solution: Solution) -> float | None:
    """Return the high end of most at its worst ambient, or None where any ambient has none."""
    ends = [row.most_range_A[1] for row in solution.currents if row.most_range_A is not None]
    return max(ends) if ends and len(ends) == len(solution.currents) else None


def _fit(case: Case, value_ohm: float, count: int) -> str:
    parts = case.parts("sense")
    value = format_quantity(value_ohm, "ohm")
    if len(parts) == 1:
        return f"fit {value} as {parts[0]}"
    if count > 1:
        return f"fit {value} as each of {', '.join(parts)}"
    return f"make {', '.join(parts)} {value} together"


def _rated(case: Case, value_ohm: float, solution: Solution) -> str:
    """Return the rating that the new sense resistor needs, where that is more than the one drawn; else nothing."""
    parts = case.parts("sense")
    rating = resistor_rating(case, case.part(parts[0])) if len(parts) == 1 else None
    if rating is None:
        return ""
    share = case.threshold("sense-resistor-power", "warning")
    needed_W = rating.power.value
    for row, point in zip(solution.currents, solution.high_short, strict=False):
        current_A = max(abs(point.states[name].current_A) for name in case.circuit.sense)
        power_W = current_A**2 * value_ohm
        needed_W = max(needed_W, rating_to_fit_W(power_W, rating, row.ambient_degC, share, overload_times(case)) or 0.0)
    return f", rated {format_quantity(needed_W, 'W')}" if needed_W > rating.power.value else ""


def with_resistance(circuit: Circuit, names: Collection[str], factor: float) -> Circuit:
    """Return the circuit with the resistances of some of its devices multiplied by a factor."""
    devices = tuple(
        replace(one, model={**one.model, "R": one.model["R"] * factor}) if one.name in names else one
        for one in circuit.devices
    )
    return replace(circuit, devices=devices)


def _no_value(case: Case, carries_A: float, most_A: float) -> str:
    """Say that no sense resistance meets both needs, and what window could be met."""
    spread = most_A / carries_A if carries_A > 0.0 else float("inf")
    carry_A, cap_A = case.needs.carry_A, case.needs.cap_A
    if carry_A is None or cap_A is None:
        return "no preferred sense value meets it: the drive, not the sense resistance, decides here"
    return (
        f"no sense value meets both: the limit spreads {format_quantity(spread, '')} to 1 over tolerance and temperature, "
        f"the window is {format_quantity(cap_A / carry_A, '')} to 1; with this carry the cap has to be at least "
        f"{format_quantity(carry_A * spread, 'A')}, or V_BE spread, tolerance or temperature range has to shrink"
    )
