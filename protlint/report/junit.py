"""The report as JUnit-style XML: a suite per limiter, a case per check, for build servers.

There is no one standard; the structure is the xunit plug-in's ``junit-10.xsd``: every suite has name, tests, failures and
errors, and a case holds a failure, an error or a skip.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Sequence
from xml.etree import ElementTree

from protlint.report.digest import left_open, place_of, sentence, unsolved, waiver_of, working_line
from protlint.report.memory import behind
from protlint.report.safe import throughout, xml
from protlint.report.shape import CAUTION, Document, boards_of

FAILING_LEVELS = ("error", "warning")
"""A note is told in its case's output and does not fail it."""


def rendered_junit(report: Document) -> str:
    """Return the report as XML text."""
    safe: Document = throughout(report, xml)
    boards = boards_of(safe)
    root = ElementTree.Element("testsuites", name="protlint")
    for board in boards:
        prefix = f"{board['netlist']['file']}: " if len(boards) > 1 or safe.get("unread") else ""
        for limiter in board["limiters"]:
            found = [finding for finding in board["findings"] if finding["limiter"] == limiter["id"]]
            _suite(root, f"{prefix}{limiter['id']} ({limiter['topology']})", board, found, limiter)
        known = {limiter["id"] for limiter in board["limiters"]}
        others = [finding for finding in board["findings"] if finding["limiter"] not in known]
        if others or board["not_checked"] or not board["limiters"]:
            _suite(root, f"{prefix}the board", board, others, None)
    if safe.get("unread"):
        _unread(root, safe["unread"])
    for total in ("tests", "failures", "errors"):
        root.set(total, str(sum(int(suite.get(total, "0")) for suite in root)))
    ElementTree.indent(root)
    return f"<?xml version='1.0' encoding='UTF-8'?>\n{ElementTree.tostring(root, encoding='unicode')}\n"


def _suite(
    root: ElementTree.Element, name: str, board: Document, findings: Sequence[Document], limiter: Document | None
) -> None:
    suite = ElementTree.SubElement(root, "testsuite", name=name)
    place = f"{board['netlist']['file']}.{limiter['id'] if limiter else 'board'}"
    by_check: dict[str, list[Document]] = {}
    for finding in findings:
        by_check.setdefault(finding["check"], []).append(finding)
    skipped = _skipped(left_open(limiter) if limiter else board["not_checked"], by_check)
    for check, found in by_check.items():
        _case(suite, check, place, found)
    for check, needs in skipped.items():
        case = ElementTree.SubElement(suite, "testcase", name=check, classname=place)
        ElementTree.SubElement(case, "skipped", message=f"not checked: needs {'; '.join(needs)}")
    if limiter is not None:
        _passed(suite, limiter, place, {*by_check, *skipped})
    elif not findings and not skipped:
        ElementTree.SubElement(suite, "testcase", name="no limiter found", classname=place)
    if len(root) == 1:
        ElementTree.SubElement(suite, "system-out").text = CAUTION
    _count(suite)


def _skipped(rows: Iterable[Document], by_check: dict[str, list[Document]]) -> dict[str, list[str]]:
    """Gather what each check needs; one that found something as well has its case already."""
    needs: dict[str, list[str]] = {}
    for row in rows:
        name = row["check"] if row["check"] not in by_check else f"{row['check']}, in part"
        needs.setdefault(name, []).append(row["needs"])
    return needs


def _case(suite: ElementTree.Element, check: str, place: str, findings: Sequence[Document]) -> None:
    """Write a case with a failure for its worst finding that counts; the other findings stand in its text."""
    case = ElementTree.SubElement(suite, "testcase", name=check, classname=place)
    counting = [one for one in findings if one["level"] in FAILING_LEVELS and one["waived"] is None]
    others = [one for one in findings if one not in counting]
    if counting:
        worst = min(counting, key=lambda one: FAILING_LEVELS.index(one["level"]))
        failure = ElementTree.SubElement(case, "failure", type=worst["level"], message=sentence(worst))
        failure.text = _told(counting)
    elif all(one["waived"] is not None for one in findings):
        reasons = ", ".join(dict.fromkeys(one["waived"] for one in findings))
        ElementTree.SubElement(case, "skipped", message=f"waived: {reasons}")
    if others:
        ElementTree.SubElement(case, "system-out").text = _told(others)


def _told(findings: Iterable[Document]) -> str:
    return "\n" + "\n\n".join("\n".join(_lines(finding)) for finding in findings) + "\n"


def _lines(finding: Document) -> list[str]:
    level = finding["level"] if finding["waived"] is None else f"waived {finding['level']}"
    lines = [f"{level}: {sentence(finding)}"]
    for line in finding["working"]:
        lines.append(f"  {working_line(line)}")
    lines += [f"remedy: {finding['remedy']}"] if finding["remedy"] else []
    lines += ["rests on an assumption"] if finding["assumption"] else []
    if finding["waived"] is not None:
        lines.append(f"waived: {waiver_of(finding)}")
    return [*lines, f"{place_of(finding)} {finding['fingerprint']}".strip()]


def _passed(suite: ElementTree.Element, limiter: Document, place: str, told: Collection[str]) -> None:
    """Write a case for every check that was asked and found nothing, or one skip where the circuit was not solved; it is
    bare but for the figures from memory that it rests on."""
    for check in limiter["asked"]:
        if check not in told:
            case = ElementTree.SubElement(suite, "testcase", name=check, classname=place)
            if behind(check, limiter):
                ElementTree.SubElement(case, "system-out").text = f"from memory: {behind(check, limiter)}"
    if limiter["not_solved"]:
        case = ElementTree.SubElement(suite, "testcase", name="solved", classname=place)
        ElementTree.SubElement(case, "skipped", message=f"not judged{unsolved(limiter)}")


def _unread(root: ElementTree.Element, errors: Sequence[Document]) -> None:
    suite = ElementTree.SubElement(root, "testsuite", name="files that could not be reviewed")
    for error in errors:
        case = ElementTree.SubElement(suite, "testcase", name=error["file"] or "?", classname="protlint")
        ElementTree.SubElement(case, "error", type="unread", message=f"{place_of(error)}: {error['message']}")
    _count(suite)


def _count(suite: ElementTree.Element) -> None:
    cases = suite.findall("testcase")
    suite.set("tests", str(len(cases)))
    for name, child in (("failures", "failure"), ("errors", "error"), ("skipped", "skipped")):
        suite.set(name, str(sum(case.find(child) is not None for case in cases)))
