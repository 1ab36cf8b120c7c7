"""Halves that differ, channels that differ, shares that nothing senses: just inside each threshold and just outside."""

from __future__ import annotations

from typing import Any

import pytest

from protlint.findings import Finding
from protlint.pipeline import Review
from tests.support.desk import found, limits, reviewed, unchecked

FIXED = {"+12V": "12 V", "+24V": "24 V", "-24V": "-24 V", "GND": "0 V"}

CHANNEL = """
J{n} CONN - CMD{n} LAMP{n}
R{n}0 RES {drive} CMD{n} BASE{n} POWER:0.25W
Q{n}0 NPN QPN1 LAMP{n} BASE{n} SNS{n}
R{n}1 RES {sense} SNS{n} GND POWER:1W
R{n}2 RES {stop} SNS{n} STOP{n} POWER:0.125W
Q{n}1 NPN QSN1 BASE{n} STOP{n} GND
C{n}1 CAP {cap} BASE{n} STOP{n}
"""
USUAL = {"drive": "390", "sense": "2.2", "stop": "150", "cap": "10n"}


def channels(*odd: dict[str, str], needs: dict[str, Any] | None = None) -> Review:
    """Return the review of a board with a channel for each argument: what is odd in it."""
    board = "J0 CONN - +12V GND\n" + "".join(CHANNEL.format(n=n, **{**USUAL, **one}) for n, one in enumerate(odd, 1))
    drive = {f"CMD{n}": {"low": "0 V", "high": "5 V"} for n in range(1, len(odd) + 1)}
    asked = {"*": {"output": "2 V", "shorted_to": ["+12V"]}, **(needs or {})}
    return reviewed(board, limits(supply=FIXED, drive=drive, limiter=asked))


def odd_parts(review: Review) -> dict[str | None, tuple[str, ...]]:
    return {one.limiter: one.parts for one in found(review, "channels-unequal")}


def test_the_odd_channel_is_named_with_its_own_part_and_the_value_of_most() -> None:
    (finding,) = found(channels({}, {"sense": "2.7"}, {}, {}), "channels-unequal")
    assert (finding.limiter, finding.parts, finding.level) == ("Q20", ("R21",), "warning")
    assert {line.quantity: line.value for line in finding.working}["in most channels"] == 2.2
    assert finding.remedy is not None
    assert finding.remedy.endswith(", fit 2.2 ohm as R21")


def test_applying_the_remedy_makes_the_channels_equal() -> None:
    assert odd_parts(channels({}, {"sense": "2.7"}, {})) == {"Q20": ("R21",)}
    assert odd_parts(channels({}, {"sense": "2.2"}, {})) == {}


@pytest.mark.parametrize("sense, told", [("2.11", False), ("2.08", True), ("2.29", False), ("2.34", True)])
def test_five_per_cent_of_holds_is_the_bound(sense: str, told: bool) -> None:
    """Holds goes as 1 / R to within a few parts in a thousand here: 2.2 / 2.08 is 5.8 %, 2.2 / 2.11 4.3 %."""
    assert bool(odd_parts(channels({}, {}, {"sense": sense}))) is told


def test_two_channels_do_not_tell_which_is_odd() -> None:
    assert odd_parts(channels({}, {"sense": "4.7"})) == {}


def test_half_of_them_is_no_majority() -> None:
    assert odd_parts(channels({}, {}, {"sense": "4.7"}, {"sense": "4.7"})) == {}
    assert odd_parts(channels({}, {}, {}, {"sense": "4.7"}, {"sense": "4.7"})) == {"Q40": ("R41",), "Q50": ("R51",)}


def test_channels_that_are_odd_in_different_parts_are_each_named() -> None:
    review = channels({}, {"sense": "4.7"}, {"stop": "15k"}, {"cap": "1u"})
    assert odd_parts(review) == {"Q20": ("R21",), "Q30": ("R32",)}  # a capacitor changes no direct current


def test_what_the_limits_file_asks_of_one_channel_is_not_odd() -> None:
    assert odd_parts(channels({}, {"sense": "4.7"}, {}, needs={"Q20": {"carry": "80 mA"}})) == {}
    assert odd_parts(channels({}, {"sense": "4.7"}, {}, needs={"LAMP?": {"carry": "80 mA"}})) == {"Q20": ("R21",)}


def test_a_check_can_be_set_off_or_higher_for_one_limiter() -> None:
    off = {"Q20": {"checks": {"channels-unequal": "off"}}}
    assert odd_parts(channels({}, {"sense": "4.7"}, {}, needs=off)) == {}
    wide = {"Q20": {"checks": {"channels-unequal": {"difference": 2.0}}}}
    assert odd_parts(channels({}, {"sense": "4.7"}, {}, needs=wide)) == {}


def test_an_odd_channel_that_cannot_be_solved_is_not_checked() -> None:
    review = channels({}, {"sense": "4.7", "drive": "none"}, {})
    assert {check for check, _ in unchecked(review)} >= {"channels-unequal"}


FOLDING = """
J{n} CONN - OUT{n} GND
J{n}5 CONN - CTL{n} GND
R{n}0 RES 100 CTL{n} BASE{n} POWER:5W
Q{n}0 NPN QPN1 +24V BASE{n} SNS{n}
R{n}1 RES 0.68 SNS{n} OUT{n} POWER:5W
R{n}2 RES 100 SNS{n} FOLD{n} POWER:0.5W
R{n}3 RES {leg} FOLD{n} GND POWER:0.5W
Q{n}1 NPN {shunt} BASE{n} FOLD{n} OUT{n}
C{n}1 CAP 1n BASE{n} FOLD{n}
"""


def folding(*legs: str, shunt: str = "QSN1", outputs: tuple[str, ...] = ()) -> Review:
    """Return the review of a board of foldback channels, their legs to ground as given; ``shunt`` is the last one's type."""
    types = ["QSN1"] * (len(legs) - 1) + [shunt]
    board = "J0 CONN - +24V GND\n" + "".join(
        FOLDING.format(n=n, leg=leg, shunt=one) for n, (leg, one) in enumerate(zip(legs, types, strict=True), 1)
    )
    drive = {f"CTL{n}": {"low": "0 V", "high": "20 V"} for n in range(1, len(legs) + 1)}
    asked = {f"OUT{n}": {"output": one} for n, one in enumerate(outputs or ("12 V",) * len(legs), 1)}
    return reviewed(board, limits(supply=FIXED, drive=drive, limiter=asked))


def test_a_leg_to_ground_ten_times_too_great_shows_at_the_working_output_and_is_told() -> None:
    """By hand (divider law) the leg adds V_O R_1 / (R_2 R_S) = 0.45 A at 12 V and nothing in the short."""
    review = folding("3.9k", "39k", "3.9k")
    assert odd_parts(review) == {"Q20": ("R23",)}
    (finding,) = found(review, "channels-unequal")
    working = {line.quantity: line.value for line in finding.working}
    assert working["carries, the others"] - working["carries, Q20"] == pytest.approx(0.9 * 12 * 100 / 3900 / 0.68, rel=0.1)
    assert odd_parts(folding("3.9k", "3.9k", "3.9k")) == {}


def test_channels_that_work_at_other_outputs_are_compared_by_what_they_hold_only() -> None:
    assert odd_parts(folding("3.9k", "39k", "3.9k", outputs=("12 V", "5 V", "12 V"))) == {}


def test_another_type_of_shunt_makes_a_channel_no_other_build() -> None:
    assert odd_parts(folding("3.9k", "39k", "3.9k", shunt="BC547C")) == {"Q20": ("R23",)}


HALVES = """
J1 CONN - OUT GND
J2 CONN - +24V -24V
J3 CONN - DP DN
R10 RES 1k DP BP POWER:1W
Q10 NPN QPN1 +24V BP SP
R11 RES {upper} SP OUT POWER:5W
R12 RES 220 SP TP
Q11 NPN QSN1 BP TP OUT
C11 CAP 1n BP TP
R20 RES 1k DN BN POWER:1W
Q20 PNP QPP1 -24V BN SN
R21 RES {lower} SN OUT POWER:5W
R22 RES 220 SN TN
Q21 PNP QSP1 BN TN OUT
C21 CAP 1n BN TN
"""


def halves(upper: str = "1", lower: str = "1", *, spread: str = "30 mV", **needs: Any) -> Review:
    drive = {name: {"low": "-24 V", "high": "24 V"} for name in ("DP", "DN")}
    tables = limits(board={"vbe_spread": spread}, supply=FIXED, drive=drive, limiter={"*": {"output": "0 V", **needs}})
    return reviewed(HALVES.format(upper=upper, lower=lower), tables)


def unequal(review: Review) -> Finding | None:
    findings = found(review, "halves-unequal")
    assert len(findings) < 2
    return findings[0] if findings else None


def test_equal_halves_are_equal_and_a_missing_pair_is_none() -> None:
    assert unequal(halves()) is None


def test_halves_with_unlike_sense_resistors_are_told_with_the_value_to_fit() -> None:
    finding = unequal(halves("1", "1.5"))
    assert finding is not None
    assert finding.level == "warning"
    assert finding.limiter == "Q10"  # the larger current comes down: the careful side
    assert finding.remedy is not None
    assert finding.remedy.startswith("fit 1.5 ohm as R11")
    assert set(finding.parts) >= {"R11", "R21", "Q11", "Q21"}
    assert unequal(halves("1.5", "1.5")) is None


def test_where_the_careful_side_would_starve_the_load_the_other_half_changes() -> None:
    finding = unequal(halves("1", "1.5", carry="0.5 A"))
    assert finding is not None
    assert (finding.limiter, finding.remedy) == ("Q20", "fit 1 ohm as R21")
    assert unequal(halves("1", "1", carry="0.5 A")) is None


def test_tolerance_makes_up_for_a_difference_within_it() -> None:
    """20 % apart as drawn: told where V_BE is known to 5 mV, not where it may lie 80 mV to either side."""
    assert unequal(halves("1", "1.2", spread="5 mV")) is not None
    assert unequal(halves("1", "1.2", spread="80 mV")) is None


def test_fifteen_per_cent_is_the_bound() -> None:
    told = {lower: unequal(halves("1", lower, spread="0 mV")) is not None for lower in ("1.1", "1.2")}
    assert told == {"1.1": False, "1.2": True}


FOLDING_HALVES = """
J1 CONN - OUT GND
J2 CONN - +24V -24V
J3 CONN - DP DN
R10 RES 100 DP BP POWER:5W
Q10 NPN QPN1 +24V BP SP
R11 RES 0.68 SP OUT POWER:5W
R12 RES 100 SP TP POWER:0.5W
R13 RES {upper} TP GND POWER:0.5W
Q11 NPN QSN1 BP TP OUT
C11 CAP 1n BP TP
R20 RES 100 DN BN POWER:5W
Q20 PNP QPP1 -24V BN SN
R21 RES 0.68 SN OUT POWER:5W
R22 RES 100 SN TN POWER:0.5W
R23 RES {lower} TN GND POWER:0.5W
Q21 PNP QSP1 BN TN OUT
C21 CAP 1n BN TN
"""


def folding_halves(
    upper: str, lower: str, outputs: tuple[str, str] | None = ("12 V", "-12 V"), *, negative: str = "-24 V"
) -> Review:
    drive = {name: {"low": "-20 V", "high": "20 V"} for name in ("DP", "DN")}
    asked = {} if outputs is None else {name: {"output": one} for name, one in zip(("Q10", "Q20"), outputs, strict=True)}
    supply = {**FIXED, "-24V": negative}
    return reviewed(FOLDING_HALVES.format(upper=upper, lower=lower), limits(supply=supply, drive=drive, limiter=asked))


def test_halves_whose_legs_to_ground_differ_carry_unlike_currents_and_hold_like_ones() -> None:
    """By hand (divider law) a leg adds V_O R_1 / (R_2 R_S) = 0.45 A at 12 V and nothing in the short."""
    finding = unequal(folding_halves("3.9k", "39k"))
    assert finding is not None
    working = {line.quantity: line.value for line in finding.working}
    upper_A, lower_A = working["carries, Q10"], working["carries, Q20"]
    assert upper_A is not None
    assert lower_A is not None
    assert upper_A - lower_A == pytest.approx(0.9 * 12 * 100 / 3900 / 0.68, rel=0.1)
    assert "Q10 carries" in finding.message
    assert (finding.limiter, finding.remedy) == ("Q10", "fit 39 kohm as R13")
    assert unequal(folding_halves("39k", "39k")) is None
    assert unequal(folding_halves("3.9k", "3.9k")) is None


@pytest.mark.parametrize(
    ("outputs", "negative"), [(("12 V", "12 V"), "-24 V"), (("12 V", "-5 V"), "-24 V"), (("12 V", "-12 V"), "-18 V")]
)
def test_halves_that_do_not_mirror_each_other_are_compared_by_what_they_hold_only(
    outputs: tuple[str, str], negative: str
) -> None:
    assert unequal(folding_halves("3.9k", "39k", outputs, negative=negative)) is None


def test_halves_without_a_stated_output_are_compared_by_what_they_pass_at_most() -> None:
    finding = unequal(folding_halves("1.5k", "39k", None))
    assert finding is not None
    assert "Q10 passes at most" in finding.message


SHARED = """
J1 CONN - OUT GND
J2 CONN - +24V DRV
R1 RES 1k DRV B1 POWER:2W
Q1 NPN QDN1 +24V B1 B2
Q2 NPN QPN1 +24V B2 E2
Q3 NPN {other} +24V B2 E3
R2 RES 0.47 E2 OUT POWER:5W
R3 RES {ballast} E3 OUT POWER:5W
R4 RES 220 B2 OUT POWER:0.5W
R5 RES 100 E2 TAP
Q4 NPN QSN1 B1 TAP OUT
C1 CAP 1n B1 TAP
"""


def shared(
    other: str = "QPN1", ballast: str = "0.47", *, spread: str = "30 mV", board: str = SHARED, **needs: Any
) -> Review:
    drive = {"DRV": {"low": "0 V", "high": "24 V"}}
    tables = limits(board={"vbe_spread": spread}, supply=FIXED, drive=drive, limiter={"*": {"output": "12 V", **needs}})
    return reviewed(board.format(other=other, ballast=ballast), tables)


def share(review: Review) -> Finding | None:
    findings = found(review, "share-unsensed")
    assert len(findings) < 2
    return findings[0] if findings else None


def test_a_like_device_beside_the_sensed_one_is_a_note_with_the_total() -> None:
    finding = share(shared())
    assert finding is not None
    assert finding.level == "note"
    figures = {line.quantity: line.value for line in finding.working}
    assert figures["total"] is not None
    assert figures["sensed"] is not None
    assert figures["total"] / figures["sensed"] == pytest.approx(2.0, rel=0.03)
    assert "Q3" in finding.parts


@pytest.mark.parametrize(
    "changed",
    [{"other": "QDN1"}, {"ballast": "0.22"}, {"spread": "80 mV"}],
    ids=["another type", "another emitter resistor", "a wide spread of V_BE"],
)
def test_what_spoils_the_sharing_makes_it_a_warning(changed: dict[str, Any]) -> None:
    finding = share(shared(**changed))
    assert finding is not None
    assert finding.level == "warning"


def test_ten_per_cent_of_the_drop_is_the_bound() -> None:
    finding = share(shared())
    assert finding is not None
    drop_V = {line.quantity: line.value for line in finding.working}["drop across R3"]
    assert drop_V is not None
    levels = []
    for factor in (0.099, 0.101):
        at = share(shared(spread=f"{factor * drop_V} V"))
        levels.append(at and at.level)
    assert levels == ["note", "warning"]


def test_a_total_above_the_cap_is_an_error() -> None:
    high_A = max(row.holds_range_A[1] for row in shared().limiters[0].solution.currents if row.holds_range_A)
    levels = []
    for cap_A in (high_A * 1.005, high_A * 0.995):
        at = share(shared(cap=f"{cap_A} A"))
        levels.append(at and at.level)
    assert levels == ["note", "error"]


def test_sensing_them_all_as_the_remedy_says_mends_it() -> None:
    finding = share(shared())
    assert finding is not None
    assert finding.remedy is not None
    assert "2 resistors of 200 ohm" in finding.remedy
    averaged = SHARED.replace("R5 RES 100 E2 TAP", "R5 RES 200 E2 TAP\nR6 RES 200 E3 TAP")
    assert share(shared(board=averaged)) is None
    assert shared(board=averaged).limiters
