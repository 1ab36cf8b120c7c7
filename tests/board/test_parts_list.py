"""Parts lists as people export them, and where they contradict the netlist."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.board.attributes import file_habits
from protlint.board.parts_list import differences, expand, read_parts_list
from protlint.limits import Limits
from protlint.sources import FileError, InputError
from tests.support.placed import board_of, placed


def _written(tmp_path: Path, text: str, encoding: str = "utf-8") -> Path:
    path = tmp_path / "parts.csv"
    path.write_bytes(text.encode(encoding))
    return path


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "cp1252"])
def test_delimiters_and_encodings(tmp_path: Path, delimiter: str, encoding: str) -> None:
    rows = [["Designator", "Value", "Part Number", "Power"], ["R1", "4K7", "RX-1", "0.25W"], ["C1", "10µF", "", ""]]
    text = "\r\n".join(delimiter.join(row) for row in rows)
    parts = read_parts_list(_written(tmp_path, text, encoding))
    assert parts.parts["r1"].attributes == {"value": "4K7", "part_number": "RX-1", "power": "0.25W"}
    assert parts.parts["c1"].attributes == {"value": "10µF"}
    assert parts.columns == {"value": "Value", "part_number": "Part Number", "power": "Power"}


def test_headings_below_a_title_and_designators_in_one_cell(tmp_path: Path) -> None:
    text = (
        "Bill of materials;board of an invented scenario\n;;\nItem;Quantity;Reference;Comment;PCB Footprint\n"
        '1;5;"R1-R4, R7";10K;0603\n2;2;"Q1\nQ2";BC547B;TO92\n3;0;;nothing;\n'
    )
    parts = read_parts_list(_written(tmp_path, text))
    assert sorted(parts.parts) == ["q1", "q2", "r1", "r2", "r3", "r4", "r7"]
    assert parts.parts["r3"].attributes == {"value": "10K", "footprint": "0603"}
    assert parts.parts["r3"].line == 4
    assert parts.parts["q2"].attributes["value"] == "BC547B"
    assert parts.columns["footprint"] == "PCB Footprint"
    assert len(parts.remarks) == 1


def test_a_decimal_comma_inside_quotes(tmp_path: Path) -> None:
    parts = read_parts_list(_written(tmp_path, 'Ref,Value\nC1,"0,1мк"\n'))
    assert parts.parts["c1"].attributes == {"value": "0,1мк"}


def test_a_part_that_stands_twice_counts_once_and_is_told(tmp_path: Path) -> None:
    parts = read_parts_list(_written(tmp_path, "Ref,Value\nR1,10K\nR1,22K\nR2,1K\nR2,1K\n"))
    assert parts.parts["r1"].attributes["value"] == "10K"
    assert len(parts.remarks) == 1


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("R1", ("R1",)),
        ("R1-R4, R7", ("R1", "R2", "R3", "R4", "R7")),
        ("R1 - R3", ("R1", "R2", "R3")),
        ("R1..R3", ("R1", "R2", "R3")),
        ("R1–R3", ("R1", "R2", "R3")),
        ("R1 to R3", ("R1", "R2", "R3")),
        ("R1-3", ("R1", "R2", "R3")),
        ("R1 R2;R3\nR4", ("R1", "R2", "R3", "R4")),
        ("R08-R10", ("R08", "R09", "R10")),
        ("CH1/R5, Q1A", ("CH1/R5", "Q1A")),
        ("", ()),
    ],
)
def test_designators_and_ranges(text: str, expected: tuple[str, ...]) -> None:
    assert expand(text) == expected


@pytest.mark.parametrize("text", ["R4-R1", "R1-C4", "R1-R999999"])
def test_a_range_that_is_none(tmp_path: Path, text: str) -> None:
    with pytest.raises(InputError, match="no range") as caught:
        read_parts_list(_written(tmp_path, f"Ref,Value\nR1,10K\n{text},10K\n"))
    assert caught.value.line == 3


@given(first=st.integers(1, 500), count=st.integers(0, 60))
def test_a_range_names_every_part_between(first: int, count: int) -> None:
    assert expand(f"R{first}-R{first + count}") == tuple(f"R{first + step}" for step in range(count + 1))


@pytest.mark.parametrize(
    "content",
    [b"", b"\n\n\n", b"a,b,c\n1,2,3\n", b"Ref\nR1\n", b"Value,Power\n10K,1W\n", bytes(range(256)) * 20, b'Ref,Value\n"R1'],
)
def test_what_is_no_parts_list_is_one_clear_error(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "parts.csv"
    path.write_bytes(content)
    try:
        parts = read_parts_list(path)
    except InputError as error:
        assert "\n" not in str(error)
    else:
        assert content.startswith(b'Ref,Value\n"R1')
        assert list(parts.parts) == ["r1"]


def test_a_missing_file(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="no such file"):
        read_parts_list(tmp_path / "none.csv")


def test_parts_inside_hierarchy_by_path_or_by_designator(tmp_path: Path) -> None:
    parts = read_parts_list(_written(tmp_path, "Ref,Value\nCH1/R5,1K\nR5,2K\n"))
    assert parts.listed(placed("R5", "RES", ("1", "2"), path="CH1/"))["value"] == "1K"
    assert parts.listed(placed("R5", "RES", ("1", "2"), path="CH2/"))["value"] == "2K"
    assert parts.listed(placed("R6", "RES", ("1", "2"))) == {}


def test_contradictions_with_the_netlist(tmp_path: Path) -> None:
    parts = (
        placed("R1", "RES", ("1", "2"), {"VALUE": "10K,1%"}),
        placed("R2", "RES", ("1", "2"), {"VALUE": "10K,1%"}),
        placed("R3", "RES", ("1", "2"), {"VALUE": "10K", "POWER": "0.25W"}),
        placed("R4", "RES", ("1", "2"), {"VALUE": "10K"}),
        placed("R5", "RES", ("1", "2")),
        placed("Q1", "NPN", ("C", "B", "E"), {"Part Number": "BC547B"}),
        placed("R6", "RES", ("1", "2"), {"VALUE": "4K7"}),
    )
    text = "Ref;Value;Power;Part Number\nR1;10k 1%;;\nR2;22K;;\nR3;10K;0.1W;\nR4;DNP;;\nR5;1K;;\nQ1;;;2N3904\n"
    listed = read_parts_list(_written(tmp_path, text))
    kinds = ["resistor"] * 5 + ["npn", "resistor"]
    found = differences(parts, kinds, file_habits(board_of(*parts), Limits()), listed)
    assert [(one.part, one.attribute, one.line) for one in found] == [
        ("R2", "value", 3),
        ("R3", "power", 4),
        ("R4", "fitted", 5),
        ("Q1", "part_number", 7),
    ]
    assert (found[0].netlist, found[0].parts_list) == ("10K,1%", "22K")
