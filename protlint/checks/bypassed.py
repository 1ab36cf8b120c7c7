"""Sense resistances with both ends on one net: those of limiters, and resistors like one beside a power device."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.board.graph import Board, BoardPart, Element
from protlint.checks.board_case import BoardAnswer, BoardCase
from protlint.checks.unguarded import LEAD
from protlint.checks.wiring import wiring_check
from protlint.findings import Finding, WorkingLine
from protlint.topology.faults import links_across
from protlint.topology.suspects import SENSE_OHM

CHECK = "sense-bypassed"


def sense_bypassed(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield a finding for every limiter whose sense resistance has both ends on one net, and a note for every other small
    resistor that lies so beside a power device: there nobody can tell whether it was to be sensed."""
    yield from wiring_check(CHECK)(whole)
    told = {part for fault in whole.found.faults for part in fault.parts_ends}
    claimed = {part for case in whole.cases.values() for part in case.limiter.roles["pass"]}
    leads: dict[int, list[BoardPart]] = {}
    for resistor in whole.board.elements:
        value = resistor.value
        if resistor.kind != "resistor" or value is None or not 0.0 < value < SENSE_OHM:
            continue
        ends = set(resistor.terminals.values())
        if len(ends) != 1:  # as it should be, or connected to nothing
            continue
        parts = [whole.board.parts[index] for index in resistor.parts]
        if told.isdisjoint(part.id for part in parts):
            net = ends.pop()
            if net not in leads:
                leads[net] = [device for device in _power_devices(whole, net) if device.id not in claimed]
            device = _beside(whole.board, leads[net], parts)
            if device is not None:
                yield _note(whole, resistor, parts, device)


def _power_devices(whole: BoardCase, net: int) -> Iterator[BoardPart]:
    """Yield the power devices with a lead of the load current on a net."""
    board = whole.board
    for index, role in board.elements_at[net]:
        element = board.elements[index]
        if role in LEAD.get(element.kind, ())[:2] and _is_power(whole, board.parts[element.parts[0]]):
            yield board.parts[element.parts[0]]


def _beside(board: Board, devices: list[BoardPart], parts: list[BoardPart]) -> BoardPart | None:
    """Return the one of some power devices in whose lead a resistor lies, if there is one: where a link shorts it that at
    the end which fewer parts share, of several the one drawn nearest."""
    wired = {pin.net for part in parts for pin in part.part.pins}
    found = []
    for device in devices:
        crowds = [len(board.netlist.nets[pin.net].pins) for pin in device.part.pins if pin.net in wired]
        found += [(min(crowds), abs(device.index - parts[0].index), device)] if crowds else []
    return min(found, key=lambda one: one[:2])[2] if found else None


def _is_power(whole: BoardCase, part: BoardPart) -> bool:
    """Tell whether a device is a power device; one of which nothing is known may be."""
    rating = None if part.entry is None else part.entry.ratings.get("ic") or part.entry.ratings.get("id")
    return rating is None or rating.value >= whole.threshold("limiter-absent", "power_device")


def _note(whole: BoardCase, resistor: Element, parts: list[BoardPart], device: BoardPart) -> Finding:
    board = whole.board
    names = ", ".join(part.id for part in parts)
    net = board.nets[next(iter(resistor.terminals.values()))].name
    links = links_across(board, [part.id for part in parts])
    return Finding(
        check=CHECK,
        limiter=None,
        parts=(*(part.id for part in parts), device.id, *links),
        nets=(net,),
        message=f"both ends of {names} are on {net}, in the lead of {device.id}: no current flows through it, and what "
        f"is to watch the current of {device.id} there sees no drop",
        working=(WorkingLine(f"drop across {names}", f"both ends on {net}", 0.0, "V"),),
        remedy=f"take out {', '.join(links)}, which shorts {names}"
        if links
        else f"part the ends of {names}: one with {device.id}, the other where both are now",
        level="note",
    )
