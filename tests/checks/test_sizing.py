"""The sense resistance to fit: within the window, with the rating it needs, or the plain statement that none will do."""

from __future__ import annotations

import re

import pytest

from protlint.checks.sizing import greatest_most_A, least_carries_A
from protlint.quantities import preferred
from protlint.quantities.series import hundredths
from tests.support.cures import figure, resistor
from tests.support.desk import found, the_one
from tests.support.judged import Job, folding, follower, sink, source


def spread(job: Job) -> float:
    solution = the_one(job.review()).solution
    least, most = least_carries_A(solution), greatest_most_A(solution)
    assert least is not None
    assert most is not None
    return most / least


def test_both_needs_are_met_over_all_corners() -> None:
    job = sink().stated(carry="0.35 A", cap="0.6 A")
    (ill,) = found(job.review(), "carry-not-met")
    solution = the_one(resistor(job, "R2", figure(ill.remedy or "", "ohm")).review()).solution
    least, most = least_carries_A(solution), greatest_most_A(solution)
    assert least is not None
    assert most is not None
    assert least >= 0.35
    assert most <= 0.6


def test_a_narrow_window_takes_a_value_of_e96() -> None:
    # the limit spreads by some 1.40 over tolerance and temperature; a window of 1.42 has room for few values
    assert spread(sink()) == pytest.approx(1.40, abs=0.01)
    (ill,) = found(sink().stated(carry="0.2 A", cap="0.284 A").review(), "cap-exceeded")
    ohm = figure(ill.remedy or "", "ohm")
    assert round(100 * ohm) in hundredths("E96")
    assert round(100 * ohm) not in hundredths("E24")


def test_a_window_narrower_than_the_spread_is_said_with_what_could_be_had() -> None:
    (ill,) = found(sink().stated(carry="0.25 A", cap="0.3 A").review(), "cap-exceeded")
    said = ill.remedy or ""
    assert said.startswith("no sense value meets both")
    achievable = re.search(r"at least ([0-9.]+) A", said)
    assert achievable
    assert float(achievable[1]) == pytest.approx(0.25 * spread(sink()), rel=0.01)
    # with that cap a value is found
    wider = sink().stated(carry="0.25 A", cap=f"{float(achievable[1]) * 1.02} A").review()
    assert not [one for one in found(wider, "cap-exceeded") if (one.remedy or "").startswith("no sense value")]


def test_a_smaller_resistance_comes_with_the_rating_it_needs() -> None:
    job = sink().drawn(("SNS GND POWER:1W", "SNS GND POWER:0.4W")).stated(carry="0.4 A", cap=None)
    (ill,) = found(job.review(), "carry-not-met")
    # some 0.62 A through 1.3 ohm: 0.5 W, to be at most 80 % of the rating
    assert figure(ill.remedy or "", "W") == 0.75


def test_a_stage_that_passes_nothing_is_no_matter_of_the_sense_resistor() -> None:
    (ill,) = [one for one in found(follower().stated(output="25 V").review()) if one.check.startswith(("carry", "drive"))]
    assert "nothing" in (ill.remedy or "") or "cannot" in (ill.remedy or "")


def test_an_output_that_the_supply_s_low_end_does_not_reach_is_told_from_a_weak_stage() -> None:
    """A 15 V source with 20 % less at worst, 12 V, cannot carry at an output of 13 V; at 10 V it can."""
    low = source().supplied(**{"+15V": "15 V 20 %"})
    (one,) = [one for one in low.review().findings if one.check in ("carry-not-met", "drive-insufficient")]
    assert "may be as little as 12 V and the output works at 13 V" in (one.remedy or "")
    assert "[limiter" in (one.remedy or "")
    lower = low.limited("limiter", "*", output="10 V").review()
    assert not [one for one in lower.findings if one.check in ("carry-not-met", "drive-insufficient")]


def exchanged(preset: str) -> Job:
    """The stage that folds back, its limit set by a preset whose legs have each other's values."""
    return folding().drawn(("R62 RES 180 SNS STOP POWER:0.25W\nR63 RES 1k8 STOP GND POWER:0.5W", preset))


FOLDBACK = exchanged("R62 RES 1k8 SNS STOP POWER:0.25W\nR63 RES 180 STOP GND POWER:0.5W")
SLOPE = exchanged("R62 RES 22k SNS STOP POWER:0.5W\nR63 RES 180 STOP +20V POWER:0.5W\nR64 RES 330 STOP OUT POWER:0.25W")


def beside_the_preset(job: Job, check: str) -> str:
    """What the remedy says of the sense resistance, the preset left as it is."""
    (ill,) = found(job.review(), check)
    return (ill.remedy or "").split("if they are meant so: ")[-1]


@pytest.mark.parametrize(("job", "check"), [(FOLDBACK, "cap-exceeded"), (SLOPE, "carry-not-met")], ids=["foldback", "slope"])
def test_where_a_preset_decides_no_cap_is_asked_for_that_is_met_already(job: Job, check: str) -> None:
    said = beside_the_preset(job, check)
    assert said.startswith("no sense value")
    assert "beside R62, R63" in said
    assert "spreads" not in said
    assert "cap has to be" not in said


def test_the_value_that_comes_nearest_beside_a_preset_is_what_it_is_said_to_be() -> None:
    said = beside_the_preset(FOLDBACK, "cap-exceeded")
    ohm, passes = figure(said, "ohm"), re.search(r"up to ([0-9.]+) A passes", said)
    assert passes
    nearest, next_one = (resistor(FOLDBACK, "R61", value).review() for value in (ohm, preferred(1.001 * ohm, "E24", "up")))
    assert not found(nearest, "carry-not-met") + found(nearest, "drive-insufficient")
    assert greatest_most_A(the_one(nearest).solution) == pytest.approx(float(passes[1]), rel=0.01)
    assert least_carries_A(the_one(next_one).solution) < 0.8  # type: ignore[operator]


def test_a_value_beside_a_preset_far_from_1_over_r_is_found_all_the_same() -> None:
    """With its legs exchanged the drive decides, not the divider: the limit goes otherwise than as 1 / R."""
    job = FOLDBACK.stated(carry="0.3 A", cap="0.8 A", load=None)
    assert figure(beside_the_preset(job, "cap-exceeded"), "ohm") == 22.0
    checks = {one.check for one in found(resistor(job, "R61", 22.0).review())}
    assert not checks & {"cap-exceeded", "carry-not-met", "drive-insufficient"}


def test_a_drive_that_ends_below_the_working_output_is_named() -> None:
    """A follower gives nothing above its drive: Kirchhoff's voltage law. The op-amp swings to within 1.5 V of its 12 V."""
    low = follower().drawn(("V+=+24V", "V+=+12V")).supplied(**{"+12V": "12 V"}).stated(output="11 V")
    assert ["the drive on DRV reaches 10.5 V and the output works at 11 V" in one for one in starved(low)] == [True]
    assert not any("reaches" in one for one in starved(low.stated(output="5 V")))


def starved(job: Job) -> list[str]:
    """Return what is advised where the output gets too little."""
    review = job.review()
    return [one.remedy or "" for check in ("carry-not-met", "drive-insufficient") for one in found(review, check)]
