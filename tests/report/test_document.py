"""The JSON report: the promised keys, the shipped schema, stable bytes."""

from __future__ import annotations

import json
import math
import re
from dataclasses import replace

import pytest
from jsonschema import Draft202012Validator

from protlint.checks.table import BOARD_CHECKS, CHECKS, WITHOUT_SOLUTION
from protlint.limits import CheckSetting
from protlint.report import document as document_module
from protlint.report.answers import rounded
from protlint.report.digest import held_back
from protlint.report.document import document
from protlint.report.junit import rendered_junit
from protlint.report.markdown import rendered_markdown
from protlint.report.sarif import rendered_sarif
from protlint.report.shape import Document, combined, rendered_json
from protlint.report.text import rendered_text
from tests.support.paths import ROOT
from tests.support.sample_review import HOSTILE, PLAIN, sample_review

SCHEMA = json.loads((ROOT / "protlint/report/review-1.schema.json").read_text(encoding="utf-8"))

PROMISED = {
    "": "report protlint netlist limiters findings warnings",
    "netlist": "file sha256 design parts nets pins",
    "limiters.0": "id topology polarity verdict roles nets currents locus regulates loop step assumed not_checked",
    "limiters.0.roles": "pass driver sense shunt base_stop preset steering compensation drive others",
    "limiters.0.nets": "drive feed sense far output",
    "limiters.0.currents.0": "ambient_degC begins_A holds_A carries_A most_A unlimited_A shunt_A pass_A limited_by "
    "begins_range_A holds_range_A carries_range_A most_range_A",
    "limiters.0.currents.0.limited_by": "short output",
    "limiters.0.locus.0": "output_V holds_A",
    "limiters.0.loop": "least_damping at_Hz worst_damping low_frequency_gain crossover_Hz phase_margin_deg",
    "limiters.0.step": "settles delay_s peak_A pass_energy_J",
    "limiters.0.not_checked.0": "check needs",
    "findings.0": "check level limiter parts nets message working remedy assumption file line column fingerprint waived",
    "findings.0.working.0": "quantity formula value unit source",
    "warnings.0": "message line column count",
}
"""What the design promises to users, by path into the sample."""


def errors(report: Document) -> list[str]:
    return [error.message for error in Draft202012Validator(SCHEMA).iter_errors(json.loads(rendered_json(report)))]


def reached(report: Document, path: str) -> Document:
    value = report
    for step in path.split(".") if path else ():
        value = value[int(step)] if step.isdigit() else value[step]
    return value


@pytest.mark.parametrize("path", PROMISED)
def test_promised_keys_are_there(path: str) -> None:
    assert set(PROMISED[path].split()) <= set(reached(document(sample_review()), path))


def test_the_schema_is_one_and_the_sample_keeps_to_it() -> None:
    Draft202012Validator.check_schema(SCHEMA)
    report = document(sample_review(notes=3))
    assert errors(report) == []
    assert errors(combined([report, report], [{"file": "x.edf", "line": 1, "column": 2, "message": "not EDIF"}])) == []


def test_the_schema_refuses_a_missing_and_an_unknown_key() -> None:
    report = document(sample_review())
    assert errors({key: value for key, value in report.items() if key != "warnings"})
    assert errors({**report, "extra": 1})


def test_what_was_not_checked_of_the_board_counts_as_what_was_not_checked_of_its_limiters() -> None:
    report = document(replace(sample_review(), limiters=()))
    assert report["not_checked"] == [{"check": "limiter-absent", "needs": "the power rating of R77"}]
    assert held_back(report, "never", complete=True) == ["1 not checked"]
    assert held_back(report, "never") == []
    for text in (rendered_text(report), rendered_markdown(report), rendered_sarif(report), rendered_junit(report)):
        assert "the power rating of R77" in text


def test_the_checks_a_limiter_was_put_to_are_all_those_that_are_not_off() -> None:
    review = sample_review()
    asked = {limiter["id"]: set(limiter["asked"]) for limiter in document(review)["limiters"]}
    assert asked["Q10"] == {*CHECKS, *BOARD_CHECKS} - {"limiter-absent"}
    assert asked["CH2/Q20"] == WITHOUT_SOLUTION
    off = {"second-road": CheckSetting(level="off"), "cap-exceeded": CheckSetting(level="off")}
    told = document(replace(review, limits=replace(review.limits, checks=off)))["limiters"]
    assert {name for limiter in told if limiter["id"] == "Q10" for name in asked["Q10"] - set(limiter["asked"])} == set(off)


def test_a_limiter_without_a_solution_has_every_key_with_null() -> None:
    unsolved = next(item for item in document(sample_review())["limiters"] if item["verdict"] == "not judged")
    assert [row["ambient_degC"] for row in unsolved["currents"]] == [-10.0, 27.0, 85.0]
    assert {row["holds_A"] for row in unsolved["currents"]} == {None}
    assert {unsolved["loop"][key] for key in PROMISED["limiters.0.loop"].split()} == set(unsolved["step"].values()) == {None}
    assert (unsolved["loop"]["worst"], unsolved["loop"]["natural"]) == (None, [])


def test_numbers_have_six_digits_and_are_finite() -> None:
    assert rounded(0.12345678) == 0.123457
    assert rounded(math.inf) is None
    assert rounded(math.nan) is None
    assert rounded(-0.0) == 0.0
    assert math.copysign(1.0, rounded(-0.0) or 0.0) == 1.0
    report = document(sample_review())
    assert report["limiters"][0]["loop"]["least_damping"] == 0.223457
    assert report["findings"][0]["working"][1]["value"] == 0.282136


def test_the_last_bits_of_a_number_do_not_change_the_bytes() -> None:
    review = sample_review()
    first = review.limiters[0]
    row = first.solution.currents[0]
    assert row.holds_A is not None
    nudged = replace(row, holds_A=math.nextafter(row.holds_A, 1.0))
    solution = replace(first.solution, currents=(nudged, *first.solution.currents[1:]))
    other = replace(review, limiters=(replace(first, solution=solution), *review.limiters[1:]))
    assert rendered_json(document(other)) == rendered_json(document(review))


def test_in_hand_is_taken_at_the_worst_ends() -> None:
    hand = document(sample_review())["limiters"][0]["in_hand"]
    assert hand["least_carries_at_degC"] == 85.0
    assert hand["carry_A"] == pytest.approx(0.367 * 0.8 * 0.95 - 0.7, rel=1e-5)
    assert hand["greatest_most_at_degC"] == -10.0
    assert hand["cap_A"] == pytest.approx(1.2 - 0.367 * 1.15 * 1.05, rel=1e-5)


def test_the_summary_counts_what_is_not_waived() -> None:
    summary = document(sample_review(notes=3))["summary"]
    assert (summary["errors"], summary["warnings"], summary["notes"], summary["waived"]) == (2, 0, 3, 1)


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names_come_through_json_unchanged_and_do_not_act(name: str) -> None:
    text = rendered_json(document(sample_review({**PLAIN, "pass": name})))
    text.encode("utf-8")
    assert json.loads(text)["limiters"][0]["id"] == name
    assert "</" not in text
    assert not re.search("[\x00-\x09\x0b-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069]", text)


def test_there_is_no_clock_and_no_absolute_path() -> None:
    text = rendered_json(document(sample_review()))
    assert str(ROOT) not in text
    assert not {"time", "datetime"} & set(vars(document_module))
