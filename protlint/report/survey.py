"""What a survey tells: what was read of a board, how it was understood, what is missing, and each limiter's circuit.

Like a report it is one plain dict first; ``survey_text`` lays it out.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from typing import TYPE_CHECKING

from protlint.board.attributes import file_habits, part_number_from
from protlint.board.graph import Board, BoardPart
from protlint.limits import ATTRIBUTES, Limits, Range
from protlint.report.answers import rounded
from protlint.report.digest import listed
from protlint.report.document import document
from protlint.report.shape import Document
from protlint.solve.circuit import Circuit

if TYPE_CHECKING:
    from protlint.pipeline import Review, ReviewedLimiter

VALUED_KINDS = ("resistor", "capacitor", "inductor")
"""Kinds whose value a circuit cannot do without."""

ROLED_KINDS = ("npn", "pnp", "npn-darlington", "pnp-darlington", "nmos", "pmos", "diode", "zener", "thyristor")
"""Kinds whose pins are not alike, so that their roles have to be known."""

TELLING_ROLES = frozenset(("base", "gate", "anode"))
"""Roles one of which each of those kinds has where its pins are known; pins that are not go by their numbers."""


def pins_unknown(part: BoardPart) -> bool:
    """Tell whether a part's pins are not alike and nobody knows which is which."""
    return part.kind in ROLED_KINDS and not part.sections and TELLING_ROLES.isdisjoint(part.roles)


def survey(review: Review) -> Document:
    """Return what a survey shows of a review."""
    report = document(review)
    by_id = {item.limiter.id: item for item in review.limiters}
    board_order = {limiter.id: place for place, limiter in enumerate(review.found.limiters)}
    board = review.board
    return {
        "caution": report["caution"],
        "netlist": report["netlist"],
        "reading": [
            *([name, str(sentence)] for name, sentence in board.netlist.facts.items()),
            *_habits(board, review.limits),
        ],
        "kinds": _counted((part.kind, part.kind_from) for part in board.parts),
        "pins": _counted((part.kind, part.roles_from) for part in board.parts if part.kind in ROLED_KINDS),
        "values": _values(board),
        "unknown": {
            "kind": _gathered(
                (part.part.cell or "that is not named", part.id) for part in board.parts if part.kind == "unknown"
            ),
            "pins": _gathered((_type_of(part), part.id) for part in board.parts if pins_unknown(part)),
            "part_data": _types_without_data(board, {part["id"] for one in report["limiters"] for part in one["parts"]}),
        },
        "supplies": [
            {"net": net.name, **_ends(net.supply.voltage_V), "known_from": net.supply.known_from}
            for net in board.nets
            if net.supply is not None
        ],
        "limiters": [
            {**limiter, **_circuit(by_id[limiter["id"]], board)}
            for limiter in sorted(report["limiters"], key=lambda one: board_order[one["id"]])
        ],
        "faults": [
            {
                "fault": fault.fault,
                "spoils": fault.spoils,
                "parts": [name for names in fault.group.roles.values() for name in names],
                "says": fault.says,
            }
            for fault in review.found.faults
        ],
        "warnings": report["warnings"],
        "not_checked": report["not_checked"],
        "assumed": report["assumed"],
        "remarks": [*review.found.remarks, *review.remarks],
    }


def _habits(board: Board, limits: Limits) -> list[list[str]]:
    """Tell which properties of the file tell what, and what its commas mean where its values have any."""
    if not board.netlist.parts:
        return []
    habits = file_habits(board.netlist, limits)
    told = [
        [
            f"{attribute.replace('_', ' ')} from",
            ", ".join(f"{name} ({count})" for name, count in habits.found[attribute].items()),
        ]
        for attribute in ATTRIBUTES
        if habits.found[attribute]
    ]
    silent = [attribute.replace("_", " ") for attribute in ATTRIBUTES if not habits.found[attribute]]
    if silent:
        told.append(["no property tells", ", ".join(silent)])
    if silent and habits.others:
        others = sorted(habits.others.items(), key=lambda other: -other[1])
        named = listed([f"{name} ({count})" for name, count in others])
        told.append(["other properties", f"{named}; [attributes] in the limits file says what one tells"])
    numbered = [(part.part, part.part_number) for part in board.parts if part.part_number is not None]
    sources = Counter(part_number_from(part, number, habits) for part, number in numbered)
    if sources:
        told.append(["part numbers taken from", ", ".join(f"{source} ({count})" for source, count in sources.most_common())])
    properties = (part.properties.get(key) for part in board.netlist.parts for key in habits.names["value"])
    if any(item is not None and "," in str(item.value) for item in properties):
        told.append(["commas", habits.comma_from])
    return told


def _counted(pairs: Iterable[tuple[str, str]]) -> list[Document]:
    """Count parts by kind, and inside a kind by how it was known, in order of appearance."""
    counts: dict[str, Counter[str]] = {}
    for kind, known_from in pairs:
        counts.setdefault(kind, Counter())[known_from] += 1
    return [
        {"kind": kind, "count": known.total(), "known_from": [[source, count] for source, count in known.items()]}
        for kind, known in counts.items()
    ]


def _gathered(pairs: Iterable[tuple[str, str]]) -> list[Document]:
    """Gather parts by the cell or type number that they have in common, in order of appearance."""
    parts: dict[str, list[str]] = {}
    for name, part in pairs:
        parts.setdefault(name, []).append(part)
    return [{"of": name, "parts": ids} for name, ids in parts.items()]


def _values(board: Board) -> Document:
    valued = [part for part in board.parts if part.kind in VALUED_KINDS]
    return {
        "read": sum(part.values.value is not None for part in valued),
        "unreadable": [
            {"part": part.id, "text": part.values.text, "why": part.values.unreadable}
            for part in valued
            if part.values.unreadable is not None
        ],
        "absent": [part.id for part in valued if part.values.text is None and part.values.value is None],
        "not_fitted": [part.id for part in board.parts if not part.values.fitted],
        "with_tolerance": sum(part.values.tolerance is not None for part in valued),
        "with_power": sum(part.values.power_W is not None for part in valued),
    }


def _types_without_data(board: Board, of_limiters: set[str]) -> list[Document]:
    """List the semiconductor types of which nothing is known, with the parts of each; those that limiters use come first."""
    lacking: dict[str, list[str]] = {}
    for part in board.parts:
        if part.kind in ROLED_KINDS and part.entry is None:
            lacking.setdefault(_type_of(part), []).append(part.id)
    types = sorted(lacking.items(), key=lambda each: of_limiters.isdisjoint(each[1]))
    return [{"part_number": number, "parts": parts} for number, parts in types]


def _type_of(part: BoardPart) -> str:
    return part.part_number or part.part.cell


def _circuit(item: ReviewedLimiter, board: Board) -> Document:
    bench, circuit = item.bench, item.circuit
    return {
        "also_matched": list(item.limiter.also_matched),
        "rule_nets": [[name, board.nets[index].name] for name, index in item.limiter.bound.items()],
        "held": [[net, held] for net, held in bench.nets.items()],
        "missing": [missing.needs for missing in bench.missing],
        "drive_ends": _drive(circuit),
        "loop_table": [
            {"at_Hz": rounded(at_Hz), "gain": rounded(gain), "phase_deg": rounded(phase_deg)}
            for at_Hz, gain, phase_deg in (item.solution.loop.table if item.solution.loop is not None else ())
        ],
        "shorts": list(circuit.shorts) if circuit else [],
        "devices": [
            {"name": device.name, "kind": device.kind, "nodes": list(device.nodes), "assumed": list(device.assumed)}
            for device in (circuit.devices if circuit else ())
        ],
    }


def _drive(circuit: Circuit | None) -> Document | None:
    if circuit is None:
        return None
    drive = circuit.drive
    return {
        "node": drive.node,
        "low_V": _ends(drive.low_V),
        "high_V": _ends(drive.high_V),
        "resistance_ohm": rounded(drive.resistance_ohm),
        "current_A": rounded(drive.current_A),
        "assumed": drive.assumed,
    }


def _ends(voltage: Range) -> Document:
    return {"low": rounded(voltage.low), "usual": rounded(voltage.usual), "high": rounded(voltage.high)}
