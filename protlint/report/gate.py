"""Whether a report passes: the gate that a continuous-integration job stands on."""

from __future__ import annotations

from protlint.findings import LEVELS
from protlint.report.figures import counted
from protlint.report.shape import Document, boards_of

GATES = (*LEVELS, "never")
"""The least level that closes the gate."""


def held_back(report: Document, gate: str, *, complete: bool = False) -> list[str]:
    """Return why the gate does not hold, in a few words each; an empty list where it holds.

    A waived finding does not count. ``complete`` lets what was not checked count too.
    """
    levels = LEVELS[: LEVELS.index(gate) + 1] if gate in LEVELS else ()
    reasons = []
    for level in levels:
        count = sum(board["summary"][f"{level}s"] for board in boards_of(report))
        if count:
            reasons.append(counted(count, level))
    unchecked = sum(board["summary"]["not_checked"] for board in boards_of(report))
    if complete and unchecked:
        reasons.append(f"{unchecked} not checked")
    return reasons
