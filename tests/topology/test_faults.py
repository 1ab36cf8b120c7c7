"""Every wiring fault on every circuit it can occur in: found and named, and its cure restores the sound limiter.

The faults are drawn into the circuits of fixtures/circuits, one at a time.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from protlint.board.graph import Board, build_board
from protlint.limits_file import load_limits
from protlint.netlist import read_netlist
from protlint.netlist.model import Netlist
from protlint.partdata.book import load_book
from protlint.topology.language import load_rules
from protlint.topology.limiter import FaultMatch, Found
from protlint.topology.match import find_limiters
from tests.support import edits
from tests.support.paths import FIXTURES

NOT_TOLD_APART = {("supply-preset-npn", "base-on-far-end"), ("supply-preset-npn", "sense-bypassed")}
"""A base held by a divider between two supplies is also how a voltage monitor is drawn: of these nothing is said."""


@dataclass(frozen=True)
class Case:
    circuit: str
    fault: str
    drawn: Netlist
    topology: str
    shunt: tuple[str, ...]


@cache
def settled() -> tuple[Any, Any, Any]:
    return load_rules(), load_book([]), load_limits(None)


def found_on(netlist: Netlist) -> tuple[Board, Found]:
    rules, book, limits = settled()
    board = build_board(netlist, limits=limits, book=book)
    return board, find_limiters(board, rules)


def is_supply(name: str) -> bool:
    return name == "GND" or name[0] in "+-"


@cache
def cases() -> tuple[Case, ...]:
    made = []
    for path in sorted((FIXTURES / "circuits").glob("*.edf")):
        wanted = tomllib.loads(path.with_suffix(".toml").read_text(encoding="utf-8"))["limiter"]
        if len(wanted) == 1:
            drawn = faults_of(read_netlist(path), wanted[0], path)
            shunt = tuple(wanted[0]["roles"]["shunt"])
            made += [Case(path.stem, fault, netlist, wanted[0]["topology"], shunt) for fault, netlist in drawn]
    return tuple(made)


def faults_of(netlist: Netlist, limiter: dict[str, Any], path: Path) -> Iterator[tuple[str, Netlist]]:
    """Yield (fault, netlist with that fault drawn into it)."""
    roles, nets = limiter["roles"], limiter["nets"]
    shunt, near, far = roles["shunt"][0], nets["sense"], nets["far"]
    if len(roles["shunt"]) > 1:
        yield "shunt-polarity-wrong", edits.exchanged(netlist, (shunt, "anode"), (shunt, "cathode"))
        return
    collector, base = "collector", "base"
    if limiter["topology"] == "latched-thyristor":
        collector, base = "anode", "gate"
        yield "shunt-pins-exchanged", edits.exchanged(netlist, (shunt, "anode"), (shunt, "cathode"))
        yield "shunt-pins-exchanged", edits.exchanged(netlist, (shunt, "gate"), (shunt, "cathode"))
        yield "shunt-pins-exchanged", edits.exchanged(netlist, (shunt, "gate"), (shunt, "anode"))
    else:
        yield "collector-emitter-swapped", edits.exchanged(netlist, (shunt, "collector"), (shunt, "emitter"))
        yield "base-emitter-swapped", edits.exchanged(netlist, (shunt, "base"), (shunt, "emitter"))
        yield "shunt-polarity-wrong", edits.other_polarity(netlist, shunt)
    for latch in (part for part in roles.get("others", ()) if limiter["topology"] == "latched-pair" and part[0] == "Q"):
        yield "shunt-pins-exchanged", edits.exchanged(netlist, (latch, "collector"), (latch, "emitter"))
        yield "shunt-pins-exchanged", edits.exchanged(netlist, (latch, "base"), (latch, "emitter"))
        yield "shunt-pins-exchanged", edits.exchanged(netlist, (latch, "collector"), (latch, "base"))
    supplies = [net.name for net in netlist.nets if is_supply(net.name) and net.name not in ("GND", far)]
    if supplies:
        yield "collector-not-on-the-drive", edits.moved(netlist, shunt, collector, supplies[0])
    drivers = roles.get("driver", [])
    if len(drivers) == 1 and "compound" not in path.stem:
        second_base = edits.net_of(netlist, drivers[0], "emitter")
        yield "collector-not-on-the-drive", edits.moved(netlist, shunt, "collector", second_base)
    if len(roles["sense"]) > 1:
        return
    yield "sense-bypassed", edits.with_link(netlist, near, far)
    resistors = [part for part in (*roles.get("base_stop", ()), *roles.get("preset", ())) if part.startswith("R")]
    stop = [(part, end) for part in resistors for end in "12" if edits.net_of(netlist, part, end) == near]
    part, pin = stop[0] if stop else (shunt, base)
    yield "base-on-far-end", edits.moved(netlist, part, pin, far)
    if is_supply(far):
        both = edits.twice(netlist, is_supply)
        yield "wrong-device-sensed", edits.moved(both, f"A/{part}", pin, f"B/{near}")


def names(case: Case) -> str:
    return f"{case.circuit} {case.fault}"


def only_fault(case: Case) -> FaultMatch | None:
    faults = found_on(case.drawn)[1].faults
    if len(faults) != 1 or faults[0].fault != case.fault:
        return None
    shunt = sorted(part.removeprefix("A/") for part in faults[0].group.roles["shunt"])
    return faults[0] if shunt == sorted(case.shunt) else None


def cured(board: Board, netlist: Netlist, fault: FaultMatch) -> Netlist:
    """Return the netlist with a fault's cure applied."""
    for one, other in fault.exchange:
        netlist = edits.exchanged(netlist, one, other)
    for (part, role), net in fault.moves:
        netlist = edits.moved(netlist, part, role, board.nets[net].name)
    for part, _ in fault.replaces:
        netlist = edits.other_polarity(netlist, part)
    return edits.without(netlist, fault.links)


@pytest.mark.parametrize("case", cases(), ids=names)
def test_a_fault_is_found_on_its_shunt_and_its_cure_holds(case: Case) -> None:
    if (case.circuit, case.fault) in NOT_TOLD_APART:
        assert not found_on(case.drawn)[1].faults
        return
    fault = only_fault(case)
    assert fault is not None
    assert all(part in fault.says for part in ((fault.turned,) if fault.turned else fault.group.roles["shunt"]))
    assert fault.exchange or fault.moves or fault.replaces or fault.parts_ends
    board, _ = found_on(case.drawn)
    _, after = found_on(cured(board, case.drawn, fault))
    assert not after.faults
    restored = {one.topology for one in after.limiters if one.roles["shunt"] == fault.group.roles["shunt"]}
    if (case.topology, case.fault) == ("preset-divider", "base-on-far-end"):
        assert restored <= {"preset-divider", "emitter-sensed"}  # both legs lie across each other, and both are moved
    else:
        assert restored == {case.topology}


def test_the_table_of_faults(show: Callable[[Sequence[str]], None]) -> None:
    """Print for every fault and topology how many of the drawn ones are found; and how many are known not to be told."""
    faults = sorted({case.fault for case in cases()})
    topologies = sorted({case.topology for case in cases()})
    lines = [f"{'found of drawn':<30}" + "".join(f"{topology[:12]:>14}" for topology in topologies)]
    missed = 0
    for fault in faults:
        cells = []
        for topology in topologies:
            drawn = [case for case in cases() if (case.fault, case.topology) == (fault, topology)]
            found = sum(only_fault(case) is not None for case in drawn)
            missed += sum(only_fault(case) is None and (case.circuit, case.fault) not in NOT_TOLD_APART for case in drawn)
            cells.append(f"{found} of {len(drawn)}" if drawn else "-")
        lines.append(f"{fault:<30}" + "".join(f"{cell:>14}" for cell in cells))
    show(lines)
    assert missed == 0
