"""What a board was written as, in whatever habits, is what is read; and damaged files end in one clear error."""

from __future__ import annotations

import json
import os
import random
from itertools import product

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from protlint.netlist import read_netlist_bytes
from protlint.netlist.model import Netlist
from protlint.sources import InputError, UsageError
from tests.support.board_writer import CELLS, Habits, Truth, groups, random_board, random_habits, write
from tests.support.damage import cut_up, rearranged
from tests.support.paths import FIXTURES

STEADY = settings(deadline=None, derandomize=True)
MUTATIONS = int(os.environ.get("PROTLINT_MUTATIONS", "10000"))
"""How many damaged files to read."""


def read(text: str) -> Netlist:
    return read_netlist_bytes(text.encode(), "board.edf")


def as_truth(netlist: Netlist) -> Truth:
    return {part.id: {pin.name: netlist.nets[pin.net].name for pin in part.pins} for part in netlist.parts}


def assert_same(netlist: Netlist, truth: Truth) -> None:
    found = as_truth(netlist)
    assert {part: set(pins) for part, pins in found.items()} == {part: set(pins) for part, pins in truth.items()}
    assert groups(found) == groups(truth)


@STEADY
@given(st.integers(0, 60), st.integers(0, 10**6), st.integers(0, 10**6))
def test_a_random_board_in_random_habits(parts: int, seed: int, habit_seed: int) -> None:
    board = random_board(parts, seed)
    text, truth = write(board, random_habits(habit_seed), seed)
    netlist = read(text)
    assert_same(netlist, truth)
    by_designator = {part.designator: part for part in board}
    for part in netlist.parts:
        written = by_designator[part.id.rpartition("/")[2]]
        assert (part.cell, part.library, part.properties["value"].value) == (written.cell, "PARTS", written.value)
        assert part.designator == written.designator
    assert not netlist.pins_on_two_nets
    assert not netlist.duplicate_designators


@STEADY
@given(st.integers(0, 10**6))
def test_all_habits_give_one_netlist(seed: int) -> None:
    board = random_board(25, seed)
    plain, truth = write(board, Habits(), seed)
    assert_same(read(plain), truth)
    flat_habits = [
        Habits(wrap=80, line_end="\r\n"),
        Habits(case="mixed", renames=True),
        Habits(pages=3, drawing=True),
        Habits(line_end="\r", wrap=20, pages=1, case="upper"),
        Habits(globals=True, pages=4, renames=True),
        Habits(aliases=True, case="mixed", drawing=True),
    ]
    for habits in flat_habits:
        text, _ = write(board, habits, seed)
        assert_same(read(text), truth)


def test_the_writer_uses_every_cell_and_every_habit() -> None:
    boards = [random_board(50, seed) for seed in range(5)]
    assert {part.cell for board in boards for part in board} == set(CELLS)
    habits = [random_habits(seed) for seed in range(100)]
    assert {each.pages for each in habits} == {0, 1, 4}
    assert {each.blocks for each in habits} == {0, 2, 5}
    assert {each.wrap for each in habits} == {0, 33, 80}
    assert {(each.globals, each.aliases, each.blocks > 0) for each in habits} == set(product((False, True), repeat=3))


def test_damaged_files_give_a_netlist_or_one_clear_error() -> None:
    files = [path.read_bytes() for path in sorted((FIXTURES / "netlist" / "valid").glob("*.edf"))]
    files += [write(random_board(12, seed), random_habits(seed), seed)[0].encode() for seed in range(12)]
    chance = random.Random(20260131)
    refused = 0
    for number in range(MUTATIONS):
        damage = cut_up if number % 3 == 0 else rearranged
        try:
            netlist = read_netlist_bytes(damage(chance.choice(files), chance), "damaged.edf")
        except InputError as error:
            refused += 1
            assert "\n" not in error.message
            assert error.line is not None
            assert error.column is not None
        else:
            ids = [part.id for part in netlist.parts]
            assert len(set(ids)) == len(ids)
            for index, net in enumerate(netlist.nets):
                assert all(netlist.parts[part].pins[pin].net == index for part, pin in net.pins)
            json.dumps([warning.message for warning in netlist.warnings]).encode()
    print(f"\n{MUTATIONS} damaged files: {refused} refused, {MUTATIONS - refused} read, no traceback")
    assert 0 < refused < MUTATIONS


@pytest.mark.parametrize("encoding", ["utf-8", "cp1251", "latin-1", "utf-16", "hex", "no-such"])
def test_random_bytes_in_any_encoding(encoding: str) -> None:
    chance = random.Random(encoding)
    for _ in range(30):
        data = chance.randbytes(chance.randrange(400))
        with pytest.raises((InputError, UsageError)):
            read_netlist_bytes(data, "noise.edf", encoding=encoding)
