"""What parts are taken for, and which pin is which: part data, words, pin names, class letters, never a letter alone."""

from __future__ import annotations

import pytest

from protlint.board.graph import KINDS
from protlint.board.kinds import identify
from protlint.board.pins import numbers_at_odds
from protlint.limits import Limits
from protlint.netlist.model import Part, PropertyValue
from protlint.partdata.book import PartEntry, load_book
from tests.support.placed import placed

CBE = ("C", "B", "E")


def _kind(part: Part, number: str | None = None, entry: PartEntry | None = None) -> str:
    kind = identify(part, number, entry, Limits()).kind
    assert kind in KINDS
    return kind


@pytest.mark.parametrize(
    ("designator", "cell", "pins", "properties", "kind"),
    [
        ("D1", "SMAJ24A", ("1", "2"), {}, "zener"),
        ("D1", "DIO", ("1", "2"), {"VALUE": "P6KE15"}, "zener"),
        ("Q1", "NPN", CBE, {}, "npn"),
        ("Q1", "PNP_BCE", CBE, {}, "pnp"),
        ("Q1", "QSYM", CBE, {"Description": "TRANSISTOR NPN 45V TO-92"}, "npn"),
        ("Q1", "QSYM", CBE, {"TYPE": "PNP"}, "pnp"),
        ("Q1", "NPN_DARLINGTON", CBE, {}, "npn-darlington"),
        ("Q1", "DARLINGTON_PNP", CBE, {}, "pnp-darlington"),
        ("Q1", "2SC1815", CBE, {}, "npn"),
        ("Q1", "2SA1015", CBE, {}, "pnp"),
        ("Q1", "2SK1058", ("G", "D", "S"), {}, "nmos"),
        ("Q1", "2SJ162", ("G", "D", "S"), {}, "pmos"),
        ("Q1", "NMOS", ("G", "D", "S"), {}, "nmos"),
        ("Q1", "P-CHAN MOSFET", ("G", "D", "S"), {}, "pmos"),
        ("Q1", "MOSFET_N", ("G", "D", "S"), {}, "nmos"),
        ("Q1", "NFET", ("G", "D", "S"), {}, "nmos"),
        ("Q1", "MOSFET P-CH", ("G", "D", "S"), {}, "pmos"),
        ("Q1", "JFET_N", ("G", "D", "S"), {}, "unknown"),
        ("Q1", "DTC114EK", CBE, {}, "unknown"),
        ("Q1", "DUAL", CBE, {"Description": "TRANS NPN/PNP PAIR"}, "unknown"),
        ("R1", "RES", ("1", "2"), {"VALUE": "10K"}, "resistor"),
        ("R1", "R0603", ("1", "2"), {}, "resistor"),
        ("R1", "X", ("1", "2"), {"Description": "RES SURFACE MOUNT 10K"}, "resistor"),
        ("R1", "ZZ", ("1", "2"), {}, "resistor"),
        ("R1", "RES", ("1", "2", "3"), {}, "unknown"),
        ("RN1", "RESNET8", ("1", "2", "3", "4"), {}, "unknown"),
        ("RV1", "POT", ("1", "2", "3"), {}, "unknown"),
        ("RT1", "THERMISTOR", ("1", "2"), {}, "unknown"),
        ("R1", "RES", ("1", "2"), {"VALUE": "10K NTC"}, "unknown"),
        ("C1", "CAP_POL", ("+", "-"), {}, "capacitor"),
        ("C1", "ZZ", ("1", "2"), {}, "capacitor"),
        ("L1", "INDUCTOR", ("1", "2"), {}, "inductor"),
        ("FB1", "FERRITE_BEAD", ("1", "2"), {}, "link"),
        ("L1", "IND", ("1", "2"), {"VALUE": "600R@100MHz"}, "link"),
        ("JP1", "JUMPER2", ("1", "2"), {}, "link"),
        ("JP1", "JUMPER3", ("1", "2", "3"), {}, "unknown"),
        ("NT1", "NET_TIE", ("1", "2"), {}, "link"),
        ("D1", "DIODE", ("A", "K"), {}, "diode"),
        ("D1", "1N4148", ("A", "K"), {}, "diode"),
        ("D1", "LED_RED", ("A", "K"), {}, "diode"),
        ("D1", "ZENER", ("A", "K"), {}, "zener"),
        ("D1", "DIODE", ("A", "K"), {"VALUE": "5V1"}, "zener"),
        ("D1", "BZX84C5V6", ("A", "K"), {}, "zener"),
        ("D1", "BRIDGE_RECTIFIER", ("AC1", "AC2", "+", "-"), {}, "unknown"),
        ("D1", "SCR", ("A", "K", "G"), {}, "thyristor"),
        ("F1", "FUSE", ("1", "2"), {}, "fuse"),
        ("J1", "CONN_4", ("1", "2", "3", "4"), {}, "connector"),
        ("J1", "CONN2", ("1", "2"), {"VALUE": "SPEAKER"}, "connector"),
        ("J1", "HEADER_2", ("1", "2"), {"VALUE": "LED STRING"}, "connector"),
        ("J1", "JUMPER", ("1", "2"), {"VALUE": "FUSE"}, "fuse"),
        ("F1", "CONN2", ("1", "2"), {"VALUE": "FUSE"}, "fuse"),
        ("X1", "ZZ", ("1", "2", "3"), {}, "connector"),
        ("U1", "ZZ", ("IN+", "IN-", "OUT"), {}, "ic"),
        ("U1", "ZZ", ("IN", "OUT"), {"Description": "IC 3-TERMINAL REGULATOR"}, "ic"),
        ("TP1", "TEST_POINT", ("1",), {}, "link"),
        ("TP1", "ZZ", ("1",), {}, "link"),
        ("MH1", "MOUNTING_HOLE", ("1",), {}, "link"),
        ("K1", "RELAY", ("1", "2", "3"), {}, "unknown"),
        ("T1", "ZZ", ("1", "2", "3", "4"), {}, "unknown"),
        ("Q1", "ZZ", ("1", "2", "3"), {}, "unknown"),
        ("ZZ1", "ZZ", ("1", "2"), {}, "unknown"),
        ("p0_out[0]_i_1", "LUT4", ("I0", "I1", "O"), {}, "unknown"),
        ("p2in", "IBUF", ("I", "O"), {}, "unknown"),
        ("x_IBUF[3]_inst", "IBUF", ("I", "O"), {}, "unknown"),
        ("p0_out_reg[0]", "FDPE", ("C", "CE", "D", "PRE", "Q"), {}, "unknown"),
    ],
)
def test_kinds_by_words_and_by_letters(
    designator: str, cell: str, pins: tuple[str, ...], properties: dict[str, PropertyValue], kind: str
) -> None:
    assert _kind(placed(designator, cell, pins, properties)) == kind


@pytest.mark.parametrize(
    "designator",
    [
        "R7",
        "r7",
        "R7A",
        "R7A2",
        "R7_CH2",
        "R12-3",
        "R?",
        "R?A",
        "R7[2]",
        "R7[2]#1",
        "R7#2",
        "R_LOAD",
        "R7_OUT.A",
        "R7*",
        "R7б",
    ],
)
def test_what_schematics_make_of_a_designator(designator: str) -> None:
    """Class letters, number, suffix: ASME Y14.44 reference designations, and suffixes of channels by common practice."""
    assert _kind(placed(designator, "ZZ", ("1", "2"))) == "resistor"


def test_part_data_comes_first() -> None:
    entry = PartEntry("X", "pmos")
    found = identify(placed("Q1", "NPN", ("G", "D", "S")), "X", entry, Limits())
    assert (found.kind, found.kind_from) == ("pmos", "part data")
    assert found.roles == {"gate": (0,), "drain": (1,), "source": (2,)}


def test_pins_named_like_a_transistors_tell_roles_but_no_polarity() -> None:
    found = identify(placed("Q1", "MYSTERY9", CBE), "MYSTERY9", None, Limits())
    assert found.kind == "unknown"
    assert found.roles == {"collector": (0,), "base": (1,), "emitter": (2,)}
    assert "polarity" in found.kind_from


@pytest.mark.parametrize(
    ("cell", "pins", "roles"),
    [
        ("NPN", ("BASE", "Emitter", "collector"), {"base": (0,), "emitter": (1,), "collector": (2,)}),
        ("NPN", ("B", "C", "E", "C"), {"base": (0,), "collector": (1, 3), "emitter": (2,)}),
        ("NPN", ("B", "C1", "E", "C2"), {"base": (0,), "collector": (1, 3), "emitter": (2,)}),
        ("NPN", ("B", "E"), {"base": (0,), "emitter": (1,)}),
        ("NPN", ("B1", "C1", "E1"), {"base": (0,), "collector": (1,), "emitter": (2,)}),
        ("NPN", ("B", "C", "E", "NC"), {"base": (0,), "collector": (1,), "emitter": (2,)}),
        ("NMOS", ("S1", "S2", "S3", "G", "D1", "D2"), {"source": (0, 1, 2), "gate": (3,), "drain": (4, 5)}),
        ("DIODE", ("C", "A"), {"cathode": (0,), "anode": (1,)}),
        ("DIODE", ("+", "-"), {"anode": (0,), "cathode": (1,)}),
        ("SCR", ("MT1", "MT2", "G"), {"cathode": (0,), "anode": (1,), "gate": (2,)}),
        ("RES", ("2", "1"), {"2": (0,), "1": (1,)}),
        ("RES", ("A", "B"), {"1": (0,), "2": (1,)}),
        ("CAP", ("-", "+"), {"2": (0,), "1": (1,)}),
        ("RES", ("1",), {"1": (0,)}),
    ],
)
def test_roles_by_pin_names(cell: str, pins: tuple[str, ...], roles: dict[str, tuple[int, ...]]) -> None:
    found = identify(placed("X1", cell, pins), None, None, Limits())
    assert found.roles == roles
    assert found.sections == ()


@pytest.mark.parametrize("pins", [("1", "2", "3"), ("B", "2", "3"), ("P1", "P2", "P3")])
def test_numbers_alone_tell_no_roles_but_the_kind_stands(pins: tuple[str, ...]) -> None:
    found = identify(placed("Q1", "NPN", pins), None, None, Limits())
    assert (found.kind, found.roles, found.sections) == ("npn", {}, ())


def test_sections_of_one_package_are_kept_apart() -> None:
    found = identify(placed("Q1", "DUAL_NPN", ("C1", "B1", "E1", "C2", "B2", "E2")), None, None, Limits())
    assert found.roles == {}
    assert found.sections == (
        {"collector": (0,), "base": (1,), "emitter": (2,)},
        {"collector": (3,), "base": (4,), "emitter": (5,)},
    )


def test_two_diodes_with_one_cathode() -> None:
    found = identify(placed("D1", "DUAL_DIODE", ("A1", "A2", "K")), None, None, Limits())
    assert found.sections == ({"anode": (0,), "cathode": (2,)}, {"anode": (1,), "cathode": (2,)})


def test_the_limits_file_gives_roles_to_numbered_pins() -> None:
    limits = Limits(pins={"SOT23-*": {"1": "base", "2": "emitter", "3": "collector", "4": "none"}})
    part = placed("Q1", "SOT23-X", ("1", "2", "3", "4"), {"TYPE": "NPN"})
    found = identify(part, None, None, limits)
    assert found.roles == {"base": (0,), "emitter": (1,), "collector": (2,)}
    assert found.roles_from == "limits file"
    assert identify(placed("Q1", "ZZ", ("1", "2", "3")), "SOT23-Y", None, limits).roles == found.roles


def test_the_limits_file_stands_over_part_data_and_pin_names() -> None:
    limits = Limits(pins={"2N3904": {"B": "emitter", "E": "base", "C": "collector"}})
    found = identify(placed("Q1", "2N3904", CBE), "2N3904", load_book().find("2N3904"), limits)
    assert found.roles == {"collector": (0,), "emitter": (1,), "base": (2,)}


def test_the_limits_file_tells_sections_apart() -> None:
    table = {"1": "base.1", "2": "emitter.1", "3": "collector.1", "4": "base.2", "5": "emitter.2", "6": "collector.2"}
    found = identify(placed("Q1", "DUAL6", "123456", {"TYPE": "NPN"}), None, None, Limits(pins={"DUAL6": table}))
    assert [section["base"] for section in found.sections] == [(0,), (3,)]


def test_part_data_gives_roles_by_pin_number_or_name() -> None:
    entry = PartEntry("X", "npn", pins={"1": "emitter", "2": "base", "3": "collector"}, pins_source="an invented sheet")
    by_number = identify(placed("Q1", "Q", ("P1/3", "P2/2", "P3/1")), "X", entry, Limits())
    assert by_number.roles == {"collector": (0,), "base": (1,), "emitter": (2,)}
    assert "invented sheet" in by_number.roles_from
    by_name = identify(placed("Q1", "Q", ("1", "2", "3")), "X", entry, Limits())
    assert by_name.roles == {"emitter": (0,), "base": (1,), "collector": (2,)}


def test_a_pin_order_from_memory_gives_way_to_names_and_helps_where_there_are_none() -> None:
    entry = load_book().find("2N3904")
    assert entry is not None
    named = identify(placed("Q1", "2N3904", ("B/1", "C/2", "E/3")), "2N3904", entry, Limits())
    assert named.roles == {"base": (0,), "collector": (1,), "emitter": (2,)}
    numbered = identify(placed("Q1", "2N3904", ("1", "2", "3")), "2N3904", entry, Limits())
    assert numbered.roles == {"emitter": (0,), "base": (1,), "collector": (2,)}
    assert "memory" in numbered.roles_from


@pytest.mark.parametrize(
    ("pins", "at_odds"),
    [
        (("B/1", "C/2", "E/3"), ()),
        (("B/1", "E/2", "C/3"), (("2", "emitter", "collector"), ("3", "collector", "emitter"))),
        (("1", "2", "3"), ()),
        (("B", "C", "E"), ()),
        (("B/1", "C/2", "C/TAB", "E/3"), ()),
    ],
)
def test_pin_numbers_that_name_other_terminals_than_the_part_data(
    pins: tuple[str, ...], at_odds: tuple[tuple[str, str, str], ...]
) -> None:
    """Base, collector, emitter from the left is the order of TO-247 and TO-264 bipolars; from memory."""
    entry = PartEntry("X", "npn", pins={"1": "base", "2": "collector", "3": "emitter"})
    assert numbers_at_odds(placed("Q1", "Q", pins), entry, "bipolar") == at_odds


def test_properties_can_name_the_pins() -> None:
    part = placed("Q1", "NPN", ("1", "2", "3"), {"PIN1": "C", "PIN2": "B", "PIN3": "E"})
    found = identify(part, None, None, Limits())
    assert found.roles == {"collector": (0,), "base": (1,), "emitter": (2,)}


def test_a_test_point_joins_nothing() -> None:
    assert identify(placed("TP1", "TEST_POINT", ("1",)), None, None, Limits()).kind == "link"
    assert identify(placed("MH1", "MOUNTING_HOLE", ("1", "2")), None, None, Limits()).kind == "connector"


def test_the_class_letter_counts_inside_hierarchy() -> None:
    assert _kind(placed("R5", "ZZ", ("1", "2"), path="CH2/")) == "resistor"


def test_of_a_text_of_a_megabyte_only_the_beginning_is_looked_at() -> None:
    assert _kind(placed("Q1", "X", ("1", "2", "3"), {"VALUE": "npn " * 250_000})) == "npn"
    assert _kind(placed("Q1", "X", ("1", "2", "3"), {"VALUE": "x " * 500_000 + "npn"})) == "unknown"
