"""Files in and out: the name a file goes by, standard input that is not there, and files written whole."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from protlint.board.parts_list import read_parts_list
from protlint.sources import FileError, InputError, read_bytes, shown_name, write_whole
from protlint.toml.file import load_toml


@pytest.mark.parametrize(
    ("path", "name"),
    [
        ("board.edf", "board.edf"),
        ("./a/../board.edf", "board.edf"),
        ("a/board.edf", "a/board.edf"),
        ("../board.edf", "board.edf"),
        ("../here/a/board.edf", "a/board.edf"),
        ("/board.edf", "board.edf"),
    ],
)
def test_a_file_below_the_working_folder_goes_by_its_way_there_any_other_by_its_name(
    path: str, name: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    assert shown_name(path) == name


def test_a_standard_input_that_is_closed_is_one_clear_error(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", None)
    with pytest.raises(FileError) as caught:
        read_bytes("-")
    assert caught.value.file == "<standard input>"


def test_a_file_is_written_whole_under_any_name_a_file_can_have(tmp_path: Path) -> None:
    target = tmp_path / ("n" * 250 + ".json")
    write_whole(target, "µ\n")
    assert target.read_bytes() == b"\xc2\xb5\n"
    assert list(tmp_path.iterdir()) == [target]


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="SKIPPED: this machine has no endless file")
@pytest.mark.parametrize("reader", [load_toml, read_parts_list])
def test_an_endless_file_is_read_no_further_than_makes_sense(reader: Callable[[str], object]) -> None:
    with pytest.raises(InputError, match="the most that is read"):
        reader("/dev/zero")


def test_what_stood_there_stands_where_writing_fails(tmp_path: Path) -> None:
    (tmp_path / "folder").mkdir()
    (tmp_path / "folder" / "kept").write_text("as it was", encoding="utf-8")
    with pytest.raises(FileError):
        write_whole(tmp_path / "folder", "text")
    assert (tmp_path / "folder" / "kept").read_text(encoding="utf-8") == "as it was"
    assert list(tmp_path.iterdir()) == [tmp_path / "folder"]


def test_a_link_goes_on_pointing_and_what_it_points_to_is_written(tmp_path: Path) -> None:
    (tmp_path / "other").mkdir()
    link, target = tmp_path / "link.json", tmp_path / "other" / "target.json"
    try:
        link.symlink_to(target)
    except OSError:
        pytest.skip("SKIPPED: this machine makes no symbolic links")
    for text in ("first", "second"):
        write_whole(link, text)
        assert link.is_symlink()
        assert target.read_text(encoding="utf-8") == text
