"""Whatever is stated of a board and its parts, a review comes of it: no exception, no figure that is none.

``PROTLINT_WORN_BOARDS`` makes more of them.
"""

from __future__ import annotations

import math
import os

import pytest

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
