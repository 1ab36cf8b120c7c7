"""The lead of a limiter's power side: the series parts between it and the supply that the load current comes from."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator, Mapping

from protlint.board.graph import Board, Element
from protlint.board.regulators import regulator_across

LEAD_AT_MOST_OHM = 10.0
"""A larger resistor is not taken for one in a supply lead; common practice of the trade."""

MOST_STEPS = 4
"""A supply behind more parts in series is not looked for."""

MAIN_PATH = (("collector", "emitter"), ("drain", "source"))
"""The ends of a transistor's main path."""


def lead_to_supply(board: Board, power: int, barred: set[int], *, sources: bool) -> tuple[int, ...]:
    """Return the fuses, inductors, diodes and small resistors from the power side to the nearest supply, if any.

    The load current has to flow that way: through none of the ``barred`` nets, and through a diode only
    forwards (towards the power side where the limiter ``sources`` current). Where a diode leads to ground, nothing
    tells a catch diode or a rectifier of a raw supply from a part in the return: that is no lead.
    """
    start = (power, False)
    came: dict[tuple[int, bool], tuple[tuple[int, bool], int] | None] = {start: None}
    queue = deque([(start, 0)])
    while queue:
        place, steps = queue.popleft()
        net, through_diode = place
        supply = board.nets[net].supply
        if supply is not None:
            if not (through_diode and supply.voltage_V.usual == 0.0):
                return _trace(came, place)
            continue
        if steps == MOST_STEPS:
            continue
        for index, _ in board.elements_at[net]:
            element = board.elements[index]
            if not _in_the_lead(element):
                continue
            for other in other_nets(element, net):
                beyond = (other, through_diode or element.kind == "diode")
                if other in barred or beyond in came or not _carries(board, element, net, other, sources=sources):
                    continue
                came[beyond] = (place, index)
                queue.append((beyond, steps + 1))
    return ()


def other_nets(element: Element, net: int) -> Iterator[int]:
    """Yield an element's other nets, each once."""
    seen = {net}
    for other in element.terminals.values():
        if other not in seen:
            seen.add(other)
            yield other


def _in_the_lead(element: Element) -> bool:
    """Tell whether an element may stand in a supply lead, with the whole load current through it."""
    if element.kind == "resistor":
        return element.value is not None and element.value <= LEAD_AT_MOST_OHM
    return element.kind in ("fuse", "inductor", "diode")


def _carries(board: Board, element: Element, net: int, other: int, *, sources: bool) -> bool:
    """Tell whether an element carries the load current between a net and the one next to the supply.

    A diode does forwards, and where it catches nothing. One whose pins nobody can tell apart may do.
    """
    if element.kind != "diode" or "anode" not in element.terminals:
        return True
    forwards = element.terminals["anode"] == (other if sources else net)
    return forwards and not _makes(board, net, other)


def _makes(board: Board, net: int, other: int) -> bool:
    """Tell whether a net is made of another one: by a regulator, or by a transistor, directly or behind a small resistor.

    A diode between the two blocks while that works.
    """
    if regulator_across(board, net, other) is not None:
        return True
    ends = {other}
    for index, _ in board.elements_at[other]:
        if board.elements[index].kind == "resistor" and _in_the_lead(board.elements[index]):
            ends.update(other_nets(board.elements[index], other))
    ends.discard(net)
    for index, _ in board.elements_at[net]:
        terminals = board.elements[index].terminals
        for one, another in (*MAIN_PATH, *(pair[::-1] for pair in MAIN_PATH)):
            if terminals.get(one) == net and terminals.get(another) in ends:
                return True
    return False


def _trace(came: Mapping[tuple[int, bool], tuple[tuple[int, bool], int] | None], place: tuple[int, bool]) -> tuple[int, ...]:
    path = []
    step = came[place]
    while step is not None:
        path.append(step[1])
        step = came[step[0]]
    return tuple(path)
