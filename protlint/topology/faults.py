"""Limiters drawn wrong: fault rules on the shunts and pass devices that no sound rule claimed."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence

from protlint.board.assemble import is_link
from protlint.board.graph import Board
from protlint.topology.fitting import Match
from protlint.topology.index import Index
from protlint.topology.language import Rules
from protlint.topology.limiter import FaultMatch, Limiter
from protlint.topology.naming import board_net, build_limiter
from protlint.topology.terms import MIRROR, Cure

Connection = tuple[str, str]
"""A part's id and the role of its pin."""

STOPS = ("others.base-stop", "others.gate-stop")
"""The roles of a resistor between the drive and a pass device."""


def find_faults(index: Index, matches: Sequence[Match], rules: Rules, limiters: Sequence[Limiter]) -> tuple[FaultMatch, ...]:
    """Return the faults of a board, one a shunt, in board order of the shunts, from the matches of fault patterns."""
    sound_carriers = {one for limiter in limiters for one in _of_role(limiter.elements, "pass", "driver")}
    shunts = {one for limiter in limiters for one in _of_role(limiter.elements, "shunt")}
    carriers = set(sound_carriers)
    found: dict[tuple[int, ...], Match] = {}
    shorted: set[int] = set()
    for match in sorted(matches, key=lambda one: _rank(one, rules, index)):
        bypassed = set(match.elements["sense"]) if _is_shorted(match, index) else set()
        if bypassed and (bypassed & shorted or not _touches_the_sense(match, index)):
            continue
        its_shunts, its_carriers = _of_role(match.elements, "shunt"), _of_role(match.elements, "pass", "driver")
        # A carrier of a sound limiter has its shunt; what carries the load in one limiter, right or wrong, shunts no other.
        if its_carriers & (sound_carriers | shunts) or its_shunts & (carriers | shunts):
            continue
        found[tuple(sorted(its_shunts))] = match
        carriers |= its_carriers
        shunts |= its_shunts
        shorted |= bypassed
    return tuple(_fault(found[shunt], index, rules) for shunt in sorted(found))


def _rank(match: Match, rules: Rules, index: Index) -> tuple[object, ...]:
    """Return a sort key: most required parts first, then the rule's precedence.

    A resistor before the pass device counts for nothing and comes last: with no collector to tell where the drive is, that
    is as likely the drive's own. Resistors shorted on a supply would fit every stage there: the first is the first stage's.
    """
    stops = sum(len(match.elements.get(role, ())) for role in STOPS)
    in_order = [
        index.board.elements[match.elements[role][0]].parts[0] for role in ("shunt", "sense") if match.elements.get(role)
    ]
    return stops - match.required, -rules.resolved[match.pattern.rule].rule.precedence, stops, in_order, match.key


def _is_shorted(match: Match, index: Index) -> bool:
    """Tell whether a match has a sense resistance, with both ends on one net."""
    sense = match.elements.get("sense", ())
    return bool(sense) and all(len(set(index.terminals[element].values())) == 1 for element in sense)


def _touches_the_sense(match: Match, index: Index) -> bool:
    """Tell whether a match's other parts are on both nets that the netlist joins its shorted sense resistance to.

    Where a link makes one net of the two, any limiter at the far end would fit otherwise.
    """
    board = index.board

    def wired(elements: Iterable[int]) -> set[int]:
        parts = (board.parts[part].part for element in elements for part in board.elements[element].parts)
        return {pin.net for part in parts for pin in part.pins}

    sense = match.elements["sense"]
    return wired(sense) <= wired(match.own - set(sense))


def _of_role(elements: Mapping[str, Sequence[int]], *heads: str) -> set[int]:
    """Return the elements of all roles that begin with one of these words."""
    return {one for role, found in elements.items() if role.split(".")[0] in heads for one in found}


def _fault(match: Match, index: Index, rules: Rules) -> FaultMatch:
    resolved = rules.resolved[match.pattern.rule]
    group = build_limiter(match, index, (), ())
    cures = next((cure for cure in resolved.rule.cure if _has_parts(match, cure)), ())
    exchange, moves, replaces, parted = [], [], [], list[str]()
    for cure in cures:
        if cure.what == "exchange":
            one, other = (_connections(match, index, word) for word in cure.of)
            exchange += list(zip(one, other, strict=True))
        elif cure.what == "move":
            net = board_net(match, cure.of[1], index)
            moves += [(connection, net) for connection in _connections(match, index, cure.of[0])]
        elif cure.what == "replace":
            kind = cure.of[1] if match.pattern.polarity == "n" else MIRROR.get(cure.of[1], cure.of[1])
            replaces += [(part, kind) for part in _part_ids(match, index, cure.of[0])]
        elif cure.what == "turn":
            exchange += [((part, "anode"), (part, "cathode")) for part in _against(match, index, *cure.of)]
        else:
            parted += _part_ids(match, index, cure.of[0])
    return FaultMatch(
        fault=match.pattern.rule.split(".")[0],
        spoils=resolved.ancestors[0],
        group=group,
        says=_sentence(resolved.rule.says, match, index),
        exchange=tuple(exchange),
        moves=tuple(moves),
        replaces=tuple(replaces),
        parts_ends=tuple(parted),
        links=links_across(index.board, parted),
    )


def _has_parts(match: Match, cures: Sequence[Cure]) -> bool:
    return all(match.elements.get(cure.of[0]) or match.elements.get(_split(cure.of[0])[0]) for cure in cures)


def _split(connection: str) -> tuple[str, str]:
    """Return the role and the pin (or net) of a connection; a role may have a dot of its own."""
    role, _, pin = connection.rpartition(".")
    return (role, pin) if role else (pin, "")


def _connections(match: Match, index: Index, word: str) -> list[Connection]:
    """Return the pins a connection of a cure stands for: by role and pin, or by role and the net the pin is on."""
    role, pin = _split(word)
    board = index.board
    found = []
    for element in match.elements.get(role, ()):
        for part in (board.parts[one] for one in board.elements[element].parts):
            if pin in part.roles:
                found.append((part.id, pin))
            elif pin in match.nets:
                found += [(part.id, name) for name, net in part.roles.items() if index.net_of[net] == match.nets[pin]]
    return found


def _part_ids(match: Match, index: Index, role: str) -> list[str]:
    board = index.board
    return [board.parts[part].id for element in match.elements.get(role, ()) for part in board.elements[element].parts]


def _against(match: Match, index: Index, role: str, first: str, last: str) -> list[str]:
    """Return the diodes of a string that point the other way than from one net to another (mirrored, from the other)."""
    if match.pattern.polarity == "p":
        first, last = last, first
    net, left, turned = match.nets[first], list(match.elements.get(role, ())), []
    while left and net != match.nets[last]:
        element = next(one for one in left if net in index.terminals[one].values())
        left.remove(element)
        ends = index.ends(element)
        assert ends is not None
        if ends[0] != net:
            turned += [index.board.parts[part].id for part in index.board.elements[element].parts]
        net = ends[1] if ends[0] == net else ends[0]
    return turned


def _sentence(template: str, match: Match, index: Index) -> str:
    """Return a fault's sentence with parts and nets named."""

    def named(found: re.Match[str]) -> str:
        word = found[1]
        parts = _part_ids(match, index, word)
        if parts:
            return ", ".join(parts)
        return index.board.nets[board_net(match, word, index)].name if word in match.nets else found[0]

    return re.sub(r"\{([^{}]+)\}", named, template)


def links_across(board: Board, parts: Sequence[str]) -> tuple[str, ...]:
    """Return the links that join what the ends of some parts were joined to in the netlist."""
    links = []
    for part in board.parts if parts else ():
        if part.id in parts:
            ends = {pin.net for pin in part.part.pins}
            for other in board.parts:
                if len(ends) > 1 and is_link(other) and ends <= {pin.net for pin in other.part.pins}:
                    links.append(other.id)
    return tuple(dict.fromkeys(links))
