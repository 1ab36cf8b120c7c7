"""Outputs that bear a supply's name: the +5V that a guarded pass device makes of +12V is no source of its own."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from protlint.board.graph import Board, Element
from protlint.board.pins import FAMILY, TERMINALS

_TRANSISTOR = {kind: TERMINALS[family] for kind, family in FAMILY.items() if family in ("bipolar", "mosfet")}
"""The roles of a transistor's terminals by kind: what the load is on, what steers it, its lead."""


def outputs_named_as_supplies(board: Board) -> Mapping[int, int]:
    """Return the supply nets that a guarded pass device makes of another supply, each with the net it makes it of.

    The pass device stands, with a resistance in its emitter or source lead, between two supplies of one sign and unlike
    voltage, and a transistor at the far end of that resistance takes its drive away. Were both ends held,
    there would be nothing to limit: the end of lesser voltage is the output.
    """
    outputs: dict[int, int] = {}
    for element in board.elements:
        if element.kind not in _TRANSISTOR:
            continue
        load, drive, near = (element.terminals.get(role) for role in _TRANSISTOR[element.kind])
        load_V = _usual_V(board, load)
        if not load_V or drive is None or near is None or _usual_V(board, near) is not None:
            continue
        for far in _behind_resistors(board, near):
            far_V = _usual_V(board, far)
            if not far_V or load is None or load_V * far_V < 0.0 or abs(load_V) == abs(far_V):
                continue
            if _takes_the_drive(board, far, _drives(board, drive), element):
                low, high = (far, load) if abs(far_V) < abs(load_V) else (load, far)
                outputs[low] = high
    return outputs


def with_outputs_free(board: Board, outputs: Mapping[int, int]) -> Board:
    """Return the board with these nets no longer held."""
    nets = tuple(replace(net, supply=None) if net.index in outputs else net for net in board.nets)
    return replace(board, nets=nets)


def _usual_V(board: Board, net: int | None) -> float | None:
    supply = None if net is None else board.nets[net].supply
    return None if supply is None else supply.voltage_V.usual


def _behind_resistors(board: Board, net: int) -> list[int]:
    beyond = [
        board.elements[index].terminals for index, _ in board.elements_at[net] if board.elements[index].kind == "resistor"
    ]
    return [other for terminals in beyond for other in terminals.values() if other != net]


def _drives(board: Board, drive: int) -> set[int]:
    """Return the nets that steer a pass device: its own drive, and those of the drivers before it."""
    nets, waiting = {drive}, [drive]
    while waiting:
        net = waiting.pop()
        for index, role in board.elements_at[net]:
            roles = _TRANSISTOR.get(board.elements[index].kind)
            before = board.elements[index].terminals.get(roles[1]) if roles and role == roles[2] else None
            if before is not None and before not in nets and board.nets[before].supply is None:
                nets.add(before)
                waiting.append(before)
    return nets


def _takes_the_drive(board: Board, far: int, drives: set[int], passing: Element) -> bool:
    """Tell whether a transistor, be it with its ends exchanged, leads from a drive, or a diode at it, to the far end."""
    for index, role in board.elements_at[far]:
        element = board.elements[index]
        ends = _TRANSISTOR.get(element.kind, ("", "", ""))[::2]
        if role not in ends or element is passing:
            continue
        take = element.terminals.get(ends[1 - ends.index(role)])
        if take is not None and drives & {take, *_behind_diodes(board, take)}:
            return True
    return False


def _behind_diodes(board: Board, net: int) -> list[int]:
    diodes = [
        board.elements[index].terminals for index, _ in board.elements_at[net] if board.elements[index].kind == "diode"
    ]
    return [other for terminals in diodes for other in terminals.values() if other != net]
