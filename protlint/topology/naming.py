"""Matches to limiters: the names that every report uses."""

from __future__ import annotations

from collections.abc import Collection, Mapping

from protlint.board.graph import Board
from protlint.topology.fitting import Match
from protlint.topology.index import Index
from protlint.topology.limiter import NETS, ROLES, Limiter
from protlint.topology.questions import holds


def build_limiter(match: Match, index: Index, also: tuple[str, ...], taken: Collection[str]) -> Limiter:
    """Return a match as a limiter: parts by report role, nets by report name, an id that is not taken."""
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
        bound={name: board_net(match, name, index) for name in match.nets},
        grounded=match.pattern.grounded,
        also_matched=also,
        places=dict(sorted(places.items())),
    )


def _first_part(match: Match, role: str, board: Board) -> str:
    return board.parts[board.elements[match.elements[role][0]].parts[0]].id


def _part_ids(board: Board, elements: Mapping[str, tuple[int, ...]], role: str) -> tuple[str, ...]:
    """Return the part ids of a report role: in board order, but the sensed pass device first."""
    head = role.replace("_", "-")
    parts = [
        part
        for name, found in elements.items()
        if name.split(".")[0] == head
        for element in found
        for part in board.elements[element].parts
    ]
    first = parts[:1] if role == "pass" else []
    return tuple(board.parts[part].id for part in dict.fromkeys((*first, *sorted(parts))))


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
        asked = {name, *(one for test in tests for one in test.nets())}
        if asked <= match.nets.keys() and all(holds(test, match.nets, index) for test in tests):
            return _output_net(match, name, index) if net == "output" else board_net(match, name, index)
    return None


def board_net(match: Match, name: str, index: Index) -> int:
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
    return board_net(match, name, index)
