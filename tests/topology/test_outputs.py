"""Outputs that bear a supply's name: the node equations of a circuit with both ends held leave nothing to limit."""

from __future__ import annotations

import pytest

from protlint.board.outputs import outputs_named_as_supplies
from protlint.topology.language import load_rules
from protlint.topology.outputs import find_on_board
from tests.support.boards import board

FOLDBACK = """
npn Q1 +12V DRV NEAR
resistor R1 NEAR +5V =0.47
resistor R2 NEAR TAP =220
resistor R3 TAP GND =1500
npn Q2 DRV TAP +5V
resistor R4 CMD DRV =330
ic U1 V=+12V OUT=CMD FB=+5V
"""
DARLINGTON = """
npn Q1 +40V MID NEAR
npn Q3 +40V DRV MID
resistor R1 NEAR +30V =0.47
resistor R2 NEAR TAP =100
npn Q2 TAKE TAP +30V
diode D1 DRV TAKE
resistor R4 CMD DRV =330
ic U1 V=+40V OUT=CMD
"""
NEGATIVE = """
pnp Q1 -15V DRV NEAR
resistor R1 NEAR -5V =1
pnp Q2 DRV NEAR -5V
resistor R4 CMD DRV =330
ic U1 V=-15V OUT=CMD
"""
HIGH_SIDE = """
pnp Q1 +5V DRV NEAR
resistor R1 NEAR +12V =1
pnp Q2 DRV NEAR +12V
resistor R4 CMD DRV =470
ic U1 V=+12V OUT=CMD
"""
SINK = """
npn Q1 OUT DRV NEAR
resistor R1 NEAR GND =1
npn Q2 DRV NEAR GND
resistor R4 CMD DRV =470
resistor RL +24V OUT =20
ic U1 V=+5V OUT=CMD
"""


@pytest.mark.parametrize(
    ("text", "output", "made_of", "topology"),
    [
        (FOLDBACK, "+5V", "+12V", "foldback"),
        (DARLINGTON, "+30V", "+40V", "emitter-sensed"),
        (NEGATIVE, "-5V", "-15V", "emitter-sensed"),
        (HIGH_SIDE, "+5V", "+12V", "emitter-sensed"),
    ],
)
def test_the_end_of_lesser_voltage_is_the_output(text: str, output: str, made_of: str, topology: str) -> None:
    made = board(text)
    found, boards = find_on_board(made, load_rules())
    (limiter,) = found.limiters
    net = limiter.nets["output"]
    assert net is not None and made.nets[net].name == output
    assert limiter.topology == topology
    assert boards["Q1"].nets[net].supply is None and made.nets[net].supply is not None
    assert found.remarks == (f"{output} is taken as the output of Q1, which makes it of {made_of}",)


def test_other_limiters_find_the_output_held() -> None:
    made = board(FOLDBACK + SINK.replace("Q1", "Q11").replace("Q2", "Q12").replace("NEAR", "N2").replace("DRV", "D2"))
    found, boards = find_on_board(made, load_rules())
    assert [one.id for one in found.limiters] == ["Q1", "Q11"]
    assert set(boards) == {"Q1"}


@pytest.mark.parametrize("text", [SINK, FOLDBACK.replace("+12V", "+5V IN=+12V").replace("npn Q1 +5V IN=+12V", "npn Q1 VIN")])
def test_a_supply_that_no_other_makes_stays_one(text: str) -> None:
    made = board(text)
    assert outputs_named_as_supplies(made) == {}
    assert find_on_board(made, load_rules())[1] == {}


def test_a_fault_at_such_an_output_is_named() -> None:
    """Collector and emitter of the shunt exchanged: the same fault as at an output that bears another name."""
    wrong = FOLDBACK.replace("npn Q2 DRV TAP +5V", "npn Q2 +5V TAP DRV")
    for text in (wrong, wrong.replace("+5V", "OUT")):
        found, _ = find_on_board(board(text), load_rules())
        assert found.limiters == ()
        assert [(one.fault, one.group.id) for one in found.faults] == [("collector-emitter-swapped", "Q1")]
