"""What a check of the whole board is given: the board, what was found on it, and every limiter as it was judged."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from protlint.board.graph import Board
from protlint.checks.case import Case
from protlint.checks.catalogue import CheckRow
from protlint.findings import Finding, NotChecked
from protlint.limits import LimiterLimits, Limits, needs_of
from protlint.topology.limiter import Found


@dataclass(frozen=True, slots=True)
class BoardCase:
    """A whole board before the checks that look beyond one limiter; ``cases`` holds every limiter's case by its id."""

    board: Board
    found: Found
    cases: Mapping[str, Case]
    limits: Limits
    rows: Mapping[str, CheckRow]

    def threshold(self, check: str, name: str, needs: LimiterLimits | None = None) -> float:
        """Return a check's threshold: that of the given needs, else the limits file's, else the catalogue's."""
        for settings in (() if needs is None else (needs.checks,)) + (self.limits.checks,):
            setting = settings.get(check)
            if setting is not None and name in setting.thresholds:
                return setting.thresholds[name]
        return self.rows[check].thresholds[name].value

    def needs_at(self, finding: Finding) -> LimiterLimits:
        """Return what the limits file says of what a finding is about: its limiter, else its parts and nets."""
        case = self.cases.get(finding.limiter or "")
        return case.needs if case is not None else needs_of(self.limits, *finding.parts, *finding.nets)


@dataclass(frozen=True, slots=True)
class Unanswered:
    """A check that could not be done for one limiter, by its id, or (None) for something that is none."""

    limiter: str | None
    what: NotChecked


BoardAnswer = Finding | Unanswered
"""What a check of the whole board yields."""
