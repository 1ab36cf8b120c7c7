"""The faces a report can be saved in: one explicit table from file ending to renderer."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from pathlib import Path

from protlint.report.shape import Document, rendered_json
from protlint.sources import UsageError, write_whole

FACES: dict[str, Callable[[Document], str]] = {
    ".json": rendered_json,
}
"""By file ending, in the order help texts name them."""


def face_of(target: str) -> Callable[[Document], str]:
    """Return the renderer for a file to save.

    Raises
    ------
    UsageError : the ending is none of ours.
    """
    ending = Path(target).suffix.lower()
    if ending not in FACES:
        known = ", ".join(FACES)
        raise UsageError(f"the ending of a file to save is one of {known}", file=target)
    return FACES[ending]


def save(report: Document, targets: Iterable[str]) -> None:
    """Render every target first, then write each whole; where one cannot be rendered none is written.

    Raises
    ------
    UsageError : an ending is none of ours.
    FileError : a file cannot be written.
    """
    rendered = [(target, face_of(target)(report)) for target in targets]
    for target, text in rendered:
        write_whole(target, text)
