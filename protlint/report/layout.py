"""Lines of 80 columns: display width, wrapping, small tables, colour.

Text is escaped before it comes here (see ``safe``); widths are those of a terminal, where East Asian characters take two
columns and combining marks none.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Sequence

from protlint.findings import some_of

COLUMNS = 80

TIED = "\0"
"""Stands for a blank that is no place to break; texts hold none, for they are escaped."""

_BEFORE_UNIT = re.compile(
    r"(?<=\d) (?=(?:[pnumkMG]?(?:A|V|W|ohm|F|H|Hz|s|J)|%|degC|K|K/W"
    r"|(?:error|warning|note|limiter|part|net)s?|waived|not checked)(?![\w/]))"
)

COLOURS = {
    "error": "31", "fails": "31",
    "warning": "33", "rests on assumptions": "33", "not judged": "33",
    "note": "36",
    "passes": "32",
    "heading": "1",
    "quiet": "2",
}  # fmt: skip
"""SGR codes of ECMA-48 by what is painted."""


def width(text: str) -> int:
    """Return how many terminal columns a text takes."""
    if text.isascii():
        return len(text)
    return sum(_character_width(character) for character in text)


def wrapped(text: str, *, indent: int = 0, first: str | None = None, columns: int = COLUMNS) -> list[str]:
    """Break a text into lines; ``first`` stands in place of the first line's indent.

    A word too long is broken; a figure and its unit stay together.
    """
    lead = " " * indent if first is None else first
    lines: list[str] = []
    line, used = lead, width(lead)
    empty = True
    for word in _words(text):
        for piece in _pieces(word, columns - indent):
            needed = width(piece) + (0 if empty else 1)
            if used + needed > columns and not empty:
                lines.append(line)
                line, used, empty = " " * indent, indent, True
                needed = width(piece)
            line += piece if empty else f" {piece}"
            used += needed
            empty = False
    lines.append(line.rstrip())
    return lines


def shortened(text: str, columns: int) -> str:
    """Return a text cut to a width, with a mark where it was cut."""
    if width(text) <= columns:
        return text
    kept = ""
    for character in text:
        if width(kept) + _character_width(character) > columns - 2:
            break
        kept += character
    return kept + ".."


def tail(text: str, columns: int) -> str:
    """Return the end of a text cut to a width, with a mark where it was cut: paths tell their parts apart at the end."""
    return text if width(text) <= columns else shortened(text[::-1], columns)[::-1]


def fitting(names: Sequence[str], columns: int) -> str:
    """Return as many names as there is room for, the rest counted."""
    most, shown = len(names), ", ".join(names)
    while width(shown) > columns and most > 1:
        most -= 1
        shown = some_of(names, most)
    if width(shown) <= columns:
        return shown
    rest = shown.removeprefix(names[0])
    return tail(names[0], columns - width(rest)) + rest


def _padded(text: str, columns: int, *, right: bool = False) -> str:
    """Return a text filled with blanks to a width."""
    blanks = " " * max(0, columns - width(text))
    return blanks + text if right else text + blanks


def table(rows: Sequence[Sequence[str]], *, indent: int = 2, left: Iterable[int] = (0,), gap: int = 2) -> list[str]:
    """Return rows as aligned columns; the columns named in ``left`` stand left, the others right."""
    if not rows:
        return []
    lefts = set(left)
    widths = [max(width(row[column]) for row in rows) for column in range(len(rows[0]))]
    lines = []
    for row in rows:
        cells = [_padded(cell, widths[column], right=column not in lefts) for column, cell in enumerate(row)]
        lines.append((" " * indent + (" " * gap).join(cells)).rstrip())
    return lines


def painted(text: str, what: str, *, colour: bool) -> str:
    """Return a text in the colour of what it is, or as it is."""
    return f"\x1b[{COLOURS[what]}m{text}\x1b[0m" if colour and what in COLOURS else text


def _words(text: str) -> Iterable[str]:
    return (word.replace(TIED, " ") for word in _BEFORE_UNIT.sub(TIED, text).split())


def _pieces(word: str, columns: int) -> Iterable[str]:
    if width(word) <= columns:
        yield word
        return
    piece, used = "", 0
    for character in word:
        size = _character_width(character)
        if used + size > columns:
            yield piece
            piece, used = "", 0
        piece += character
        used += size
    yield piece


def _character_width(character: str) -> int:
    if unicodedata.combining(character):
        return 0
    return 2 if unicodedata.east_asian_width(character) in ("W", "F") else 1
