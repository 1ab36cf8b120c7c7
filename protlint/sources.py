"""Files in and files out, and the one family of errors.

Every error a user can meet is a :class:`ProtlintError`: it carries the file, the line and the column it is about and the
exit code of the command, and it prints as one line ``file:line:column: message``.
"""

from __future__ import annotations

import bisect
import contextlib
import os
import re
import sys
import tempfile
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from protlint.toml_places import key_places

LARGEST_TOML = 4_000_000
"""Bytes; what a person writes is a thousandth of it."""


class ProtlintError(Exception):
    """Something the user gave cannot be worked with.

    Parameters
    ----------
    message : what is wrong and what to do about it, one line, no full stop at the end.
    file : the file's name as the user wrote it, ``<standard input>`` for a pipe, or None.
    line, column : counted from 1, or None where the error has no place.
    """

    exit_code = 2

    def __init__(self, message: str, *, file: str | None = None, line: int | None = None, column: int | None = None) -> None:
        super().__init__(message)
        self.message = message
        self.file = file
        self.line = line
        self.column = column

    def __str__(self) -> str:
        place = ":".join(str(part) for part in (self.file, self.line, self.column) if part is not None)
        return f"{place}: {self.message}" if place else self.message


class InputError(ProtlintError, ValueError):
    """The content of a file is wrong."""


class FileError(ProtlintError, OSError):
    """A file cannot be read or written."""


class UsageError(ProtlintError, ValueError):
    """A command or a function was called in a way that cannot work."""


def read_bytes(path: str | Path) -> tuple[bytes, str]:
    """Return a file's bytes and the name to call it by; ``-`` is standard input.

    Raises
    ------
    FileError : the file is missing, a folder, or cannot be read.
    """
    if str(path) == "-":
        return sys.stdin.buffer.read(), "<standard input>"
    name = shown_name(path)
    try:
        return Path(path).read_bytes(), name
    except FileNotFoundError:
        raise FileError("no such file", file=name) from None
    except IsADirectoryError:
        raise FileError("this is a folder, not a file", file=name) from None
    except OSError as error:
        raise FileError(f"cannot be read ({error.strerror})", file=name) from None


def shown_name(path: str | Path) -> str:
    """Return the name a file goes by in messages and reports.

    Relative with forward slashes where the file lies below the working folder, else the bare file name, so that the same
    input gives the same report wherever it lies.
    """
    absolute = Path(path).absolute()
    try:
        return absolute.relative_to(Path.cwd()).as_posix()
    except ValueError:
        return absolute.name


def write_whole(path: str | Path, text: str) -> None:
    """Write a text file whole or not at all: into a temporary file beside it, then renamed over it.

    Raises
    ------
    FileError : the file cannot be written; what stood there before still stands.
    """
    target = Path(path)
    temporary: str | None = None
    try:
        handle, temporary = tempfile.mkstemp(prefix=f".{target.name}.", dir=target.parent)
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
        umask = os.umask(0)
        os.umask(umask)
        Path(temporary).chmod(0o666 & ~umask)
        Path(temporary).replace(target)
    except OSError as error:
        if temporary is not None:
            with contextlib.suppress(OSError):
                Path(temporary).unlink()
        raise FileError(f"cannot be written ({error.strerror})", file=shown_name(path)) from None


def data_folder(name: str, checkout_name: str | None = None) -> Path:
    """Return a folder of protlint's own data (``rules``, ``demo``), in a wheel, an editable install or a checkout.

    A wheel carries the folder inside the package; in a checkout and an editable install it stands one level up, under
    ``checkout_name`` where that differs.

    Raises
    ------
    FileError : the installation is incomplete.
    """
    package = Path(__file__).parent
    for folder in (package / name, package.parent / (checkout_name or name)):
        if folder.is_dir():
            return folder
    raise FileError(f"protlint's own folder {name!r} is missing: install protlint again", file=name)


@dataclass(frozen=True, slots=True)
class TomlFile:
    """A parsed TOML file: its tables as plain dictionaries, and where each key stands."""

    file: str
    tables: Mapping[str, Any]
    offsets: Mapping[tuple[str | int, ...], int] = field(repr=False)
    line_starts: tuple[int, ...] = field(repr=False)

    def place(self, path: tuple[str | int, ...]) -> tuple[int, int]:
        """Return line and column, from 1, of a key by its path (keys, and indices inside arrays), or of what holds it."""
        while path and path not in self.offsets:
            path = path[:-1]
        offset = self.offsets.get(path, 0)
        line = bisect.bisect_right(self.line_starts, offset)
        return line, offset - self.line_starts[line - 1] + 1


def load_toml(path: str | Path) -> TomlFile:
    """Return a TOML file's tables with the place of every key.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : it is not UTF-8 or not TOML, with line and column.
    """
    content, name = read_bytes(path)
    if len(content) > LARGEST_TOML:
        raise InputError(f"larger than {LARGEST_TOML // 1_000_000} MB, no file of settings", file=name)
    try:
        text = content.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        column = error.start - content.rfind(b"\n", 0, error.start)
        raise InputError("not UTF-8 text, as TOML has to be", file=name, line=line, column=column) from None
    line_starts = (0, *(found.end() for found in re.finditer("\n", text)))
    try:
        tables = tomllib.loads(text)
        offsets = key_places(text)
    except RecursionError:
        raise InputError("nested too deeply", file=name) from None
    except ValueError as error:
        said = re.fullmatch(r"(.*) \(at (?:line (\d+), column (\d+)|end of document)\)", str(error), re.DOTALL)
        if said is None:
            raise InputError(f"not TOML: {error}", file=name) from None
        line, column = (int(said[2]), int(said[3])) if said[2] else (len(line_starts), len(text) - line_starts[-1] + 1)
        raise InputError(f"not TOML: {said[1]}", file=name, line=line, column=column) from None
    return TomlFile(file=name, tables=tables, offsets=offsets, line_starts=line_starts)
