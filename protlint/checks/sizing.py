"""The sense resistance that meets what the board needs, found by solving the circuit again with preferred values."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace

from protlint.checks.case import Case
from protlint.findings import Fit, Remedy
from protlint.quantities import format_quantity
from protlint.quantities.series import within
from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit
from protlint.solve.solution import Solution

REACH = 1.15
"""How far beyond the window that goes as 1 / R preferred values are tried; the solved circuit decides."""

MOST_TRIES = 8

FARTHEST = 30.0
"""By how much a sense resistance is changed at most where the limit does not go as 1 / R."""


@dataclass(frozen=True, slots=True)
class Sense:
    """The sense resistance as it is drawn: its resistance between the ends, and what one part of it has of that.

    ``of_whole`` is 1 for a single resistor, the count of equal ones in a bank, one over it in a chain; None where the
    parts are unlike, so that no one preferred value stands for all.
    """

    parts: tuple[str, ...]
    now_ohm: float
    of_whole: float | None

    def part_ohm(self, whole_ohm: float) -> float:
        """Return the value of each part, or of all together where they are unlike."""
        return whole_ohm * (self.of_whole or 1.0)


def sense_of(case: Case) -> Sense | None:
    """Return the sense resistance of a case, or None where its circuit has none."""
    sense = [device for device in case.circuit.devices if device.name in case.circuit.sense]
    if not sense:
        return None
    now_ohm, parts = sense[0].model["R"], case.parts("sense")
    values = {case.part(part).values.value or 0.0 for part in parts}
    return Sense(parts, now_ohm, values.pop() / now_ohm if len(values) == 1 else None)


def out_of_reach(case: Case) -> str | None:
    """Return what to do where a supply's end, or the drive of a follower, leaves nothing over the working output, so that no
    value on the board helps."""
    output_V, held = case.needs.output_V, case.circuit.held
    if output_V is None or not case.circuit.shorts:
        return None
    sign = 1.0 if output_V > held[case.circuit.shorts[0]].usual else -1.0
    output = format_quantity(output_V, "V")
    node, supply = max(held.items(), key=lambda item: sign * item[1].usual)
    end_V = supply.low if sign > 0.0 else supply.high
    if sign * (end_V - output_V) <= 0.0 < sign * (supply.usual - output_V):
        return (
            f"{node} may be as little as {format_quantity(end_V, 'V')} and the output works at {output}, which leaves the "
            f"stage nothing: state another {case.limits_key('output')}, or give {node} less spread"
        )
    drive = case.circuit.drive
    on_V = drive.high_V.usual if sign > 0.0 else drive.low_V.usual
    if case.limiter.nets["far"] == case.limiter.nets["output"] and sign * (on_V - output_V) <= 0.0:
        return (
            f"the drive on {drive.node} reaches {format_quantity(on_V, 'V')} and the output works at {output}, which leaves "
            f"the stage nothing: let the drive reach further, or state another {case.limits_key('output')}"
        )
    return None


def sense_remedy(case: Case) -> Remedy:
    """Return what sense resistance to fit, or the plain statement that none will do; None where it cannot be told.

    The limit goes nearly as 1 / R, so carry bounds the resistance from above and cap from below. Values of E24 inside that
    window, then of E96, are solved over all corners until one meets both. In a bank or chain they are those of each part.
    Where none does though the limit spreads less than the window is wide, or where a preset moves the limit besides, the end
    that the needs leave is looked for among all values.
    """
    sense = sense_of(case)
    if sense is None or case.solution.not_solved is not None:
        return None, ()
    carries_A, most_A = least_carries_A(case.solution), greatest_most_A(case.solution)
    if carries_A is None or most_A is None:
        return None, ()
    carry_A, cap_A = case.needs.carry_A, case.needs.cap_A
    upper_ohm = sense.now_ohm * carries_A / carry_A if carry_A else None
    lower_ohm = sense.now_ohm * most_A / cap_A if cap_A else None
    if carries_A <= 0.0 or most_A <= 0.0:
        nothing = "no sense value meets it: at the working output the stage passes nothing, whatever the sense resistance"
        return out_of_reach(case) or nothing, ()
    if upper_ohm is not None and lower_ohm is not None and lower_ohm > upper_ohm * REACH:
        return _at_the_end(case, sense) if case.parts("preset") else (_no_value(case, carries_A, most_A), ())
    ends = (None if end is None else sense.part_ohm(end) for end in (lower_ohm, upper_ohm))
    for part_ohm in _candidates(*ends):
        factor = part_ohm / sense.part_ohm(sense.now_ohm)
        if meets(resolve(case, factor), carry_A, cap_A):
            return fit_sense(case, sense, part_ohm, factor)
    fits_in = carry_A is not None and cap_A is not None and most_A / carries_A <= cap_A / carry_A
    return _at_the_end(case, sense) if fits_in or case.parts("preset") else (_no_value(case, carries_A, most_A), ())


def _at_the_end(case: Case, sense: Sense) -> Remedy:
    """Return the greatest sense resistance of E24 that still carries enough (with no carry stated, the least that keeps the
    cap), where it meets both needs; else what it comes to. More of it lets less through, so it is found by halving."""
    carry_A, cap_A = case.needs.carry_A, case.needs.cap_A
    now_ohm = sense.part_ohm(sense.now_ohm)
    values = within(now_ohm / FARTHEST, now_ohm * FARTHEST, "E24")

    def at(place: int) -> Solution:
        return resolve(case, values[place] / now_ohm)

    low, high = -1, len(values)
    while high - low > 1:
        middle = (low + high) // 2
        does = meets(at(middle), carry_A, None) if carry_A is not None else not meets(at(middle), None, cap_A)
        low, high = (middle, high) if does else (low, middle)
    place = low if carry_A is not None else high
    presets = ", ".join(case.parts("preset"))
    beside, others = (f" beside {presets}", f": give {presets} other values") if presets else ("", "")
    if not 0 <= place < len(values):
        span = f"{format_quantity(values[0], 'ohm')} to {format_quantity(values[-1], 'ohm')}"
        return f"no sense value of {span} meets it{beside}{others}", ()
    solution, factor = at(place), values[place] / now_ohm
    if meets(solution, carry_A, cap_A):
        return fit_sense(case, sense, values[place], factor)
    most_A, parts = greatest_most_A(solution) or 0.0, ", ".join(sense.parts)
    carry, cap, most = (format_quantity(amperes or 0.0, "A") for amperes in (carry_A, cap_A, most_A))
    return (
        f"no sense value meets both{beside}: with {format_quantity(values[place], 'ohm')} as {parts}, of those tried the "
        f"greatest that carries {carry}, up to {most} passes and the cap is {cap}{others}"
    ), ()


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


def fit_sense(case: Case, sense: Sense, part_ohm: float, factor: float) -> Remedy:
    """Return the remedy that fits a sense resistance: each part's value, and by how much it changes."""
    value, names = format_quantity(part_ohm, "ohm"), ", ".join(sense.parts)
    if sense.of_whole is None:
        fits = tuple(Fit(part, (case.part(part).values.value or 0.0) * factor) for part in sense.parts)
        apart = len(case.circuit.sense) > 1
        return f"make {names} {f'{factor:.3g} times what they are' if apart else f'{value} together'}", fits
    fits = tuple(Fit(part, part_ohm) for part in sense.parts)
    if len(sense.parts) == 1:
        return f"fit {value} as {names}", fits
    together = f" ({format_quantity(sense.now_ohm * factor, 'ohm')} together)" if sense.of_whole != 1.0 else ""
    return f"fit {value} as each of {names}{together}", fits


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
