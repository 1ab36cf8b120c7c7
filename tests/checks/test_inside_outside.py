"""Every check just inside and just outside its threshold, with a table of what was found, missed and false."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from protlint.pipeline import Review
from tests.support.desk import found
from tests.support.judged import SOUND
from tests.support.scenarios import Scenario, every

SCENARIOS = every()
TALLY: dict[str, dict[str, int]] = {}


@pytest.fixture(scope="module", autouse=True)
def table() -> Iterator[None]:
    """Print what came of it, check by check."""
    yield
    print("\ncheck                     found missed false")
    for check, counts in sorted(TALLY.items()):
        print(f"{check:25s} {counts['found']:5d} {counts['missed']:6d} {counts['false']:5d}")


def levels(review: Review, check: str) -> list[str]:
    return [str(finding.level) for finding in found(review, check)]


@pytest.mark.parametrize("scenario", SCENARIOS, ids=str)
def test_outside_is_found_and_inside_is_not(scenario: Scenario) -> None:
    counts = TALLY.setdefault(scenario.check, dict.fromkeys(("found", "missed", "false"), 0))
    outside, inside = levels(scenario.outside.review(), scenario.check), levels(scenario.inside.review(), scenario.check)
    hit, wrong = scenario.level in outside, scenario.level in inside
    counts["found" if hit else "missed"] += 1
    counts["false"] += wrong
    assert hit, f"missed: {outside}"
    assert not wrong, f"false: {inside}"


@pytest.mark.parametrize("name", SOUND)
def test_sound_boards_give_no_warning_and_no_error(name: str) -> None:
    review = SOUND[name]().review()
    assert [(one.check, one.message) for one in found(review)] == []
    assert [one.solution.not_solved for one in review.limiters] == [None]
