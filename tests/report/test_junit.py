"""JUnit-style XML: the structure build servers read, counts that agree, names that do not act."""

from __future__ import annotations

from xml.etree import ElementTree

import pytest

from protlint.report.document import document
from protlint.report.junit import rendered_junit
from protlint.report.safe import xml
from protlint.report.shape import Document, combined
from tests.support.sample_review import HOSTILE, PLAIN, sample_review

CHILDREN = {
    "testsuites": {"testsuite"},
    "testsuite": {"testcase", "system-out", "system-err"},
    "testcase": {"skipped", "error", "failure", "system-out", "system-err"},
}
ATTRIBUTES = {
    "testsuites": (set(), {"name", "time", "tests", "failures", "errors"}),
    "testsuite": (
        {"name", "tests", "failures", "errors"},
        {"skipped", "time", "timestamp", "hostname", "id", "package", "group", "file", "log", "url"},
    ),
    "testcase": ({"name"}, {"time", "classname", "group"}),
    "failure": (set(), {"type", "message"}),
    "error": (set(), {"type", "message"}),
    "skipped": (set(), {"type", "message"}),
    "system-out": (set(), set()),
    "system-err": (set(), set()),
}
"""What ``junit-10.xsd`` of the xunit plug-in (jenkinsci, MIT) allows: children, and required and optional attributes."""


def parsed(report: Document) -> ElementTree.Element:
    return ElementTree.fromstring(rendered_junit(report).encode("utf-8"))


def structure_errors(element: ElementTree.Element) -> list[str]:
    required, optional = ATTRIBUTES[element.tag]
    errors = [f"{element.tag} lacks {name}" for name in required - set(element.attrib)]
    errors += [f"{element.tag} has {name}" for name in set(element.attrib) - required - optional]
    for child in element:
        if child.tag not in CHILDREN.get(element.tag, set()):
            errors.append(f"{child.tag} in {element.tag}")
        else:
            errors += structure_errors(child)
    if element.tag == "testsuite":
        cases = element.findall("testcase")
        counts = {"tests": len(cases)}
        for name, tag in (("failures", "failure"), ("errors", "error"), ("skipped", "skipped")):
            counts[name] = sum(case.find(tag) is not None for case in cases)
        errors += [f"{name} is not {count}" for name, count in counts.items() if element.get(name) != str(count)]
        names = [(case.get("classname"), case.get("name")) for case in cases]
        errors += ["a case stands twice"] if len(set(names)) != len(names) else []
    return errors


@pytest.mark.parametrize("notes", [0, 200])
def test_structure_and_counts(notes: int) -> None:
    report = document(sample_review(notes=notes))
    broken = {"file": "broken.edf", "line": 3, "column": None, "message": "not EDIF"}
    assert structure_errors(parsed(report)) == []
    assert structure_errors(parsed(combined([report, report], [broken]))) == []


def test_a_suite_per_limiter_with_a_case_per_check() -> None:
    suites = {suite.get("name"): suite for suite in parsed(document(sample_review()))}
    assert list(suites) == ["Q10 (emitter-sensed)", "CH2/Q20 (foldback)", "Q30 (emitter-sensed)", "the board"]
    told = {case.get("name"): [child.tag for child in case] for case in suites["Q10 (emitter-sensed)"].findall("testcase")}
    assert told["carry-not-met"] == ["failure"]
    assert told["base-stop-absent"] == ["skipped", "system-out"]
    assert told["trips-on-peaks"] == ["skipped"]
    assert told["cap-exceeded"] == []
    unsolved = suites["CH2/Q20 (foldback)"].find("testcase/skipped")
    assert unsolved is not None
    assert "node N3 floats" in unsolved.get("message", "")


def test_a_failure_shows_its_working_and_remedy() -> None:
    failure = parsed(document(sample_review())).find("testsuite/testcase/failure")
    assert failure is not None
    assert failure.get("type") == "error"
    for expected in ("carries: 0.282 A, 0.482 V / (R11 = 1 ohm)", "remedy: fit 0.36 ohm", "Gummel and Poon 1970"):
        assert expected in (failure.text or "")


def test_a_note_does_not_fail_its_case() -> None:
    suite = parsed(document(sample_review(notes=200)))[2]
    assert (suite.get("name"), suite.get("failures")) == ("Q30 (emitter-sensed)", "0")
    assert (suite.findtext("testcase/system-out") or "").count("remedy: fit 100 ohm") == 200


def test_an_unread_file_is_an_error() -> None:
    root = parsed(combined([], [{"file": "broken.edf", "line": 3, "column": 9, "message": "not EDIF"}]))
    error = root.find("testsuite/testcase/error")
    assert error is not None
    assert error.get("message") == "broken.edf:3:9: not EDIF"
    assert root.get("errors") == "1"


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names(name: str) -> None:
    names = {**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)}
    root = parsed(document(sample_review(names)))
    assert structure_errors(root) == []
    assert root[0].get("name") == f"{xml(name)} (emitter-sensed)"
