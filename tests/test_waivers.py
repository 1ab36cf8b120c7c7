"""Waivers: what they cover, when they end, and how one is added to a file."""

from __future__ import annotations

import re
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from datetime import date
from pathlib import Path

import pytest

from protlint.findings import Finding, stamp_fingerprints
from protlint.sources import InputError, UsageError
from protlint.toml.text import toml_key, toml_string
from protlint.waivers import Waiver, add_waiver, apply_waivers, load_waivers

FINDINGS = stamp_fingerprints(
    [
        Finding(check="base-stop-absent", limiter="Q10", parts=("Q11",), message="one", level="warning"),
        Finding(check="base-stop-absent", limiter="Q20", parts=("Q21",), message="two", level="warning"),
        Finding(check="carry-not-met", limiter="Q20", parts=("R21",), message="three", level="error"),
    ]
)


def written(folder: Path, text: str) -> Path:
    path = folder / "waivers.toml"
    path.write_text(text, encoding="utf-8")
    return path


def marks(folder: Path, text: str, on: date | None = None) -> tuple[list[str | None], tuple[str, ...]]:
    findings, remarks = apply_waivers(FINDINGS, load_waivers(written(folder, text)), on=on)
    return [finding.waived for finding in findings], remarks


def test_by_fingerprint(tmp_path: Path) -> None:
    text = f'[[waiver]]\nfingerprint = "{FINDINGS[1].fingerprint}"\nreason = "seen"\nby = "A. R."\n'
    assert marks(tmp_path, text) == ([None, "seen", None], ())


@pytest.mark.parametrize(
    ("check", "part", "expected"),
    [
        ("base-stop-absent", "Q11", [True, False, False]),
        ("base-*", "Q*", [True, True, False]),
        ("*", "q20", [False, True, True]),
        ("carry-not-met", "R21", [False, False, True]),
    ],
)
def test_by_check_and_part_with_globs(tmp_path: Path, check: str, part: str, expected: list[bool]) -> None:
    text = f'[[waiver]]\ncheck = "{check}"\npart = "{part}"\nreason = "seen"\nby = "A. R."\n'
    found, remarks = marks(tmp_path, text)
    assert [mark is not None for mark in found] == expected
    assert remarks == ()


@pytest.mark.parametrize(
    ("board", "covered"),
    [("hw/left/lamp.edf", True), ("lamp.edf", True), ("left/*.edf", True), ("right/lamp.edf", False), ("amp.edf", False)],
)
def test_of_several_boards_one_can_be_meant(tmp_path: Path, board: str, covered: bool) -> None:
    finding = replace(FINDINGS[0], file="hw/left/lamp.edf")
    text = f'[[waiver]]\nfingerprint = "{finding.fingerprint}"\nboard = "{board}"\nreason = "seen"\nby = "A. R."\n'
    (marked,), remarks = apply_waivers([finding], load_waivers(written(tmp_path, text)))
    assert (marked.waived is not None, remarks == ()) == (covered, covered)


def test_one_that_matches_nothing_is_told_with_its_place(tmp_path: Path) -> None:
    text = '# kept\n\n[[waiver]]\nfingerprint = "none"\nreason = "seen"\nby = "A. R."\n'
    found, remarks = marks(tmp_path, text)
    assert found == [None, None, None]
    assert [re.sub(r"^.*waivers.toml", "", remark) for remark in remarks] == [":3:3: this waiver matches nothing"]


@pytest.mark.parametrize(("day", "holds"), [("2027-06-29", True), ("2027-06-30", True), ("2027-07-01", False)])
def test_until_is_judged_by_the_day_given(tmp_path: Path, day: str, holds: bool) -> None:
    text = f'[[waiver]]\nfingerprint = "{FINDINGS[0].fingerprint}"\nreason = "seen"\nby = "A. R."\nuntil = 2027-06-30\n'
    found, remarks = marks(tmp_path, text, date.fromisoformat(day))
    assert (found[0] is not None) == holds
    assert bool(remarks) == (not holds)
    assert all("2027-06-30" in remark and FINDINGS[0].fingerprint in remark for remark in remarks)


@pytest.mark.parametrize(
    ("body", "line", "word"),
    [
        ('fingerprint = "x"\nby = "A"', 1, "reason"),
        ('fingerprint = "x"\nreason = "A"', 1, "by"),
        ('reason = "A"\nby = "A"', 1, "fingerprint"),
        ('check = "x"\nreason = "A"\nby = "A"', 1, "part"),
        ('fingerprint = "x"\ncheck = "x"\npart = "y"\nreason = "A"\nby = "A"', 1, "fingerprint"),
        ('fingerprint = "x"\nreson = "A"\nby = "A"', 3, "reason"),
        ('fingerprint = "x"\nreason = 3\nby = "A"', 3, "reason"),
        ('fingerprint = "x"\nreason = "A"\nby = "A"\nuntil = "2027-06-30"', 5, "2027-06-30"),
        ('fingerprint = "x"\nreason = "A"\nby = "A"\nuntil = 2027-06-30T10:00:00', 5, "without quotes"),
    ],
)
def test_a_wrong_waiver_is_pointed_at(tmp_path: Path, body: str, line: int, word: str) -> None:
    with pytest.raises(InputError) as caught:
        load_waivers(written(tmp_path, f"[[waiver]]\n{body}\n"))
    assert (caught.value.line, word in caught.value.message) == (line, True)


def test_adding_one_keeps_every_byte_that_stood_there(tmp_path: Path) -> None:
    text = '# why these\r\n[[waiver]]\r\nfingerprint = "old"  # kept\r\nreason = "a"\r\nby = "b"'
    path = tmp_path / "waivers.toml"
    path.write_bytes(text.encode("utf-8"))
    new = Waiver(reason='the "driver"\ngives 5 mA', by="Ö. R.", fingerprint="new", until=date(2027, 6, 30))
    add_waiver(path, new, on=date(2027, 1, 1))
    assert path.read_bytes().startswith(text.encode("utf-8"))
    loaded = load_waivers(path).entries
    assert [(one.fingerprint, one.reason, one.by, one.until) for one in loaded] == [
        ("old", "a", "b", None),
        ("new", new.reason, new.by, new.until),
    ]


def test_one_that_ended_is_not_said_to_count_again_where_another_covers_the_same(tmp_path: Path) -> None:
    text = f'[[waiver]]\nfingerprint = "{FINDINGS[0].fingerprint}"\nreason = "seen"\nby = "A. R."\n'
    found, (remark,) = marks(tmp_path, f"{text}until = 2027-06-30\n{text}", date(2028, 1, 1))
    assert found[0] == "seen"
    assert remark.endswith("waivers.toml:1:3: this waiver ended on 2027-06-30")


def test_one_that_is_past_is_not_added_and_one_that_ended_is_pointed_at(tmp_path: Path) -> None:
    path, day = tmp_path / "waivers.toml", date(2027, 6, 30)
    waiver = Waiver(reason="a", by="b", fingerprint="x", until=day)
    with pytest.raises(UsageError, match="2027-06-30 is past"):
        add_waiver(path, waiver, on=date(2027, 7, 1))
    assert not path.exists()
    add_waiver(path, waiver, on=day)
    with pytest.raises(UsageError, match=r"already waived by b until 2027-06-30$"):
        add_waiver(path, waiver, on=day)
    with pytest.raises(UsageError, match="which is past: put a later date there") as caught:
        add_waiver(path, Waiver(reason="a", by="b", fingerprint="x"), on=date(2027, 7, 1))
    assert (caught.value.line, caught.value.column) == (1, 3)


def test_none_is_lost_where_several_add_at_once(tmp_path: Path) -> None:
    pytest.importorskip("fcntl", reason="SKIPPED: this system has no locks on folders")
    path = tmp_path / "waivers.toml"
    names = [f"check-{number}" for number in range(40)]
    with ThreadPoolExecutor(8) as pool:
        list(pool.map(lambda name: add_waiver(path, Waiver(reason="a", by="b", fingerprint=name)), names))
    assert sorted(one.fingerprint or "" for one in load_waivers(path).entries) == sorted(names)


def test_adding_one_makes_the_file_and_refuses_it_twice(tmp_path: Path) -> None:
    path = tmp_path / "waivers.toml"
    add_waiver(path, Waiver(reason="a", by="b", fingerprint="x"))
    with pytest.raises(UsageError):
        add_waiver(path, Waiver(reason="a", by="b", fingerprint="x"))
    assert len(load_waivers(path).entries) == 1


TEXTS = ["plain", "", 'a"b\\c', "\x1b[2J\n\t\r\x7f\x9b", "\u202ee\u2028", "日本 Ω", "a.b c", "##x[::y"]


@pytest.mark.parametrize("text", TEXTS)
def test_written_text_reads_back(tmp_path: Path, text: str) -> None:
    import tomllib

    assert tomllib.loads(f"{toml_key(text)} = {toml_string(text)}") == {text: text}
    assert not re.search("[\x00-\x1f\x7f-\x9f\u2028-\u202e]|##|::", toml_string(text))
