"""Where each key of a TOML document stands, which the standard library's reader does not tell.

The text is one that :mod:`tomllib` has accepted, so this scanner only walks along it and never judges it.
"""

from __future__ import annotations

import re
import tomllib

Path = tuple[str | int, ...]
"""Keys and, inside arrays, indices from the document's root to a value."""

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_SPACE = re.compile(r"[ \t]*")
_BARE = re.compile(r"[A-Za-z0-9_-]+")
_STRING = re.compile(r'"""(?:\\.|[^\\])*?"{3,5}|\'\'\'.*?\'{3,5}|"(?:\\.|[^"\\\n])*"|\'[^\'\n]*\'', re.DOTALL)
_SCALAR = re.compile(r"[^,\]}#\n]+")


def key_places(text: str) -> dict[Path, int]:
    """Return the offset in ``text`` of every key, table header and array element, by its path."""
    return _Scanner(text).document()


class _Scanner:
    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.places: dict[Path, int] = {}
        self.arrays: dict[Path, int] = {}

    def document(self) -> dict[Path, int]:
        table: Path = ()
        self._pass(_BLANK)
        while self.at < len(self.text):
            if self.text[self.at] == "[":
                table = self._header()
            else:
                self._pair(table)
            self._pass(_BLANK)
        return self.places

    def _pass(self, pattern: re.Pattern[str]) -> str:
        found = pattern.match(self.text, self.at)
        assert found is not None
        self.at = found.end()
        return found[0]

    def _header(self) -> Path:
        repeated = self.text.startswith("[[", self.at)
        self.at += 2 if repeated else 1
        keys = self._keys()
        self.at += 2 if repeated else 1
        path = self._inside_arrays((), keys[:-1])
        last, start = keys[-1]
        path = (*path, last)
        self.places.setdefault(path, start)
        if repeated:
            index = self.arrays.get(path, -1) + 1
            self.arrays[path] = index
            path = (*path, index)
            self.places[path] = start
        elif path in self.arrays:
            path = (*path, self.arrays[path])
        return path

    def _inside_arrays(self, table: Path, keys: list[tuple[str, int]]) -> Path:
        """The path of dotted keys; a key that names an array of tables means its latest table."""
        path = table
        for key, start in keys:
            path = (*path, key)
            self.places.setdefault(path, start)
            if path in self.arrays:
                path = (*path, self.arrays[path])
        return path

    def _keys(self) -> list[tuple[str, int]]:
        keys = []
        while True:
            self._pass(_SPACE)
            start = self.at
            if self.text[start] in "\"'":
                keys.append((str(tomllib.loads(f"key = {self._pass(_STRING)}")["key"]), start))
            else:
                keys.append((self._pass(_BARE), start))
            self._pass(_SPACE)
            if self.text[self.at] != ".":
                return keys
            self.at += 1

    def _pair(self, table: Path) -> None:
        keys = self._keys()
        self.at += 1  # the equals sign
        path = self._inside_arrays(table, keys[:-1])
        path = (*path, keys[-1][0])
        self.places[path] = keys[-1][1]
        self._value(path)

    def _value(self, path: Path) -> None:
        self._pass(_SPACE)
        opening = self.text[self.at]
        if opening == "[":
            self._array(path)
        elif opening == "{":
            self._inline_table(path)
        elif opening in "\"'":
            self._pass(_STRING)
        else:
            self._pass(_SCALAR)

    def _array(self, path: Path) -> None:
        self.at += 1
        index = 0
        self._pass(_BLANK)
        while self.text[self.at] != "]":
            self.places[(*path, index)] = self.at
            self._value((*path, index))
            self._pass(_BLANK)
            if self.text[self.at] == ",":
                self.at += 1
                self._pass(_BLANK)
            index += 1
        self.at += 1

    def _inline_table(self, path: Path) -> None:
        self.at += 1
        self._pass(_BLANK)
        while self.text[self.at] != "}":
            self._pair(path)
            self._pass(_BLANK)
            if self.text[self.at] == ",":
                self.at += 1
                self._pass(_BLANK)
        self.at += 1
