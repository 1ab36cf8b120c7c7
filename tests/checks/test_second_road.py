"""Other ways from a supply to the output: told where they give a current worth speaking of, and only there."""

from __future__ import annotations

import pytest

from protlint.findings import Finding
from protlint.pipeline import Review
from tests.support.desk import found, limits, reviewed, unchecked
from tests.support.judged import Job, follower, sink, source

FOLLOWER, SINK, SOURCE = follower(), sink(), source()


def with_parts(job: Job, *lines: str) -> Review:
    """Return the review of a board with parts added."""
    return job.drawn(("\nJ1 ", "\n" + "\n".join(lines) + "\nJ1 ")).review()


def way(review: Review) -> Finding | None:
    findings = found(review, "second-road")
    assert len(findings) < 2
    return findings[0] if findings else None


def holds_A(job: Job) -> float:
    held = job.review().limiters[0].solution.currents[1].holds_A
    assert held is not None
    return float(held)


PAST_A_FOLLOWER = {
    "a transistor": ("Q90 NPN QPN1 +24V B90 OUT", "U90 IC IC9 B=B90"),
    "a transistor of the other polarity": ("Q90 PNP QPP1 OUT B90 +24V", "U90 IC IC9 B=B90"),
    "a MOSFET": ("Q90 NMOS MPN1 +24V G90 OUT", "U90 IC IC9 B=G90"),
    "the body diode of a MOSFET": ("Q90 NMOS MPN1 OUT G90 +24V", "U90 IC IC9 B=G90"),
    "a diode": ("D90 DIODE 1N4007 +24V OUT",),
    "a resistor": ("R90 RES 47 +24V OUT POWER:20W",),
    "a resistor and a diode": ("R90 RES 47 +24V X90", "D90 DIODE 1N4007 X90 OUT"),
    "an inductor": ("L90 IND 10u +24V OUT",),
}
QUIET = {
    "a pull-up that gives next to nothing": ("R90 RES 10k +24V OUT",),
    "a load to ground": ("R90 RES 47 OUT GND POWER:20W",),
    "a diode to the supply": ("D90 DIODE 1N4007 OUT +24V",),
    "a diode from ground": ("D90 DIODE 1N4007 GND OUT",),
    "a transistor to ground": ("Q90 NPN QPN1 OUT B90 GND", "U90 IC IC9 B=B90"),
    "a clamp above the supply": ("D90 ZENER - OUT +24V",),
    "a divider": ("R90 RES 10k OUT X90", "R91 RES 10k X90 GND"),
    "a capacitor": ("C90 CAP 10u +24V OUT",),
    "a resistor to the negative supply": ("R90 RES 1k OUT -5V",),
}


@pytest.mark.parametrize("lines", PAST_A_FOLLOWER.values(), ids=PAST_A_FOLLOWER)
def test_every_kind_of_way_past_a_follower_is_told(lines: tuple[str, ...]) -> None:
    finding = way(with_parts(FOLLOWER, *lines))
    assert finding is not None
    resistive = any(line.startswith("R") for line in lines)
    assert (finding.limiter, finding.level) == ("Q10", "error" if resistive else "warning")
    assert finding.parts[0].endswith("90")
    assert finding.remedy is not None
    assert finding.nets[:2] == ("OUT", "+24V")


@pytest.mark.parametrize("lines", QUIET.values(), ids=QUIET)
def test_what_feeds_nothing_is_left_alone(lines: tuple[str, ...]) -> None:
    assert way(with_parts(FOLLOWER, *lines)) is None


def test_past_a_sink_it_is_the_way_to_ground_that_counts() -> None:
    assert way(with_parts(SINK, "R90 RES 22 LAMP GND POWER:10W")) is not None
    assert way(with_parts(SINK, "Q90 NMOS MPN1 LAMP G90 GND", "U90 IC IC9 B=G90")) is not None
    assert way(with_parts(SINK, "R90 RES 22 +12V LAMP POWER:10W")) is None  # the load
    assert way(with_parts(SINK, "D90 DIODE 1N4007 LAMP +12V")) is None  # a flyback diode


def test_past_a_source_it_is_the_way_from_the_supply_that_counts() -> None:
    assert way(with_parts(SOURCE, "D90 DIODE 1N4007 +15V OUT")) is not None
    assert way(with_parts(SOURCE, "D90 DIODE 1N4007 GND OUT")) is None


def test_five_per_cent_of_holds_is_the_bound() -> None:
    """V / R of 24 V 5 %, at its high end, against 5 % of holds, by Ohm's law."""
    at_ohm = 1.05 * 24.0 / (0.05 * holds_A(FOLLOWER))
    assert way(with_parts(FOLLOWER, f"R90 RES {at_ohm * 1.01:.6g} +24V OUT")) is None
    assert way(with_parts(FOLLOWER, f"R90 RES {at_ohm * 0.99:.6g} +24V OUT")) is not None


def test_the_resistance_named_in_the_remedy_will_do() -> None:
    finding = way(with_parts(FOLLOWER, "R90 RES 47 +24V OUT"))
    assert finding is not None
    assert finding.remedy is not None
    value, unit = finding.remedy.rpartition("put ")[2].split()[:2]
    ohm = float(value) * {"ohm": 1.0, "kohm": 1e3}[unit]
    assert way(with_parts(FOLLOWER, "R90 RES 47 +24V X90", f"R91 RES {ohm:.6g} X90 OUT")) is None


def test_moved_before_the_sense_resistor_it_is_no_second_way() -> None:
    assert way(with_parts(FOLLOWER, "R90 RES 47 +24V SNS")) is None


def test_a_current_that_breaks_the_cap_is_an_error() -> None:
    """The cap is 0.8 A: the high end of most leaves room for some milliamperes, not for half an ampere."""
    finding = way(with_parts(FOLLOWER, "R90 RES 47 +24V OUT"))
    assert finding is not None
    assert finding.level == "error"
    far = way(with_parts(FOLLOWER.stated(cap="5 A"), "R90 RES 47 +24V OUT"))
    assert far is not None
    assert far.level == "warning"


def test_a_second_limiter_on_the_same_output_is_limited_itself() -> None:
    second = (
        "R30 RES 680 DRV B3 POWER:1W", "Q30 NPN QPN1 +24V B3 S3", "R31 RES 1.2 S3 OUT POWER:2W", "R32 RES 150 S3 T3",
        "Q31 NPN QSN1 B3 T3 OUT", "C31 CAP 10n B3 T3",
    )  # fmt: skip
    review = with_parts(FOLLOWER, *second)
    assert {one.limiter.id for one in review.limiters} == {"Q10", "Q30"}
    assert way(review) is None


def test_a_way_whose_value_is_not_known_is_not_checked() -> None:
    review = with_parts(FOLLOWER, "R90 RES odd +24V OUT")
    assert way(review) is None
    assert ("second-road", "the value of R90") in unchecked(review)


BOOSTER = """
J1 CONN - VOUT GND
J2 CONN - +10V GND
R1 RES 3 +10V B POWER:3W
Q1 PNP QPP1 VOUT B E
R2 RES 0.27 +10V E POWER:5W
R3 RES 1 E T
Q2 PNP QPP1 B T +10V
U1 IC REG5 IN=B OUT=VOUT GND=GND
C1 CAP 1n B T
"""


def booster(cap: str = "9 A", *, board: str = BOOSTER, driver: str | None = None, **drive: str) -> Review:
    """Return the review of a booster around a three-terminal regulator, its sense resistor in the supply lead.

    What the regulator draws at most is stated for its part number (``driver``), or as a drive of its own.
    """
    fixed, stated = {"+10V": "10 V", "GND": "0 V"}, {"drive": {"B": drive} if drive else {}}
    if driver is not None:
        stated["driver"] = {"REG5": {"current": driver}}
    return reviewed(board, limits(supply=fixed, limiter={"*": {"output": "5 V", "cap": cap}}, **stated))


def test_a_booster_is_judged_with_what_its_regulator_draws_and_gives() -> None:
    """I_O = I_booster + I_regulator: NEC three-terminal regulator manual G12702E, section 4.2."""
    review = booster(low="2 V", high="10 V", current="1.9 A")
    (limiter,) = review.limiters
    held_A = limiter.solution.currents[1].holds_A
    assert held_A == pytest.approx(0.75 / 0.27, rel=0.1)  # V_BE of a power transistor that takes over an ampere
    finding = way(review)
    assert finding is not None
    assert (finding.level, finding.parts) == ("note", ("U1", "R2"))
    most_A = limiter.solution.currents[0].most_range_A
    assert most_A is not None
    room = booster(f"{most_A[1] + 1.9 - 0.01} A", low="2 V", high="10 V", current="1.9 A")
    assert (way(room) or finding).level == "error"


def test_without_the_current_its_regulator_draws_a_booster_is_not_judged() -> None:
    review = booster()
    assert review.limiters[0].verdict == "not judged"
    assert ("currents", "[driver.REG5] current: the most that U1 draws") in unchecked(review)
    nameless = booster(board=BOOSTER.replace("REG5", "-"))
    assert ("currents", "[drive.B] current: the most that U1 draws") in unchecked(nameless)


def test_a_booster_is_solved_with_what_its_regulator_draws() -> None:
    """I_1(max) = V_BE2 / R2: NEC three-terminal regulator manual G12702E, section 4.2; here with the base stop's drop. What
    the shunt takes is what the regulator draws less what comes to it by the booster's base and the resistor beside it."""
    review = booster(driver="1.9 A")
    (limiter,) = review.limiters
    assert limiter.limiter.topology == "regulator-booster"
    assert not limiter.assumed
    held, row = limiter.solution.held_short, limiter.solution.currents[1]
    assert held is not None
    shunt, booster_, beside = (held.states[name] for name in ("Q2", "Q1", "R1"))
    assert held.drive_A == pytest.approx(-1.9)
    assert row.holds_A == pytest.approx((-shunt.control_V - shunt.control_A * 1.0) / 0.27 - -booster_.control_A, rel=0.01)
    assert -shunt.current_A - booster_.control_A + beside.current_A == pytest.approx(1.9, rel=1e-6)
    assert row.begins_A is not None
    assert row.holds_A is not None
    assert row.unlimited_A is not None
    assert 0.5 * row.holds_A < row.begins_A < row.holds_A < 0.5 * row.unlimited_A


def test_a_booster_of_a_small_shunt_is_told_that_it_has_to_bear_the_regulator() -> None:
    """The shunt has to bear the regulator's short-circuit current: common practice of the trade, told beside the circuit in
    makers' data sheets of three-terminal regulators (from memory)."""
    told = found(booster(board=BOOSTER.replace("Q2 PNP QPP1", "Q2 PNP QSP1"), driver="1.9 A"), "shunt-overloaded")
    assert {(one.level, one.parts) for one in told} == {("error", ("Q2",))}
