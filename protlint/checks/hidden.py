"""Is there a limiter that nobody sees, because the pins of its transistors cannot be told apart or too much lies around."""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator

from protlint.board.graph import Board, Element
from protlint.board.kinds import UNTOLD_TRANSISTOR
from protlint.board.pins import FAMILY, TERMINALS
from protlint.checks.board_case import BoardAnswer, BoardCase, Unanswered
from protlint.findings import Finding, NotChecked, WorkingLine, some_of
from protlint.solve.surroundings import CONTROL
from protlint.toml.text import toml_key
from protlint.topology.excerpt import MOST, is_rail
from protlint.topology.index import CROWDED
from protlint.topology.suspects import SENSE_OHM


def hidden_limiters(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield what :func:`hidden_by_unknown_pins` finds, the transistors with a part of no known kind at the shunt's base, and
    those around which the search had to end early."""
    yield from hidden_by_unknown_pins(whole)
    yield from _hidden_behind_unknown_parts(whole)
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
        yield Unanswered(None, NotChecked(f"whether a limiter is at {some_of(parts)}", key))


def _hidden_behind_unknown_parts(whole: BoardCase) -> Iterator[Unanswered]:
    """Yield the transistors that lie as pass device and shunt do, the shunt's base on a part of no known kind.

    A trimmer in the preset is the usual one. The sense resistor stands in the lead of the pass device, the shunt's lead is
    on its other end, and the shunt takes the drive of the pass device or of its driver.
    """
    board = whole.board
    strangers = [element for element in board.elements if element.kind == "unknown"]
    at = {net: element for element in reversed(strangers) for net in element.terminals.values()}
    taken = {index for one in whole.found.limiters for indices in one.elements.values() for index in indices}
    for shunt in board.elements:
        if shunt.kind not in CONTROL or shunt.index in taken or _unknown(shunt):
            continue
        stranger = at.get(shunt.terminals[CONTROL[shunt.kind]])
        pass_device = _pass_device_of(board, shunt) if stranger is not None else None
        if stranger is not None and pass_device is not None and pass_device.index not in taken:
            part = board.parts[stranger.parts[0]]
            _, colon, why = part.kind_from.partition(": ")
            key = f"[{toml_key(part.part_number or part.part.cell)}] kind, in a file for --parts"
            if colon:
                key = f"resistors drawn in place of {part.id}: {why}"
            names = some_of([board.parts[one.parts[0]].id for one in (pass_device, shunt)])
            yield Unanswered(None, NotChecked(f"whether a limiter is at {names}", key))


def _pass_device_of(board: Board, shunt: Element) -> Element | None:
    """Return the transistor whose drive a shunt takes and in whose lead a sense resistor stands that the shunt is on."""
    load, _, lead = (shunt.terminals.get(role) for role in TERMINALS[FAMILY[shunt.kind]])
    for driven in _driven_from(board, load):
        for one in (driven, *_driven_from(board, driven.terminals.get(TERMINALS[FAMILY[driven.kind]][2]))):
            near = one.terminals.get(TERMINALS[FAMILY[one.kind]][2])
            if near is not None and lead in _beyond_resistors(board, near, SENSE_OHM) - {near}:
                return one
    return None


def _driven_from(board: Board, net: int | None) -> Iterator[Element]:
    """Yield the transistors whose base or gate is on a net that is no supply."""
    if net is not None and not is_rail(board, net):
        for index, role in board.elements_at[net]:
            element = board.elements[index]
            if element.kind in CONTROL and role == CONTROL[element.kind]:
                yield element


def _hidden_in_a_crowd(whole: BoardCase) -> Iterator[Unanswered]:
    """Yield, by the crowded net that ended the search, the transistors that may be drawn wrong and were not fully tried."""
    told = {part for fault in whole.found.faults for parts in fault.group.roles.values() for part in parts}
    for net, parts in whole.found.unsearched.items():
        left = [part for part in parts if part not in told]
        key = f"[supply] {toml_key(whole.board.nets[net].name)}, if that is one: a search ends at {MOST} parts"
        if left:
            yield Unanswered(None, NotChecked(f"whether a limiter drawn wrong is at {some_of(left)}", key))


def _unknown(element: Element) -> bool:
    return CONTROL[element.kind] not in element.terminals


def _shunts_of(board: Board, element: Element) -> Iterator[Element]:
    """Yield the transistors that would fit as the shunt of a pass device."""
    nets = set(element.terminals.values())
    for near in sorted(nets):
        if is_rail(board, near):
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


def _beyond_resistors(board: Board, net: int, below_ohm: float = math.inf) -> set[int]:
    return {
        other
        for index, _ in board.elements_at[net]
        if board.elements[index].kind == "resistor" and (board.elements[index].value or 0.0) < below_ohm
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
