"""The whole family through the road: every circuit of fixtures/circuits read from EDIF, found, named right.

Each ``NAME.edf`` has a twin ``NAME.toml`` that says where the circuit was published, and what is to be found: topology,
polarity, the parts of each role, the nets. What the twin does not name must not be there.
"""

from __future__ import annotations

import tomllib
from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from functools import cache, partial
from pathlib import Path
from typing import Any

import pytest

from protlint.board.graph import build_board
from protlint.limits_file import load_limits
from protlint.netlist import read_netlist, read_netlist_bytes
from protlint.netlist.model import Netlist
from protlint.partdata.book import load_book
from protlint.topology.language import load_rules
from protlint.topology.match import find_limiters
from tests.support.edif_text import drawn, flat_netlist, schematic_pages
from tests.support.paths import FIXTURES

CIRCUITS = sorted((FIXTURES / "circuits").glob("*.edf"))


@cache
def rules_and_book() -> tuple[Any, Any]:
    return load_rules(), load_book([])


@cache
def twin(path: Path) -> dict[str, Any]:
    return tomllib.loads(path.with_suffix(".toml").read_text(encoding="utf-8"))


@cache
def found_in(path: Path) -> list[dict[str, Any]]:
    """Return what is found in a file, in the terms of its twin."""
    return found_on(read_netlist(path))


def found_on(netlist: Netlist) -> list[dict[str, Any]]:
    rules, book = rules_and_book()
    board = build_board(netlist, limits=load_limits(None), book=book)
    found = find_limiters(board, rules)
    assert not found.faults
    return [
        {
            "topology": one.topology,
            "polarity": one.polarity,
            "roles": {role: list(parts) for role, parts in one.roles.items() if parts},
            "nets": {role: board.nets[net].name for role, net in one.nets.items() if net is not None},
        }
        for one in found.limiters
    ]


def plain(limiter: Mapping[str, Any]) -> tuple[Any, ...]:
    """Return a limiter with the parts of every role sorted, for comparing."""
    roles = {role: sorted(parts) for role, parts in limiter["roles"].items()}
    return limiter["topology"], limiter["polarity"], sorted(roles.items()), sorted(limiter["nets"].items())


@pytest.mark.parametrize("path", CIRCUITS, ids=lambda path: path.stem)
def test_every_circuit_is_found_and_named_right(path: Path) -> None:
    assert sorted(map(plain, found_in(path))) == sorted(map(plain, twin(path)["limiter"]))


@pytest.mark.parametrize("path", CIRCUITS, ids=lambda path: path.stem)
def test_it_is_found_however_it_is_drawn(path: Path) -> None:
    """Written again by the other exporter: a flat netlist as schematic pages, pages as a flat netlist."""
    was_flat = twin(path)["drawn_as"] == "flat netlist"
    write = partial(schematic_pages, pages=3) if was_flat else flat_netlist
    text = write("AGAIN", drawn(read_netlist(path)), remark="written again")
    again = read_netlist_bytes(text.encode(), "again.edf")
    assert sorted(map(plain, found_on(again))) == sorted(map(plain, found_in(path)))


def test_one_board_may_hold_every_topology() -> None:
    found = found_in(FIXTURES / "family" / "quayside-outputs.edf")
    assert {one["topology"] for one in found} == set(rules_and_book()[0].topologies)
    assert len(found) == 13


def test_the_family_is_covered() -> None:
    """At least 40 circuits, every topology in the polarities it has and both ways of drawing, a third of them published."""
    cases = {
        (one["topology"], one["polarity"], twin(path)["drawn_as"]) for path in CIRCUITS for one in twin(path)["limiter"]
    }
    topologies = set(rules_and_book()[0].topologies)
    assert len(CIRCUITS) >= 40
    assert {topology for topology, _, _ in cases} == topologies
    for topology in topologies:
        both = rules_and_book()[0].topologies[topology].both_polarities
        assert {polarity for name, polarity, _ in cases if name == topology} == ({"n", "p"} if both else {"n"}), topology
        assert len({drawn for name, _, drawn in cases if name == topology}) == 2, topology
    published = [path for path in CIRCUITS if twin(path)["published"]]
    assert 3 * len(published) >= len(CIRCUITS)
    assert all(twin(path)["source"] for path in CIRCUITS)


def test_the_table(show: Callable[[Sequence[str]], None]) -> None:
    """Print how many of each topology are found, named right and missed; none may be missed."""
    counts: dict[str, Counter[str]] = {}
    for path in CIRCUITS:
        found = found_in(path)
        for wanted in twin(path)["limiter"]:
            count = counts.setdefault(wanted["topology"], Counter())
            shunt = sorted(wanted["roles"]["shunt"])
            same_shunt = [one for one in found if sorted(one["roles"]["shunt"]) == shunt]
            count["circuits"] += 1
            count["published"] += twin(path)["published"]
            count["found"] += bool(same_shunt)
            count["named right"] += plain(wanted) in map(plain, same_shunt)
            count["missed"] += not same_shunt
    columns = ("circuits", "published", "found", "named right", "missed")
    lines = [f"{'topology':<30}" + "".join(f"{column:>13}" for column in columns)]
    lines += [
        f"{name:<30}" + "".join(f"{count[column]:>13}" for column in columns) for name, count in sorted(counts.items())
    ]
    total = sum(counts.values(), Counter())
    lines += [f"{'all':<30}" + "".join(f"{total[column]:>13}" for column in columns)]
    show(lines)
    assert total["missed"] == 0
