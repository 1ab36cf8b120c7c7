"""A power device that feeds an output through a resistor nobody watches: told under every condition, quiet without one."""

from __future__ import annotations

from typing import Any

import pytest

from protlint.findings import Finding
from protlint.pipeline import Review
from tests.support.desk import found, limits, reviewed

FIXED = {"+24V": "24 V", "-24V": "-24 V", "GND": "0 V"}
SINK = """
J1 CONN - LAMP +24V
J2 CONN - CMD GND
R1 RES 390 CMD BASE
Q1 NPN QPN1 LAMP BASE SNS
R2 RES 2.2 SNS GND POWER:1W
"""


def review_of(board: str = SINK, *changes: tuple[str, str], needs: dict[str, Any] | None = None) -> Review:
    for old, new in changes:
        assert old in board
        board = board.replace(old, new)
    drive = {name: {"low": "0 V", "high": "5 V"} for name in ("CMD",)}
    return reviewed(board, limits(supply=FIXED, drive=drive, limiter=needs or {}))


def absent(review: Review) -> Finding | None:
    findings = found(review, "limiter-absent")
    assert len(findings) < 2
    return findings[0] if findings else None


def test_a_note_without_a_cap_and_a_warning_with_one() -> None:
    finding = absent(review_of())
    assert finding is not None
    assert (finding.level, finding.limiter, finding.parts) == ("note", None, ("Q1", "R2"))
    for name in ("LAMP", "Q1", "R2", "LA*"):
        finding = absent(review_of(needs={name: {"cap": "0.5 A"}}))
        assert finding is not None
        assert finding.level == "warning", name


def test_what_stands_under_the_star_is_for_limiters() -> None:
    finding = absent(review_of(needs={"*": {"cap": "0.5 A"}}))
    assert finding is not None
    assert finding.level == "note"


FEEDING = {
    "a follower": ("LAMP BASE SNS\nR2 RES 2.2 SNS GND", "+24V BASE SNS\nR2 RES 2.2 SNS LAMP"),
    "a MOSFET": ("Q1 NPN QPN1", "Q1 NMOS MPN1"),
    "a high-side source": (
        "Q1 NPN QPN1 LAMP BASE SNS\nR2 RES 2.2 SNS GND",
        "Q1 PNP QPP1 LAMP BASE SNS\nR2 RES 2.2 SNS +24V",
    ),
    "a Darlington pair": ("R1 RES 390 CMD BASE", "R1 RES 390 CMD B0\nQ9 NPN QSN1 LAMP B0 BASE\nR9 RES 1k BASE SNS"),
    "an output behind an inductor": ("J1 CONN - LAMP", "L1 IND 10u LAMP FAR\nJ1 CONN - FAR"),
    "a bank of resistors": ("R2 RES 2.2 SNS GND", "R2 RES 4.4 SNS GND POWER:1W\nR3 RES 4.4 SNS GND"),
    "a compound pair": (
        "Q1 NPN QPN1 LAMP BASE SNS\nR2 RES 2.2 SNS GND",
        "Q9 NPN QSN1 PB BASE SNS\nQ1 PNP QPP1 SNS PB +24V\nR9 RES 220 +24V PB\nR2 RES 2.2 SNS LAMP",
    ),
}
NOT_FEEDING = {
    "a shunt": ("R1 RES", "R5 RES 100 SNS STOP\nQ2 NPN QSN1 BASE STOP GND\nR1 RES"),
    "a fuse": ("J1 CONN - LAMP", "F1 FUSE 1 LAMP FAR\nJ1 CONN - FAR"),
    "an IC that senses": ("R1 RES", "U1 IC SNX1 CS=SNS\nR1 RES"),
    "an IC that senses behind a filter": ("R1 RES", "R5 RES 1k SNS FLT\nC5 CAP 10n FLT GND\nU1 IC SNX1 CS=FLT\nR1 RES"),
    "a transistor that watches and reports": (
        "R1 RES",
        "R5 RES 1k SNS FLT\nQ2 NPN QSN1 OC FLT GND\nU1 IC SNX1 OC=OC\nR1 RES",
    ),
    "a transistor that watches with its emitter": ("R1 RES", "Q2 PNP QSP1 OC GND SNS\nU1 IC SNX1 OC=OC\nR1 RES"),
    "no connector": ("J1 CONN - LAMP +24V", "J1 CONN - X +24V"),
    "a small transistor": ("Q1 NPN QPN1", "Q1 NPN QSN1"),
    "a resistor of little drop": ("POWER:1W", "POWER:0.04W"),
    "a resistor for a signal": ("R2 RES 2.2 SNS GND POWER:1W", "R2 RES 330 SNS GND POWER:0.25W"),
    "no resistor": ("R2 RES 2.2 SNS GND", "R2 RES 0 SNS GND"),
}


@pytest.mark.parametrize("change", FEEDING.values(), ids=FEEDING)
def test_every_stage_without_a_limiter_is_told(change: tuple[str, str]) -> None:
    finding = absent(review_of(SINK, change))
    assert finding is not None
    assert "Q1" in finding.parts
    assert "R2" in finding.parts
    assert "Q9" not in finding.parts


@pytest.mark.parametrize("change", NOT_FEEDING.values(), ids=NOT_FEEDING)
def test_one_condition_less_and_it_is_quiet(change: tuple[str, str]) -> None:
    assert absent(review_of(SINK, change)) is None


def test_three_tenths_of_a_volt_at_the_rating_is_the_bound() -> None:
    """sqrt(P R) = 0.3 V at 2.2 ohm means P = 40.9 mW."""
    assert absent(review_of(SINK, ("POWER:1W", "POWER:0.0412W"))) is not None
    assert absent(review_of(SINK, ("POWER:1W", "POWER:0.0406W"))) is None


def test_devices_on_one_output_are_one_finding() -> None:
    pair = """
J1 CONN - OUT GND
J2 CONN - CMD -24V
Q1 NPN QPN1 +24V CMD E1
R1 RES 0.47 E1 OUT POWER:5W
Q2 PNP QPP1 -24V CMD E2
R2 RES 0.47 E2 OUT POWER:5W
"""
    finding = absent(review_of(pair))
    assert finding is not None
    assert finding.parts == ("Q1", "Q2", "R1", "R2")


def test_a_power_rating_that_is_not_known_is_said() -> None:
    review = review_of(SINK, (" POWER:1W", ""))
    assert absent(review) is None
    assert any(one.check == "limiter-absent" and "R2" in one.needs for one in review.not_checked)


def test_what_the_remedy_proposes_is_a_limiter() -> None:
    finding = absent(review_of())
    assert finding is not None
    assert finding.remedy is not None
    for word in ("NPN", "GND", "SNS", "100 ohm"):
        assert word in finding.remedy
    mended = review_of(SINK, ("R1 RES", "R3 RES 100 SNS STOP\nQ2 NPN QSN1 BASE STOP GND\nR1 RES"))
    assert absent(mended) is None
    (limiter,) = mended.limiters
    held_A = limiter.solution.currents[1].holds_A
    about = {line.quantity: line.value for line in finding.working}["a shunt would hold about"]
    assert about is not None
    assert held_A == pytest.approx(about, rel=0.2)
