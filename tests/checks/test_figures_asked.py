"""The catalogue names every figure of part data that a check looks at: watched while the checks are put to the examples."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import replace
from typing import Any

import pytest

from protlint.checks import asking
from protlint.checks.case import Answer, Case
from protlint.checks.catalogue import load_catalogue
from protlint.checks.table import WITHOUT_SOLUTION
from protlint.netlist import read_netlist
from protlint.partdata.ratings import DYNAMIC_FIGURES, STATIC_FIGURES
from protlint.pipeline import review_netlist
from tests.checks.test_dropped_tables import BOARDS, FOLDER, desk_of

MODELS = {*STATIC_FIGURES, *DYNAMIC_FIGURES}
"""What a check that solves a changed circuit looks at again: told under the currents."""

FOR_THE_REMEDY = {("loop-undamped", "tj_max"), ("trips-on-peaks", "tj_max"), ("base-stop-high", "ib")}
"""Looked at for what is advised alone: the finding stands without them."""


class Watched(dict[str, Any]):
    """Ratings that note which of them were looked at."""

    def __init__(self, ratings: dict[str, Any], number: str, seen: set[tuple[str, str]]) -> None:
        super().__init__(ratings)
        self.number, self.seen = number, seen

    def __getitem__(self, name: str) -> Any:
        self.seen.add((self.number, name))
        return super().__getitem__(name)

    def get(self, name: str, default: Any = None) -> Any:
        if name in self:
            self.seen.add((self.number, name))
        return super().get(name, default)


def test_every_figure_looked_at_is_in_the_catalogue(monkeypatch: pytest.MonkeyPatch) -> None:
    seen: set[tuple[str, str]] = set()
    asked: set[tuple[str, str, str]] = set()

    def watched(check: str, put: Callable[[Case], Iterable[Answer]]) -> Callable[[Case], Iterable[Answer]]:
        def asks(case: Case) -> Iterable[Answer]:
            seen.clear()
            answers = list(put(case))
            for role, parts in case.limiter.roles.items():
                for part in parts:
                    entry = case.part(part).entry
                    numbers = {entry.part_number} if entry is not None else set()
                    asked.update((check, role, name) for number, name in seen if number in numbers)
            return answers

        return asks

    monkeypatch.setattr(asking, "CHECKS", {check: watched(check, put) for check, put in asking.CHECKS.items()})
    for board in BOARDS:
        desk = desk_of(board)
        entries = {
            name: replace(entry, ratings=Watched(dict(entry.ratings), entry.part_number, seen))
            for name, entry in desk.book.entries.items()
        }
        review_netlist(read_netlist(FOLDER / f"{board}.edf"), replace(desk, book=replace(desk.book, entries=entries)))
    figures = load_catalogue()
    unnamed = {
        (check, role, name)
        for check, role, name in asked
        if check not in WITHOUT_SOLUTION and name not in MODELS and name not in figures[check].figures.get(role, ())
        if (check, name) not in FOR_THE_REMEDY
    }
    assert len({check for check, _, _ in asked}) > 8
    assert unnamed == set()
