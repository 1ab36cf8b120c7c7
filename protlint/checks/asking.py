"""Putting all checks to one limiter: their findings with levels, and what could not be checked."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

from protlint.checks.case import Case
from protlint.checks.catalogue import CheckRow
from protlint.checks.table import BOUNDED, CHECKS, WITHOUT_SOLUTION
from protlint.findings import Finding, Level, NotChecked
from protlint.limits import CheckSetting


def ask(case: Case, only: Iterable[str] = CHECKS) -> tuple[list[Finding], list[NotChecked]]:
    """Return the findings of every check of a limiter, or the ``only`` ones named, and what could not be checked."""
    findings: list[Finding] = []
    not_checked: list[NotChecked] = []
    for check in only:
        if case.solution.not_solved is not None and check not in WITHOUT_SOLUTION:
            continue
        if check in BOUNDED and case.unbounded:
            not_checked.append(NotChecked(check, case.drive_bound))
            continue
        answers = list(CHECKS[check](case))
        not_checked += [answer for answer in answers if isinstance(answer, NotChecked)]
        found = (answer for answer in answers if isinstance(answer, Finding))
        findings += with_levels(found, check, case.rows, (case.needs.checks, case.limits.checks))
    return findings, not_checked


def with_levels(
    findings: Iterable[Finding],
    check: str,
    catalogue: Mapping[str, CheckRow],
    settings: Sequence[Mapping[str, CheckSetting]],
) -> list[Finding]:
    """Give findings their level: the user's for the check, else the check's own; assumptions are never errors."""
    chosen = next((one[check].level for one in settings if check in one and one[check].level is not None), None)
    if chosen == "off":
        return []
    stamped = []
    for finding in findings:
        level: Level = chosen or finding.level or catalogue[check].level  # type: ignore[assignment]
        if finding.assumption and level == "error":
            level = "warning"
        stamped.append(replace(finding, level=level))
    return stamped
