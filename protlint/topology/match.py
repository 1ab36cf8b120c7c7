"""Finds the limiters of a board: every rule that fits, and one limiter for every shunt."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence

from protlint.board.graph import Board
from protlint.netlist.forms import no_collection
from protlint.topology.fitting import Fitter, Match
from protlint.topology.index import Index
from protlint.topology.language import Rules
from protlint.topology.limiter import NETS, ROLES, Found, Limiter
from protlint.topology.questions import holds
from protlint.topology.sets import find_pairs, find_sets


def find_limiters(board: Board, rules: Rules) -> Found:
    """Return every limiter on a board, in board order of its shunt."""
    with no_collection():
        index = Index(board)
        fitter = Fitter(index, rules.patterns)
        remarks: list[str] = []
        limiters: list[Limiter] = []
        for match, also in _one_for_each_shunt(fitter.matches(), rules, board, remarks):
            fitter.add_optional(match)
            limiters.append(_limiter(match, index, also, {one.id for one in limiters}))
    return Found(
        limiters=tuple(limiters),
        remarks=tuple(remarks),
        pairs=find_pairs(limiters),
        sets=find_sets(board, limiters),
    )


def _one_for_each_shunt(
    matches: Sequence[Match], rules: Rules, board: Board, remarks: list[str]
) -> list[tuple[Match, tuple[str, ...]]]:
    """Return the match that names each shunt best, with the other topologies that fit it.

    A rule beats what it builds on; then the match with more required parts wins, then the rule's stated precedence.
    """
    by_shunt: dict[int, list[Match]] = {}
    for match in matches:
        for shunt in match.elements["shunt"]:
            by_shunt.setdefault(shunt, []).append(match)
    chosen: dict[int, tuple[Match, tuple[str, ...]]] = {}
    for shunt in sorted(by_shunt):
        rivals = by_shunt[shunt]
        ancestors = {name for one in rivals for name in rules.resolved[one.pattern.rule].ancestors}
        best = max(rivals, key=lambda one: (one.pattern.rule not in ancestors, *_rank(one, rules)))
        others = sorted({one.pattern.rule for one in rivals} - ancestors - {best.pattern.rule})
        chosen.setdefault(id(best), (best, tuple(others)))
        level = [
            one.pattern.rule for one in rivals if one.pattern.rule in others and _rank(one, rules) == _rank(best, rules)
        ]
        if level:
            part = board.parts[board.elements[shunt].parts[0]].id
            remarks.append(f"{part} fits {best.pattern.rule} and {', '.join(dict.fromkeys(level))} alike")
    return list(chosen.values())


def _rank(match: Match, rules: Rules) -> tuple[int, int]:
    return match.required, rules.resolved[match.pattern.rule].rule.precedence


def _limiter(match: Match, index: Index, also: tuple[str, ...], taken: Collection[str]) -> Limiter:
    board = index.board
    name, shunt = (_first_part(match, role, board) for role in ("pass", "shunt"))
    _add_fuses(match, index)
    elements = {role: tuple(found) for role, found in match.elements.items()}
    roles = {role: _part_ids(board, elements, role) for role in ROLES}
    places = {
        board.parts[part].id: place for element, place in match.places.items() for part in board.elements[element].parts
    }
    return Limiter(
        id=name if name not in taken else f"{name} ({shunt})",
        topology=match.pattern.rule,
        polarity=match.pattern.polarity,
        elements=elements,
        roles=roles,
        nets={net: _report_net(match, net, index) for net in NETS},
        bound={name: _board_net(match, name, index) for name in match.nets},
        also_matched=also,
        places=dict(sorted(places.items())),
    )


def _first_part(match: Match, role: str, board: Board) -> str:
    return board.parts[board.elements[match.elements[role][0]].parts[0]].id


def _part_ids(board: Board, elements: Mapping[str, tuple[int, ...]], role: str) -> tuple[str, ...]:
    head = role.replace("_", "-")
    parts = [
        part
        for name, found in elements.items()
        if name.split(".")[0] == head
        for element in found
        for part in board.elements[element].parts
    ]
    return tuple(board.parts[part].id for part in dict.fromkeys(parts))


def _add_fuses(match: Match, index: Index) -> None:
    """Give the fuses that the search crossed, on nets that are no supply, to the match."""
    crossed = {net for net in match.nets.values() if net in index.members and net not in index.voltage_V}
    for net in sorted(crossed):
        for element, _ in index.at[net]:
            if index.kind[element] == "fuse" and element not in match.own:
                match.elements.setdefault("others.fuse", []).append(element)
                match.places[element] = "fuse"


def _report_net(match: Match, net: str, index: Index) -> int | None:
    for name, tests in match.pattern.nets.get(net, ()):
        if name in match.nets and all(holds(test, match.nets, index) for test in tests):
            return _output_net(match, name, index) if net == "output" else _board_net(match, name, index)
    return None


def _board_net(match: Match, name: str, index: Index) -> int:
    """Return the board net of a name: beside a fuse the one that the limiter's own parts are on."""
    members = index.board_nets(match.nets[name])
    if len(members) > 1:
        for role in ("sense", "shunt", "pass", "drive"):
            for element in match.elements.get(role, ()):
                for net in index.board.elements[element].terminals.values():
                    if net in members:
                        return net
    return members[0]


def _output_net(match: Match, name: str, index: Index) -> int:
    """Return the board net the load hangs on: beside a fuse the one that a connector is on, if there is one."""
    board = index.board
    for net in index.board_nets(match.nets[name]):
        if any(board.parts[part].kind == "connector" for part, _ in board.nets[net].pins):
            return net
    return _board_net(match, name, index)
