"""A review as one plain dict: the JSON report, and the single truth that every other face renders.

Numbers are SI floats rounded to six significant digits, so that the last bits of a numerical library do not change the
bytes of a report; what is not finite or not known is null. ``review-1.schema.json`` beside this module fixes the shape.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from protlint import __version__
from protlint.board.graph import Board, BoardPart
from protlint.findings import Finding
from protlint.limits import LimiterLimits
from protlint.partdata.book import PartEntry
from protlint.report.shape import CAUTION, Document, summarised
from protlint.solve.solution import Currents, Loop, Point, Step, Worst
from protlint.topology.limiter import NETS, ROLES

if TYPE_CHECKING:
    from protlint.pipeline import Review, ReviewedLimiter

SIGNIFICANT_DIGITS = 6

MEMORY = "memory"
"""How part data names a source that is none."""

LOOP_KEYS = ("least_damping", "at_Hz", "worst_damping", "low_frequency_gain", "crossover_Hz", "phase_margin_deg")

WORST_KEYS = ("damping", "at_Hz", "ambient_degC", "wiring_H")

STEP_KEYS = ("settles", "delay_s", "peak_A", "pass_energy_J")

UNIT_OF_KIND = {"resistor": "ohm", "capacitor": "F", "inductor": "H", "zener": "V"}


def document(review: Review) -> Document:
    """Return the JSON report of one netlist, version 1: every promised key, null where unknown."""
    by_id = {part.id: part for part in review.board.parts}
    limiters = [_limiter(item, review, by_id) for item in review.limiters]
    findings = [_finding(finding, by_id) for finding in review.findings]
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
        "limits": {"file": review.limits.file, "ambient_degC": _numbers(review.limits.ambient_degC)},
        "summary": summarised(limiters, findings),
        "limiters": limiters,
        "findings": findings,
        "warnings": [
            {"message": warning.message, "line": warning.line, "column": warning.column, "count": warning.count}
            for warning in netlist.warnings
        ],
        "assumed": list(review.assumed),
        "remarks": list(review.remarks),
    }


def rounded(value: float | None) -> float | None:
    """Return a number of six significant digits, or None where it is not finite."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{value:.{SIGNIFICANT_DIGITS}g}") + 0.0


def _limiter(item: ReviewedLimiter, review: Review, by_id: Mapping[str, BoardPart]) -> Document:
    limiter, solution = item.limiter, item.solution
    currents = [_currents(row) for row in solution.currents]
    if not currents:
        currents = [_currents(_no_currents(ambient)) for ambient in review.limits.ambient_degC]
    return {
        "id": limiter.id,
        "topology": limiter.topology,
        "polarity": limiter.polarity,
        "verdict": item.verdict,
        "roles": {role: list(limiter.roles.get(role, ())) for role in ROLES},
        "nets": {net: _net_name(review.board, limiter.nets.get(net)) for net in NETS},
        "parts": _parts(item, by_id),
        "needs": _needs(item.needs),
        "currents": currents,
        "in_hand": _in_hand(item.needs, currents),
        "locus": [{"output_V": rounded(point.output_V), "holds_A": rounded(point.output_A)} for point in solution.locus],
        "regulates": _plain(solution.regulates),
        "loop": {**_keys(solution.loop, LOOP_KEYS), **_modes(solution.loop)},
        "step": _keys(solution.step, STEP_KEYS),
        "held_short": _point(solution.held_short),
        "worst_point": _point(solution.worst_point),
        "sensitivities": [_plain(row) for row in solution.sensitivities],
        "short": solution.short,
        "shorts": [{"net": one.node, "holds_A": _numbers(one.holds_A)} for one in solution.shorts],
        "not_solved": solution.not_solved,
        "assumed": list(dict.fromkeys(item.assumed)),
        "asked": _asked(item, review),
        "not_checked": [{"check": row.check, "needs": row.needs} for row in item.not_checked],
    }


def _asked(item: ReviewedLimiter, review: Review) -> list[str]:
    """Name the checks that the limiter was put to; one that found nothing and is not under not checked has passed."""
    from protlint.checks.table import CHECKS

    if item.solution.not_solved is not None:
        return []
    settings = (item.needs.checks, review.limits.checks)
    levels = {check: next((one[check].level for one in settings if check in one), None) for check in CHECKS}
    return [check for check, level in levels.items() if level != "off"]


def _currents(row: Currents) -> Document:
    def of(name: str) -> float | None:
        return rounded(getattr(row, name))

    names = ("begins_A", "holds_A", "carries_A", "most_A", "unlimited_A", "shunt_A", "pass_A")
    ranges = ("begins_range_A", "holds_range_A", "carries_range_A", "most_range_A")
    return {
        "ambient_degC": row.ambient_degC,
        **{name: of(name) for name in names},
        "limited_by": {"short": row.limited_by_short, "output": row.limited_by_output},
        **{name: _pair(getattr(row, name)) for name in ranges},
    }


def _no_currents(ambient: float) -> Currents:
    return Currents(ambient, None, None, None, None, None, None, None, None, None)


def _keys(answers: Loop | Step | Worst | None, names: Sequence[str]) -> Document:
    """Return the named answers, each null where there are none."""
    return {name: _number(getattr(answers, name, None)) for name in names}


def _modes(loop: Loop | None) -> Document:
    """Return where the worst damping lies, and the natural frequencies as drawn."""
    worst = _keys(loop.worst, WORST_KEYS) if loop is not None and loop.worst is not None else None
    natural = loop.natural if loop is not None else ()
    return {
        "worst": worst,
        "natural": [{"at_Hz": rounded(at_Hz), "damping": rounded(damping)} for at_Hz, damping in natural],
    }


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
        "peak": _plain(needs.peak),
    }


def _parts(item: ReviewedLimiter, by_id: Mapping[str, BoardPart]) -> list[Document]:
    """List the limiter's parts once each, in the order of the roles, with what is known of them."""
    listed: dict[str, Document] = {}
    for role in ROLES:
        for name in item.limiter.roles.get(role, ()):
            part = by_id.get(name)
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
                    "from_memory": _from_memory(part.entry) if part and part.entry else [],
                    "line": part.part.line if part else None,
                    "column": part.part.column if part else None,
                },
            )
    return list(listed.values())


def _finding(finding: Finding, by_id: Mapping[str, BoardPart]) -> Document:
    return {
        "check": finding.check,
        "level": finding.level or "warning",
        "limiter": finding.limiter,
        "parts": list(finding.parts),
        "nets": list(finding.nets),
        "message": finding.message,
        "working": [_plain(line) for line in finding.working],
        "remedy": finding.remedy,
        "assumption": finding.assumption,
        "file": finding.file,
        "line": finding.line,
        "column": finding.column,
        "places": [_place(by_id[name]) for name in dict.fromkeys(finding.parts) if name in by_id],
        "fingerprint": finding.fingerprint,
        "waived": finding.waived,
        "waived_by": finding.waived_by,
    }


def _from_memory(entry: PartEntry) -> list[str]:
    """Name the figures of a part that nobody has held against a data sheet yet."""
    names = [name for name, rating in entry.ratings.items() if rating.source == MEMORY]
    return names + (["model"] if entry.model and entry.model_source == MEMORY else [])


def _place(part: BoardPart) -> Document:
    return {
        "part": part.id,
        "kind": part.kind,
        "part_number": part.part_number,
        "value": rounded(part.values.value),
        "line": part.part.line,
        "column": part.part.column,
    }


def _point(point: Point | None) -> Document | None:
    if point is None:
        return None
    return {
        "output_V": rounded(point.output_V),
        "output_A": rounded(point.output_A),
        "devices": [{"device": name, **_plain(state)} for name, state in point.states.items()],
    }


def _net_name(board: Board, index: int | None) -> str | None:
    return None if index is None else board.nets[index].name


def _plain(value: Any) -> Any:
    """Return a dataclass of plain fields as a dict of rounded numbers and texts."""
    return None if value is None else {key: _number(item) for key, item in asdict(value).items()}


def _number(value: Any) -> Any:
    return rounded(value) if isinstance(value, float) else value


def _numbers(values: Iterable[float | None]) -> list[float | None]:
    return [rounded(value) for value in values]


def _pair(ends: tuple[float, float] | None) -> list[float] | None:
    if ends is None:
        return None
    low, high = (rounded(end) for end in ends)
    return None if low is None or high is None else [low, high]
