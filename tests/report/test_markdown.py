"""Markdown for a pull request, and the folder of tracker texts."""

from __future__ import annotations

import html
import os
import re
from pathlib import Path

import pytest
from markdown_it import MarkdownIt

from protlint.report.document import document
from protlint.report.faces import check_targets, save
from protlint.report.issues import mark, rendered_issues
from protlint.report.markdown import MOST_CHARACTERS, rendered_markdown
from protlint.report.safe import readable
from protlint.report.shape import CAUTION, Document, combined
from protlint.sources import FileError, UsageError
from tests.support.sample_review import HOSTILE, PLAIN, sample_review

OURS = re.compile(r"</?(details|summary)>|<!-- -->|<!-- written by protlint [^<>]*-->")

ELEMENTS = {
    "h1", "h2", "h3", "p", "ul", "li", "strong", "em", "br", "details", "summary",
    "table", "thead", "tbody", "tr", "th", "td",
}  # fmt: skip
"""What our Markdown is made of."""


def unescaped(text: str) -> str:
    """Return Markdown without escaped characters and without the markup that is ours."""
    return re.sub(r"\\.", "", OURS.sub("", text))


def test_counts_table_and_levels() -> None:
    text = rendered_markdown(document(sample_review(notes=3)))
    assert "3 limiters (1 fails, 1 not judged, 1 passes), 2 errors, 0 warnings, 3 notes, 1 waived" in text
    assert "| Q10 | fails | emitter-sensed | 0.279 A | 0.7 A | 0.443 A | 1.2 A | 0.349 / 0.367 / 0.385 A |" in text
    assert "### Errors (2)" in text
    assert "<summary>Notes (3)</summary>" in text
    assert "Remedy: fit 0.36 ohm in place of R11" in text
    assert CAUTION in text


@pytest.mark.parametrize("notes", [200, 3000])
def test_hundreds_of_findings_still_fit_a_comment(notes: int) -> None:
    report = document(sample_review(notes=notes))
    text = rendered_markdown(report)
    assert len(text) <= MOST_CHARACTERS
    assert f"<summary>Notes ({notes})</summary>" in text
    shown = sum(finding["fingerprint"] in text for finding in report["findings"])
    left_out = re.search(r"and (\d+) more", text)
    assert shown + (int(left_out.group(1)) if left_out else 0) == len(report["findings"])


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names_do_not_act(name: str) -> None:
    names = {**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)}
    report = document(sample_review(names, notes=2))
    for text in (rendered_markdown(report), *rendered_issues(report).values()):
        bare = unescaped(text)
        assert not re.search(r"[`<>~\[\]{}$&!]", bare)
        assert not re.search(r"@\w|#\d|https?:|www\.", text)
        assert not re.search("[\x00-\x09\x0b-\x1f\x7f-\x9f\u202a-\u202e\ud800-\udfff]", text)
        tables = [line for line in bare.split("\n") if "|" in line]
        assert {line.count("|") for line in tables} <= {9}
        assert all(line.startswith("|") for line in tables)


@pytest.mark.parametrize("name", HOSTILE)
def test_a_reader_of_commonmark_shows_hostile_names_as_they_are(name: str) -> None:
    """Read by markdown-it-py, an implementation of CommonMark, with the tables that code hosts add."""
    names = {**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)}
    report = document(sample_review(names, notes=2))
    reader = MarkdownIt("commonmark", {"html": True, "linkify": False}).enable("table")
    texts = [rendered_markdown(report), *rendered_issues(report).values()]
    for text in texts:
        page = reader.render(text)
        elements = set(re.findall(r"<([a-z][a-z0-9]*)", page))
        assert elements <= ELEMENTS
    shown = " ".join(html.unescape(re.sub(r"<[^>]*>", "", reader.render(texts[0]))).split())
    assert " ".join(readable(name).split()) in shown


def test_boards_together(tmp_path: Path) -> None:
    boards = [document(sample_review({**PLAIN, "name": name})) for name in ("a.edf", "b.edf")]
    report = combined(boards, [{"file": "broken.edf", "line": 3, "column": None, "message": "not EDIF"}])
    text = rendered_markdown(report)
    assert "## protlint: a.edf" in text
    assert "- broken.edf:3: not EDIF" in text
    assert len(rendered_issues(report)) == 6
    assert {name.split(".")[0] for name in rendered_issues(report)} == {"a", "b"}


def test_of_more_boards_than_a_comment_holds_a_table_is_left_the_worst_first() -> None:
    one = document(sample_review(notes=30))
    quiet = {**one, "findings": [], "summary": {**one["summary"], "errors": 0, "warnings": 0, "notes": 0}}
    boards = [{**quiet, "netlist": {**one["netlist"], "file": f"quiet-{number}.edf"}} for number in range(3000)]
    report = combined([*boards, one], [{"file": "broken.edf", "line": 3, "column": 9, "message": "not EDIF"}] * 100)
    text = rendered_markdown(report)
    assert len(text) <= MOST_CHARACTERS
    assert "3101 boards" not in text and "## protlint: 3001 boards" in text
    rows = [line for line in text.splitlines() if ".edf |" in line]
    assert rows[0].startswith("| lamp.edf | 3 | 2 | 0 | 30 |")
    assert f"and {3001 - len(rows)} more boards" in text
    assert text.count("broken.edf:3:9") == 50
    assert "### Errors (2)" in text
    assert CAUTION in text


def test_texts_of_boards_with_one_stem_are_told_apart_by_their_folders() -> None:
    boards = [document(sample_review({**PLAIN, "name": name})) for name in ("left/lamp.edf", "right/lamp.edf", "b.edf")]
    leads = {name.split(".")[0] for name in rendered_issues(combined(boards))}
    assert leads == {"left-lamp", "right-lamp", "b"}
    assert {name.split(".")[0] for name in rendered_issues(combined([boards[1], boards[0], boards[2]]))} == leads


def report_of(notes: int, file: str = "lamp.edf") -> Document:
    return document(sample_review({**PLAIN, "name": file}, notes=notes))


def test_issues_are_the_same_on_every_run_and_stale_ones_go(tmp_path: Path) -> None:
    folder = tmp_path / "issues"
    save(report_of(3), [f"{folder}/"])
    first = {path.name: path.read_bytes() for path in folder.iterdir()}
    assert len(first) == 6
    assert all(name.removesuffix(".md") in content.decode() for name, content in first.items())
    save(report_of(3), [f"{folder}/"])
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == first
    save(report_of(1), [f"{folder}/"])
    assert len(list(folder.iterdir())) == 4


def test_nothing_but_stale_texts_of_the_same_board_is_removed(tmp_path: Path) -> None:
    folder = tmp_path / "issues"
    save(report_of(0, "other.edf"), [f"{folder}/"])
    others = {path.name for path in folder.iterdir()}
    own = {"README.md": "# ours\n", "carry-not-met-0.md": "written by a person\n", "note.txt": mark("lamp.edf")}
    for name, text in own.items():
        (folder / name).write_text(text, encoding="utf-8")
    stale = folder / "gone-1.md"
    stale.write_text(mark("lamp.edf") + "\nold\n", encoding="utf-8")
    renamed = document(sample_review({**PLAIN, "pass": "Q99", "sense": "R99", "shunt": "Q98"}))
    save(renamed, [f"{folder}/"])
    assert not stale.exists()
    left = {path.name for path in folder.iterdir()}
    assert left >= others | set(own)
    assert all((folder / name).read_text(encoding="utf-8") == text for name, text in own.items())


def test_what_cannot_be_saved_is_refused_first(tmp_path: Path) -> None:
    with pytest.raises(UsageError):
        check_targets([str(tmp_path / "x.pdf")])
    with pytest.raises(FileError):
        check_targets([str(tmp_path / "absent" / "x.json")])
    (tmp_path / "folder.json").mkdir()
    (tmp_path / "file").write_text("as it was", encoding="utf-8")
    for target in (tmp_path / "folder.json", f"{tmp_path}/file/"):
        with pytest.raises(FileError):
            check_targets([str(target)])
    with pytest.raises(UsageError):
        check_targets([str(tmp_path / "x.json")] * 2)
    (tmp_path / "link.json").symlink_to("x.json")
    with pytest.raises(UsageError):
        check_targets([str(tmp_path / "x.json"), str(tmp_path / "link.json")])
    check_targets([str(tmp_path / "X.JSON"), str(tmp_path / "absent") + "/"])


def test_a_folder_that_takes_no_file_is_refused_before_the_work(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The system's answer is put in its mouth: to root, who may run this, every folder is open."""
    monkeypatch.setattr(os, "access", lambda path, mode: not (Path(path) == tmp_path and mode == os.W_OK))
    with pytest.raises(FileError, match="this folder takes no file"):
        check_targets([str(tmp_path / "x.json")])


def test_where_one_face_fails_nothing_is_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from protlint.report import faces

    def failing(report: Document) -> str:
        raise ValueError("no")

    standing = tmp_path / "a.json"
    standing.write_text("as it was", encoding="utf-8")
    monkeypatch.setitem(faces.FACES, ".xml", failing)
    with pytest.raises(ValueError, match="no"):
        save(report_of(0), [str(standing), str(tmp_path / "b.xml")])
    assert standing.read_text(encoding="utf-8") == "as it was"
    assert [path.name for path in tmp_path.iterdir()] == ["a.json"]


def test_a_folder_that_cannot_be_written_is_one_clear_error(tmp_path: Path) -> None:
    blocked = tmp_path / "issues"
    blocked.write_text("a file", encoding="utf-8")
    with pytest.raises(FileError):
        save(report_of(0), [f"{blocked}/"])
    assert blocked.read_text(encoding="utf-8") == "a file"
