"""Is there a limiter that nobody sees, because the pins of its transistors cannot be told apart or too much lies around."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence

from protlint.board.graph import Board, Element
from protlint.board.kinds import UNTOLD_TRANSISTOR
from protlint.checks.board_case import BoardAnswer, BoardCase, Unanswered
from protlint.findings import Finding, NotChecked, WorkingLine
from protlint.solve.surroundings import CONTROL
from protlint.toml.text import toml_key
from protlint.topology.excerpt import MOST

SENSE_OHM = 100.0
"""Sense resistors of limiters are smaller; common practice of the trade."""

MOST_NAMED = 6
"""Parts of one type that are named before the rest are counted."""

CROWDED = 64
"""A net with more on it is a supply, whatever it is called."""


def hidden_limiters(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield what :func:`hidden_by_unknown_pins` finds, and the transistors around which the search had to end early."""
    yield from hidden_by_unknown_pins(whole)
    yield from _hidden_in_a_crowd(whole)


def hidden_by_unknown_pins(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield a finding for each pair of transistors that lie as pass device and shunt do, the pins of one or both unknown.

    A small resistor stands between a net of the one and a net of the other, they share another net, and the other reaches
    the near end of that resistor too, itself or through one more resistor. Of every other transistor that nobody can place,
    say what would tell.
    """
    suspected: set[str] = set()
    for finding in _suspicions(whole):
        suspected.update(finding.parts)
        yield finding
    yield from _unplaced(whole.board, suspected)


def _suspicions(whole: BoardCase) -> Iterator[Finding]:
    board = whole.board
    if not any(_unknown(element) for element in board.elements if element.kind in CONTROL):
        return
    taken = {index for one in whole.found.limiters for indices in one.elements.values() for index in indices}
    for element in board.elements:
        if element.kind in CONTROL and element.index not in taken:
            for other in _shunts_of(board, element):
                if other.index not in taken and (_unknown(element) or _unknown(other)):
                    taken |= {element.index, other.index}
                    yield _suspected(board, element, other)


def _unplaced(board: Board, suspected: Collection[str]) -> Iterator[Unanswered]:
    """Yield, for each type of transistor whose pins or kind nobody knows, the key that would let a limiter be found."""
    wanted: dict[str, list[str]] = {}
    for part in board.parts:
        name = part.part_number or part.part.cell
        if part.id in suspected:
            continue
        if part.kind in CONTROL and CONTROL[part.kind] not in part.roles and not part.sections:
            wanted.setdefault(f"[pins.{toml_key(name)}]", []).append(part.id)
        elif part.kind_from == UNTOLD_TRANSISTOR:
            wanted.setdefault(f"[{toml_key(name)}] kind, in a file for --parts", []).append(part.id)
    for key, parts in wanted.items():
        yield Unanswered(None, NotChecked(f"whether a limiter is at {_named(parts)}", key))


def _hidden_in_a_crowd(whole: BoardCase) -> Iterator[Unanswered]:
    """Yield, by the crowded net that ended the search, the transistors that may be drawn wrong and were not fully tried."""
    told = {part for fault in whole.found.faults for parts in fault.group.roles.values() for part in parts}
    for net, parts in whole.found.unsearched.items():
        left = [part for part in parts if part not in told]
        key = f"[supply] {toml_key(whole.board.nets[net].name)}, if that is one: a search ends at {MOST} parts"
        if left:
            yield Unanswered(None, NotChecked(f"whether a limiter drawn wrong is at {_named(left)}", key))


def _named(parts: Sequence[str]) -> str:
    more = f" and {len(parts) - MOST_NAMED} more" if len(parts) > MOST_NAMED else ""
    return f"{', '.join(parts[:MOST_NAMED])}{more}"


def _unknown(element: Element) -> bool:
    return CONTROL[element.kind] not in element.terminals


def _shunts_of(board: Board, element: Element) -> Iterator[Element]:
    """Yield the transistors that would fit as the shunt of a pass device."""
    nets = set(element.terminals.values())
    for near in sorted(nets):
        if board.nets[near].supply is not None or len(board.elements_at[near]) > CROWDED:
            continue
        beside = _beyond_resistors(board, near) | {near}
        for index, _ in board.elements_at[near]:
            sense = board.elements[index]
            if sense.kind != "resistor" or sense.value is None or not 0.0 < sense.value < SENSE_OHM:
                continue
            for far in set(sense.terminals.values()) - nets:
                for other_index, _ in board.elements_at[far] if len(board.elements_at[far]) <= CROWDED else ():
                    other = board.elements[other_index]
                    its = set(other.terminals.values())
                    if other.kind in CONTROL and its & beside and its & nets - {near, far}:
                        yield other


def _beyond_resistors(board: Board, net: int) -> set[int]:
    return {
        other
        for index, _ in board.elements_at[net]
        if board.elements[index].kind == "resistor"
        for other in board.elements[index].terminals.values()
    }


def _suspected(board: Board, element: Element, other: Element) -> Finding:
    parts = [board.parts[one.parts[0]] for one in (element, other)]
    unknown = [part for part, one in zip(parts, (element, other), strict=True) if _unknown(one)]
    names = ", ".join(part.id for part in unknown)
    keys = " and ".join(dict.fromkeys(f"[pins.{part.part_number or part.part.cell}]" for part in unknown))
    return Finding(
        check="pins-unknown",
        limiter=None,
        parts=tuple(part.id for part in parts),
        message=f"{parts[0].id} and {parts[1].id} lie as a limiter's pass device and shunt do, but nobody knows which pin "
        f"of {names} is which",
        working=tuple(
            WorkingLine(
                f"{part.id} pin {pin.number or pin.name}", f"on {board.nets[pin.net].name}, its role not known", None, ""
            )
            for part in unknown
            for pin in part.part.pins
        ),
        remedy=f"state the roles of its pins in {keys} of the limits file or in its part data",
        level="warning",
    )
