"""Transistors that stand otherwise than a sound limiter would have them: turned round, or with one pin on a wrong net of it.

What a wrong symbol or footprint does is the commonest slip of all. It is found by trying: of transistors that lie together
as those of a limiter do, one at a time is turned every way there is, and the sound rules are asked again. Of a shunt that
stands right but for one pin, that pin is moved to where it may belong.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Iterator, Mapping, Sequence, Set
from dataclasses import dataclass, replace
from itertools import permutations

from protlint.board.graph import Board, Element
from protlint.topology.excerpt import Excerpt, excerpt
from protlint.topology.faults import STOPS
from protlint.topology.index import Index
from protlint.topology.likely import is_likely
from protlint.topology.limiter import FaultMatch, Limiter
from protlint.topology.suspects import CONTROL, LEAD, SENSE_OHM, Group, suspected_groups
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


def find_turned(
    index: Index, limiters: Sequence[Limiter], sound: Finder
) -> tuple[tuple[FaultMatch, ...], Mapping[int, tuple[str, ...]]]:
    """Return a fault for each group of transistors of which one, turned or a pin moved, makes a sound limiter; best first.
    And the transistors where none was found, though not all around them was looked at, by the most crowded net there.

    ``sound`` finds the sound limiters of a board.
    """
    board = index.board
    tried: dict[tuple[object, ...], list[Attempt]] = {}
    found: list[tuple[tuple[object, ...], FaultMatch]] = []
    unsearched: dict[int, dict[int, None]] = {}
    for group in suspected_groups(index, limiters):
        piece = excerpt(board, (*group.core, *group.shunts, *group.beside))
        core, shunts = ([piece.elements.index(one) for one in some] for some in (group.core, sorted(group.shunts)))
        moves = None
        if group.moves:
            moves = tuple((pin, piece.nets.index(net)) for pin, net in group.moves if net in piece.nets)
        leads = _on_piece(index, piece, () if group.far is None else (group.far,))
        controls = _on_piece(index, piece, group.taps)
        key = (piece.key, tuple(core), tuple(shunts), moves, leads, controls)
        if key not in tried:
            ways = [
                turned
                for element in (piece.board.elements[one] for one in core)
                for turned in (_turned(element) if moves is None else _moved(element, moves))
                if group.far is None or _stands(turned, leads, controls)
            ]
            tried[key] = list(_attempts(piece, ways, shunts, sound))
        if piece.crowded is not None and not tried[key]:
            parts = (board.elements[one].parts[0] for one in group.core)
            unsearched.setdefault(piece.crowded, {}).update(dict.fromkeys(parts))
        for attempt in tried[key]:
            found.append(_fault(index, piece, attempt, group))
    found.sort(key=lambda one: one[0])
    named = {net: tuple(board.parts[part].id for part in sorted(parts)) for net, parts in sorted(unsearched.items())}
    return tuple(fault for _, fault in found), named


def _on_piece(index: Index, piece: Excerpt, nets: Collection[int]) -> frozenset[int]:
    """Return by their numbers on a piece the nets there that are some nets of the index."""
    return frozenset(place for place, net in enumerate(piece.nets) if index.net_of[net] in nets)


def _stands(element: Element, leads: Set[int], controls: Set[int]) -> bool:
    """Tell whether a shunt stands with its lead and its control on nets where they belong."""
    lead, _ = LEAD[element.kind]
    return element.terminals[lead] in leads and element.terminals[CONTROL[element.kind]] in controls


def _attempts(piece: Excerpt, ways: Iterable[Element], shunts: Sequence[int], sound: Finder) -> Iterator[Attempt]:
    """Yield every way for an element to stand that makes it part of a sound limiter of these shunts."""
    for turned in ways:
        for limiter in sound(piece.with_element(turned)):
            role = next((role for role in TURNED_ROLES if turned.index in _in_role(limiter, role)), None)
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


def _moved(element: Element, moves: Sequence[tuple[str, int]]) -> Iterator[Element]:
    """Yield an element with one pin on another net, by each of some moves."""
    for pin, net in moves:
        yield replace(element, terminals={**element.terminals, pin: net})


def _fault(index: Index, piece: Excerpt, attempt: Attempt, group: Group) -> tuple[tuple[object, ...], FaultMatch]:
    """Return what is wrong as a fault, behind a sort key: likely limiters first, then what takes the least change."""
    board, limiter = index.board, piece.on_whole_board(attempt.limiter)
    element = board.elements[piece.elements[attempt.element.index]]
    part = board.parts[element.parts[0]]
    belongs = {pin: piece.nets[net] for pin, net in attempt.element.terminals.items()}
    pins = [pin for pin in belongs if element.terminals[pin] != belongs[pin]]
    other = attempt.element.kind != element.kind
    if group.moves:
        far = belongs[LEAD[element.kind][0]]
        name = _name_moved(index, element, pins[0], far)
        says = _sentence_moved(index, part.id, element, pins[0], limiter, far)
    else:
        name = _name(attempt.role, pins, other)
        says = _sentence(board, part.id, element, pins, attempt.element.kind if other else None)
    fault = FaultMatch(
        fault=name,
        spoils=limiter.topology,
        group=limiter,
        says=says,
        exchange=(((part.id, pins[0]), (part.id, pins[1])),) if len(pins) == 2 else (),
        moves=tuple(((part.id, pin), belongs[pin]) for pin in pins) if len(pins) != 2 else (),
        replaces=((part.id, attempt.element.kind),) if other else (),
        turned=None if group.moves else part.id,
        beside=group.in_limiter,
    )
    place = TURNED_ROLES.index(attempt.role)
    likely = is_likely(limiter, index, part.id)
    # Of a resistor before the pass device nobody knows which side the shunt was to be on: it is as likely the drive's own.
    stops = sum(len(limiter.elements.get(role, ())) for role in STOPS) if group.moves else 0
    rank = (not likely, (len(pins) + 1) // 2 + other, place, part.index, stops, -len(limiter.bound), fault.spoils)
    return rank, fault


def _name(role: str, pins: Sequence[str], other: bool) -> str:
    """Return the check for a transistor of a role some pins of which stand elsewhere, or that is of the other polarity."""
    if role == LATCH:
        return "shunt-polarity-wrong" if other else "shunt-pins-exchanged"
    if role != "shunt":
        return "pass-polarity-wrong" if other else "pass-pins-exchanged"
    return "shunt-polarity-wrong" if other else EXCHANGED.get(frozenset(pins), "shunt-pins-exchanged")


def _name_moved(index: Index, element: Element, pin: str, far: int) -> str:
    """Return the check for a shunt one pin of which is on a wrong net of its limiter."""
    lead, take = LEAD[element.kind]
    if pin == take:
        return "collector-not-on-the-drive"
    on_far = pin != lead and index.net_of[element.terminals[pin]] == index.net_of[far]
    return "base-on-far-end" if on_far else "shunt-pin-misplaced"


def _sentence_moved(index: Index, name: str, element: Element, pin: str, limiter: Limiter, far_end: int) -> str:
    """Say where the pin of a shunt stands, and what the shunt does there."""
    board = index.board
    here = element.terminals[pin]
    with_it = next((one for one, net in element.terminals.items() if one != pin and net == here), None)
    net, far = board.nets[here].name, board.nets[far_end].name
    lead, take = LEAD[element.kind]
    sense, carrier = ", ".join(limiter.roles["sense"]), ", ".join(limiter.roles["pass"])
    if with_it is None:
        does = "it takes no drive away" if pin == take else f"it does not see the drop across {sense}"
        belongs = {take: f"the drive of {carrier}", lead: f"{far}, the far end of {sense}"}.get(
            pin, f"the near end of {sense}"
        )
        return f"the {pin} of {name} is on {net}, not on {belongs}: {does}"
    pair = [one for one in ORDER if one in (pin, with_it)]
    if set(pair) == {lead, take}:
        does = "it takes no drive away"
    elif take not in pair:
        does = "it never turns on"
    else:
        does = "it is a diode, and takes no drive away" if pin == take else f"it is a diode from the drive to {far}"
    return f"{pair[0]} and {pair[1]} of {name} are both on {net}: {does}"


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
