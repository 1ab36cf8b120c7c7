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

BROKEN = {"file": "broken.edf", "line": 3, "column": 9, "message": "not EDIF"}


def log_of(report: Document) -> Any:
    return json.loads(rendered_sarif(report))


def prose_errors(log: Any) -> list[str]:
    """Check what the standard asks beyond its schema; the section numbers are the standard's, from memory."""
    errors = []
    for run in log["runs"]:
        rules, artifacts = run["tool"]["driver"]["rules"], run["artifacts"]
        names = [rule["id"] for rule in rules]
        if len(set(names)) != len(names):
            errors.append("3.19.23: rule ids repeat")
        if len({artifact["location"]["uri"] for artifact in artifacts}) != len(artifacts):
            errors.append("3.14.15: artifacts repeat")
        for notification in run["invocations"][0]["toolExecutionNotifications"]:
            rule = notification.get("associatedRule")
            if rule is not None and names[rule["index"]] != rule["id"]:
                errors.append("3.52: associated rule and index differ")
        fingerprints = []
        for result in run["results"]:
            if names[result["ruleIndex"]] != result["ruleId"]:
                errors.append("3.27.6: rule id and index differ")
            if result["level"] == "none":
                errors.append("3.27.10: a failing result has a level")
            if "suppressions" not in result:
                errors.append("3.27.23: suppressions on some results only")
            identities = [location["id"] for location in result["relatedLocations"]]
            if len(set(identities)) != len(identities):
                errors.append("3.28.2: location ids repeat")
            for location in (*result["locations"], *result["relatedLocations"]):
                where = location["physicalLocation"]["artifactLocation"]
                if artifacts[where["index"]]["location"]["uri"] != where["uri"]:
                    errors.append("3.4.5: artifact and index differ")
            fingerprints.append((result["locations"][0]["physicalLocation"]["artifactLocation"]["uri"],
                                 result["partialFingerprints"][FINGERPRINT_KEY]))  # fmt: skip
        if len(set(fingerprints)) != len(fingerprints):
            errors.append("3.27.17: fingerprints repeat")
    return errors


def test_it_is_valid() -> None:
    log = log_of(document(sample_review(notes=200)))
    assert validation_errors(log) == []
    assert prose_errors(log) == []
    assert len(log["runs"][0]["results"]) == 203


def test_boards_together_are_one_valid_run_and_the_unread_are_notified() -> None:
    boards = [document(sample_review({**PLAIN, "name": name})) for name in ("a.edf", "b.edf")]
    log = log_of(combined(boards, [BROKEN]))
    assert validation_errors(log) == []
    assert prose_errors(log) == []
    (run,) = log["runs"]
    assert run["invocations"][0]["executionSuccessful"] is False
    said = [(one["level"], one["message"]["text"]) for one in run["invocations"][0]["toolExecutionNotifications"]]
    assert ("error", "broken.edf:3:9: not EDIF") in said
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
    [("a b.edf", "a%20b.edf"), ("x:y/ü.edf", "x%3Ay/%C3%BC.edf"), ("<standard input>", "%3Cstandard%20input%3E")],
)
def test_uris(file: str, uri: str) -> None:
    assert artifact_uri(file) == uri


def test_braces_and_links_in_messages_are_escaped() -> None:
    assert message("{0} [text](link) [drive.DRV]") == {"text": "{{0}} \\[text](link) [drive.DRV]"}
