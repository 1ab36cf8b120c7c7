"""Any one table of any part's data taken away on every example board: what was found is found, or said not to be checked.

Where figures usual for the kind take the place of a pass device's model, the circuit is solved all the same, and what it
passes unlimited may come to less: the base current then stays below its threshold, and the limiter says what was assumed.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from functools import cache
from typing import Any

import pytest

from protlint.findings import UNSOLVED
from protlint.netlist import read_netlist
from protlint.partdata.book import PartEntry
from protlint.pipeline import Desk, Review, review_netlist, set_up
from tests.support.paths import FIXTURES

FOLDER = FIXTURES / "examples"
BOARDS = sorted(path.stem for path in FOLDER.glob("*.edf"))
EMPTY: dict[str, dict[str, Any]] = {
    "ratings": {"ratings": {}}, "model": {"model": {}, "model_source": None}, "safe_area": {"safe_area": ()},
    "transient": {"transient": ()}, "everything": {},
}  # fmt: skip


@cache
def desk_of(board: str) -> Desk:
    listed = FOLDER / f"{board}.csv"
    return set_up(
        limits=FOLDER / f"{board}.toml",
        parts=FOLDER / "parts.toml",
        parts_list=listed if listed.exists() else None,
    )


@cache
def reviewed(board: str, number: str = "", table: str = "") -> Review:
    """Return the review of an example board, one table of a type's data taken away."""
    desk = desk_of(board)
    entries = dict(desk.book.entries)
    if table == "everything":
        del entries[number]
    elif table:
        entries[number] = replace(entries[number], **EMPTY[table])
    return review_netlist(read_netlist(FOLDER / f"{board}.edf"), replace(desk, book=replace(desk.book, entries=entries)))


def in_use(board: str) -> Iterator[PartEntry]:
    """Yield the entries that the board's parts have, each once."""
    entries = (part.entry for part in reviewed(board).board.parts)
    yield from {entry.part_number: entry for entry in entries if entry is not None and not entry.footprints}.values()


@pytest.mark.parametrize("board", BOARDS)
def test_a_dropped_table_turns_findings_into_entries_never_into_silence(board: str) -> None:
    silent = []
    for entry in in_use(board):
        for table in EMPTY:
            if table != "everything" and not getattr(entry, table):
                continue
            after = reviewed(board, entry.part_number.casefold(), table)
            silent += [(entry.part_number, table, *one) for one in _gone(reviewed(board), after)]
    assert silent == []


def _gone(before: Review, after: Review) -> Iterator[tuple[str, str | None]]:
    """Yield the checks and limiters that said something before and are neither heard nor excused afterwards."""
    told = {(one.check, one.limiter) for one in after.findings} | {(one.check, None) for one in after.not_checked}
    for limiter in after.limiters:
        told |= {(one.check, limiter.limiter.id) for one in limiter.not_checked}
    assuming = {one.limiter.id for one in after.limiters if one.assumed}
    for finding in before.findings:
        own = finding.limiter or ""
        heard = {(finding.check, finding.limiter), (finding.check, None), (UNSOLVED, own)} & told
        if not heard and not (finding.check == "base-stop-low" and own in assuming):
            yield finding.check, finding.limiter
