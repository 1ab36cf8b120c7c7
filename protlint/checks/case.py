"""What a check is given: one limiter, its circuit and solution, and what the board needs of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from protlint.board.graph import Board, BoardPart
from protlint.checks.catalogue import CheckRow
from protlint.findings import Finding, Level, NotChecked, WorkingLine
from protlint.limits import UNSTATED, CheckSetting, LimiterLimits, Limits
from protlint.partdata.book import Figure
from protlint.solve.bench import Bench
from protlint.solve.solution import Solution
from protlint.toml_text import toml_key
from protlint.topology.limiter import Limiter

ALL_ASSUMPTIONS = ("drive", "short", "supply", "model", "tolerance", "circuit", "ambient_degC", "vbe_spread_V")
"""Everything a number can rest on that nobody stated: subjects of the bench, and fields of the limits file."""


@dataclass(frozen=True, slots=True)
class Case:
    """One limiter before the checks. ``rows`` is the catalogue."""

    board: Board
    limiter: Limiter
    bench: Bench
    solution: Solution
    needs: LimiterLimits
    limits: Limits
    rows: Mapping[str, CheckRow]

    def threshold(self, check: str, name: str) -> float:
        """Return a check's threshold: the limiter's own, else the limits file's, else the catalogue's."""
        for settings in (self.needs.checks, self.limits.checks):
            setting: CheckSetting | None = settings.get(check)
            if setting is not None and name in setting.thresholds:
                return setting.thresholds[name]
        return self.rows[check].thresholds[name].value

    def assumes(self, *subjects: str) -> bool:
        """Tell whether any of these subjects was assumed for this limiter (see :data:`ALL_ASSUMPTIONS`)."""
        of_bench = {subject for subject, _ in self.bench.assumed}
        return any(one in of_bench or (one in UNSTATED and self.limits.assumes(one)) for one in subjects)

    def parts(self, *roles: str) -> tuple[str, ...]:
        """Return the part ids that stand in the given roles, in the order given."""
        return tuple(part for role in roles for part in self.limiter.roles.get(role, ()))

    def part(self, part_id: str) -> BoardPart:
        """Return a part of the board by id."""
        return next(part for part in self.board.parts if part.id == part_id)

    def rating(self, part_id: str, name: str) -> Figure | None:
        """Return a rating from the part data, or None."""
        entry = self.part(part_id).entry
        return None if entry is None else entry.ratings.get(name)

    def rating_key(self, part_id: str, name: str) -> str:
        """Return the part-data key that would supply a rating: ``QSN1.ratings.ib``."""
        part = self.part(part_id)
        number = part.part_number if part.entry is None else part.entry.part_number
        return f"{toml_key(number)}.ratings.{name}" if number else f"a part number for {part_id}, then its ratings.{name}"

    def limits_key(self, name: str) -> str:
        """Return the limits-file key that would state something of this limiter: ``[limiter.Q10] carry``."""
        return f"[limiter.{toml_key(self.limiter.id)}] {name}"

    def finding(
        self,
        check: str,
        message: str,
        *,
        parts: tuple[str, ...],
        working: tuple[WorkingLine, ...],
        remedy: str | None,
        level: Level | None = None,
        assumption: bool = False,
        subject: str = "",
        nets: tuple[str, ...] = (),
    ) -> Finding:
        """Return a finding about this limiter."""
        return Finding(
            check=check,
            limiter=self.limiter.id,
            parts=parts,
            nets=nets,
            message=message,
            working=working,
            remedy=remedy,
            level=level,
            assumption=assumption,
            subject=subject,
        )


Answer = Finding | NotChecked
"""What a check yields: something wrong, or why it could not tell."""
