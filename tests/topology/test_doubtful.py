"""Circuits that sound rules fit and the supplies forbid: told as what is wrong, and judged as no limiter."""

from __future__ import annotations

import pytest

from protlint.pipeline import Review
from tests.support.desk import limits, reviewed

SUPPLIES = {"+24V": "24 V", "+12V": "12 V", "GND": "0 V"}
BOOSTER = """
Q1 NPN QPN1 OUT B E
Q2 NPN QSN1 B E +24V
R1 RES 0.5 E +24V POWER:2W
R2 RES 10 E B
U1 IC REG IN=B OUT=OUT GND=GND
J1 CONN - OUT GND
"""
BETWEEN_SUPPLIES = """
Q1 NPN QPN1 +12V B E
Q2 NPN QSN1 B T +24V
R1 RES 0.5 E +24V POWER:2W
R2 RES 100 E T
R3 RES 390 CMD B
J1 CONN - CMD GND
"""


def review_of(board: str, *changes: tuple[str, str]) -> Review:
    for old, new in changes:
        assert old in board
        board = board.replace(old, new)
    return reviewed(board, limits(supply=SUPPLIES))


@pytest.mark.parametrize("board", [BOOSTER, BETWEEN_SUPPLIES], ids=["booster", "between supplies"])
def test_a_current_against_the_supplies_is_told_and_no_limiter(board: str) -> None:
    review = review_of(board)
    assert review.limiters == ()
    (finding,) = (one for one in review.findings if one.level == "error")
    assert (finding.check, finding.parts[:2]) == ("pass-polarity-wrong", ("Q2", "Q1"))
    assert "+24V is the higher" in finding.message
    assert finding.remedy == "fit a PNP as Q2; fit a PNP as Q1"


@pytest.mark.parametrize("board", [BOOSTER, BETWEEN_SUPPLIES], ids=["booster", "between supplies"])
def test_the_remedy_makes_a_limiter(board: str) -> None:
    review = review_of(board, ("NPN QPN1", "PNP QPP1"), ("NPN QSN1", "PNP QSP1"))
    assert [one.limiter.polarity for one in review.limiters] == ["p"]
    assert not [one for one in review.findings if one.check == "pass-polarity-wrong"]


def test_the_same_with_the_supplies_the_right_way_is_sound() -> None:
    review = review_of(BETWEEN_SUPPLIES, ("QPN1 +12V", "QPN1 +24V"), ("B T +24V", "B T +12V"), ("E +24V", "E +12V"))
    assert [one.limiter.polarity for one in review.limiters] == ["n"]
    assert not [one for one in review.findings if one.check == "pass-polarity-wrong"]


def test_a_supply_that_nobody_named_forbids_nothing() -> None:
    """A follower whose unnamed supply is above its output: what is not known is not taken for low."""
    review = review_of(BETWEEN_SUPPLIES, ("QPN1 +12V", "QPN1 RAW"), ("J1 CONN - CMD", "J2 CONN - RAW GND\nJ1 CONN - CMD"))
    assert [one.limiter.polarity for one in review.limiters] == ["n"]
