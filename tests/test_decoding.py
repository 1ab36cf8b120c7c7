"""Bytes to text: one encoding for a whole file, and no more bytes than a stated limit."""

from __future__ import annotations

from pathlib import Path

import pytest

from protlint.sources import Decoded, FileError, InputError, UsageError, decode_text, read_bytes


@pytest.mark.parametrize(
    ("data", "expected"),
    [
        (b"plain", Decoded("plain", "utf-8", None, 0)),
        (b"", Decoded("", "utf-8", None, 0)),
        ("10 µF, 47к".encode(), Decoded("10 µF, 47к", "utf-8", 3, 2)),
        (b"\xef\xbb\xbf(edif", Decoded("(edif", "utf-8", None, 0)),
        ("10 µF".encode("cp1252"), Decoded("10 µF", "cp1252", 3, 1)),
        (b"a\x81b", Decoded("a\x81b", "latin-1", 1, 1)),
    ],
)
def test_the_encoding_is_decided_once(data: bytes, expected: Decoded) -> None:
    assert decode_text(data) == expected


def test_the_encoding_asked_for() -> None:
    assert decode_text("47к".encode("cp1251"), "cp1251") == Decoded("47к", "cp1251", 2, 1)
    assert decode_text("(edif".encode("utf-16"), "utf-16").text == "(edif"


def test_bytes_that_are_not_in_the_encoding_asked_for() -> None:
    with pytest.raises(InputError, match="0xff means nothing in utf-8") as caught:
        decode_text(b"one\ntwo \xff", "utf-8", file="x.edf")
    assert (caught.value.file, caught.value.line, caught.value.column) == ("x.edf", 2, 5)


@pytest.mark.parametrize(
    "name", ["klingon", "", "a\0b", "hex", "rot13", "zip", "undefined", "unicode_escape", "idna", "utf-7"]
)
def test_names_that_are_no_encoding_of_files(name: str) -> None:
    with pytest.raises(UsageError, match="no encoding is called"):
        decode_text(b"x", name)


def test_no_more_is_read_than_the_limit(tmp_path: Path) -> None:
    file = tmp_path / "file"
    file.write_bytes(b"x" * 2_000_000)
    assert read_bytes(file, limit=2_000_000) == (b"x" * 2_000_000, "file")
    with pytest.raises(InputError, match="file: larger than 1 MB"):
        read_bytes(file, limit=1_999_999)
    with pytest.raises(FileError, match="no such file"):
        read_bytes(tmp_path / "none")
    with pytest.raises(FileError, match="a folder"):
        read_bytes(tmp_path)
