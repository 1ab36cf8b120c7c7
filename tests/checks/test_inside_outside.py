"""Every check just inside and just outside its threshold, with a table of what was found, missed and false."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import pytest

from protlint.checks.catalogue import load_catalogue
from protlint.pipeline import Review
from tests.support import scenarios, scenarios_of_boards, scenarios_of_ranges
from tests.support.desk import found
from tests.support.judged import SOUND
from tests.support.scenarios import Scenario

GROUPS = (*scenarios.GROUPS, *scenarios_of_boards.GROUPS, *scenarios_of_ranges.GROUPS)
TALLY: dict[str, dict[str, int]] = {}
TRIED: set[Callable[[], Iterator[Scenario]]] = set()
"""The groups that were put to the test: all of them, unless somebody asked for one."""


def levels(review: Review, check: str) -> list[str]:
    return [str(finding.level) for finding in found(review, check)]


@pytest.mark.parametrize("group", GROUPS, ids=lambda group: group.__name__)
def test_outside_is_found_and_inside_is_not(group: Callable[[], Iterator[Scenario]]) -> None:
    TRIED.add(group)
    wrong = []
    for scenario in group():
        counts = TALLY.setdefault(scenario.check, dict.fromkeys(("found", "missed", "false"), 0))
        outside, inside = levels(scenario.outside.review(), scenario.check), levels(scenario.inside.review(), scenario.check)
        hit, false = scenario.level in outside, scenario.level in inside
        counts["found" if hit else "missed"] += 1
        counts["false"] += false
        wrong += [] if hit and not false else [(str(scenario), outside, inside)]
    assert wrong == []


def test_every_check_of_the_catalogue_was_put_to_the_test(show: Callable[[Sequence[str]], None]) -> None:
    """And a table of what came of it, check by check."""
    if len(TRIED) < len(GROUPS):
        pytest.skip("SKIPPED: only some groups of scenarios were run")
    rows = [f"{check:26s} {one['found']:5d} {one['missed']:6d} {one['false']:5d}" for check, one in sorted(TALLY.items())]
    show([f"{'check':26s} found missed false", *rows])
    assert set(TALLY) == set(load_catalogue())


@pytest.mark.parametrize("name", SOUND)
def test_sound_boards_give_no_warning_and_no_error(name: str) -> None:
    review = SOUND[name]().review()
    assert [(one.check, one.message) for one in found(review)] == []
    assert [one.solution.not_solved for one in review.limiters] == [None]
