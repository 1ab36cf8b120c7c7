"""The rack of 10,000 parts: what its file says is read pin by pin, and the survey counts what its twin counts."""

from __future__ import annotations

import json
import re
from typing import Any

import pytest

from protlint.netlist import read_netlist
from tests.support import rack
from tests.support.board_writer import groups
from tests.support.command import protlint
from tests.support.paths import ROOT


@pytest.fixture(scope="module")
def twin() -> dict[str, Any]:
    said: dict[str, Any] = json.loads(rack.RACK.with_suffix(".json").read_text(encoding="utf-8"))
    return said


@pytest.fixture(scope="module")
def surveyed() -> str:
    done = protlint("survey", rack.RACK.relative_to(ROOT).as_posix(), folder=ROOT)
    assert (done.returncode, done.stderr) == (0, "")
    return done.stdout


def test_the_file_and_its_twin_are_what_the_lists_say(twin: dict[str, Any]) -> None:
    assert rack.RACK.read_bytes() == rack.text().encode(), "write it anew: python -m tests.support.rack"
    assert twin == rack.twin()


def test_the_twin_holds_what_a_hand_counts(twin: dict[str, Any]) -> None:
    """Of a filter 14 parts, five filters an input, 16 inputs a card, two outputs of 12, 100 of its own; 48 of the rack's."""
    assert twin["parts"] == 8 * (16 * 5 * 14 + 2 * 12 + 100) + 48 == 10_000
    assert twin["parts_by_cell"]["CAP"] == 8 * (16 * 5 * 6 + 2 * 2 + 15 + 16) + 10
    assert twin["parts_by_cell"]["RES"] == 8 * (16 * 5 * 4 + 2 * 6 + 3 * 16) + 2 * 16
    assert twin["pins_on_supplies"]["-12V"] == 8 * 16 * 5 * (2 + 1 + 1) + 1 + 2
    assert len(twin["ends_of_bus_bit_5"]) == 8 + 1 + 1
    assert len(twin["limiters"]) == 8 * 2


def test_every_pin_is_where_the_lists_put_it(twin: dict[str, Any]) -> None:
    netlist = read_netlist(rack.RACK)
    found = {part.id: {pin.name: str(pin.net) for pin in part.pins} for part in netlist.parts}
    meant = rack.truth()
    assert {part: set(pins) for part, pins in found.items()} == {part: set(pins) for part, pins in meant.items()}
    assert groups(found) == groups(meant)
    assert netlist.warnings == netlist.pins_on_two_nets == netlist.duplicate_designators == ()
    assert len(netlist.nets) == twin["nets_with_pins"]
    sizes = {net.name: len(net.pins) for net in netlist.nets}
    assert {name: sizes[name] for name in twin["pins_on_supplies"]} == twin["pins_on_supplies"]


def test_the_survey_counts_what_the_twin_counts(twin: dict[str, Any], surveyed: str) -> None:
    plain = " ".join(surveyed.split())
    limiters, cells = len(twin["limiters"]), twin["parts_by_cell"]
    for expected in (
        f"{limiters} limiters found; design {twin['design']}, {twin['parts']} parts, {twin['nets_with_pins']} nets,"
        f" {twin['pins']} connected pins",
        f"drawn as: SCHEMATIC views, 9 pages, {twin['levels']} levels of hierarchy, {len(rack.CELLS)} cells",
        f"parts: {twin['parts']} of {len(cells)} cells",
        f"designators: {twin['parts']} stated in the file",
        "rippers and ties: 3, which join nets",
        f"value from: Value ({twin['parts']})",
        "a comma between digits parts fields",
    ):
        assert expected in plain, expected
    kinds = {kind: int(count) for count, kind in re.findall(r"^ {2,7}(\d+)  ([a-z ]+?) {2,}", surveyed, re.MULTILINE)}
    assert kinds == {
        "resistor": cells["RES"],
        "capacitor": cells["CAP"],
        "diode": cells["DIODE"] + cells["LED"],
        "npn": cells["NPN"],
        "ic": cells["OPAMP"] + cells["REGULATOR"] + cells["BUFFER16"] + cells["CPU"],
        "connector": cells["CONN8"],
    }
    assert re.findall(r"^  (\S+): emitter-sensed, n type$", surveyed, re.MULTILINE) == twin["limiters"]
    assert re.findall(r"no part data for (\S+) \(", surveyed) == list(reversed(twin["types_without_data"]))


def test_the_survey_of_ten_thousand_parts_is_short_and_tells_like_things_once(surveyed: str) -> None:
    lines = surveyed.splitlines()
    assert len(lines) < 200
    assert max(map(len, lines)) <= 80
    assert surveyed.count("in the held short") == 1
    assert surveyed.count("held, driven and solved as CARD1/O1/Q1") == 15
    assert "CARD1/+5V and 7 alike" in surveyed
