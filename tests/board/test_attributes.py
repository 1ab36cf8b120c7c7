"""What properties say, in the habits of the file they stand in."""

from __future__ import annotations

import pytest

from protlint.board.attributes import file_habits, part_number, part_number_from, part_numbers, read_values
from protlint.limits import Limits
from protlint.netlist.model import PropertyValue
from protlint.partdata.book import load_book
from tests.support.placed import board_of, placed

TWO = ("1", "2")


@pytest.mark.parametrize(
    ("values", "comma"),
    [
        (["0,1мк", "4,7k", "10K"], "decimal"),
        (["10K,1%", "33,0402", "100,1%"], "field"),
        (["33,0402", "10K,1%"], "field"),
        (["33,0402"], "field"),
        (["33,0402", "4,7k", "10K,1%"], "field"),
        (["4,7k", "2,2u", "33,1%"], "decimal"),
        (["10K", "4K7"], "field"),
        (["1,000"], "field"),
    ],
)
def test_what_a_comma_means_is_decided_once_per_file_and_said(values: list[str], comma: str) -> None:
    parts = [placed(f"R{index}", "RES", TWO, {"VALUE": value}) for index, value in enumerate(values)]
    habits = file_habits(board_of(*parts), Limits())
    assert habits.comma == comma
    assert "comma" in habits.comma_from


def test_one_file_reads_one_text_as_another_does_not() -> None:
    part = placed("R1", "RES", TWO, {"VALUE": "33,0402"})
    in_fields = file_habits(board_of(part, placed("R2", "RES", TWO, {"VALUE": "10K,1%"})), Limits())
    others = [placed(f"R{number}", "RES", TWO, {"VALUE": text}) for number, text in enumerate(("4,7k", "2,2M"), 2)]
    in_decimals = file_habits(board_of(part, *others), Limits())
    assert read_values(part, "resistor", in_fields).value == 33.0
    assert read_values(part, "resistor", in_fields).footprint == "0402"
    assert read_values(part, "resistor", in_decimals).value == pytest.approx(33.0402)


@pytest.mark.parametrize(
    ("properties", "kind", "value"),
    [
        ({"Value": "4K7"}, "resistor", 4700.0),
        ({"Comment": "4K7"}, "resistor", 4700.0),
        ({"PartValue": "4K7"}, "resistor", 4700.0),
        ({"VALUE": "", "Comment": "4K7"}, "resistor", 4700.0),
        ({"VALUE": "RES-STD", "Comment": "4K7"}, "resistor", 4700.0),
        ({"VALUE": 330}, "resistor", 330.0),
        ({"VALUE": 4.7}, "resistor", 4.7),
        ({"VALUE": 1e-9}, "capacitor", 1e-9),
        ({"VALUE": "10u"}, "inductor", 1e-5),
        ({"VALUE": "5V6"}, "zener", 5.6),
        ({"VALUE": "BZX84-C5V6"}, "zener", 5.6),
        ({"VALUE": "BZX55C12"}, "zener", 12.0),
    ],
)
def test_a_value_wherever_it_stands(properties: dict[str, PropertyValue], kind: str, value: float) -> None:
    part = placed("X1", "CELL", TWO, properties)
    read = read_values(part, kind, file_habits(board_of(part), Limits()))
    assert read.value == pytest.approx(value)
    assert read.unreadable is None


@pytest.mark.parametrize(
    ("properties", "kind", "text"),
    [
        ({"VALUE": "see note"}, "resistor", "see note"),
        ({"VALUE": 104}, "capacitor", "104"),
        ({"VALUE": "R7"}, "resistor", "R7"),
        ({"VALUE": -5.0}, "resistor", "-5.0"),
        ({"VALUE": float("nan")}, "resistor", "nan"),
        ({"VALUE": "10M"}, "capacitor", "10M"),
    ],
)
def test_what_cannot_be_read_is_quoted_with_a_reason(properties: dict[str, PropertyValue], kind: str, text: str) -> None:
    part = placed("R7", "CELL", TWO, properties)
    read = read_values(part, kind, file_habits(board_of(part), Limits()))
    assert (read.value, read.text) == (None, text)
    assert read.unreadable


def test_a_part_that_states_no_value_is_not_unreadable() -> None:
    part = placed("R1", "RES", TWO)
    read = read_values(part, "resistor", file_habits(board_of(part), Limits()))
    assert (read.value, read.text, read.unreadable, read.fitted) == (None, None, None, True)


@pytest.mark.parametrize(
    "properties",
    [
        {"VALUE": "DNP"},
        {"VALUE": "10K,DNI"},
        {"VALUE": "10K", "Comment": "not fitted"},
        {"VALUE": "10K", "DNP": "1"},
        {"VALUE": "10K", "DNI": "DNI"},
        {"VALUE": "10K", "DNP": True},
        {"VALUE": "10K", "Fitted": "No"},
        {"VALUE": "10K", "POPULATE": False},
        {"VALUE": "10K", "Populate": "DNP"},
        {"VALUE": "10K", "MOUNT": "no"},
        {"VALUE": "10K", "BOM": "DNP"},
        {"VALUE": "10K", "Variant": "Not Fitted"},
    ],
)
def test_marks_of_a_part_that_is_not_fitted(properties: dict[str, PropertyValue]) -> None:
    part = placed("R1", "RES", TWO, properties)
    read = read_values(part, "resistor", file_habits(board_of(part), Limits()))
    assert not read.fitted
    assert read.unreadable is None


@pytest.mark.parametrize(
    "properties",
    [{"DNP": "0"}, {"DNP": ""}, {"Fitted": "yes"}, {"Fitted": ""}, {"DNP": False}, {"BOM": "no"}, {"Variant": "X"}],
)
def test_marks_that_say_nothing_against_a_part(properties: dict[str, PropertyValue]) -> None:
    part = placed("R1", "RES", TWO, {"VALUE": "10K", **properties})
    assert read_values(part, "resistor", file_habits(board_of(part), Limits())).fitted


@pytest.mark.parametrize(
    ("properties", "tolerance", "power_W", "voltage_V"),
    [
        ({"VALUE": "10K,1%"}, 0.01, None, None),
        ({"VALUE": "10K", "TOL": "J"}, 0.05, None, None),
        ({"VALUE": "10K", "Tolerance": "5"}, 0.05, None, None),
        ({"VALUE": "10K", "Tolerance": "0.05"}, None, None, None),
        ({"VALUE": "10K,1%", "TOLERANCE": "5%"}, 0.05, None, None),
        ({"VALUE": "10K", "POWER": "1/4W"}, None, 0.25, None),
        ({"VALUE": "10K", "Wattage": "1/4"}, None, 0.25, None),
        ({"VALUE": "10K", "Power Rating": 0.5}, None, 0.5, None),
        ({"VALUE": "10K", "POWER": "0,125W"}, None, 0.125, None),
        ({"VALUE": "10K", "Rating": "63 mW"}, None, 0.063, None),
        ({"VALUE": "10K", "Rating": "63"}, None, None, None),
        ({"VALUE": "10K", "Rating": "50V"}, None, None, 50.0),
        ({"VALUE": "10K", "VOLTAGE": "200"}, None, None, 200.0),
        ({"VALUE": "0R22 5W"}, None, 5.0, None),
    ],
)
def test_ratings_in_the_value_and_in_properties(
    properties: dict[str, PropertyValue], tolerance: float | None, power_W: float | None, voltage_V: float | None
) -> None:
    part = placed("R1", "RES", TWO, properties)
    read = read_values(part, "resistor", file_habits(board_of(part), Limits()))
    assert (read.tolerance, read.power_W, read.voltage_V) == (tolerance, power_W, voltage_V)


def test_a_files_own_names_come_from_the_limits_file() -> None:
    part = placed("R1", "RES", TWO, {"NENNWERT": "4K7", "VALUE": "10K"})
    limits = Limits(attributes={"value": ("Nennwert",)})
    assert read_values(part, "resistor", file_habits(board_of(part), Limits())).value == 1e4
    assert read_values(part, "resistor", file_habits(board_of(part), limits)).value == 4700.0


def test_the_spellings_found_are_told_with_their_counts() -> None:
    parts = [placed(f"R{index}", "RES", TWO, {"Value": "1k", "PCB Footprint": "0603"}) for index in range(3)]
    habits = file_habits(board_of(*parts, placed("Q1", "BC547B", ("C", "B", "E"), {"Part Number": "BC547B"})), Limits())
    assert habits.found["value"] == {"Value": 3}
    assert habits.found["footprint"] == {"PCB Footprint": 3}
    assert habits.found["part_number"] == {"Part Number": 1}
    assert habits.found["power"] == {}


@pytest.mark.parametrize(
    ("cell", "properties", "expected"),
    [
        ("NPN", {"PART_NUMBER": "BC547B"}, ("BC547B",)),
        ("NPN", {"Part Number": "100-2345", "VALUE": "BC547B"}, ("100-2345", "BC547B")),
        ("2N3904", {}, ("2N3904",)),
        ("NPN", {"Comment": "2N3904"}, ("2N3904",)),
        ("NPN", {"Name": "I07934553", "VALUE": "BC547B"}, ("BC547B",)),
        ("NPN", {"VALUE": "2N3904/TO"}, ("2N3904/TO",)),
        ("RES", {"VALUE": "10K"}, ()),
        ("CAP", {"VALUE": "100nF"}, ()),
        ("CAP", {"VALUE": "100nF/50V"}, ()),
        ("IND", {"VALUE": "10uH"}, ()),
        ("D", {"VALUE": "1N914"}, ("1N914",)),
        ("D", {"VALUE": "5V1"}, ()),
        ("NPN", {"VALUE": "BC547B,112"}, ("BC547B,112",)),
        ("RES", {"Comment": "10K"}, ()),
        ("RES", {"Name": "Shunt resistor"}, ()),
    ],
)
def test_where_part_numbers_are_found(cell: str, properties: dict[str, PropertyValue], expected: tuple[str, ...]) -> None:
    part = placed("Q1", cell, ("C", "B", "E"), properties)
    habits = file_habits(board_of(part), Limits())
    assert part_numbers(part, habits) == expected
    assert part_number(part, habits) == (expected[0] if expected else None)


@pytest.mark.parametrize(
    ("cell", "properties", "source"),
    [
        ("NPN", {"Part Number": "BC547B"}, "Part Number"),
        ("NPN", {"Part Number": "100-2345", "Val": "BC547B,112"}, "Val"),
        ("BC547B", {"VALUE": "see text"}, "the cell's name"),
        ("NPN", {}, "the parts list"),
    ],
)
def test_where_a_part_number_was_taken_from(cell: str, properties: dict[str, PropertyValue], source: str) -> None:
    part = placed("Q1", cell, ("C", "B", "E"), properties)
    assert part_number_from(part, "BC547B", file_habits(board_of(part), Limits())) == source


@pytest.mark.parametrize(
    ("properties", "expected"),
    [
        ({"Part Number": "100-2345", "VALUE": "BC547B"}, "BC547B"),
        ({"VALUE": "BC547B,112"}, "BC547B"),
        ({"VALUE": "2N3904/TO92"}, "2N3904"),
        ({"MPN": "UNHEARD-OF-7"}, "UNHEARD-OF-7"),
    ],
)
def test_the_book_decides_between_part_numbers(properties: dict[str, PropertyValue], expected: str) -> None:
    part = placed("Q1", "NPN", ("C", "B", "E"), properties)
    assert part_number(part, file_habits(board_of(part), Limits()), book=load_book()) == expected


def test_a_parts_list_fills_what_the_netlist_leaves_open() -> None:
    part = placed("R1", "RES", TWO, {"VALUE": "10K"})
    habits = file_habits(board_of(part), Limits())
    listed = {"value": "22K", "power": "0.5W", "footprint": "0805", "part_number": "ABC-1"}
    read = read_values(part, "resistor", habits, listed=listed)
    assert (read.value, read.power_W, read.footprint) == (1e4, 0.5, "0805")
    assert part_number(part, habits, listed=listed) == "ABC-1"
    bare = placed("R1", "RES", TWO)
    assert read_values(bare, "resistor", habits, listed=listed).value == 22e3
