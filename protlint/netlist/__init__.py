"""Reading: a file becomes positioned forms, definitions, and one flat netlist."""

from __future__ import annotations

from collections.abc import Callable
from hashlib import sha256
from pathlib import Path

from protlint.netlist.edif import read_definitions
from protlint.netlist.facts import facts_of
from protlint.netlist.flatten import flatten
from protlint.netlist.forms import Places, no_collection
from protlint.netlist.model import Netlist
from protlint.sources import InputError, decode_text, read_bytes

__all__ = ["FILE_LIMIT", "LINE_LIMIT", "read_netlist", "read_netlist_bytes"]

FILE_LIMIT = 250_000_000
"""Most bytes of a file."""
LINE_LIMIT = 100_000_000
"""Most bytes of a line; a whole netlist on one line is legal, and a line longer than this is no netlist's."""
_PACKED = {b"\x1f\x8b": "gzip", b"PK\x03\x04": "zip", b"BZh": "bzip2", b"\xfd7zXZ": "xz", b"7z\xbc\xaf": "7z"}
"""What packed files begin with."""


def read_netlist(path: str | Path, *, design: str | None = None, encoding: str | None = None) -> Netlist:
    """Read one design of an EDIF 2 0 0 file, flattened.

    Parameters
    ----------
    path : the file, or ``-`` for standard input.
    design : the name of the design, where the file has several; the first by default.
    encoding : how bytes outside ASCII are meant; by default UTF-16 where the file is marked as that, UTF-8 where it is
        that, else cp1252.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : it is no EDIF 2 0 0, is damaged, uses what is refused by name, or is past a stated limit.
    UsageError : there is no such design or encoding.
    """
    return _read(lambda: read_bytes(path, limit=FILE_LIMIT), design, encoding)


def read_netlist_bytes(data: bytes, name: str, *, design: str | None = None, encoding: str | None = None) -> Netlist:
    """Read one design of an EDIF 2 0 0 netlist from bytes; ``name`` is what errors call it. See :func:`read_netlist`."""
    return _read(lambda: (data, name), design, encoding)


def _read(source: Callable[[], tuple[bytes, str]], design: str | None, encoding: str | None) -> Netlist:
    """Read what ``source`` gives. Bytes, text and definitions are let go as soon as the next stage has what it needs."""
    data, name = source()
    digest = sha256(data).hexdigest()
    _refuse_packed(data, name)
    _refuse_long_lines(data, name)
    decoded = decode_text(data, encoding, file=name)
    nul = decoded.text.find("\0")
    if nul >= 0:
        unmarked = {b"(\0": "utf-16-le", b"\0(": "utf-16-be"}.get(data[:2])
        hint = f", unless it is UTF-16, which --encoding {unmarked} reads" if unmarked else ""
        raise Places(decoded.text, name).error(f"a NUL character: this is no text, and no EDIF{hint}", nul)
    del data
    read_as = decoded.encoding + ("" if encoding else ", --encoding NAME takes another")
    first, count, used = decoded.first_outside_ascii, decoded.outside_ascii, decoded.encoding
    text = decoded.text
    del decoded
    with no_collection():
        edif, notes = read_definitions(text, name)
        del text
        if first is not None:
            notes.add("encoding", first, f"read as {read_as}", count=count)
        flat = flatten(edif, notes, design=design)
        return Netlist(
            file=name,
            sha256=digest,
            design=flat.design,
            parts=flat.parts,
            nets=flat.nets,
            warnings=notes.warnings(),
            pins_on_two_nets=flat.pins_on_two_nets,
            facts=facts_of(edif, flat, used),
            duplicate_designators=flat.duplicate_designators,
        )


def _refuse_packed(data: bytes, name: str) -> None:
    for mark, program in _PACKED.items():
        if data.startswith(mark):
            raise InputError(f"a file packed with {program}: unpack it first", file=name, line=1, column=1)


def _refuse_long_lines(data: bytes, name: str) -> None:
    start = 0
    while len(data) - start > LINE_LIMIT:
        end = max(data.rfind(b"\n", start, start + LINE_LIMIT), data.rfind(b"\r", start, start + LINE_LIMIT))
        if end < 0:
            line = data.count(b"\n", 0, start) + 1
            raise InputError(f"a line of more than {LINE_LIMIT} bytes", file=name, line=line, column=1)
        start = end + 1
