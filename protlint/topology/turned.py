"""Transistors that stand with their pins in another order, or of the other polarity, than a sound limiter would have them.

What a wrong symbol or footprint does is the commonest slip of all. It is found by trying: of transistors that lie together
as those of a limiter do, one at a time is turned every way there is, and the sound rules are asked again.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import permutations

from protlint.board.graph import Board, Element
from protlint.topology.excerpt import Excerpt, excerpt
from protlint.topology.index import Index
from protlint.topology.likely import is_likely
from protlint.topology.limiter import FaultMatch, Limiter
from protlint.topology.suspects import SENSE_OHM, Group, suspected_groups
from protlint.topology.terms import MIRROR, PINS

Finder = Callable[[Board], Sequence[Limiter]]
"""What finds the sound limiters of a board."""

ORDER = ("collector", "base", "emitter", "drain", "gate", "source", "anode", "cathode")
"""The order in which pins are spoken of."""

LATCH = "others.latch"
TURNED_ROLES = ("shunt", LATCH, "driver", "pass")
"""The roles in which a transistor may be found turned round, the likeliest first."""

EXCHANGED = {
    frozenset({"collector", "emitter"}): "collector-emitter-swapped",
    frozenset({"base", "emitter"}): "base-emitter-swapped",
    frozenset({"collector", "base"}): "collector-not-on-the-drive",
}
"""What it is called where two pins of a shunt stand in each other's place."""


@dataclass(frozen=True, slots=True)
class Attempt:
    """An element turned so that it becomes part of a sound limiter: as it would have to be, its role, the limiter."""

    element: Element
    role: str
    limiter: Limiter


def find_turned(index: Index, limiters: Sequence[Limiter], sound: Finder) -> tuple[FaultMatch, ...]:
    """Return a fault for each group of transistors of which one, turned, makes a sound limiter; best first.

    ``sound`` finds the sound limiters of a board.
    """
    board = index.board
    tried: dict[tuple[object, ...], list[Attempt]] = {}
    found: list[tuple[tuple[object, ...], FaultMatch]] = []
    for group in suspected_groups(index, limiters):
        piece = excerpt(board, (*group.core, *group.shunts, *group.beside))
        core, shunts = ([piece.elements.index(one) for one in some] for some in (group.core, sorted(group.shunts)))
        key = (piece.key, tuple(core), tuple(shunts))
        if key not in tried:
            tried[key] = list(_attempts(piece, core, shunts, sound))
        for attempt in tried[key]:
            found.append(_fault(index, piece, attempt, group))
    found.sort(key=lambda one: one[0])
    return tuple(fault for _, fault in found)


def _attempts(piece: Excerpt, core: Sequence[int], shunts: Sequence[int], sound: Finder) -> Iterator[Attempt]:
    """Yield every way to turn one element of the core that makes it part of a sound limiter of these shunts."""
    for one in core:
        for turned in _turned(piece.board.elements[one]):
            for limiter in sound(piece.with_element(turned)):
                role = next((role for role in TURNED_ROLES if one in _in_role(limiter, role)), None)
                if role is not None and set(shunts) & set(limiter.elements["shunt"]) and _senses(piece.board, limiter):
                    yield Attempt(turned, role, limiter)


def _in_role(limiter: Limiter, role: str) -> set[int]:
    own = (ones for name, ones in limiter.elements.items() if role in (name, name.split(".")[0]))
    return {one for ones in own for one in ones}


def _senses(board: Board, limiter: Limiter) -> bool:
    """Tell whether a limiter's sense resistances are as small as those of limiters are."""
    values = [board.elements[one].value for one in limiter.elements.get("sense", ())]
    return all(value is None or value < SENSE_OHM for value in values)


def _turned(element: Element) -> Iterator[Element]:
    """Yield an element with its pins in every other order, and of the other polarity in every order."""
    pins = [pin for pin in ORDER if pin in PINS[element.kind]]
    nets = [element.terminals[pin] for pin in pins]
    for kind in dict.fromkeys((element.kind, MIRROR.get(element.kind, element.kind))):
        for order in permutations(nets):
            if kind != element.kind or list(order) != nets:
                yield replace(element, kind=kind, terminals=dict(zip(pins, order, strict=True)))


def _fault(index: Index, piece: Excerpt, attempt: Attempt, group: Group) -> tuple[tuple[object, ...], FaultMatch]:
    """Return what is wrong as a fault, behind a sort key: likely limiters first, then what takes the least change."""
    board, limiter = index.board, piece.on_whole_board(attempt.limiter)
    element = board.elements[piece.elements[attempt.element.index]]
    part = board.parts[element.parts[0]]
    belongs = {pin: piece.nets[net] for pin, net in attempt.element.terminals.items()}
    pins = [pin for pin in belongs if element.terminals[pin] != belongs[pin]]
    other = attempt.element.kind != element.kind
    fault = FaultMatch(
        fault=_name(attempt.role, pins, other),
        spoils=limiter.topology,
        group=limiter,
        says=_sentence(board, part.id, element, pins, attempt.element.kind if other else None),
        exchange=(((part.id, pins[0]), (part.id, pins[1])),) if len(pins) == 2 else (),
        moves=tuple(((part.id, pin), belongs[pin]) for pin in pins) if len(pins) > 2 else (),
        replaces=((part.id, attempt.element.kind),) if other else (),
        turned=part.id,
        beside=group.in_limiter,
    )
    place = TURNED_ROLES.index(attempt.role)
    likely = is_likely(limiter, index, part.id)
    rank = (not likely, (len(pins) + 1) // 2 + other, place, part.index, -len(limiter.bound), fault.spoils)
    return rank, fault


def _name(role: str, pins: Sequence[str], other: bool) -> str:
    """Return the check for a transistor of a role some pins of which stand elsewhere, or that is of the other polarity."""
    if role == LATCH:
        return "shunt-pins-exchanged"
    if role != "shunt":
        return "pass-polarity-wrong" if other else "pass-pins-exchanged"
    return "shunt-polarity-wrong" if other else EXCHANGED.get(frozenset(pins), "shunt-pins-exchanged")


def _sentence(board: Board, name: str, element: Element, pins: Sequence[str], place_takes: str | None) -> str:
    """Say how a transistor stands."""
    where = [f"its {pin} on {board.nets[element.terminals[pin]].name}" for pin in pins]
    said = []
    if place_takes is not None:
        said.append(f"{name} is of the wrong polarity, {element.kind.upper()} where the place takes {place_takes.upper()}")
    if len(pins) == 2:
        said.append(f"{pins[0]} and {pins[1]} of {name} are exchanged: {' and '.join(where)}")
    elif pins:
        said.append(f"all pins of {name} stand in another order: {', '.join(where[:-1])} and {where[-1]}")
    return ", and ".join(said)
