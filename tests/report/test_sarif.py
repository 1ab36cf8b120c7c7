"""SARIF: valid against the OASIS schema, and against the prose rules that a schema cannot hold."""

from __future__ import annotations

import json
from typing import Any
from urllib.parse import unquote

import pytest
from sarif_kit.validate import validation_errors

from protlint.checks.catalogue import load_catalogue
from protlint.report.document import document
from protlint.report.sarif import FINGERPRINT_KEY, artifact_uri, message, rendered_sarif
from protlint.report.shape import Document, combined
from tests.support.sample_review import HOSTILE, PLAIN, sample_review
from tests.support.sarif_prose import prose_errors

BROKEN = {"file": "broken.edf", "line": 3, "column": 9, "message": "not EDIF"}


def log_of(report: Document) -> Any:
    return json.loads(rendered_sarif(report))


def test_it_is_valid() -> None:
    log = log_of(document(sample_review(notes=200)))
    assert validation_errors(log) == []
    assert prose_errors(log) == []
    assert len(log["runs"][0]["results"]) == 203


def changed(*steps: Any) -> Any:
    """Return a change of a log: the value at a way through its only run, replaced (or taken out where it is ``...``)."""
    *way, last, value = steps

    def change(run: Any) -> None:
        for step in way:
            run = run[step]
        if value is ...:
            del run[last]
        elif last == "append":
            run.append(value)
        else:
            run[last] = value

    return change


RESULT = ("results", 0)
PLACE = (*RESULT, "locations", 0, "physicalLocation")
DRIVER = ("tool", "driver")
CALL = ("invocations", 0)

BROKEN_PROSE = {
    "3.19.23": changed(*DRIVER, "rules", "append", {"id": "carry-not-met"}),
    "3.19.12": changed(*DRIVER, "semanticVersion", "1"),
    "3.49.7": changed(*DRIVER, "rules", 0, {"id": "carry-not-met", "name": "carry-not-met"}),
    "3.49.9": changed(*DRIVER, "rules", 0, "shortDescription", "text", "no stop"),
    "3.14.15": changed("artifacts", "append", {"location": {"uri": "lamp.edf"}, "hashes": {"sha-256": "0" * 64}}),
    "3.24.11": changed("artifacts", 0, "hashes", {"SHA256": "0" * 64}),
    "3.4.5": changed(*PLACE, "artifactLocation", "index", 1),
    "3.4.3": changed("artifacts", 0, "location", "uri", "../a b.edf"),
    "3.4.4": changed(*PLACE, "artifactLocation", "uriBaseId", "ROOT"),
    "3.52.5": changed(*CALL, "toolExecutionNotifications", 0, "associatedRule", {"id": "carry-not-met", "index": 1}),
    "3.20.14": changed(*CALL, "toolExecutionNotifications", 0, "level", "error"),
    "3.14.23": changed("results", None),
    "3.27.23": changed(*RESULT, "suppressions", ...),
    "3.27.6": changed(*RESULT, "ruleIndex", 1),
    "3.27.10": changed(*RESULT, "kind", "pass"),
    "3.28.2": changed(*RESULT, "relatedLocations", 1, "id", 1),
    "3.27.22": changed(*RESULT, "relatedLocations", 0, "message", ...),
    "3.27.17": changed(*RESULT, "partialFingerprints", {"protlint": "x"}),
    "3.35.4": changed("results", 1, "suppressions", 0, "justification", ""),
    "3.35.5": changed("results", 1, "suppressions", 0, "location", {}),
    "3.30.5": changed(*PLACE, "region", "startLine", 0),
    "3.30.7": changed(*PLACE, "region", "endLine", 1),
    "3.14.17": changed("columnKind", ...),
    "3.33.5": changed(*RESULT, "locations", 0, "logicalLocations", 0, "name", "other"),
    "3.11.5": changed(*RESULT, "message", "text", "The {0}."),
    "3.11.6": changed(*RESULT, "message", "text", "See [this](9)."),
    "3.11.3": changed(*RESULT, "message", "text", "no stop"),
}
"""For every prose rule a log that breaks it and no other, so that none of them passes whatever comes."""


@pytest.mark.parametrize("section", BROKEN_PROSE)
def test_every_prose_rule_is_held(section: str) -> None:
    log = log_of(document(sample_review()))
    BROKEN_PROSE[section](log["runs"][0])
    assert section in {error.split(":")[0] for error in prose_errors(log)}


def test_boards_together_are_one_valid_run_and_the_unread_are_notified() -> None:
    boards = [document(sample_review({**PLAIN, "name": name})) for name in ("a.edf", "b.edf")]
    log = log_of(combined(boards, [BROKEN]))
    assert validation_errors(log) == []
    assert prose_errors(log) == []
    (run,) = log["runs"]
    assert run["invocations"][0]["executionSuccessful"] is False
    said = [(one["level"], one["message"]["text"]) for one in run["invocations"][0]["toolExecutionNotifications"]]
    assert ("error", "broken.edf:3:9: not EDIF.") in said
    assert {result["locations"][0]["physicalLocation"]["artifactLocation"]["index"] for result in run["results"]} == {0, 1}


def test_a_result_carries_what_a_tracker_needs() -> None:
    result = log_of(document(sample_review()))["runs"][0]["results"][0]
    assert result["ruleId"] == "carry-not-met"
    assert result["level"] == "error"
    assert result["locations"][0]["physicalLocation"]["region"] == {"startLine": 12, "startColumn": 5}
    names = [(one["name"], one["fullyQualifiedName"], one["kind"]) for one in result["locations"][0]["logicalLocations"]]
    assert names == [("Q10", "LAMP/Q10", "limiter"), ("R11", "LAMP/R11", "part"), ("Q11", "LAMP/Q11", "part")]
    assert [one["message"]["text"] for one in result["relatedLocations"]] == ["R11", "Q11"]
    assert result["partialFingerprints"][FINGERPRINT_KEY].startswith("carry-not-met-")
    assert result["properties"]["working"][1]["value"] == 0.282136
    assert "0.36 ohm" in result["message"]["text"]


def test_a_waiver_is_a_suppression() -> None:
    results = log_of(document(sample_review()))["runs"][0]["results"]
    assert [len(result["suppressions"]) for result in results] == [0, 1, 0]
    assert results[1]["suppressions"][0]["justification"] == "the driver gives 5 mA at most (A. Reviewer)"


def test_what_was_not_checked_is_notified() -> None:
    notifications = log_of(document(sample_review()))["runs"][0]["invocations"][0]["toolExecutionNotifications"]
    texts = [one["message"]["text"] for one in notifications]
    assert any("trips-on-peaks" in text and "[limiter.Q10] peak" in text for text in texts)
    assert any("node N3 floats" in text for text in texts)


def test_every_check_of_the_catalogue_is_described() -> None:
    rules = {rule["id"]: rule for rule in log_of(document(sample_review()))["runs"][0]["tool"]["driver"]["rules"]}
    for name, row in load_catalogue().items():
        assert rules[name]["defaultConfiguration"]["level"] == row.level
        assert row.source in rules[name]["help"]["text"]


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names(name: str) -> None:
    names = {**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)}
    text = rendered_sarif(document(sample_review(names)))
    log = json.loads(text)
    assert validation_errors(log) == []
    assert prose_errors(log) == []
    assert "</" not in text
    assert unquote(log["runs"][0]["artifacts"][0]["location"]["uri"], errors="surrogatepass") == name


@pytest.mark.parametrize(
    ("file", "uri"),
    [
        ("a b.edf", "a%20b.edf"),
        ("x:y/ü.edf", "x%3Ay/%C3%BC.edf"),
        ("<standard input>", "%3Cstandard%20input%3E"),
        ("\udcff\u2028.edf", "%FF%E2%80%A8.edf"),
    ],
)
def test_uris(file: str, uri: str) -> None:
    assert artifact_uri(file) == uri


def test_braces_and_links_in_messages_are_escaped() -> None:
    assert message("{0} [text](link) [drive.DRV]") == {"text": "{{0}} \\[text](link) [drive.DRV]"}
