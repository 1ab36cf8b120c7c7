"""Does the limiter let through what the board needs, and no more than it may: carry, cap, and a drive that gives out."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.drive_resistor import greatest_drive_resistance
from protlint.checks.sizing import least_carries_A, out_of_reach, sense_remedy
from protlint.findings import NotChecked, Remedy, WorkingLine
from protlint.quantities import format_quantity
from protlint.solve.solution import Currents


def carry_not_met(case: Case) -> Iterator[Answer]:
    """Yield a finding where the limiter may cut into the current the board needs."""
    missed = _carry_missed(case, "carry-not-met", by_drive=False)
    if missed is None:
        return
    if isinstance(missed, NotChecked):
        yield missed
        return
    row, carries_A, carry_A = missed
    remedy, fits = sense_remedy(case)
    yield case.finding(
        "carry-not-met",
        f"carries at least {format_quantity(carries_A, 'A')} at {format_quantity(row.ambient_degC, 'degC')}, "
        f"{format_quantity(carry_A - carries_A, 'A')} less than the {format_quantity(carry_A, 'A')} the board needs",
        parts=case.parts("sense", "shunt"),
        working=_carry_working(case, row, carries_A, carry_A),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def drive_insufficient(case: Case) -> Iterator[Answer]:
    """Yield a finding where the drive or the pass device's gain gives out below the current the board needs."""
    missed = _carry_missed(case, "drive-insufficient", by_drive=True)
    if missed is None:
        return
    if isinstance(missed, NotChecked):
        yield missed
        return
    row, carries_A, carry_A = missed
    drive = case.parts("drive")
    remedy, fits = _more_drive(case, carries_A, carry_A)
    yield case.finding(
        "drive-insufficient",
        f"the drive gives out at {format_quantity(carries_A, 'A')} at {format_quantity(row.ambient_degC, 'degC')}, "
        f"before the {format_quantity(carry_A, 'A')} the board needs and before the limiter acts",
        parts=(*drive, *case.parts("pass")),
        working=_carry_working(case, row, carries_A, carry_A),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def _more_drive(case: Case, carries_A: float, carry_A: float) -> Remedy:
    """Return the drive resistor that lets the stage carry what the board needs, or by how much drive or gain fall short."""

    def does(changed: Case) -> bool:
        least_A = least_carries_A(changed.solution)
        return least_A is not None and least_A >= carry_A

    fit = greatest_drive_resistance(case, does)
    if fit is not None:
        return fit
    resistors = ", ".join(case.parts("drive")) or "the drive"
    if carries_A <= 0.0:
        nothing = f"{resistors} cannot turn the pass device on at all there: give the drive more voltage"
        return out_of_reach(case) or nothing, ()
    return f"let {resistors} give {carry_A / carries_A:.2g} times the drive, or fit a pass device of as much more hFE", ()


def cap_exceeded(case: Case) -> Iterator[Answer]:
    """Yield a finding where more current can flow than the board may ever pass."""
    cap_A = case.needs.cap_A
    if cap_A is None:
        yield NotChecked("cap-exceeded", case.limits_key("cap"))
        return
    rows = [row for row in case.solution.currents if row.most_range_A is not None]
    if len(rows) < len(case.solution.currents) or not rows:
        return
    row = max(rows, key=_high_most_A)
    most_A = _high_most_A(row)
    if most_A <= cap_A:
        return
    remedy, fits = sense_remedy(case)
    yield case.finding(
        "cap-exceeded",
        f"passes up to {format_quantity(most_A, 'A')} at {format_quantity(row.ambient_degC, 'degC')}, "
        f"{format_quantity(most_A - cap_A, 'A')} more than its cap of {format_quantity(cap_A, 'A')}",
        parts=case.parts("sense", "shunt"),
        working=(
            WorkingLine("most, usual", "greatest current over all output voltages, as drawn", row.most_A, "A"),
            WorkingLine("most, high end", "the same with every tolerance at its worst", most_A, "A"),
            WorkingLine("cap", "limits file", cap_A, "A"),
        ),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def _carry_missed(case: Case, check: str, *, by_drive: bool) -> tuple[Currents, float, float] | NotChecked | None:
    """Return the row, carries and carry where the least carries misses carry, because of the drive or not; or why that
    cannot be told."""
    carry_A = case.needs.carry_A
    if carry_A is None:
        return NotChecked(check, case.limits_key("carry"))
    currents = case.solution.currents
    if not currents or any(row.carries_A is None for row in currents):
        return NotChecked(check, case.limits_key("output")) if currents else None
    rows = [(row, row.carries_range_A[0]) for row in currents if row.carries_range_A is not None]
    if len(rows) < len(currents):
        return None
    row, carries_A = min(rows, key=lambda item: item[1])
    return None if carries_A >= carry_A or (row.limited_by_output == "drive") != by_drive else (row, carries_A, carry_A)


def _high_most_A(row: Currents) -> float:
    return row.most_range_A[1] if row.most_range_A is not None else 0.0


def _carry_working(case: Case, row: Currents, carries_A: float, carry_A: float) -> tuple[WorkingLine, ...]:
    at = (
        f"output at {format_quantity(case.needs.output_V, 'V')}"
        if case.needs.output_V is not None
        else "2 V left to the pass device"
    )
    return (
        WorkingLine("carries, usual", f"solved at {format_quantity(row.ambient_degC, 'degC')}, {at}", row.carries_A, "A"),
        WorkingLine("carries, low end", "the same with every tolerance at its worst", carries_A, "A"),
        WorkingLine("carry", "limits file", carry_A, "A"),
    )
