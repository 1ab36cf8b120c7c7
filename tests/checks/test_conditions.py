"""The conditions that checks are solved under: push-pull stages, diodes that return charge, a drive that nothing bounds."""

from __future__ import annotations

import pytest

from protlint.checks.reverse import has_other_half
from protlint.checks.surge import shunt_of, surge
from tests.support.desk import case_of, found, limits, the_one, unchecked
from tests.support.judged import Job, folding, follower, gated, sink
from tests.support.scenarios import DIODE

PUSH_PULL = """
J1 CONN - OUT GND
J2 CONN - +35V -35V
U1 DRV VAS1 OUT=DRV IN=FB
R10 RES 470 DRV B1 POWER:2W VOLTAGE:200V
R20 RES 470 DRV B2 POWER:2W VOLTAGE:200V
Q10 NPN QPN1 +35V B1 S1
R11 RES 0.47 S1 OUT POWER:5W
R12 RES 100 S1 T1 POWER:0.125W
D10 DIODE QSD1 B1 C1
Q11 NPN QSN1 C1 T1 OUT
Q20 PNP QPP1 -35V B2 S2
R21 RES 0.47 S2 OUT POWER:5W
R22 RES 100 S2 T2 POWER:0.125W
D20 DIODE QSD1 C2 B2
Q21 PNP QSP1 C2 T2 OUT
"""


def push_pull(board: str = PUSH_PULL) -> Job:
    """An output stage of two halves with their limiters, invented."""
    supply = {"+35V": "35 V", "-35V": "-35 V", "GND": "0 V"}
    drive = {"DRV": {"low": "-33 V", "high": "33 V", "current": "60 mA"}}
    needs = {"carry": "1 A", "cap": "4 A", "output": "20 V", "sink": "0.3 K/W", "short": "20 ms"}
    job = Job(board, limits(supply=supply, drive=drive, limiter={"*": needs, "Q20": {**needs, "output": "-20 V"}}))
    return job.knowing("QSD1", **DIODE)


def test_the_other_half_keeps_the_drive_near_the_output() -> None:
    review = push_pull().review()
    assert {one.limiter.id for one in review.limiters} == {"Q10", "Q20"}
    assert not found(review, "reverse-base-emitter")
    assert not [needs for check, needs in unchecked(review) if check == "reverse-base-emitter"]


def test_without_the_other_half_the_drives_whole_swing_counts() -> None:
    lone = "\n".join(line for line in PUSH_PULL.splitlines() if not line.startswith(("Q2", "R2", "D2")))
    (one,) = [one for one in found(push_pull(lone).review(), "reverse-base-emitter") if one.parts == ("Q10",)]
    assert one.level == "error"


def test_a_half_is_known_by_the_transistor_at_the_output() -> None:
    assert not has_other_half(case_of(follower().review()))
    assert not has_other_half(case_of(sink().review()))


@pytest.mark.parametrize("diodes", ["D11 DIODE QSD1 OUT BASE\nD12 DIODE QSD1 OUT +24V\nC11 CAP"])
def test_charge_returned_by_a_diode_harms_nothing(diodes: str) -> None:
    charged = follower().stated(load_capacitance="470 uF")
    assert found(charged.review(), "reverse-base-emitter")
    assert not found(charged.drawn(("C11 CAP", diodes)).knowing("QSD1", **DIODE).review(), "reverse-base-emitter")


def test_a_drive_that_nothing_bounds_is_said_once_and_nothing_is_made_of_its_figures() -> None:
    # the command straight on the base, the sensed drop straight on the shunt's: some 11 V across a junction
    bare = sink().drawn(
        ("R1 RES 390 CMD BASE POWER:0.25W", ""), ("J1 CONN - CMD LAMP", "J1 CONN - BASE LAMP"),
        ("R3 RES 100 SNS STOP POWER:0.125W", ""), ("BASE STOP GND", "BASE SNS GND"), ("C1 CAP 10n BASE STOP", ""),
    )  # fmt: skip
    job = bare.limited("drive", "BASE", low="0 V", high="12 V").knowing("QSN1", model={"IS": 1e-14, "BF": 100.0})
    review = job.review()
    assert the_one(review).solution.not_solved == "for want of [drive.BASE] current"
    assert the_one(review).solution.currents == ()
    (one,) = found(review, "drive-unlimited")
    assert one.working == ()
    assert {check for check, needs in unchecked(review) if needs == "[drive.BASE] current"} >= {"pass-overheated"}
    assert not [one for one in found(review) if one.check in ("pass-overheated", "shunt-overloaded", "resistor-power")]


def test_the_instant_before_the_loop_acts_by_hand() -> None:
    # I_B = (I_unl R_S - 0.8 V) / (R_th + RB): 100 ohm base stop, 2.2 ohm sense resistor, 10 ohm RB
    case = case_of(sink().supplied().review())
    shunt = shunt_of(case)
    assert shunt is not None
    instant = surge(case, shunt, 0.8)
    assert instant is not None
    hottest = max(case.solution.unlimited, key=lambda point: point.states["R2"].current_A)
    drop_V = hottest.states["R2"].voltage_V
    assert instant.seen_V == pytest.approx(drop_V, rel=1e-9)
    assert instant.seen_ohm == pytest.approx(102.2)
    assert instant.base_A == pytest.approx((drop_V - 0.8) / (102.2 + 10.0))


def test_a_divider_shares_the_drop() -> None:
    divided = sink().drawn(("C1 CAP 10n BASE STOP", "R4 RES 100 STOP GND POWER:0.125W"))
    case = case_of(divided.stated(carry=None, cap=None).review())
    shunt = shunt_of(case)
    assert shunt is not None
    instant = surge(case, shunt, 0.8)
    assert instant is not None
    assert instant.seen_V == pytest.approx(instant.drop_V * 100.0 / 202.2, rel=1e-6)
    assert instant.seen_ohm == pytest.approx(102.2 * 100.0 / 202.2)


def test_of_a_mosfet_the_supply_over_the_loops_resistance_counts() -> None:
    case = case_of(gated().review())
    shunt = shunt_of(case)
    assert shunt is not None
    instant = surge(case, shunt, 0.8)
    assert instant is not None
    assert instant.sense_A == pytest.approx(1.05 * 24.0 / (1.0 + 0.05))  # 24 V 5 % at its high end
    assert instant.how.endswith("(+24V at its high end, 25.2 V)")


@pytest.mark.parametrize(("pin", "assumed"), [("Y", False), ("A", True)])
def test_a_drive_stated_of_a_pin_counts_on_the_net_of_that_pin_alone(pin: str, assumed: bool) -> None:
    board = """
    Q10 NPN QPN1 OUT DRV SNS
    Q11 NPN QSN1 DRV SNS GND
    R10 RES 1K CMD DRV
    R11 RES 1R SNS GND
    J1  CONN - 1=OUT 2=+12V 3=GND
    U1  BUFFER BUF7 Y=CMD A=REF
    """
    stated = limits(drive={f"U1.{pin}": {"low": "0 V", "high": "5 V"}})
    circuit = case_of(Job(board, stated).review()).circuit
    assert circuit.drive.node == "CMD"
    assert circuit.drive.assumed is assumed


def test_the_sense_resistor_of_a_foldback_is_judged_at_its_knee_that_of_a_flat_limit_in_the_short() -> None:
    """An overload leaves the output anywhere between the short and 10 V, and lets most through just below that."""
    review = folding().drawn(("SNS OUT POWER:5W", "SNS OUT POWER:3W")).review()
    (one,) = found(review, "sense-resistor-power")
    rows = [[point for point in row if point.output_V <= 10.0] for row in the_one(review).solution.high_locus]
    knee = max((point for row in rows for point in row), key=lambda point: abs(point.states["R61"].current_A))
    assert knee.output_V > 8.0
    assert one.working[1].value == pytest.approx(knee.states["R61"].current_A ** 2)  # in 1 ohm
    assert f"with the output at {knee.output_V:.3g} V" in one.message
    short = [abs(row[0].states["R61"].current_A) for row in rows]
    assert max(short) < 0.7 * abs(knee.states["R61"].current_A)  # in the short 3 W are enough
    (flat,) = found(sink().drawn(("SNS GND POWER:1W", "SNS GND POWER:0.125W")).review(), "sense-resistor-power")
    assert "in the held short" in flat.message
