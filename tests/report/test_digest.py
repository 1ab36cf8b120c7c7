"""What the faces tell alike: needs gathered, sentences begun, figures with sensible digits, behaviour in words."""

from __future__ import annotations

from typing import Any

import pytest

from protlint.quantities import format_ratio
from protlint.report.behaviour import sentences
from protlint.report.digest import left_open, sentence, unchecked, unsolved
from protlint.report.document import document
from protlint.report.figures import aligned, current, figure
from protlint.report.safe import markdown, throughout
from tests.support.sample_review import sample_review

ROWS = [
    {"check": check, "needs": needs}
    for check, needs in (
        ("carries", "[limiter.Q10] output"),
        ("carry-not-met", "[limiter.Q10] carry"),
        ("resistor-power", "a POWER property of R1, or ratings.power"),
        ("drive-insufficient", "[limiter.Q10] carry"),
        ("resistor-power", "a POWER property of R2, or ratings.power"),
        ("sense-resistor-power", "a POWER property of R3, or ratings.power"),
        ("base-stop-low", "QSN1.ratings.ib"),
    )
]


def told(**changes: Any) -> str:
    """Return the sentences on the first limiter of the sample, with some of its answers changed."""
    return " ".join(sentences({**document(sample_review())["limiters"][0], **changes}))


def test_what_is_needed_is_told_once_keys_and_parts_together() -> None:
    needs = [
        "[limiter.Q10] output (carries); carry (carry-not-met, drive-insufficient)",
        "a POWER property of R1, R2, or ratings.power (resistor-power)",
        "a POWER property of R3, or ratings.power (sense-resistor-power)",
        "QSN1.ratings.ib (base-stop-low)",
    ]
    assert unchecked(ROWS) == needs
    assert unchecked(throughout(ROWS, markdown)) == [markdown(need) for need in needs]


@pytest.mark.parametrize(
    ("why", "told"),
    [
        ("for want of a value of R1", " for want of a value of R1"),
        ("node N3 floats", ": node N3 floats"),
    ],
)
def test_why_a_limiter_was_not_solved_is_told_once(why: str, told: str) -> None:
    rows = [{"check": "currents", "needs": why}, {"check": "value-unreadable", "needs": "[attributes] value"}]
    limiter = {"not_solved": why, "not_checked": rows}
    assert unsolved(limiter) == told
    assert left_open(limiter) == rows[1:]


@pytest.mark.parametrize(
    ("message", "said"),
    [("the shunt is off", "The shunt is off"), ("q11 is off", "q11 is off"), ("out is on", "out is on"), ("", "")],
)
def test_a_sentence_begins_with_a_capital_and_a_name_as_it_is_written(message: str, said: str) -> None:
    assert sentence({"message": message, "parts": ["q11"], "nets": ["out"], "limiter": None}) == said


@pytest.mark.parametrize(
    ("shown", "text"),
    [
        (figure(5.09e-14), "0"),
        (figure(4.66e-22, "W"), "0 W"),
        (figure(1.4e-14, "A"), "14 fA"),
        (figure(-7.01e-6, "deg"), "0 deg"),
        (figure(0.223457), "0.223"),
        (figure(-0.0123), "-0.0123"),
        (format_ratio(0.0364), "0.036"),
        (format_ratio(-0.2004), "-0.2"),
        (format_ratio(4e-5), "0"),
        (format_ratio(-4e-5), "0"),
        (aligned(0.16), "0.160 A"),
        (aligned(None), "-"),
        (aligned(0.0123), "12.3 mA"),
        (current(3.4e-12, 0.3), "next to nothing"),
        (current(3.4e-6, 0.3), "3.4 uA"),
        (current(0.0, None), "0 A"),
    ],
)
def test_figures_have_sensible_digits(shown: str, text: str) -> None:
    assert shown == text


def test_the_damping_is_told_as_drawn_within_the_spreads_and_with_wiring() -> None:
    text = told()
    assert (
        "Loop: damping 0.22 at 1.2 MHz as drawn; at worst 0.19 within every spread, 0.035 with 500 nH in the short." in text
    )
    loop = document(sample_review())["limiters"][0]["loop"]
    assert "damping 1 as drawn (nothing swings); at worst" in told(loop={**loop, "own_damping": 1.0})
    bare = {**loop, "worst": loop["worst_without_wiring"]}
    assert told(loop=bare).count("at worst") == 1


def test_a_hand_calculation_gone_astray_is_not_told_in_per_cent() -> None:
    formula = document(sample_review())["limiters"][0]["formula"]
    assert "solved 0.367 A, 39 % less. Not so here: the shunt's V_BE is 0.6 V." in told()
    for figure_A, difference in ((-0.44, -13.7), (0.01, 35.7)):
        text = told(formula={**formula, "figure_A": figure_A, "difference": difference})
        assert "solved 0.367 A. Not so here" in text
        assert ("no current at all" in text) == (figure_A < 0.0)


def test_how_many_times_holds_a_failed_part_lets_through_is_a_plain_number() -> None:
    table = document(sample_review())["limiters"][0]["if_a_part_fails"]
    rows = [{**table["rows"][1], "of_holds": 177.4}, {**table["rows"][0], "of_holds": 1e-9, "output_A": 1e-9}]
    text = told(if_a_part_fails={**table, "rows": rows})
    assert "(180 times holds)" in text
    assert "open next to nothing" in text


def test_where_the_drive_gives_out_is_told_once_for_the_same_ambients() -> None:
    rows = document(sample_review())["limiters"][0]["currents"]
    every = [{**row, "limited_by": {"short": "drive", "output": "drive"}} for row in rows]
    assert "The drive gives out at the working output and in the short, not the limiter, at every ambient." in told(
        currents=every
    )
    some = [*every[:2], rows[2]]
    assert "not the limiter, at -10 degC and 27 degC." in told(currents=some)
