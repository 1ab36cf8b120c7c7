"""Which board of one report is which of another: by files, content and design."""

from __future__ import annotations

from typing import Any

import pytest

from protlint.pairing import matched_boards


def called(*files: str, **designs: str) -> list[dict[str, Any]]:
    """Return boards of which only the names matter; each is of a content and a design of its own unless it is given."""
    return [{"netlist": {"file": file, "sha256": object(), "design": designs.get(file[0], file + "!")}} for file in files]


@pytest.mark.parametrize(
    ("before", "after", "pairs"),
    [
        (["old/a.edf", "old/b.edf"], ["new/b.edf", "new/a.edf"], [1, 0]),
        (["a.edf", "x/a.edf"], ["x/a.edf", "a.edf"], [1, 0]),
        (["old/main.edf", "old/x/main.edf"], ["new/main.edf", "new/y/main.edf"], [0, 1]),
        (["old/1/main.edf", "old/2/main.edf"], ["new/2/main.edf", "new/3/main.edf"], [1, 0]),
        (["one.edf"], ["two.edf"], [0]),
        (["a.edf"], ["b.edf", "sub/a.edf"], [None, 0]),
        (["old/p-r1.edf", "old/q.edf"], ["new/p-r2.edf", "new/q.edf"], [None, 1]),
    ],
)
def test_boards_go_by_their_files(before: list[str], after: list[str], pairs: list[int | None]) -> None:
    ours, theirs = called(*before), called(*after)
    found = {id(new): old for old, new in matched_boards(ours, theirs)}
    wanted = [None if place is None else ours[place] for place in pairs]
    assert [found[id(new)] for new in theirs] == wanted
    assert [old for old, new in matched_boards(ours, theirs) if new is None] == [one for one in ours if one not in wanted]


def test_a_renamed_board_goes_by_its_design_and_one_of_several_of_a_design_by_its_content() -> None:
    before, after = called("p-r1.edf", "q.edf", p="PSU"), called("q.edf", "p-r2.edf", p="PSU")
    assert [(old, new) for old, new in matched_boards(before, after)] == [(before[1], after[0]), (before[0], after[1])]
    twins, renamed = called("p1.edf", "p2.edf", p="PSU"), called("p3.edf", "p4.edf", p="PSU")
    renamed[1]["netlist"]["sha256"] = twins[0]["netlist"]["sha256"]
    assert (twins[0], renamed[1]) in matched_boards(twins, renamed)
