"""Files in and files out, and the one family of errors.

Every error a user can meet is a :class:`ProtlintError`: it carries the file, the line and the column it is about and the
exit code of the command, and it prints as one line ``file:line:column: message``.
"""

from __future__ import annotations

import codecs
import contextlib
import os
import re
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

_NO_ENCODINGS = frozenset({"idna", "punycode", "raw-unicode-escape", "undefined", "unicode-escape", "utf-7"})
"""What Python files under encodings, though no file is written in them."""


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


def read_bytes(path: str | Path, *, limit: int | None = None) -> tuple[bytes, str]:
    """Return a file's bytes and the name to call it by; ``-`` is standard input.

    Raises
    ------
    FileError : the file is missing, a folder, or cannot be read.
    InputError : it holds more than ``limit`` bytes; no more than that is read.
    """
    enough = -1 if limit is None else limit + 1
    if str(path) == "-":
        name = "<standard input>"
        if sys.stdin is None:
            raise FileError("there is none", file=name)
        return _within(limit, sys.stdin.buffer.read(enough), name), name
    name = shown_name(path)
    try:
        with Path(path).open("rb") as stream:
            return _within(limit, stream.read(enough), name), name
    except FileNotFoundError:
        raise FileError("no such file", file=name) from None
    except IsADirectoryError:
        raise FileError("this is a folder, not a file", file=name) from None
    except OSError as error:
        raise FileError(f"cannot be read ({error.strerror})", file=name) from None


def _within(limit: int | None, data: bytes, name: str) -> bytes:
    if limit is not None and len(data) > limit:
        raise InputError(f"larger than {limit // 1_000_000} MB, the most that is read", file=name)
    return data


def decode_text(data: bytes, encoding: str | None = None, *, file: str | None = None) -> Decoded:
    """Return the text of a file whose encoding nothing declares, decided once for the whole of it.

    The encoding asked for; else UTF-16 where its byte order mark stands in front; else UTF-8 where the bytes are that; else
    cp1252, or latin-1 where a byte means nothing in it.

    Raises
    ------
    UsageError : there is no encoding of that name.
    InputError : the bytes are not in the encoding asked for.
    """
    if encoding is None:
        marked = data[:2] in (codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)
        for guess in ("utf-16", "utf-8", "cp1252") if marked else ("utf-8", "cp1252"):
            with contextlib.suppress(UnicodeDecodeError):
                return _decoded(data.decode(guess), guess)
        return _decoded(data.decode("latin-1"), "latin-1")
    try:
        usable = codecs.lookup(encoding).name not in _NO_ENCODINGS
    except (LookupError, ValueError):
        usable = False
    try:
        if usable:
            return _decoded(data.decode(encoding), encoding)
    except LookupError:
        pass  # a codec, but of bytes
    except UnicodeDecodeError as error:
        before = data[: error.start]
        line, column = before.count(b"\n") + 1, error.start - before.rfind(b"\n")
        message = f"the byte {data[error.start]:#04x} means nothing in {encoding}: give the encoding the file was written in"
        raise InputError(message, file=file, line=line, column=column) from None
    raise UsageError(f"no encoding is called {encoding!r}; utf-8, cp1252 and cp1251 are usual ones", file=file)


def _decoded(text: str, encoding: str) -> Decoded:
    text = text.removeprefix("\ufeff")
    if text.isascii():
        return Decoded(text, encoding, None, 0)
    strange = re.compile("[^\\x00-\\x7f]")
    first = strange.search(text)
    return Decoded(text, encoding, first and first.start(), len(strange.findall(text)))


def shown_name(path: str | Path) -> str:
    """Return the name a file goes by in messages and reports.

    Relative with forward slashes where the file lies below the working folder, else the bare file name, so that the same
    input gives the same report wherever it lies.
    """
    # Not resolved: a link goes by the name it was given, and only what leads up and down again is taken out.
    absolute = Path(os.path.abspath(path))  # noqa: PTH100
    try:
        return absolute.relative_to(Path.cwd()).as_posix()
    except ValueError:
        return absolute.name


def write_whole(path: str | Path, text: str) -> None:
    """Write a text file whole or not at all: into a temporary file beside it, then renamed over it.

    A symbolic link goes on pointing where it did; the file it points to is written.

    Raises
    ------
    FileError : the file cannot be written; what stood there before still stands.
    """
    target = Path(os.path.realpath(path))
    temporary: str | None = None
    try:
        handle, temporary = tempfile.mkstemp(prefix=f".{target.name[:40]}.", dir=target.parent)
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
class Decoded:
    """A text, the encoding it was read in, the offset of its first character outside ASCII and how many there are."""

    text: str
    encoding: str
    first_outside_ascii: int | None
    outside_ascii: int
