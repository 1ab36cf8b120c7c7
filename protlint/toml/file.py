"""A TOML file read whole: its tables, the place of every key, and one clear error for whatever is no TOML."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path
from typing import Any

from protlint.sources import InputError, read_bytes
from protlint.toml.places import key_places

LARGEST_TOML = 4_000_000
"""Bytes; what a person writes is a thousandth of it."""


@dataclass(frozen=True, slots=True)
class TomlFile:
    """A parsed TOML file: its tables as plain dictionaries, and the text, which tells where each key stands."""

    file: str
    tables: Mapping[str, Any]
    text: str = field(repr=False)

    def place(self, path: tuple[str | int, ...]) -> tuple[int, int]:
        """Return line and column, from 1, of a key by its path (keys, and indices inside arrays), or of what holds it."""
        offsets = _places(self.text)
        while path and path not in offsets:
            path = path[:-1]
        offset = offsets.get(path, 0)
        return self.text.count("\n", 0, offset) + 1, offset - self.text.rfind("\n", 0, offset)


@lru_cache(maxsize=4)
def _places(text: str) -> Mapping[tuple[str | int, ...], int]:
    try:
        return key_places(text)
    except RecursionError:
        return {}


def load_toml(path: str | Path) -> TomlFile:
    """Return a TOML file's tables with the place of every key.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : it is not UTF-8 or not TOML, with line and column, or larger than any person writes.
    """
    content, name = read_bytes(path, limit=LARGEST_TOML)
    try:
        text = content.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        column = error.start - content.rfind(b"\n", 0, error.start)
        raise InputError("not UTF-8 text, as TOML has to be", file=name, line=line, column=column) from None
    try:
        tables = tomllib.loads(text)
    except RecursionError:
        raise InputError("nested too deeply", file=name) from None
    except ValueError as error:
        said = re.fullmatch(r"(.*) \(at (?:line (\d+), column (\d+)|end of document)\)", str(error), re.DOTALL)
        if said is None:
            raise InputError(f"not TOML: {error}", file=name) from None
        end = text.count("\n") + 1, len(text) - text.rfind("\n")
        line, column = (int(said[2]), int(said[3])) if said[2] else end
        names = re.sub(r"\((?:'[^()']*',? ?)+\)", lambda found: ".".join(re.findall(r"'([^']*)'", found[0])), said[1])
        raise InputError(f"not TOML: {names}", file=name, line=line, column=column) from None
    return TomlFile(file=name, tables=tables, text=text)
