"""Which nets a ``[drive]`` table speaks of: by name, by pin, by globs; and which of several tables counts."""

from __future__ import annotations

from typing import Any

import pytest

from protlint.board.drives import nets_driven
from protlint.limits import DriveLimits, Limits
from tests.support.boards import board
from tests.support.desk import limits, reviewed

BOARD = """
ic U1 OUT1=PWM_1 OUT2=PWM_2 FB=SENSE V+=+12V GND=GND
ic U10 OUT1=PWM_10
connector J1 1=PWM_1 2=DATA[3] 3=DATA3 4=X.Y
resistor R1 PWM_1 MID =10
resistor R2 MID END =10
"""


def driven(key: str) -> dict[str, bool]:
    made = board(BOARD)
    return {made.nets[net].name: named for net, named in nets_driven(key, made.parts, made.nets, made.net_of).items()}


@pytest.mark.parametrize(
    ("key", "named", "fitting"),
    [
        ("PWM_1", {"PWM_1"}, set()),
        ("pwm_1", {"PWM_1"}, set()),
        ("U1.FB", {"SENSE"}, set()),
        ("u1.out2", {"PWM_2"}, set()),
        ("+12V", {"+12V"}, set()),
        ("PWM_*", set(), {"PWM_1", "PWM_2", "PWM_10"}),
        ("pwm_?", set(), {"PWM_1", "PWM_2"}),
        ("U1.*", set(), {"PWM_1", "PWM_2"}),  # neither what it senses nor what feeds it
        ("U*.OUT1", set(), {"PWM_1", "PWM_10"}),
        ("U*", set(), set()),  # without a dot no pin
        ("*12V", set(), set()),
        ("*", set(), set()),
        ("X.?", set(), {"X.Y"}),
        ("DATA[3]", {"DATA[3]"}, {"DATA3"}),
        ("NONE", set(), set()),
    ],
)
def test_the_nets_of_a_key(key: str, named: set[str], fitting: set[str]) -> None:
    assert driven(key) == {**dict.fromkeys(fitting, False), **dict.fromkeys(named, True)}


def stated(*keys: str) -> dict[str, float]:
    """Return by net which of the tables, counted from 0, states its drive."""
    tables = Limits(drives={key: DriveLimits(resistance_ohm=place) for place, key in enumerate(keys)})
    made = board(BOARD, limits=tables)
    return {made.nets[net].name: drive.resistance_ohm for net, drive in made.drives.items()}


def test_an_exact_name_counts_before_a_glob_and_a_later_glob_before_an_earlier_one() -> None:
    assert stated("PWM_2", "PWM_*") == {"PWM_1": 1, "PWM_2": 0, "PWM_10": 1}
    assert stated("U1.OUT2", "PWM_*") == {"PWM_1": 1, "PWM_2": 0, "PWM_10": 1}
    assert stated("PWM_*", "PWM_?") == {"PWM_1": 1, "PWM_2": 1, "PWM_10": 0}
    assert stated("PWM_*", "*") == {"PWM_1": 0, "PWM_2": 0, "PWM_10": 0}


def test_a_net_whose_drive_a_glob_states_breaks_a_chain_of_resistors() -> None:
    tables = Limits(drives={"MI*": DriveLimits()})
    assert [len(element.parts) for element in board(BOARD).elements if element.kind == "resistor"] == [2]
    assert [len(element.parts) for element in board(BOARD, limits=tables).elements if element.kind == "resistor"] == [1, 1]


LAMPS = "J0 CONN - +12V GND\n" + "".join(
    f"""
J{n} CONN - LAMP{n}
U{n} BUFFER AMP{n} OUT=CMD_{n} V+=+12V GND=GND
R{n}0 RES 390 CMD_{n} BASE{n} POWER:0.25W
Q{n}0 NPN QPN1 LAMP{n} BASE{n} SNS{n}
R{n}1 RES 2.2 SNS{n} GND POWER:1W
Q{n}1 NPN QSN1 BASE{n} SNS{n} GND
"""
    for n in (1, 2, 3)
)


def reports(**tables: Any) -> list[Any]:
    """Return what is said of the three lamps' limiters."""
    supply = {"+12V": "12 V", "GND": "0 V"}
    review = reviewed(LAMPS, limits(supply=supply, limiter={"*": {"output": "2 V", "shorted_to": ["+12V"]}}, **tables))
    assert review.remarks == ()
    return [(one.circuit, one.solution, one.assumed, one.not_checked) for one in review.limiters]


@pytest.mark.parametrize(
    "tables",
    [
        {"drive": {"CMD_*": {}}},
        {"drive": {"U?.OUT": {}}},
        {"drive": {"*": {}}},
        {"driver": {"AMP*": {}}},
        {"driver": {"*": {}}},
        {"drive": {"*": {"high": "9 V"}, "CMD_[12]": {}}, "driver": {"AMP3": {}}},
    ],
)
def test_a_glob_says_what_a_table_a_net_says(tables: dict[str, dict[str, dict[str, str]]]) -> None:
    five = {"low": "0 V", "high": "5 V", "current": "20 mA"}
    filled = {kind: {key: table or five for key, table in each.items()} for kind, each in tables.items()}
    each = reports(drive={f"CMD_{n}": five for n in (1, 2, 3)})
    assert reports(**filled) == each
    assert all(circuit is not None and not circuit.drive.assumed for circuit, *_ in each)
    assert reports() != each
