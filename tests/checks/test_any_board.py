"""Whatever is stated of a board and its parts, a review comes of it: no exception, no figure that is none.

``PROTLINT_WORN_BOARDS`` makes more of them.
"""

from __future__ import annotations

import math
import os
from dataclasses import replace

import pytest

from protlint.checks.table import CHECKS
from protlint.findings import NotChecked
from tests.support.desk import case_of
from tests.support.judged import SOUND
from tests.support.worn import worn

COUNT = int(os.environ.get("PROTLINT_WORN_BOARDS", "12"))


@pytest.mark.parametrize("seed", range(COUNT))
def test_a_worn_board_is_reviewed(seed: int) -> None:
    review = worn(seed).review()
    for one in review.findings:
        assert one.message
        assert "nan" not in one.message
        assert "inf" not in one.message.replace("information", "")
        assert all(line.value is None or math.isfinite(line.value) for line in one.working), (one.check, one.working)
        assert one.level != "error" or not one.assumption
    for limiter in review.limiters:
        assert limiter.solution.not_solved is not None or limiter.if_a_part_fails is not None
        assert len(set(limiter.not_checked)) == len(limiter.not_checked)


@pytest.mark.parametrize("name", SOUND)
def test_what_could_not_be_solved_is_said_by_every_check_that_needs_it(name: str) -> None:
    case = case_of(SOUND[name]().review())
    bare = replace(case.solution, high_short=(), high_locus=(), unlimited=(), at_carry=None, held_short=None, locus=())
    answers = {check: list(ask(replace(case, solution=bare))) for check, ask in CHECKS.items()}
    asked = {
        "base-stop-low", "sense-resistor-power", "resistor-power", "drive-unlimited", "shunt-overloaded", "pass-overheated",
        "pass-outside-safe-area",
    }  # fmt: skip
    limited = case.circuit.drive.current_A is not None
    for check in asked - ({"drive-unlimited"} if limited else set()):
        assert any(isinstance(one, NotChecked) for one in answers[check]), check
