"""A review as one plain dict: the JSON report, and the single truth that every other face renders.

Numbers are SI floats rounded to six significant digits, so that the last bits of a numerical library do not change the
bytes of a report; what is not finite or not known is null. ``review-1.schema.json`` beside this module fixes the shape.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from protlint import __version__
from protlint.board.graph import Board, BoardPart
from protlint.findings import Finding, NotChecked, WorkingLine
from protlint.limits import LimiterLimits
from protlint.partdata.ratings import STATIC_FIGURES
from protlint.report.answers import answers, rounded, taken
from protlint.report.memory import FROM_MEMORY, PIN_ORDER, behind, in_use
from protlint.report.shape import CAUTION, Document, summarised
from protlint.topology.limiter import NETS, ROLES

if TYPE_CHECKING:
    from protlint.pipeline import Review, ReviewedLimiter

MEMORY = "memory"
"""How part data names a source that is none."""

WORKING = ("quantity", "formula", "value", "unit", "source")

UNIT_OF_KIND = {"resistor": "ohm", "capacitor": "F", "inductor": "H", "zener": "V"}


def document(review: Review) -> Document:
    """Return the JSON report of one netlist, version 1: every promised key, null where unknown."""
    limiters = [_limiter(item, review) for item in review.limiters]
    by_id = {limiter["id"]: limiter for limiter in limiters}
    findings = [_finding(finding, review.board, by_id.get(finding.limiter or "")) for finding in review.findings]
    not_checked = [_unchecked(row) for row in review.not_checked]
    netlist = review.board.netlist
    return {
        "report": 1,
        "protlint": __version__,
        "caution": CAUTION,
        "netlist": {
            "file": netlist.file,
            "sha256": netlist.sha256,
            "design": netlist.design,
            "parts": len(netlist.parts),
            "nets": len(netlist.nets),
            "pins": sum(len(part.pins) for part in netlist.parts),
        },
        "limits": {"file": review.limits.file, "ambient_degC": list(review.limits.ambient_degC)},
        "summary": summarised(limiters, findings, not_checked),
        "limiters": limiters,
        "findings": findings,
        "not_checked": not_checked,
        "warnings": [
            {"message": warning.message, "line": warning.line, "column": warning.column, "count": warning.count}
            for warning in netlist.warnings
        ],
        "assumed": list(review.assumed),
        "remarks": list(review.remarks),
    }


def _limiter(item: ReviewedLimiter, review: Review) -> Document:
    limiter = item.limiter
    worked_out = answers(item, review.limits.ambient_degC)
    return {
        "id": limiter.id,
        "topology": limiter.topology,
        "polarity": limiter.polarity,
        "verdict": item.verdict,
        "roles": {role: list(limiter.roles.get(role, ())) for role in ROLES},
        "nets": {net: _net_name(review.board, limiter.nets.get(net)) for net in NETS},
        "parts": _parts(item, review.board),
        "needs": _needs(item.needs),
        "in_hand": _in_hand(item.needs, worked_out["currents"]),
        **worked_out,
        "assumed": list(dict.fromkeys(item.assumed)),
        "asked": _asked(item, review),
        "not_checked": [_unchecked(row) for row in item.not_checked],
    }


def _unchecked(row: NotChecked) -> Document:
    return {"check": row.check, "needs": row.needs}


def _asked(item: ReviewedLimiter, review: Review) -> list[str]:
    """Name the checks that the limiter was put to; one that found nothing and is not under not checked has passed."""
    from protlint.checks.table import BOARD_CHECKS, CHECKS, OF_NO_LIMITER, WITHOUT_SOLUTION

    put = [check for check in dict.fromkeys((*CHECKS, *BOARD_CHECKS)) if check not in OF_NO_LIMITER]
    if item.solution.not_solved is not None:
        put = [check for check in put if check in WITHOUT_SOLUTION]
    settings = (item.needs.checks, review.limits.checks)
    levels = {check: next((one[check].level for one in settings if check in one), None) for check in put}
    return [check for check, level in levels.items() if level != "off"]


def _in_hand(needs: LimiterLimits, currents: Sequence[Document]) -> Document:
    """Compare the ends of carries and most, each at its own worst ambient, with what the board needs."""
    lows = [(row["carries_range_A"][0], row["ambient_degC"]) for row in currents if row["carries_range_A"]]
    highs = [(row["most_range_A"][1], row["ambient_degC"]) for row in currents if row["most_range_A"]]
    carry_A, carry_at = min(lows, default=(None, None))
    most_A, most_at = max(highs, default=(None, None))
    return {
        "least_carries_A": carry_A,
        "least_carries_at_degC": carry_at,
        "carry_A": rounded(carry_A - needs.carry_A) if carry_A is not None and needs.carry_A is not None else None,
        "greatest_most_A": most_A,
        "greatest_most_at_degC": most_at,
        "cap_A": rounded(needs.cap_A - most_A) if most_A is not None and needs.cap_A is not None else None,
    }


def _needs(needs: LimiterLimits) -> Document:
    return {
        "carry_A": rounded(needs.carry_A),
        "cap_A": rounded(needs.cap_A),
        "output_V": rounded(needs.output_V),
        "short_s": rounded(needs.short_s),
        "short_continuous": needs.short_s == math.inf,
        "shorted_to": list(needs.shorted_to),
        "regulate_A": rounded(needs.regulate_A),
        "peak": taken(needs.peak, "current_A", "lasts_s", "output_V"),
    }


def _parts(item: ReviewedLimiter, board: Board) -> list[Document]:
    """List the limiter's parts once each, in the order of the roles, with what is known of them."""
    listed: dict[str, Document] = {}
    for role in ROLES:
        for name in item.limiter.roles.get(role, ()):
            part = board.part_of.get(name)
            listed.setdefault(
                name,
                {
                    "id": name,
                    "role": role,
                    "kind": part.kind if part else None,
                    "part_number": part.part_number if part else None,
                    "value": rounded(part.values.value) if part else None,
                    "unit": UNIT_OF_KIND.get(part.kind) if part else None,
                    "text": part.values.text if part else None,
                    "data_source": part.entry.source if part and part.entry else None,
                    "from_memory": _from_memory(part) if part else [],
                    "line": part.part.line if part else None,
                    "column": part.part.column if part else None,
                },
            )
    return list(listed.values())


def _finding(finding: Finding, board: Board, limiter: Document | None) -> Document:
    remembered = behind(finding.check, limiter, finding.parts) if limiter is not None else ""
    last = [WorkingLine(FROM_MEMORY, remembered, None, "", MEMORY)] if remembered else []
    return {
        "check": finding.check,
        "level": finding.level or "warning",
        "limiter": finding.limiter,
        "parts": list(finding.parts),
        "nets": list(finding.nets),
        "message": finding.message,
        "working": [taken(line, *WORKING) for line in (*finding.working, *last)],
        "remedy": finding.remedy,
        "assumption": finding.assumption,
        "file": finding.file,
        "line": finding.line,
        "column": finding.column,
        "places": [_place(board.part_of[name]) for name in dict.fromkeys(finding.parts) if name in board.part_of],
        "fingerprint": finding.fingerprint,
        "waived": finding.waived,
        "waived_by": finding.waived_by,
    }


def _from_memory(part: BoardPart) -> list[str]:
    """Name what something rests on of a part and nobody has held against a data sheet yet: its figures, its pin order."""
    entry = part.entry
    if entry is None:
        return []
    idle = set(STATIC_FIGURES) - {"hfe_min", "hfe_max"} if entry.model else set()
    if "vbe_min" not in entry.ratings:
        idle.add("vbe_max")  # alone it tells no usual V_BE
    sources = [(name, rating.source) for name, rating in entry.ratings.items()]
    sources += [("model", entry.model_source or "")] if entry.model else []
    sources += [("safe_area", curve.source) for curve in entry.safe_area]
    sources += [("transient", point.source) for point in entry.transient]
    wanted = in_use() - idle | {"model"}
    figures = dict.fromkeys(name for name, source in sources if source == MEMORY and name in wanted)
    return [*([PIN_ORDER] if part.pins_from_memory else []), *figures]


def _place(part: BoardPart) -> Document:
    return {
        "part": part.id,
        "kind": part.kind,
        "part_number": part.part_number,
        "value": rounded(part.values.value),
        "line": part.part.line,
        "column": part.part.column,
    }


def _net_name(board: Board, index: int | None) -> str | None:
    return None if index is None else board.nets[index].name
