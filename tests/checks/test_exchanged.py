"""Legs of a preset with each other's values: told by what it is to exchange them, with figures that hold; else not told."""

from __future__ import annotations

import re

import pytest

from protlint.checks.sizing import greatest_most_A, least_carries_A
from tests.checks.test_afterwards import SLOPING
from tests.checks.test_sizing import FOLDBACK, SLOPE
from tests.support.cures import powered
from tests.support.desk import found, the_one
from tests.support.judged import Job, folding, sink

DIVIDED = sink().drawn(
    ("R3 RES 100 SNS STOP POWER:0.125W", "R3 RES 1k SNS STOP POWER:0.125W\nR4 RES 100 STOP GND POWER:0.125W")
)
"""The lamp driver with a divider that senses a part of the drop, its legs exchanged."""

EXCHANGED = {
    "foldback": (FOLDBACK, "R62", "R63", "180 ohm as R62, 1.8 kohm as R63", "0.5"),
    "slope": (SLOPE, "R62", "R63", "180 ohm as R62, 22 kohm as R63", "0.5"),
    "divider": (DIVIDED, "R3", "R4", "100 ohm as R3, 1 kohm as R4", "0.125"),
}


def told(job: Job) -> list[str]:
    """The remedies that say to exchange two parts."""
    return [one.remedy for one in job.review().findings if one.remedy and one.remedy.startswith("exchange")]


def with_other_legs(job: Job, one: str, other: str) -> Job:
    """The job with the values of two resistors exchanged."""
    first, second = (re.search(rf"^{name} RES (\S+)", job.board, re.MULTILINE) for name in (one, other))
    assert first
    assert second
    return job.drawn((first[0], f"{one} RES X"), (second[0], f"{other} RES {first[1]}"), ("RES X", f"RES {second[1]}"))


@pytest.mark.parametrize("name", EXCHANGED)
def test_exchanged_legs_are_told_in_every_remedy_of_what_is_wrong_with_them(name: str) -> None:
    job, one, other, values, _ = EXCHANGED[name]
    errors = [each for each in found(job.review()) if each.level == "error"]
    assert errors
    assert [each.remedy for each in errors] == told(job)
    for remedy in told(job):
        assert remedy.startswith(f"exchange {one} and {other} ({values})")
        assert "; if they are meant so: " in remedy


@pytest.mark.parametrize("name", EXCHANGED)
def test_exchanged_back_the_limiter_comes_to_what_was_said(name: str) -> None:
    job, one, other, _, watts = EXCHANGED[name]
    said = re.search(r"carries at least ([0-9.]+) (m?)A, passes up to ([0-9.]+) A and holds ([0-9.]+) A", told(job)[0])
    assert said
    mended = powered(powered(with_other_legs(job, one, other), one, float(watts)), other, float(watts)).review()
    assert [each.check for each in found(mended) if each.level == "error"] == []
    solution = the_one(mended).solution
    carries_A = float(said[1]) * (1e-3 if said[2] else 1.0)
    assert least_carries_A(solution) == pytest.approx(carries_A, rel=5e-3)
    assert greatest_most_A(solution) == pytest.approx(float(said[3]), rel=5e-3)
    assert solution.currents[1].holds_A == pytest.approx(float(said[4]), rel=5e-3)


@pytest.mark.parametrize(
    "job",
    [
        folding(),
        SLOPING,
        folding().drawn(("R61 RES 1 ", "R61 RES 3.3 ")),
        folding().drawn(("R61 RES 1 ", "R61 RES 0.33 ")),
        SLOPING.drawn(("R61 RES 1 ", "R61 RES 2.2 ")),
        FOLDBACK.stated(carry=None),
        sink().stated(carry="0.4 A"),
    ],
    ids=["sound foldback", "sound slope", "sense too large", "sense too small", "sense of a slope", "no carry", "no preset"],
)
def test_what_exchanging_does_not_mend_is_not_told_so(job: Job) -> None:
    assert told(job) == []


def test_legs_of_like_values_are_not_exchanged() -> None:
    alike = DIVIDED.drawn(("R4 RES 100", "R4 RES 1k")).stated(carry="0.35 A", cap="0.5 A")
    assert found(alike.review())
    assert told(alike) == []
