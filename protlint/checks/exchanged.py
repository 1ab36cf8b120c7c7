"""Legs of a preset that have each other's values: told where exchanging the two makes a limiter sound that is not.

Such a slip shows only by what comes of it, as currents, heat and voltages, each with a remedy of its own. The limiter is
judged once more with the values exchanged; where it is sound then, that is what the remedies say first.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from dataclasses import replace
from itertools import combinations

from protlint.checks.afterwards import POWER_CHECKS, fitted, rated
from protlint.checks.asking import ask
from protlint.checks.case import Case
from protlint.checks.likeness import usual
from protlint.checks.sizing import greatest_most_A, least_carries_A, meets
from protlint.findings import Finding, Fit
from protlint.quantities import format_quantity

About = tuple[str, tuple[str, ...], str]
"""What a finding is about: its check, its parts, its subject."""

OF_CURRENTS = ("carry-not-met", "drive-insufficient", "cap-exceeded")
"""Not sound is what misses the board's needs, whatever that rests on, and what has an error."""


def with_exchange(case: Case, findings: Sequence[Finding]) -> list[Finding]:
    """Return a limiter's findings; where exchanging two legs of its preset makes it sound, the remedies of what is wrong say
    so first, with what the limiter then comes to.

    Only of a limiter whose carry is stated: without it a much smaller current would count as sound.
    """
    if not any(map(_is_ill, findings)) or case.needs.carry_A is None:
        return list(findings)
    known = {_about(one) for one in findings}
    mends = [said for fits in _exchanges(case) if (said := _mends(case, fits, known))]
    if not mends:
        return list(findings)
    said = f"{'; or '.join(mends)}; if they are meant so: "
    return [replace(one, remedy=f"{said}{one.remedy}") if one.remedy and _is_ill(one) else one for one in findings]


def _mends(case: Case, fits: tuple[Fit, Fit], known: Collection[About]) -> str | None:
    """Return what to exchange and what the limiter then comes to; None where it is not sound then either."""
    changed = fitted(case, fits)
    if changed is None or changed.unbounded or not _limits(changed):
        return None
    after, _ = ask(changed)
    burns = [one for one in after if one.check in POWER_CHECKS and {fit.part for fit in fits}.issuperset(one.parts)]
    left = [one for one in after if one not in burns and one.level != "note"]
    if any(map(_is_ill, left)):
        return None
    new = ", ".join(dict.fromkeys(one.check for one in left if _about(one) not in known))
    warned = f", with a warning of {new}" if new else ""
    return f"{_exchange(fits)}{rated(burns, fits)}: {_comes_to(changed)}{warned}"


def _is_ill(finding: Finding) -> bool:
    return finding.level == "error" or (finding.level == "warning" and finding.check in OF_CURRENTS)


def _about(finding: Finding) -> About:
    return finding.check, finding.parts, finding.subject


def _exchanges(case: Case) -> Iterator[tuple[Fit, Fit]]:
    """Yield the two values to fit for every two legs of the preset that are single resistors of unlike values."""
    elements = [
        case.board.elements[index]
        for role, indices in case.limiter.elements.items()
        if role.split(".")[0] == "preset"
        for index in indices
    ]
    legs = [one for one in elements if one.kind == "resistor" and len(one.parts) == 1 and one.value]
    for one, other in combinations(legs, 2):
        if one.value is not None and other.value is not None and one.value != other.value:
            yield Fit(_name(case, one.parts[0]), other.value), Fit(_name(case, other.parts[0]), one.value)


def _name(case: Case, index: int) -> str:
    return case.board.parts[index].id


def _limits(case: Case) -> bool:
    """Tell whether a limiter meets carry and cap, and it is the limiter, not the drive, that holds the short."""
    row = usual(case.solution.currents)
    needs = case.needs
    return row is not None and row.limited_by_short == "limiter" and meets(case.solution, needs.carry_A, needs.cap_A)


def _exchange(fits: tuple[Fit, Fit]) -> str:
    one, other = fits
    values = (f"{format_quantity(fit.value, 'ohm')} as {fit.part}" for fit in fits)
    return f"exchange {one.part} and {other.part} ({', '.join(values)})"


def _comes_to(case: Case) -> str:
    row = usual(case.solution.currents)
    figures = (least_carries_A(case.solution), greatest_most_A(case.solution), None if row is None else row.holds_A)
    carries, most, holds = (format_quantity(amperes or 0.0, "A") for amperes in figures)
    return f"it then carries at least {carries}, passes up to {most} and holds {holds} in the short"
