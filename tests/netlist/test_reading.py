"""Reading as a whole: where the text comes from, which design, what is refused for its size."""

from __future__ import annotations

import hashlib
import io
import subprocess
import sys
import time
from pathlib import Path

import pytest

import protlint
import protlint.netlist
from protlint.netlist import read_netlist, read_netlist_bytes
from protlint.netlist.edif import ARRAY_LIMIT
from protlint.netlist.flatten import COPIED_PROPERTIES, NAMES_LIMIT, SIZE_LIMIT
from protlint.netlist.hierarchy import DEPTH_LIMIT
from protlint.netlist.model import Netlist
from protlint.netlist.ports import ELEMENTS_LIMIT
from protlint.sources import FileError, InputError, UsageError
from tests.support.paths import FIXTURES

VALID = FIXTURES / "netlist" / "valid"
HEAD = "(edif x (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))\n"
LIBRARY = "(library L (edifLevel 0) (technology (numberDefinition))\n"


def cell(name: str, contents: str = "", interface: str = "") -> str:
    """A cell with a NETLIST view, and contents where there are any."""
    inside = f"(contents {contents})" if contents else ""
    return f"(cell {name} (cellType GENERIC) (view V (viewType NETLIST) (interface {interface}) {inside}))\n"


def placed(name: str, of: str, more: str = "") -> str:
    """An instance."""
    return f"(instance {name} (viewRef V (cellRef {of})) {more})"


def net(name: str, *ends: str) -> str:
    """A net that joins pins (``R1.A``) and own ports (``A``)."""
    refs = (end.split(".") for end in ends)
    joined = (f"(portRef {ref[1]} (instanceRef {ref[0]}))" if len(ref) == 2 else f"(portRef {ref[0]})" for ref in refs)
    return f"(net {name} (joined {' '.join(joined)}))"


RES = cell("R", interface="(port A) (port B)")


def board(contents: str, *, cells: str = RES, interface: str = "", design: str = "(design x (cellRef TOP))") -> bytes:
    """A file of one library, with what a test is about inside its top cell, on line 4."""
    return f"{HEAD}{LIBRARY}{cells}{cell('TOP', contents or '(net NONE (joined))', interface)})\n{design})\n".encode()


def read(data: bytes) -> Netlist:
    return read_netlist_bytes(data, "x.edf")


def test_the_public_name_and_the_file_facts() -> None:
    path = VALID / "flat.edf"
    netlist = protlint.read_netlist(path)
    assert netlist.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert netlist.file.endswith("flat.edf")
    assert netlist.facts["written by"] == "Netwriter 7.1"
    assert netlist.facts["libraries"] == "PARTS (2 cells), BOARD (1 cell)"


def test_standard_input(monkeypatch: pytest.MonkeyPatch) -> None:
    data = (VALID / "flat.edf").read_bytes()
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(data)))
    netlist = read_netlist("-")
    assert netlist.file == "<standard input>"
    assert len(netlist.parts) == 2


@pytest.mark.parametrize("name", ["absent.edf", "."])
def test_files_that_cannot_be_read(tmp_path: Path, name: str) -> None:
    with pytest.raises(FileError) as caught:
        read_netlist(tmp_path / name)
    assert caught.value.exit_code == 2


def test_choosing_a_design() -> None:
    path = VALID / "designs.edf"
    for name in ("SECOND", "second", "second board", "Second Board"):
        netlist = read_netlist(path, design=name)
        assert (netlist.design, [part.id for part in netlist.parts]) == ("second board", ["R2"])
        assert not netlist.warnings
    with pytest.raises(UsageError, match="FIRST, second board"):
        read_netlist(path, design="THIRD")
    with pytest.raises(UsageError, match="designs in the file: none"):
        read_netlist(VALID / "no-design.edf", design="TOP")
    with pytest.raises(InputError, match="NOT_THERE of the design lost is not in the file"):
        read_netlist(VALID / "unresolved.edf", design="lost")


def test_of_many_designs_a_few_are_named() -> None:
    data = board(placed("R1", "R"), design="".join(f"(design d{number} (cellRef TOP))" for number in range(1000)))
    (warning,) = read(data).warnings
    assert "d0, d1, d2, d3, d4, d5 and 994 more" in warning.message
    with pytest.raises(UsageError, match="d5 and 994 more"):
        read_netlist_bytes(data, "x.edf", design="other")


def test_codes_without_end_between_per_cent_signs_take_little_memory() -> None:
    data = board(placed("R1", "R", f'(property P (string "%{"6 " * 1_000_000}"))'))
    assert len(str(read(data).parts[0].properties["p"].value)) == 2_000_001


def test_of_several_cells_nothing_places_the_fullest_is_taken() -> None:
    contents = placed("R1", "R") + placed("R2", "R")
    netlist = read(board(contents, cells=RES + cell("OTHER", placed("R9", "R")), design=""))
    assert [part.id for part in netlist.parts] == ["R1", "R2"]
    assert [(each.line, "OTHER, TOP" in each.message) for each in netlist.warnings] == [(5, True)]


def test_encodings_asked_for() -> None:
    data = board(placed("R1", "R", '(property VALUE (string "47к"))'))
    text = data.decode()
    for encoding in ("cp1251", "utf-16", "utf-16-le", "koi8-r"):
        netlist = read_netlist_bytes(text.encode(encoding), "x.edf", encoding=encoding)
        assert netlist.parts[0].properties["value"].value == "47к"
        assert [(each.count, encoding in each.message) for each in netlist.warnings] == [(1, True)]
    assert read_netlist_bytes(text.encode("cp1251"), "x.edf").parts[0].properties["value"].value == "47ê"
    undefined_in_cp1252 = text.replace("к", "\x81").encode("latin-1")
    assert "latin-1" in read_netlist_bytes(undefined_in_cp1252, "x.edf").warnings[0].message
    with pytest.raises(InputError, match=r"^x.edf:4:"):
        read_netlist_bytes(text.encode("cp1251"), "x.edf", encoding="utf-8")
    with pytest.raises(UsageError, match="no encoding is called"):
        read_netlist_bytes(data, "x.edf", encoding="klingon")


def test_text_of_another_kind() -> None:
    with pytest.raises(InputError, match=r"x.edf:2:3: a NUL character"):
        read(b"(edif x\nab\0")
    assert [part.id for part in read(board(placed("R1", "R")).decode().encode("utf-16")).parts] == ["R1"]
    for unmarked in ("utf-16-le", "utf-16-be"):
        with pytest.raises(InputError, match=f"--encoding {unmarked} reads"):
            read(board("").decode().encode(unmarked))
    with pytest.raises(InputError, match="packed with zip: unpack it first"):
        read(b"PK\x03\x04" + bytes(100))
    with pytest.raises(InputError, match="1:1: this is something else"):
        read(bytes(range(1, 256)) * 50)


def test_names_that_differ_in_case_only_stay_apart() -> None:
    contents = placed("r1", "C") + placed("R1", "C") + net("X", "r1.CLK", "R1.clk")
    netlist = read(board(contents, cells=cell("C", interface="(port clk) (port CLK)")))
    assert [(part.id, [pin.name for pin in part.pins]) for part in netlist.parts] == [("r1", ["CLK"]), ("R1", ["clk"])]
    assert [(each.count, "only in case" in each.message) for each in netlist.warnings] == [(2, True)]


def test_of_two_ports_alike_to_the_letter_the_first_counts() -> None:
    contents = placed("U1", "C") + net("X", "U1.P") + net("Y", "U1.Q")
    netlist = read(board(contents, cells=cell("C", interface='(port (rename P "first")) (port P) (port Q)')))
    assert [pin.name for pin in netlist.parts[0].pins] == ["first", "Q"]
    assert [(each.count, "one identifier for two" in each.message) for each in netlist.warnings] == [(1, True)]


def test_things_of_different_width() -> None:
    contents = placed("U1", "C") + placed("U2", "C") + net("GND", "U1.P") + net("(array D 2)", "U2.P")
    netlist = read(board(contents, cells=cell("C", interface="(port (array P 3))")))
    assert [[netlist.nets[pin.net].name for pin in part.pins] for part in netlist.parts] == [["GND"] * 3, ["D[0]", "D[1]"]]
    assert [each.count for each in netlist.warnings] == [2]


def test_a_blocks_port_on_two_nets_is_one_node() -> None:
    box = cell("BOX", placed("R9", "R") + net("I", "P", "R9.A"), "(port P)")
    contents = placed("X1", "BOX") + placed("R1", "R") + net("N1", "X1.P") + net("N2", "X1.P", "R1.A")
    netlist = read(board(contents, cells=RES + box))
    assert [net.name for net in netlist.nets] == ["N1"]
    assert len(netlist.nets[0].pins) == 2
    assert ["a block's port on two nets" in each.message for each in netlist.warnings] == [True]


def test_one_designator_on_parts_of_different_cells() -> None:
    """A relay's coil and contact are one package by their pin numbers; a transistor and a diode are two parts."""
    cells = (
        cell("COIL", interface='(port P (designator "1")) (port N (designator "8"))')
        + cell("CONTACT", interface='(port A (designator "3")) (port B (designator "4"))')
        + cell("NPN", interface="(port B) (port C) (port E)")
        + cell("DIODE", interface="(port A) (port K)")
    )
    contents = (
        placed("I1", "COIL", '(designator "K1")')
        + placed("I2", "CONTACT", '(designator "K1")')
        + placed("I3", "NPN", '(designator "Q1")')
        + placed("I4", "DIODE", '(designator "Q1")')
        + net("N1", "I1.P", "I2.A", "I3.B", "I4.A")
        + net("N2", "I1.N", "I2.B", "I3.C", "I4.K")
    )
    netlist = read(board(contents, cells=cells))
    assert [part.id for part in netlist.parts] == ["K1#1", "K1#2", "Q1#1", "Q1#2"]
    assert [(each.designator, each.parts) for each in netlist.duplicate_designators] == [("Q1", (2, 3))]
    assert netlist.facts["sections"] == "2 parts are sections of 1 package"
    assert [(each.line, each.count) for each in netlist.warnings] == [(7, 1)] and "Q1" in netlist.warnings[0].message


def test_a_designator_of_an_arrays_later_element_that_stands_elsewhere_too() -> None:
    """An array under one designator is one package; of elements with designators of their own each counts."""
    contents = placed("(array ROW 3)", "R", '(designator "R7 R8 R9")') + placed("I1", "R", '(designator "R9")')
    contents += placed("(array PAIR 2)", "R", '(designator "RN1")')
    netlist = read(board(contents))
    assert [part.id for part in netlist.parts] == ["R7", "R8", "R9#1", "R9#2", "RN1[0]", "RN1[1]"]
    assert [(each.designator, each.parts) for each in netlist.duplicate_designators] == [("R9", (2, 3))]
    assert ["R9" in each.message for each in netlist.warnings] == [True]
    within = read(board(placed("(array ROW 2)", "R", '(designator "R7 R7")')))
    assert [(each.designator, each.parts) for each in within.duplicate_designators] == [("R7", (0, 1))]


@pytest.mark.parametrize("name", ["RefDes", "REF_DES", '(rename REFERENCE "Part Reference")', "Reference", "Designator"])
def test_a_designator_in_a_property_counts_where_no_form_states_one(name: str) -> None:
    """Practice of exporters, from memory; the standard's own place is the designator form, which comes first."""
    contents = (
        placed("I1", "R", f'(property {name} (string "R7"))')
        + placed("I2", "R", f'(designator "R8") (property {name} (string "R9"))')
        + placed("I3", "R", f'(property {name} (string "see note 4"))')
        + placed("I4", "R", f'(designator "") (property {name} (string "R?"))')
        + placed("I5", "R", '(property Name (string "R10"))')
    )
    netlist = read(board(contents))
    assert [part.designator for part in netlist.parts] == ["R7", "R8", None, None, None]
    assert [part.id for part in netlist.parts] == ["R7", "R8", "I3", "R?", "I5"]
    assert netlist.facts["designators"] == "2 stated in the file, 1 of them in a property, 3 parts without one"


def test_a_section_and_its_package_in_properties() -> None:
    both = '(property Reference (string "Q1")) (property (rename PR "Part Reference") (string "Q1{}"))'
    contents = placed("I1", "R", both.format("A")) + placed("I2", "R", both.format("B"))
    netlist = read(board(contents))
    assert [(part.id, part.designator) for part in netlist.parts] == [("Q1A", "Q1"), ("Q1B", "Q1")]
    assert netlist.duplicate_designators == ()


def test_a_designator_in_a_property_of_the_cell_is_no_parts_own() -> None:
    cells = '(cell R (cellType GENERIC) (property RefDes (string "R?")) (view V (viewType NETLIST) (interface (port A))))'
    netlist = read(board(placed("R7", "R") + placed("R8", "R"), cells=cells))
    assert [part.designator for part in netlist.parts] == ["R7", "R8"]


def test_a_part_whose_cell_joins_pins_inside() -> None:
    jumper = cell("J", interface="(port A) (port B) (port C) (joined (portRef A) (portRef B))")
    contents = placed("J1", "J") + net("N1", "J1.A") + net("N2", "J1.B") + net("N3", "J1.C")
    netlist = read(board(contents, cells=jumper))
    assert [(node.name, len(node.pins)) for node in netlist.nets] == [("N1", 2), ("N3", 1)]
    assert netlist.facts["joined inside"].startswith("1 part,")


def test_a_global_reaches_what_no_port_joins() -> None:
    """A cell two levels down, the cell between knowing nothing of it; and a global that a block also leads out by a port."""
    leaf = cell("LEAF", placed("R1", "R") + net("Q", "R1.A").replace("(portRef", "(globalPortRef G) (portRef"))
    both = cell("BOTH", "(net Q (joined (portRef P) (globalPortRef G)))", "(port P)")
    contents = placed("X1", "MID") + placed("X2", "BOTH") + placed("R2", "R") + net("N", "X2.P", "R2.A")
    netlist = read(board(contents, cells=RES + leaf + cell("MID", placed("I", "LEAF")) + both))
    assert [(each.name, len(each.pins)) for each in netlist.nets] == [("G", 2)]
    assert [each.count for each in netlist.warnings] == [2]


def test_a_list_under_an_alias_that_is_never_closed() -> None:
    text = board(net("X", "Y") + net("Z", "Y")).decode()
    text = text.replace("(keywordLevel 0)", "(keywordLevel 1) (keywordAlias N net)").replace("(net ", "(N ")
    assert [each.name for each in read(text.encode()).nets] == ["X"]
    with pytest.raises(
        InputError, match=r"x.edf:4:80: \(n ...\) is never closed; it is still open where \(n ...\) begins at 4:105"
    ):
        read(text.replace("(joined (portRef Y)))", "(joined (portRef Y))", 1).encode())


def test_nets_that_only_their_names_join_are_told() -> None:
    pages = "".join(f"(page P{number} {placed('R', 'R')} {net('GND', 'R.A')})" for number in range(2))
    netlist = read(board(pages))
    assert [(each.name, len(each.pins)) for each in netlist.nets] == [("GND", 1), ("GND", 1)]
    assert netlist.facts["nets named alike"] == "GND: nothing joins them, so they are kept apart"


def test_a_ripper_that_does_not_say_what_it_joins() -> None:
    ripper = cell("RIP", interface="(port A) (port B)").replace("GENERIC", "RIPPER")
    mark = cell("MARK", interface="(port A)").replace("GENERIC", "TIE")
    contents = placed("X1", "RIP") + placed("X2", "MARK") + placed("R1", "R") + net("N", "R1.A", "X1.A", "X2.A")
    netlist = read(board(contents + net("M", "R1.B", "X1.B"), cells=RES + ripper + mark))
    assert [(each.name, len(each.pins)) for each in netlist.nets] == [("N", 1), ("M", 1)]
    [warning] = netlist.warnings
    assert ("nothing is joined through it: X1, a RIP" in warning.message, warning.line, warning.count) == (True, 6, 1)


def test_a_pin_on_three_nets_is_told_twice() -> None:
    contents = placed("R1", "R") + net("N1", "R1.A") + net("N2", "R1.A", "R1.A") + net("N3", "R1.A")
    netlist = read(board(contents))
    told = [[netlist.nets[each].name for each in twice.nets] for twice in netlist.pins_on_two_nets]
    assert told == [["N1", "N2"], ["N1", "N3"]]
    assert [len(each.pins) for each in netlist.nets] == [1, 0, 0]


def test_without_a_design_contents_of_a_layout_are_a_last_resort() -> None:
    layout = (
        "(cell ART (cellType GENERIC) (view L (viewType PCBLAYOUT) (interface)"
        f" (contents {placed('V1', 'R') + placed('V2', 'R')})))"
    )
    assert [part.id for part in read(board(placed("R1", "R"), cells=RES + layout, design="")).parts] == ["R1"]
    only_layout = f"{HEAD}{LIBRARY}{RES}{layout}))".encode()
    assert [part.id for part in read(only_layout).parts] == ["V1", "V2"]


def test_parts_with_unlike_designators_and_slashes() -> None:
    contents = (
        placed("I1", "R", '(designator "R1") (designator "K7")')
        + placed("I2", "R", '(designator "A/B")')
        + placed("A", "BOX")
        + placed("I3", "R", '(designator "R#") (designator "R")')
        + placed("I4", "R", '(designator "U2") (designator "U2-2")')
    )
    netlist = read(board(contents, cells=RES + cell("BOX", placed("I1", "R", '(designator "B")'))))
    assert [part.id for part in netlist.parts] == ["R1", "A/B", "A/B#2", "R#", "U2-2"]
    assert [part.designator for part in netlist.parts] == ["R1", "A/B", "B", "R", "U2"]
    assert ["two unlike designators" in each.message for each in netlist.warnings] == [True]


def test_pin_names_and_numbers() -> None:
    interface = '(port &1 (property Name (string "BASE"))) (port &2) (port G (designator "5 12 13")) (port (array D 2))'
    said = (
        '(portInstance &2 (property (rename N "Pin Name") (string "EMITTER")) (designator "3"))'
        '(portInstance (member D 1) (designator "D1"))'
    )
    joined = net("X", "Q1.&1", "Q1.&2", "Q1.G", "Q1.(member D 0)", "Q1.(member D 1)")
    netlist = read(board(placed("Q1", "C", said) + joined, cells=cell("C", interface=interface)))
    assert [(pin.name, pin.number) for pin in netlist.parts[0].pins] == [
        ("BASE", "1"), ("EMITTER", "3"), ("G", "5 12 13"), ("D[0]", None), ("D[1]", "D1"),
    ]  # fmt: skip


LIMITS = {
    "a large array of instances": (placed("(array R 60000)", "R") * 40, f"{ELEMENTS_LIMIT} elements"),
    "whole arrays joined over and over": (placed("(array R 60000)", "R") + net("X", *["R.A"] * 40), f"{ELEMENTS_LIMIT} el"),
    "arrays of nets": ("".join(net(f"(array N{number} 60000)") for number in range(40)), f"{ELEMENTS_LIMIT} elements"),
    "an array past its own limit": (net(f"(array N {ARRAY_LIMIT + 1})"), f"more than {ARRAY_LIMIT} elements"),
    "an array with a long name": (net(f'(array (rename N "{"n" * 1001}") 60000)'), "name of more than 1000 characters"),
    "an array with a long designator": (
        placed("(array R 60000)", "R", f'(designator "{"R " * 700}")'),
        "designator of more than 1000 characters",
    ),
    "an array of too many dimensions": (net("(array N 2 2 2 2 2)"), "4 dimensions"),
    "an array of more than any memory holds": (placed(f"(array R {2 * 10**9})", "R"), f"more than {ARRAY_LIMIT} elements"),
}


@pytest.mark.parametrize("name", LIMITS)
def test_what_is_too_large_is_refused_in_bounded_time(name: str) -> None:
    contents, says = LIMITS[name]
    started = time.perf_counter()
    with pytest.raises(InputError, match=says) as caught:
        read(board(contents))
    assert caught.value.line == 4
    assert time.perf_counter() - started < 60  # a bound on hanging, no measure of speed


def test_long_lists_of_pin_numbers_and_designators_for_arrays() -> None:
    """One list each, not one copy for every element: 65,536 copies of 400 kB are more than any memory holds."""
    listed = " ".join(map(str, range(ARRAY_LIMIT)))
    cells = RES + cell("IC", interface=f'(port (array D {ARRAY_LIMIT}) (designator "{listed}"))')
    cells += cell("PLAIN", interface=f"(port (array D {ARRAY_LIMIT}))")
    contents = placed("U1", "IC") + placed("U2", "PLAIN", f'(portInstance D (designator "{listed}"))')
    contents += placed("U3", "PLAIN", '(portInstance D (designator "1 2 3"))')
    contents += placed(f"(array ROW {ARRAY_LIMIT})", "R", f'(designator "{listed}")')
    contents += net(f"(array N {ARRAY_LIMIT})", "U1.D", "U2.D", "U3.D")
    netlist = read(board(contents, cells=cells))
    first, second, third = netlist.parts[:3]
    assert first.pins[40_000].number == second.pins[40_000].number == "40000"
    assert third.pins[2].number is None
    assert netlist.parts[-1].designator == str(ARRAY_LIMIT - 1)


def test_parts_share_the_many_properties_of_a_cell() -> None:
    many = "".join(f'(property P{number} (string "{number}"))' for number in range(COPIED_PROPERTIES + 1))
    listed = cell("C", interface="(port A)").replace("(view", f"{many} (view")
    contents = "".join(
        placed(f"U{number}", "C", '(property p1 (string "own")) (property X (string "x"))') for number in (1, 2)
    )
    one, other = read(board(contents, cells=listed)).parts
    assert len(one.properties) == COPIED_PROPERTIES + 2
    assert [one.properties[name].value for name in ("p0", "p1", "x")] == ["0", "own", "x"]
    assert one.properties["p0"] is other.properties["p0"]
    assert list(one.properties)[:2] == ["p0", "p1"]


def test_globals_that_every_one_of_many_cells_leads_out() -> None:
    busy = cell("BUSY", "".join(f"(net N{number} (joined (globalPortRef G{number})))" for number in range(1000)))
    contents = "".join(placed(f"X{number}", "BUSY") for number in range(1500))
    with pytest.raises(InputError, match=f"globals of this file name more than {ELEMENTS_LIMIT} elements"):
        read(board(contents, cells=busy))


def nest(levels: int, width: int) -> str:
    """Cells each of which places the one before ``width`` times, with a net apiece."""
    cells = [RES, cell("C0", placed("R1", "R"))]
    for level in range(1, levels):
        inside = "".join(placed(f"X{number}", f"C{level - 1}") for number in range(width))
        cells.append(cell(f"C{level}", inside + net("N")))
    return "".join(cells)


def test_a_hierarchy_of_more_parts_than_any_memory_holds() -> None:
    with pytest.raises(InputError, match=f"more than {SIZE_LIMIT} parts"):
        read(board(placed("X", "C39"), cells=nest(40, 2)))


def test_the_deepest_hierarchy_that_is_read() -> None:
    netlist = read(board(placed("X", f"C{DEPTH_LIMIT - 2}"), cells=nest(DEPTH_LIMIT - 1, 1)))
    assert netlist.parts[0].id.count("/") == DEPTH_LIMIT - 1
    with pytest.raises(InputError, match="levels of hierarchy"):
        read(board(placed("X", f"C{DEPTH_LIMIT - 1}"), cells=nest(DEPTH_LIMIT, 1)))
    shallow_first = "".join(placed(f"X{level}", f"C{level}") for level in range(3000))
    with pytest.raises(InputError, match="levels of hierarchy"):
        read(board(shallow_first, cells=nest(3000, 1)))


def test_names_that_grow_with_every_level() -> None:
    long_name = "N" * 100_000
    cells = nest(15, 2).replace("instance X0", f"instance {long_name}")
    with pytest.raises(InputError, match=f"{NAMES_LIMIT} characters of names"):
        read(board(placed("X", "C14"), cells=cells))


def test_a_net_that_joins_itself() -> None:
    netlist = read(board("(net X (joined (portRef X) (portRef X)) (net X (joined (portRef X))))", interface="(port X)"))
    assert [(net.name, net.pins) for net in netlist.nets] == [("X", ())]
    with pytest.raises(InputError, match="nested more than 200 deep"):
        read(board("(net X" * 1000 + ")" * 1000))


def test_sizes_of_files_and_lines(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(protlint.netlist, "LINE_LIMIT", 2000)
    long_line = board(placed("R1", "R", f'(property A (string "{"x" * 3000}"))'))
    with pytest.raises(InputError, match=r"x.edf:4:1: a line of more than 2000 bytes"):
        read(long_line)
    many_lines = board("(net X (joined))\n" * 500)
    assert len(many_lines) > 4000
    assert len(read(many_lines).nets) == 500
    monkeypatch.setattr(protlint.netlist, "FILE_LIMIT", 1_000_000)
    large = tmp_path / "large.edf"
    large.write_bytes(b"(edif" + b" " * 1_000_000)
    with pytest.raises(InputError, match="larger than 1 MB"):
        read_netlist(large)


def test_a_line_of_two_hundred_megabytes() -> None:
    for data in (b"(edif x " + b"a" * 200_000_000, b'(edif "' + b"(" * 200_000_000):
        with pytest.raises(InputError, match="a line of more than 100000000 bytes"):
            read(data)


def test_two_hundred_thousand_parentheses() -> None:
    for start in (b"", b"(edif ", HEAD.encode(), HEAD.encode() + b"(comment "):
        with pytest.raises(InputError) as caught:
            read(start + b"(" * 200_000)
        assert caught.value.line in (1, 2)


def test_an_endless_file_is_not_read_to_its_end() -> None:
    code = (
        "import protlint.netlist as n\n"
        "n.FILE_LIMIT = 5_000_000\n"
        "try: n.read_netlist('/dev/zero')\n"
        "except n.InputError as error: print(error)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True)
    assert done.stdout == "zero: larger than 5 MB, the most that is read\n"


def test_same_bytes_same_netlist() -> None:
    for path in sorted(VALID.glob("*.edf")):
        assert read_netlist(path) == read_netlist(path)


def test_reading_loads_nothing_heavy() -> None:
    code = "import sys, protlint.netlist; print(sorted({'numpy', 'networkx', 'pint', 'scipy', 'click'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True)
    assert done.stdout == "[]\n"
