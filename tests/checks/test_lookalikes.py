"""Circuits that look like limiters and are none: each of fixtures/lookalikes is read, and nothing is said of it.

A file's own comment says what its circuit is. Every one is reviewed through the whole road, without a limits file and with
one that asks something of every output.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from functools import cache
from pathlib import Path

import pytest

from protlint.board.graph import Board
from protlint.netlist import read_netlist
from protlint.pipeline import Desk, Review, review_netlist, set_up
from tests.support.paths import FIXTURES

CIRCUITS = sorted((FIXTURES / "lookalikes").glob("*.edf"))
ASKED = """[limiter."*"]
carry = "1 mA"
cap = "2 A"
output = "2 V"
"""


@cache
def bare_desk() -> Desk:
    return set_up()


@cache
def reviewed(path: Path) -> Review:
    return review_netlist(read_netlist(path), bare_desk())


def what_it_is(path: Path) -> str:
    comment = re.search(r'\(comment "([^"]*)"\)', path.read_text(encoding="utf-8"), re.IGNORECASE)
    assert comment is not None
    return comment[1]


def wiring(board: Board) -> frozenset[tuple[object, ...]]:
    """Return what makes a circuit its own kind: how many parts of each kind hang together in which roles."""
    return frozenset(
        (net.supply is not None, *sorted((board.parts[part].kind, role) for part, role in net.pins)) for net in board.nets
    )


@pytest.mark.parametrize("path", CIRCUITS, ids=lambda path: path.stem)
def test_a_look_alike_is_no_limiter_and_raises_no_alarm(path: Path) -> None:
    found = reviewed(path)
    assert [(one.limiter.id, one.limiter.topology) for one in found.limiters] == []
    assert [(one.check, one.level, one.parts) for one in found.findings] == []
    assert found.remarks == ()


@pytest.mark.parametrize("path", CIRCUITS, ids=lambda path: path.stem)
def test_every_part_of_it_is_known(path: Path) -> None:
    """A circuit whose parts are not understood would be quiet for the wrong reason."""
    board = reviewed(path).board
    assert [part.id for part in board.parts if part.kind == "unknown" or not part.roles] == []
    assert any(net.supply is not None for net in board.nets)


def test_nothing_is_said_where_limits_are_stated_either(tmp_path: Path) -> None:
    limits = tmp_path / "limits.toml"
    limits.write_text(ASKED, encoding="utf-8")
    desk = set_up(limits=limits)
    for path in CIRCUITS:
        found = review_netlist(read_netlist(path), desk)
        assert (found.limiters, found.findings) == ((), ()), path.stem


def test_there_are_enough_and_each_is_of_its_own_kind() -> None:
    assert len(CIRCUITS) >= 30
    assert len({wiring(reviewed(path).board) for path in CIRCUITS}) == len(CIRCUITS)
    assert len({what_it_is(path) for path in CIRCUITS}) == len(CIRCUITS)


def test_the_table_of_look_alikes(show: Callable[[Sequence[str]], None]) -> None:
    """Print every look-alike, alarmed or quiet."""
    lines, alarmed = [], 0
    for path in CIRCUITS:
        found = reviewed(path)
        said = [one.limiter.topology for one in found.limiters] + [one.check for one in found.findings]
        alarmed += bool(said)
        lines.append(f"{path.stem:<36}{'alarmed: ' + ', '.join(said) if said else 'quiet':<10}  {what_it_is(path)}"[:125])
    lines.append(f"{len(CIRCUITS)} look-alikes, {alarmed} alarmed, {len(CIRCUITS) - alarmed} quiet")
    show(lines)
    assert alarmed == 0
