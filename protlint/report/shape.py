"""The shape of a report: what the faces know of the dict they render, free of the floors that fill it.

A face imports this and not ``document``, so that a saved JSON report can be rendered and compared without the solver.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from protlint import __version__
from protlint.findings import LEVELS
from protlint.idle import ON_THIS_BOARD
from protlint.report.safe import json_text
from protlint.toml.tables import HINT
from protlint.waivers import MATCHES_NOTHING

Document = dict[str, Any]
"""A report, version 1, as ``review-1.schema.json`` beside this module describes it."""

VERDICTS = ("fails", "not judged", "rests on assumptions", "passes")
"""Worst first."""

CAUTION = (
    "This is a review aid for qualified people. A limiter is no fuse and does not replace one. "
    "Local codes and licensed practice decide."
)


def combined(documents: Iterable[Document], unread: Iterable[Mapping[str, Any]] = ()) -> Document:
    """Return one report over several netlists: their reports in order, and the files that could not be reviewed."""
    boards, idle = _without_idle(list(documents))
    failed = [{key: error.get(key) for key in ("file", "line", "column", "message")} for error in unread]
    summaries = [board["summary"] for board in boards]
    return {
        "report": 1,
        "protlint": __version__,
        "caution": CAUTION,
        "summary": {
            "boards": len(boards) + len(failed),
            "unread": len(failed),
            **{key: sum(summary[key] for summary in summaries) for key in summarised([], [])},
        },
        "boards": boards,
        "unread": failed,
        "remarks": idle,
    }


def boards_of(report: Document) -> list[Document]:
    """Return the reports of single netlists that a report holds: itself, or the ones it combines."""
    boards: list[Document] = report.get("boards", [report])
    return boards


def rendered_json(report: Document) -> str:
    """Return the report as JSON text: UTF-8, two blanks of indent, a line end at the end."""
    return json_text(json.dumps(report, ensure_ascii=False, indent=2, allow_nan=False)) + "\n"


IDLE = (MATCHES_NOTHING, ON_THIS_BOARD)
"""How remarks end on what one file says of no board in particular: they count where every board makes them."""


def _without_idle(boards: list[Document]) -> tuple[list[Document], list[str]]:
    """Take the remarks on idle waivers and limits out of the boards, and return those that every board makes.

    Each board has its own nearest name to hint at, so the remarks stand without it.
    """
    idle = [[bare for text in board["remarks"] if (bare := _bare(text)).endswith(IDLE)] for board in boards]
    everywhere = [text for text in idle[0] if all(text in others for others in idle)] if idle else []
    cleared = [{**board, "remarks": [one for one in board["remarks"] if not _bare(one).endswith(IDLE)]} for board in boards]
    return cleared, everywhere


def _bare(remark: str) -> str:
    return remark.partition(HINT)[0]


def summarised(limiters: Sequence[Document], findings: Sequence[Document], not_checked: Sequence[Document] = ()) -> Document:
    """Return the counts a report opens with; waived findings count as waived only. ``not_checked`` is the board's own."""
    verdicts = [item["verdict"] for item in limiters]
    counted = [item["level"] for item in findings if item["waived"] is None]
    return {
        "limiters": len(limiters),
        **{verdict.replace(" ", "_"): verdicts.count(verdict) for verdict in VERDICTS},
        **{f"{level}s": counted.count(level) for level in LEVELS},
        "waived": len(findings) - len(counted),
        "not_checked": len(not_checked) + sum(len(item["not_checked"]) for item in limiters),
    }
