"""Tables of the TOML files a user writes, read key by key, each mistake with its file, line and column.

A reader names the keys it knows, takes each by its dimension, and gets SI floats or one clear error.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from protlint.quantities import DIMENSIONS, read_any, read_quantity, read_range
from protlint.sources import InputError
from protlint.toml.file import TomlFile

Span = tuple[float, float, float]
"""Low, usual and high."""


HINT = "; did you mean "
"""Begins the hint at the known word that is nearest to an unknown one."""


def nearest(word: str, known: Iterable[str]) -> str:
    """Return ``; did you mean "..."?`` where a known word is near, else nothing."""
    names = {name.casefold(): name for name in known}
    close = difflib.get_close_matches(word.casefold(), names, n=1, cutoff=0.6)
    return f'{HINT}"{names[close[0]]}"?' if close else ""


@dataclass(frozen=True, slots=True)
class Table:
    """One table of a file and the path that leads to it."""

    document: TomlFile
    path: tuple[str | int, ...]
    content: Mapping[str, Any]

    @classmethod
    def whole(cls, document: TomlFile) -> Table:
        """Return the file's root table."""
        return cls(document, (), document.tables)

    def __contains__(self, key: str) -> bool:
        return key in self.content

    def __iter__(self) -> Iterator[str]:
        return iter(self.content)

    def error(self, message: str, *keys: str | int) -> InputError:
        """Return an error at a key of this table, or at the table itself."""
        line, column = self.document.place((*self.path, *keys))
        printable = "".join(letter if letter.isprintable() else " " for letter in message)
        return InputError(printable, file=self.document.file, line=line, column=column)

    def only(self, known: Iterable[str], called: str = "key") -> None:
        """Refuse every key that is not known.

        Raises
        ------
        InputError : at the first unknown key, naming a near one.
        """
        names = tuple(known)
        for key in self.content:
            if key not in names:
                raise self.error(f'unknown {called} "{key}"{nearest(key, names)}', key)

    def table(self, key: str) -> Table | None:
        """Return a table inside this one, or None where it is absent."""
        if key not in self.content:
            return None
        content = self.content[key]
        if not isinstance(content, dict):
            raise self.error(f'"{key}" is a table, not {_what(content)}', key)
        return Table(self.document, (*self.path, key), content)

    def tables(self, key: str) -> tuple[Table, ...]:
        """Return the tables of an array of tables, empty where it is absent."""
        content = self.content.get(key, [])
        if not isinstance(content, list) or not all(isinstance(row, dict) for row in content):
            raise self.error(f'"{key}" is a list of tables: write [[...{key}]]', key)
        return tuple(Table(self.document, (*self.path, key, index), row) for index, row in enumerate(content))

    def text(self, key: str) -> str | None:
        """Return a text, or None where it is absent."""
        if key not in self.content:
            return None
        content = self.content[key]
        if not isinstance(content, str) or not content.strip():
            raise self.error(f'"{key}" is a text, not {_what(content)}', key)
        return content

    def word(self, key: str, choices: Iterable[str]) -> str | None:
        """Return one of a few words, or None where it is absent."""
        word = self.text(key)
        names = tuple(choices)
        if word is not None and word not in names:
            raise self.error(f'"{word}" is none of {", ".join(names)}{nearest(word, names)}', key)
        return word

    def texts(self, key: str) -> tuple[str, ...]:
        """Return a text or a list of texts as a tuple, empty where it is absent."""
        content = self.content.get(key, [])
        texts = content if isinstance(content, list) else [content]
        for text in texts:
            if not isinstance(text, str) or not text.strip():
                raise self.error(f'"{key}" is a text or a list of texts, not {_what(text)}', key)
        return tuple(texts)

    def number(self, key: str) -> float | None:
        """Return a plain number, or None where it is absent."""
        if key not in self.content:
            return None
        content = self.content[key]
        if isinstance(content, bool) or not isinstance(content, int | float) or not abs(content) < float("inf"):
            raise self.error(f'"{key}" is a plain number, not {_what(content)}', key)
        return float(content)

    def quantity(self, key: str, dimension: str, *, least: float | None = None, above: float | None = None) -> float | None:
        """Return a quantity in SI units (degC), or None where it is absent; ``least`` or ``above`` bounds it from below."""
        if key not in self.content:
            return None
        value = self._read(self.content[key], dimension, key)
        if (least is not None and value < least) or (above is not None and value <= above):
            bound = "below zero" if least is not None and value < 0.0 else "too low" if least else "zero or below"
            raise self.error(f'"{key}" is {DIMENSIONS[dimension].called}, and "{self.content[key]}" is {bound}', key)
        return value

    def quantities(self, key: str, *dimensions: str) -> tuple[float, ...]:
        """Return a list of quantities, one for each dimension named."""
        return self._list(self.content[key], dimensions, key)

    def rows(self, key: str, *dimensions: str) -> tuple[tuple[float, ...], ...]:
        """Return a list of such lists, never empty."""
        content = self.content.get(key)
        if not isinstance(content, list) or not content:
            raise self.error(f'"{key}" is a list of lists, each such as {_example(dimensions)}, not {_what(content)}', key)
        return tuple(self._list(row, dimensions, key, index) for index, row in enumerate(content))

    def span(self, key: str, dimension: str) -> Span | None:
        """Return (low, usual, high) of ``"24 V"``, ``"24 V 10 %"`` or ``{ low, usual, high }``; None where it is absent."""
        if key not in self.content:
            return None
        if not isinstance(self.content[key], dict):
            return self._read_span(self.content[key], dimension, key)
        inner = self.table(key)
        assert inner is not None
        inner.only(("low", "usual", "high"))
        ends = [inner.quantity(name, dimension) for name in ("low", "usual", "high")]
        low, usual, high = ends
        if low is None or high is None:
            raise self.error(f'"{key}" lacks its {"low" if low is None else "high"} end', key)
        if usual is None:
            usual = (low + high) / 2.0
        if not low <= usual <= high:
            raise self.error(f'"{key}" has its ends in the wrong order: low, usual and high have to rise', key)
        return low, usual, high

    def any_quantity(self, key: str) -> float:
        """Return a plain number, or a quantity of whatever dimension its unit has."""
        content = self.content[key]
        if not isinstance(content, str):
            number = self.number(key)
            assert number is not None
            return number
        try:
            return read_any(content)
        except ValueError as error:
            raise self.error(str(error), key) from None

    def _list(self, content: Any, dimensions: tuple[str, ...], *keys: str | int) -> tuple[float, ...]:
        if not isinstance(content, list) or len(content) != len(dimensions):
            raise self.error(
                f"expected {len(dimensions)} quantities, such as {_example(dimensions)}, not {_what(content)}", *keys
            )
        pairs = enumerate(zip(content, dimensions, strict=True))
        return tuple(self._read(item, name, *keys, index) for index, (item, name) in pairs)

    def _read(self, content: Any, dimension: str, *keys: str | int) -> float:
        wanted = DIMENSIONS[dimension]
        if not isinstance(content, str):
            raise self.error(
                f'expected {wanted.called} with its unit, such as "{wanted.example}", not {_what(content)}', *keys
            )
        try:
            return read_quantity(content, dimension)
        except ValueError as error:
            raise self.error(str(error), *keys) from None

    def _read_span(self, content: Any, dimension: str, key: str) -> Span:
        if not isinstance(content, str):
            value = self._read(content, dimension, key)
            return value, value, value
        try:
            return read_range(content, dimension)
        except ValueError as error:
            raise self.error(str(error), key) from None


def _example(dimensions: tuple[str, ...]) -> str:
    return "[" + ", ".join(f'"{DIMENSIONS[name].example}"' for name in dimensions) + "]"


def _what(content: Any) -> str:
    if content is None:
        return "nothing"
    if isinstance(content, bool):
        return f"the truth value {str(content).lower()}"
    if isinstance(content, str):
        return f'"{content}"' if content.strip() else "an empty text"
    if isinstance(content, list):
        return f"a list of {len(content)}"
    if isinstance(content, dict):
        return "a table"
    return str(content)
