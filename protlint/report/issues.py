"""A folder of tracker texts: one Markdown file per finding, named by its fingerprint, the same on every run.

Every text opens with a mark that names the netlist it is about; a stale text is removed only where it bears the mark of a
netlist of this run, so that nothing a person wrote, and nothing about another board, is lost.
"""

from __future__ import annotations

import re
from collections import Counter
from pathlib import Path

from protlint.report.digest import place_of, sentence, waiver_of, working_line
from protlint.report.safe import markdown, throughout
from protlint.report.sarif import artifact_uri
from protlint.report.shape import Document, boards_of
from protlint.sources import FileError, shown_name, write_whole

ENDING = ".md"


def rendered_issues(report: Document) -> dict[str, str]:
    """Return the tracker texts of a report by file name."""
    boards = boards_of(report)
    stems = Counter(_slug(Path(board["netlist"]["file"]).stem) for board in boards)
    texts: dict[str, str] = {}
    for board in boards:
        path = Path(board["netlist"]["file"])
        stem = _slug(path.stem)
        lead = f"{stem if stems[stem] == 1 else _slug(str(path.with_suffix('')))}." if "boards" in report else ""
        for finding in board["findings"]:
            name = lead + _slug(finding["fingerprint"])
            place = 2
            while name + ENDING in texts:
                name = f"{lead}{_slug(finding['fingerprint'])}.{place}"
                place += 1
            texts[name + ENDING] = _issue(finding, board, report["caution"])
    return texts


def mark(file: str) -> str:
    """Return the first line of every text about a netlist."""
    return f"<!-- written by protlint about {artifact_uri(file).replace('--', '-%2D')}; made again on every run -->"


def save_issues(folder: str | Path, report: Document, texts: dict[str, str]) -> None:
    """Write the texts into a folder, made where it is absent, and remove those of the same netlists that are stale.

    Raises
    ------
    FileError : the folder or a file in it cannot be written.
    """
    target = Path(folder)
    try:
        target.mkdir(parents=True, exist_ok=True)
        for name, text in texts.items():
            write_whole(target / name, text)
        marks = {mark(board["netlist"]["file"]) for board in boards_of(report)}
        for path in sorted(target.glob(f"*{ENDING}")):
            if path.name not in texts and _first_line(path) in marks:
                path.unlink()
    except OSError as error:
        if isinstance(error, FileError):
            raise
        raise FileError(f"cannot be written ({error.strerror})", file=shown_name(folder)) from None


def _issue(finding: Document, board: Document, caution: str) -> str:
    safe: Document = throughout(finding, markdown)
    netlist = throughout(board["netlist"], markdown)
    whom = safe["limiter"] or "the board"
    lines = [mark(board["netlist"]["file"]), f"# {safe['check']}: {whom}", "", f"{sentence(safe)}.", ""]
    if safe["waived"] is not None:
        lines += [f"**Waived:** {waiver_of(safe)}", ""]
    lines += [f"**Remedy:** {safe['remedy']}.", ""] if safe["remedy"] else []
    lines += ["Rests on an assumption.", ""] if safe["assumption"] else []
    if safe["working"]:
        lines += ["Working:", "", *(f"- {working_line(line)}" for line in safe["working"]), ""]
    facts = (
        ("Level", safe["level"]),
        ("Parts", ", ".join(safe["parts"])),
        ("Nets", ", ".join(safe["nets"])),
        ("Design", netlist["design"]),
        ("Place", place_of(safe)),
        ("Fingerprint", safe["fingerprint"]),
    )
    lines += [f"- {name}: {text}" for name, text in facts if text]
    return "\n".join([*lines, "", f"_{caution}_"]) + "\n"


def _slug(text: str) -> str:
    """Return a text as part of a file name that every file system takes."""
    return re.sub(r"[^A-Za-z0-9_-]+", "-", text)[:120].strip("-") or "finding"


def _first_line(path: Path) -> str:
    with path.open(encoding="utf-8", errors="replace") as stream:
        return stream.readline().rstrip("\r\n")
