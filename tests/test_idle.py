"""Tables of a limits file that speak of nothing on the board are named; those that speak of something are not."""

from __future__ import annotations

import pytest

from protlint.report.document import document
from protlint.report.shape import combined
from tests.support.desk import limits, reviewed

BOARD = """
Q10 NPN QPN1 OUT DRV SNS
Q11 NPN QSN1 DRV SNS GND
R10 RES 1K CMD DRV POWER:1W
R11 RES 1R SNS GND POWER:5W
J1  CONN - 1=OUT 2=+12V 3=GND
U1  BUFFER BUF7 A=CMD
"""

FITTING = limits(
    supply={"+12v": "12 V", "GND": "0 V", "EARTH": "0 V", "REMOTE": "24 V"},
    drive={one: {"high": "5 V"} for one in ("CMD", "U1.A", "cm?", "U?.*", "*")},
    driver={"buf7": {"power": "1 W"}, "BUF*": {"power": "1 W"}},
    limiter={"*": {"carry": "0.1 A"}, "q1?": {"cap": "2 A"}, "R11": {"short": "1 s"}, "OUT": {"shorted_to": "REMOTE"}},
    pins={"npn": {"C": "collector", "B": "base", "E": "emitter"}, "BUF*": {"A": "none"}},
)


def test_what_fits_is_not_remarked_upon() -> None:
    assert reviewed(BOARD, FITTING).remarks == ()


@pytest.mark.parametrize(
    ("tables", "told"),
    [
        ({"supply": {"+48V": "48 V"}}, '[supply] "+48V" fits no net'),
        ({"drive": {"STAGE": {"high": "5 V"}}}, "[drive.STAGE] fits no net and no pin"),
        ({"drive": {"U1.9": {"high": "5 V"}}}, '[drive."U1.9"] fits no net and no pin'),
        ({"drive": {"PWM_*": {"high": "5 V"}}}, '[drive."PWM_*"] fits no net but supplies and no output'),
        ({"drive": {"+12*": {"high": "5 V"}}}, '[drive."+12*"] fits no net but supplies and no output'),
        ({"drive": {"U2.*": {"high": "5 V"}}}, '[drive."U2.*"] fits no net but supplies and no output'),
        ({"driver": {"AMP*": {"power": "1 W"}}}, '[driver."AMP*"] fits no part number'),
        ({"driver": {"AMP1": {"power": "1 W"}}}, "[driver.AMP1] fits no part number"),
        ({"limiter": {"Q99": {"carry": "1 A"}}}, "[limiter.Q99] fits no limiter"),
        ({"limiter": {"R10": {"carry": "1 A"}}}, "[limiter.R10] fits no limiter"),
        ({"pins": {"SOT99": {"1": "base"}}}, "[pins.SOT99] fits no cell and no part number"),
    ],
)
def test_what_fits_nothing_is_named(tables: dict[str, object], told: str) -> None:
    (remark,) = reviewed(BOARD, limits(**tables)).remarks
    assert remark.partition("; did you mean ")[0] == f"limits.toml: {told} on this board"


@pytest.mark.parametrize(
    ("tables", "near"),
    [
        ({"supply": {"+12W": "12 V"}}, "+12V"),
        ({"drive": {"CMF": {"high": "5 V"}}}, "CMD"),
        ({"driver": {"BUF8": {"power": "1 W"}}}, "BUF7"),
        ({"limiter": {"Q100": {"carry": "1 A"}}}, "Q10"),
        ({"pins": {"RESI": {"1": "base"}}}, "RES"),
    ],
)
def test_the_nearest_name_is_hinted_at(tables: dict[str, object], near: str) -> None:
    (remark,) = reviewed(BOARD, limits(**tables)).remarks
    assert remark.endswith(f' on this board; did you mean "{near}"?')


def test_of_several_boards_only_what_fits_none_is_named() -> None:
    tables = limits(limiter={"Q10": {"carry": "0.1 A"}, "Q99": {"carry": "0.1 A"}})
    boards = [document(reviewed(text, tables)) for text in (BOARD, BOARD.replace("Q10", "Q20"))]
    report = combined(boards)
    assert report["remarks"] == ["limits.toml: [limiter.Q99] fits no limiter on this board"]
    assert all(board["remarks"] == [] for board in report["boards"])
