"""What a remedy that fits a value says beforehand: the rating it needs, and the findings it would bring."""

from __future__ import annotations

import re

import pytest

from protlint.checks.afterwards import shaped
from protlint.findings import Finding, Fit
from protlint.solve.answers import solve
from tests.checks.test_loop_and_timing import peaky, slow
from tests.checks.test_sets import CHANNEL, FIXED, HALVES, SHARED, USUAL
from tests.support.cures import figure, powered, resistor
from tests.support.desk import case_of, found, limits
from tests.support.judged import Job, folding, sink

BANK = sink().drawn(
    ("R2 RES 2.2 SNS GND POWER:1W", "R2 RES 4.7 SNS GND POWER:0.25W\nR8 RES 4.7 SNS GND POWER:0.25W"),
)
CHAIN = sink().drawn(
    ("R2 RES 2.2 SNS GND POWER:1W", "R2 RES 1.1 SNS MID POWER:0.25W\nR8 RES 1.1 MID GND POWER:0.25W"),
)
UNLIKE = sink().drawn(
    ("R2 RES 2.2 SNS GND POWER:1W", "R2 RES 3.3 SNS GND POWER:1W\nR8 RES 6.8 SNS GND POWER:1W"),
)
SLOPING = folding().drawn(
    ("R63 RES 1k8 STOP GND POWER:0.5W", "R63 RES 22k STOP +20V POWER:0.5W\nR64 RES 330 STOP OUT POWER:0.25W")
)
"""The same stage with a slope: its limit falls as the voltage across the pass device rises."""


def ill(job: Job, check: str) -> Finding:
    (finding,) = found(job.review(), check)
    return finding


def said(job: Job, check: str) -> str:
    return ill(job, check).remedy or ""


def each(job: Job, text: str, names: tuple[str, ...]) -> Job:
    """Return the job with the value, and the rating where one is said, fitted as each of some resistors."""
    for name in names:
        job = resistor(job, name, figure(text, "ohm"))
        job = powered(job, name, figure(text, "W")) if "rated" in text else job
    return job


@pytest.mark.parametrize(("job", "carry"), [(BANK, "0.4 A"), (CHAIN, "0.4 A")], ids=["bank", "chain"])
def test_in_a_bank_and_in_a_chain_it_is_the_value_and_the_rating_of_each(job: Job, carry: str) -> None:
    wanting = job.stated(carry=carry, cap=None, sink="2 K/W")
    remedy = said(wanting, "carry-not-met")
    assert re.match(r"fit \S+ m?ohm as each of R2, R8 \(\S+ m?ohm together\), each rated \S+ m?W$", remedy), remedy
    assert found(each(wanting, remedy, ("R2", "R8")).review()) == []


def test_unlike_parts_of_a_bank_are_told_what_they_make_together() -> None:
    remedy = said(UNLIKE.stated(carry="0.3 A", cap=None), "carry-not-met")
    assert remedy.startswith("make R2, R8 1."), remedy


def test_a_sense_resistor_whose_rating_nobody_knows_is_told_the_one_it_needs() -> None:
    job = sink().drawn(("SNS GND POWER:1W", "SNS GND")).stated(carry="0.4 A", cap=None, sink="2 K/W")
    # some 0.62 A through 1.3 ohm: 0.5 W, to be at most 80 % of the rating
    assert figure(said(job, "carry-not-met"), "W") == 0.75


@pytest.mark.parametrize("drawn", ["14 K/W", "20 K/W"], ids=["new", "worse than before"])
def test_what_a_value_would_bring_is_said_with_how_it_is_mended(drawn: str) -> None:
    job = sink().stated(carry="0.4 A", cap=None, sink=drawn)
    remedy = said(job, "carry-not-met")
    value, _, rest = remedy.partition("; then also ")
    assert rest.startswith("pass-overheated, pass-outside-safe-area: give Q1 a sink of ")
    fitted = resistor(job, "R2", figure(value, "ohm"))
    assert {one.check for one in found(fitted.review())} == {"pass-overheated", "pass-outside-safe-area"}
    assert found(fitted.stated(sink=f"{figure(rest, 'K/W')} K/W").review()) == []


@pytest.mark.parametrize(
    ("job", "check", "fit"),
    [
        (folding().stated(carry="1.5 A", cap=None, load=None, sink="0.1 K/W"), "drive-insufficient", "R60"),
        (folding().stated(cap="1.2 A", carry=None, load=None), "cap-exceeded", "R61"),
        (SLOPING.stated(carry="1 A", cap=None, load=None, sink="0.1 K/W"), "carry-not-met", "R61"),
    ],
    ids=["foldback, drive", "foldback, cap", "slope, carry"],
)
def test_with_a_preset_all_that_comes_of_a_new_value_is_said(job: Job, check: str, fit: str) -> None:
    before = {one.check for one in found(job.review())}
    remedy = said(job, check).rpartition("if they are meant so: ")[2]
    after = each(job, remedy.partition("; then also ")[0], (fit,)).review()
    new = {one.check for one in found(after)} - before
    assert check not in {one.check for one in found(after)}
    assert all(one in remedy for one in new), (remedy, new)


def test_a_drive_resistor_comes_with_the_rating_it_needs() -> None:
    weak = sink().drawn(("R1 RES 390 CMD BASE POWER:0.25W", "R1 RES 2k2 CMD BASE POWER:0.0125W")).stated(carry="0.25 A")
    remedy = said(weak, "drive-insufficient")
    assert "rated" in remedy
    assert "drive-insufficient" not in {one.check for one in found(each(weak, remedy, ("R1",)).review())}
    assert "resistor-power" not in {one.check for one in found(each(weak, remedy, ("R1",)).review())}


def test_nothing_is_added_where_nothing_comes_of_it() -> None:
    remedy = said(sink().stated(carry="0.35 A", cap="0.6 A"), "carry-not-met")
    assert re.fullmatch(r"fit \S+ ohm as R2", remedy)


@pytest.mark.parametrize(
    ("ballast", "says"),
    [("0.47", r"fit \S+ mohm as each of R2, R3"), ("0.39", r"make R2, R3 0\.\d+ times what they are")],
    ids=["like", "unlike"],
)
def test_of_many_consequences_the_checks_are_named(ballast: str, says: str) -> None:
    board = SHARED.format(other="QPN1", ballast=ballast).replace("R5 RES 100 E2 TAP", "R5 RES 200 E2 TAP\nR6 RES 200 E3 TAP")
    needs = {"*": {"output": "12 V", "carry": "3.5 A"}}
    job = Job(board, limits(supply=FIXED, drive={"DRV": {"low": "0 V", "high": "24 V"}}, limiter=needs))
    assert re.fullmatch(says + r"; then also [a-z-]+(, [a-z-]+)+ come up", said(job, "carry-not-met"))


def unlike_halves(upper: str, lower: str, power: str, **needs: str) -> Job:
    board = HALVES.format(upper=upper, lower=lower).replace("POWER:5W", f"POWER:{power}")
    drive = {name: {"low": "-24 V", "high": "24 V"} for name in ("DP", "DN")}
    return Job(board, limits(supply=FIXED, drive=drive, limiter={"*": {"output": "0 V", **needs}}))


def unlike_channels() -> Job:
    """Three channels on poor sinks, the second with a larger sense resistor of a small rating and another base stop."""
    odd: tuple[dict[str, str], ...] = ({}, {"sense": "4.7", "stop": "1k"}, {})
    board = "J0 CONN - +12V GND\n" + "".join(CHANNEL.format(n=n, **{**USUAL, **one}) for n, one in enumerate(odd, 1))
    drive = {f"CMD{n}": {"low": "0 V", "high": "5 V"} for n in (1, 2, 3)}
    asked = {"*": {"output": "2 V", "shorted_to": ["+12V"], "sink": "40 K/W"}}
    return powered(Job(board, limits(supply=FIXED, drive=drive, limiter=asked)), "R21", 0.1)


def test_the_half_that_changes_is_judged_with_its_new_value() -> None:
    remedy = said(unlike_halves("2.2", "1", "0.4W", carry="0.5 A", sink="3 K/W"), "halves-unequal")
    assert remedy.startswith(
        "fit 1 ohm as R11, rated 1 W; then also pass-overheated, pass-outside-safe-area: give Q10 a sink"
    )
    mended = powered(unlike_halves("1", "1", "0.4W", carry="0.5 A", sink=f"{figure(remedy, 'K/W')} K/W"), "R11", 1.0)
    assert found(powered(mended, "R21", 1.0).review()) == []


def test_a_channel_made_like_the_others_is_judged_as_they_are() -> None:
    job = unlike_channels()
    remedy = said(job, "channels-unequal")
    assert "fit 2.2 ohm as R21" in remedy
    assert "R21 rated 0.5 W; then also pass-overheated, pass-outside-safe-area: give Q20 a sink of" in remedy
    mended = powered(resistor(resistor(job, "R22", 150.0), "R21", 2.2), "R21", 0.5)
    left = {one.check for one in found(mended.review()) if one.limiter == "Q20"}
    assert left == {"pass-overheated", "pass-outside-safe-area"}


def test_a_peak_that_a_capacitor_no_longer_lets_pass_is_told_with_it() -> None:
    """The capacitor that slows the limiter costs its damping and lets the pass device in for too long, and a peak pass."""
    slowed = slow(0.05).drawn(("C11 CAP 1u STOP OUT", "C11 CAP 220n STOP OUT"))
    job = slowed.stated(peak={"current": "0.5 A", "lasts": "25 us"})
    assert not found(job.review(), "trips-on-peaks")
    for check, drawn in (("trips-late", "C11 CAP 1n STOP OUT"), ("loop-undamped", "C11 CAP 220p BASE STOP")):
        value, _, also = said(job, check).partition("; then also trips-on-peaks: ")
        assert also.startswith("fit 1.1 ohm as R11"), value
        changed = job.drawn(("C11 CAP 220n STOP OUT", drawn)).review()
        assert {one.check for one in found(changed)} == {"trips-on-peaks"}
        assert said(slowed, check) == value


def test_a_sense_resistance_for_a_peak_s_sake_is_judged_like_any_other() -> None:
    job = peaky("0.4 A", "10 s").stated(cap="0.5 A")
    value, _, also = said(job, "trips-on-peaks").partition("; then also ")
    assert also.startswith("cap-exceeded: fit 2 ohm as R2"), value
    assert "cap-exceeded" in {one.check for one in found(resistor(job, "R2", figure(value, "ohm")).review())}


def test_a_capacitor_changes_no_current() -> None:
    """So that only loop, delay and peaks are asked again: every figure of the currents solved anew is the one there was."""
    case = case_of(slow(4.0).review())
    changed = shaped(case, (Fit("C11", 0.0), Fit("", 1e-6, nodes=("BASE", "OUT"))))
    assert [one.model["C"] for one in changed.circuit.devices if one.kind == "capacitor"] == [1e-6]
    anew = solve(changed.circuit, case.limits.ambient_degC)
    for drawn, now in zip(case.solution.currents, anew.currents, strict=True):
        for name in ("holds_A", "carries_A", "most_A", "unlimited_A", "holds_range_A", "carries_range_A", "most_range_A"):
            assert getattr(now, name) == pytest.approx(getattr(drawn, name), rel=1e-9)
    assert changed.solution.step != case.solution.step
    assert changed.solution.loop != case.solution.loop
