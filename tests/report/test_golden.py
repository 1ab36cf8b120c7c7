"""Each face of the sample as a file that somebody has looked at; PROTLINT_GOLDEN=1 writes them anew."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import pytest

from protlint.checks import table
from protlint.checks.catalogue import CheckRow, Threshold
from protlint.report import sarif
from protlint.report.compare_text import comparison_document, rendered_comparison
from protlint.report.document import document
from protlint.report.issues import rendered_issues
from protlint.report.junit import rendered_junit
from protlint.report.markdown import rendered_markdown
from protlint.report.sarif import rendered_sarif
from protlint.report.shape import Document, rendered_json
from protlint.report.skeleton import rendered_skeleton
from protlint.report.survey import survey
from protlint.report.survey_text import rendered_survey
from protlint.report.text import rendered_text
from tests.support.paths import FIXTURES
from tests.support.sample_review import PLAIN, sample_review

GOLDEN = FIXTURES / "golden"

ROW = CheckRow(
    name="carry-not-met",
    level="error",
    says="the output may get less than the board needs",
    why="the load starves",
    formula="low end of carries < carry",
    source="common practice of the trade",
    example="bare-sink",
    thresholds={"small": Threshold(1.0, "V", "below this it is a note")},
    figures={},
)
"""A catalogue of one check, so that a new check does not change these files."""


def compared(report: Document) -> str:
    from protlint.compare import compare

    names = {**PLAIN, "pass": "Q77", "sense": "R70"}
    after = document(sample_review(names))
    after["limiters"][0]["parts"][1]["value"] = 0.82
    after["limiters"][0]["currents"][1]["holds_A"] = 0.44
    return rendered_comparison(comparison_document(compare(report, after)))


FACES: dict[str, Callable[[Document], str]] = {
    "sample.txt": rendered_text,
    "sample.json": rendered_json,
    "sample.sarif": rendered_sarif,
    "sample.xml": rendered_junit,
    "sample.md": rendered_markdown,
    "sample-issue.md": lambda report: next(iter(rendered_issues(report).values())),
    "sample-survey.txt": lambda _: rendered_survey(survey(sample_review(notes=2))),
    "sample-limits.toml": lambda _: rendered_skeleton(sample_review(notes=2)),
    "sample-compare.txt": compared,
}


@pytest.mark.parametrize("name", FACES)
def test_a_face_is_as_it_was_looked_at(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sarif, "load_catalogue", lambda: {ROW.name: ROW})
    monkeypatch.setattr(table, "CHECKS", dict.fromkeys((ROW.name, "cap-exceeded", "base-stop-absent")))
    monkeypatch.setattr(table, "BOARD_CHECKS", dict.fromkeys(("second-road", "limiter-absent")))
    text = FACES[name](document(sample_review(notes=2)))
    path: Path = GOLDEN / name
    if os.environ.get("PROTLINT_GOLDEN"):
        path.parent.mkdir(exist_ok=True)
        path.write_text(text, encoding="utf-8", newline="\n")
    assert path.read_text(encoding="utf-8") == text
