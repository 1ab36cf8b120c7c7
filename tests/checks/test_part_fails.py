"""What the output passes with a part failed, and the fuses that the board names."""

from __future__ import annotations

import pytest

from protlint.checks.part_fails import IfPartFails, PartFails
from protlint.report.document import document
from protlint.report.text import rendered_text
from tests.support.desk import the_one
from tests.support.judged import SOUND, Job, gated, sink


def table(job: Job) -> IfPartFails:
    answer = the_one(job.review()).if_a_part_fails
    assert answer is not None
    return answer


def row(job: Job, role: str, how: str) -> PartFails:
    (one,) = [one for one in table(job).rows if (one.role, one.how) == (role, how)]
    return one


@pytest.mark.parametrize("name", SOUND)
def test_every_part_is_failed_both_ways(name: str) -> None:
    rows = [(one.role, one.how) for one in table(SOUND[name]()).rows]
    assert rows[:4] == [("sense", "open"), ("sense", "short"), ("shunt", "open"), ("shunt", "short")]
    stop = [] if name == "folding" else [("base_stop", "open")]
    assert rows[4:] == stop


@pytest.mark.parametrize("name", SOUND)
def test_without_its_shunt_or_its_base_stop_nothing_limits(name: str) -> None:
    job = SOUND[name]()
    unlimited_A = the_one(job.review()).solution.currents[1].unlimited_A
    assert row(job, "shunt", "open").output_A == pytest.approx(unlimited_A, rel=1e-6)
    if name != "folding":
        assert row(job, "base_stop", "open").output_A == pytest.approx(unlimited_A, rel=1e-3)


def test_a_shorted_sense_resistor_lets_more_through_than_no_limiter() -> None:
    short, unlimited = row(sink(), "sense", "short"), row(sink(), "shunt", "open")
    assert short.output_A is not None
    assert unlimited.output_A is not None
    assert short.output_A > unlimited.output_A
    assert short.of_holds is not None
    assert short.of_holds > 2.0


def test_what_only_supply_and_wiring_bound_is_told_as_more_than_the_pass_device_bears() -> None:
    short = row(gated(), "sense", "short")
    assert (short.output_A, short.of_holds) == (20.0, None)
    assert row(gated().rated("MPN1", id_peak="50 A"), "sense", "short").output_A == 50.0
    text = " ".join(rendered_text(document(gated().review())).split())
    assert "shorted more than the 20 A that the pass device bears, as much as supply and wiring give" in text


@pytest.mark.parametrize("name", SOUND)
def test_an_open_sense_resistor_or_a_shorted_shunt_cuts_off(name: str) -> None:
    for role, how in (("sense", "open"), ("shunt", "short")):
        one = row(SOUND[name](), role, how)
        assert one.output_A is not None
        assert abs(one.output_A) < 0.06


def test_a_bank_is_named_by_its_parts() -> None:
    bank = sink().drawn(("R2 RES 2.2 SNS GND POWER:1W", "R2 RES 4.4 SNS GND POWER:1W\nR4 RES 4.4 SNS GND POWER:1W"))
    assert row(bank, "sense", "open").parts == ("R2", "R4")


def test_fuses_upstream_are_named_and_none_elsewhere() -> None:
    assert table(sink()).fuses == ()
    fused = sink().drawn(("J2 CONN - +12V GND", "J2 CONN - VIN GND\nF1 FUSE - VIN +12V\nF2 FUSE - CMD CMD2"))
    assert table(fused).fuses == ("F1",)


def test_a_limiter_that_was_not_solved_has_no_table() -> None:
    review = sink().drawn(("R2 RES 2.2", "R2 RES two")).review()
    assert the_one(review).if_a_part_fails is None
