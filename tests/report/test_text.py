"""The report for people: order, width, figures, and names that must not act."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from protlint.report.digest import sections
from protlint.report.document import document
from protlint.report.layout import COLUMNS, width, wrapped
from protlint.report.shape import CAUTION, combined
from protlint.report.text import rendered_text
from tests.support.sample_review import HOSTILE, PLAIN, sample_review

ACTING = re.compile("[\x00-\x09\x0b-\x1f\x7f-\x9f\u200b-\u200f\u2028-\u202e\u2066-\u2069\ud800-\udfff]")


def test_the_worst_limiter_stands_first() -> None:
    names = [name for _, name, _ in sections(document(sample_review(notes=2)))]
    assert names == [None, "Q10", "CH2/Q20", "Q30"]


def test_a_waived_finding_stays_marked_with_its_reason_and_stands_last() -> None:
    _, _, findings = sections(document(sample_review()))[1]
    assert [finding["waived"] for finding in findings] == [None, "the driver gives 5 mA at most"]
    text = rendered_text(document(sample_review()))
    assert "the driver gives 5 mA at most (A. Reviewer)" in text


def test_what_a_person_needs_is_there() -> None:
    text = rendered_text(document(sample_review()))
    for expected in (
        "0.279 / 0.294 / 0.308",
        "at least 0.700",
        "-0.421 (-60 %)",
        "carries 0.282 A",
        "remedy: fit 0.36 ohm in place of R11",
        "[limiter.Q10] peak (trips-on-peaks); load (foldback-locks-out)",
        "node N3 floats",
        "resistors that state no tolerance have 1 %",
        "lamp.edf:12:5",
        "QSN1 (Q11): vceo",
    ):
        assert expected in text
    assert CAUTION in " ".join(text.split())


@pytest.mark.parametrize("notes", [0, 200])
@pytest.mark.parametrize("name", [*HOSTILE, "Q10"])
def test_lines_stay_in_80_columns_and_no_name_acts(name: str, notes: int) -> None:
    names = {**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)}
    text = rendered_text(document(sample_review(names, notes=notes)))
    assert max(width(line) for line in text.split("\n")) <= COLUMNS
    assert not ACTING.search(text)
    assert not re.search(r"##|^\s*::", text, re.MULTILINE)


def test_every_finding_of_two_hundred_is_there_and_an_index_leads_them() -> None:
    report = document(sample_review(notes=200))
    text = rendered_text(report)
    assert all(finding["fingerprint"] in text for finding in report["findings"])
    assert re.search(r"200 note +base-stop-absent +Q30", text)
    assert len(text.splitlines()) < 200 * 6 + 100


def test_a_figure_and_its_unit_stay_together() -> None:
    lines = wrapped("the drop is " + "x" * 10 + " 4.51 V and 20 K/W at 27 degC", columns=28)
    assert lines == ["the drop is xxxxxxxxxx", "4.51 V and 20 K/W at 27 degC"]


def test_like_limiters_are_shown_once_and_named_with_their_findings() -> None:
    report = document(sample_review())
    first = report["limiters"][0]
    own = [one for one in report["findings"] if one["limiter"] == "Q10"]
    for number in range(100, 300):
        name = f"Q{number}"
        report["limiters"].append({**first, "id": name})
        report["findings"] += [{**one, "limiter": name, "fingerprint": f"{one['check']}-{number}"} for one in own]
    text = rendered_text(report)
    assert text.count("Currents in A") == 2
    assert "have 200 more" in text
    assert all(f"Q{number}: carry-not-met-{number}, base-stop-absent-{number}" in text for number in range(100, 300))
    report["limiters"][-1]["currents"] = report["limiters"][2]["currents"]
    assert "have 199 more" in rendered_text(report)


def test_assumptions_that_differ_in_net_names_alone_are_one() -> None:
    report = document(sample_review())
    first = report["limiters"][0]
    report["limiters"] = [
        {
            **first,
            "id": f"Q{number}",
            "nets": {**first["nets"], "feed": f"F{number}"},
            "assumed": [f"the drive on F{number} is stiff"],
        }
        for number in (1, 2, 3)
    ]
    assert "  - the drive on F1 is stiff (Q1, and on nets of their own Q2, Q3)" in rendered_text(report)


def test_colour_only_where_asked() -> None:
    report = document(sample_review())
    plain = rendered_text(report)
    coloured = rendered_text(report, colour=True)
    assert "\x1b" not in plain
    assert re.sub(r"\x1b\[\d+m", "", coloured) == plain
    assert "\x1b[31merror\x1b[0m" in coloured


def test_boards_together_end_with_a_line_for_all_and_the_unread() -> None:
    one = document(sample_review())
    text = rendered_text(combined([one, one], [{"file": "broken.edf", "line": 3, "column": 9, "message": "not EDIF"}]))
    assert "3 boards together: 6 limiters" in text
    assert "broken.edf:3:9: not EDIF" in text


def test_of_one_board_its_own_line_is_enough() -> None:
    one = document(sample_review())
    assert "together" not in rendered_text(combined([one]))
    assert rendered_text(combined([one])) == rendered_text(one)
    unread = rendered_text(combined([], [{"file": "broken.edf", "line": 3, "column": 9, "message": "not EDIF"}]))
    assert "together" not in unread
    assert "No board was read" in unread
    assert "broken.edf:3:9: not EDIF" in unread


def test_an_empty_board_says_where_to_look() -> None:
    review = sample_review()
    text = rendered_text(document(replace(review, limiters=(), findings=())))
    assert "no limiter found" in text
    assert "protlint survey" in text
