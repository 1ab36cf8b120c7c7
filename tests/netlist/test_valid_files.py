"""Every file of fixtures/netlist/valid against its twin, which was written by hand from the EDIF text."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from protlint.netlist import read_netlist
from tests.support.paths import FIXTURES
from tests.support.twins import plain_nets, plain_pins

VALID = sorted((FIXTURES / "netlist" / "valid").glob("*.edf"))


@pytest.fixture(params=VALID, ids=lambda path: path.stem)
def pair(request: pytest.FixtureRequest) -> tuple[Path, dict[str, Any]]:
    path: Path = request.param
    return path, json.loads(path.with_suffix(".json").read_text(encoding="utf-8"))


def test_there_are_files() -> None:
    assert len(VALID) >= 18


def test_parts_and_their_pins(pair: tuple[Path, dict[str, Any]]) -> None:
    path, twin = pair
    netlist = read_netlist(path)
    assert netlist.design == twin["design"]
    assert [part.id for part in netlist.parts] == list(twin["parts"])
    for index, (part, expected) in enumerate(zip(netlist.parts, twin["parts"].values(), strict=True)):
        assert (part.designator, part.cell, part.library) == (expected["designator"], expected["cell"], expected["library"])
        assert plain_pins(netlist, index) == expected["pins"], part.id
        if "line" in expected and path.stem != "cr":
            assert (part.line, part.column) == (expected["line"], expected["column"])


def test_properties(pair: tuple[Path, dict[str, Any]]) -> None:
    path, twin = pair
    for part in read_netlist(path).parts:
        expected = twin["parts"][part.id].get("properties")
        if expected is None:
            continue
        assert list(part.properties) == list(expected) or set(part.properties) == set(expected), part.id
        for name, value in expected.items():
            found = part.properties[name].value
            assert type(found) is type(value)
            assert found == (pytest.approx(value, rel=1e-12) if isinstance(value, float) else value), name
        for name, origin in twin["parts"][part.id].get("origins", {}).items():
            assert part.properties[name].origin == origin, name


def test_nets(pair: tuple[Path, dict[str, Any]]) -> None:
    path, twin = pair
    netlist = read_netlist(path)
    assert plain_nets(netlist) == {name: sorted(pins) for name, pins in twin["nets"].items()}
    assert [net.name for net in netlist.nets] == list(twin["nets"])
    for number, net in enumerate(netlist.nets):
        assert all(netlist.parts[part].pins[pin].net == number for part, pin in net.pins)


def test_warnings_and_findings(pair: tuple[Path, dict[str, Any]]) -> None:
    path, twin = pair
    netlist = read_netlist(path)
    assert [(each.line, each.column, each.count) for each in netlist.warnings] == [
        (each["line"], each["column"], each["count"]) for each in twin["warnings"]
    ], netlist.warnings
    for warning, expected in zip(netlist.warnings, twin["warnings"], strict=True):
        assert expected["says"] in warning.message
    twice = [
        {
            "pin": f"{netlist.parts[each.part].id}.{each.pin}",
            "nets": [netlist.nets[net].name for net in each.nets],
            "line": each.line,
            "column": each.column,
        }
        for each in netlist.pins_on_two_nets
    ]
    assert twice == twin.get("pins_on_two_nets", [])
    duplicates = {each.designator: [netlist.parts[part].id for part in each.parts] for each in netlist.duplicate_designators}
    assert duplicates == twin.get("duplicate_designators", {})


def test_the_facts_count_what_the_netlist_holds(pair: tuple[Path, dict[str, Any]]) -> None:
    path, twin = pair
    netlist = read_netlist(path)
    assert netlist.facts["parts"].startswith(f"{len(twin['parts'])} ")
    assert netlist.facts["nets"].startswith(f"{len(twin['nets'])},")
    assert all(isinstance(name, str) and isinstance(fact, str) and fact for name, fact in netlist.facts.items())
