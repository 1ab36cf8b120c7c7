"""The faces a report can be saved in: one explicit table from file ending to renderer, and the folder of tracker texts."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable
from pathlib import Path

from protlint.report.issues import rendered_issues, save_issues
from protlint.report.junit import rendered_junit
from protlint.report.markdown import rendered_markdown
from protlint.report.sarif import rendered_sarif
from protlint.report.shape import Document, rendered_json
from protlint.sources import FileError, UsageError, shown_name, write_whole

FACES: dict[str, Callable[[Document], str]] = {
    ".json": rendered_json,
    ".sarif": rendered_sarif,
    ".xml": rendered_junit,
    ".md": rendered_markdown,
}
"""By file ending, in the order help texts name them."""


def check_targets(targets: Iterable[str]) -> None:
    """Refuse what could not be saved, before any work is done.

    Raises
    ------
    UsageError : an ending is none of ours, or one file is to be saved twice.
    FileError : the folder a file is to stand in is missing or takes no file, or a folder stands where the file is to be,
        or a file where the folder is.
    """
    seen: set[str] = set()
    for target in targets:
        path = Path(target)
        if _is_folder(target):
            if path.exists() and not path.is_dir():
                raise FileError("this is a file, not a folder to save in", file=shown_name(path))
        elif path.suffix.lower() not in FACES:
            raise UsageError(f"the ending of a file to save is one of {', '.join(FACES)}, or / for a folder", file=target)
        elif not path.parent.is_dir():
            raise FileError("there is no such folder to save in", file=shown_name(path.parent))
        elif path.is_dir():
            raise FileError("this is a folder, not a file to save", file=shown_name(path))
        elif not os.access(path.parent, os.W_OK):
            raise FileError("this folder takes no file", file=shown_name(path.parent))
        whole = os.path.realpath(target)
        if whole in seen:
            raise UsageError("this is to be saved twice", file=target)
        seen.add(whole)


def _is_folder(target: str) -> bool:
    """Tell whether a target asks for the folder of tracker texts: it ends in a slash."""
    return target.endswith(("/", os.sep))


def save(report: Document, targets: Iterable[str]) -> None:
    """Render every target first, then write each whole; where one cannot be rendered none is written.

    Raises
    ------
    FileError : a file cannot be written.
    """
    listed = tuple(targets)
    files = [(target, FACES[Path(target).suffix.lower()](report)) for target in listed if not _is_folder(target)]
    texts = rendered_issues(report)
    for target, text in files:
        write_whole(target, text)
    for target in listed:
        if _is_folder(target):
            save_issues(target, report, texts)
