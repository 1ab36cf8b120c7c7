"""A board as the search sees it: nets joined across fuses, and the plain lists that finding runs on."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.board.graph import Board
from protlint.board.merge import unite

CROWDED = 64
"""A net with more terminals than this is searched last, as an unnamed rail would be; never left out."""

CONTROLLED = frozenset({"npn", "pnp", "npn-darlington", "pnp-darlington", "nmos", "pmos", "thyristor"})
"""The kinds that control a current; a path of resistors does not run on past one."""

FREE, CROWD, RAIL = 0, 1, 2
"""How freely a net may be walked: an ordinary net, a crowded one (last), a supply (never)."""


class Index:
    """The lists of one board. A *net* here is the lowest board net among those that fuses join.

    ``kind[e]`` and ``terminals[e]`` (role to net) are an element's; ``at[n]`` lists (element, role) on a net; ``flag[n]`` is
    :data:`FREE`, :data:`CROWD` or :data:`RAIL`; ``voltage_V[n]`` a supply's usual voltage.
    """

    def __init__(self, board: Board) -> None:
        self.board = board
        self.kind = [element.kind for element in board.elements]
        self.terminals = [element.terminals for element in board.elements]
        self.at: list[Sequence[tuple[int, str]]] = list(board.elements_at)
        self.net_of: Sequence[int] = range(len(board.nets))
        self.members: dict[int, list[int]] = {}
        fuses = [tuple(element.terminals.values()) for element in board.elements if element.kind == "fuse"]
        if fuses:
            self._join_across(fuses)
        self.voltage_V: dict[int, float] = {}
        for net in board.nets:
            if net.supply is not None:
                self.voltage_V.setdefault(self.net_of[net.index], net.supply.voltage_V.usual)
        self.flag = [FREE if len(on_net) <= CROWDED else CROWD for on_net in self.at]
        for held in self.voltage_V:
            self.flag[held] = RAIL
        volts = self.voltage_V.values()
        self.lowest_V, self.highest_V = (min(volts), max(volts)) if volts else (0.0, 0.0)
        self.by_kind: dict[str, list[int]] = {}
        for element, kind in enumerate(self.kind):
            self.by_kind.setdefault(kind, []).append(element)
        self._open: dict[int, bool] = {}
        self._by_pin: dict[int, dict[tuple[str, str], list[int]]] = {}

    def board_nets(self, net: int) -> Sequence[int]:
        """Return the board nets that a net here stands for."""
        return self.members.get(net, (net,))

    def is_open(self, net: int) -> bool:
        """Tell whether a path may run through a net: not a supply, not crowded, and no transistor hangs on it."""
        known = self._open.get(net)
        if known is None:
            kind = self.kind
            known = self.flag[net] == FREE and all(kind[element] not in CONTROLLED for element, _ in self.at[net])
            self._open[net] = known
        return known

    def on_pin(self, net: int, kind: str, pin: str) -> Sequence[int]:
        """Return the elements of a kind with that pin on a crowded net; the table is made once a net."""
        table = self._by_pin.get(net)
        if table is None:
            table = self._by_pin[net] = {}
            for element, role in self.at[net]:
                table.setdefault((self.kind[element], role), []).append(element)
        return table.get((kind, pin), ())

    def _join_across(self, fuses: Sequence[tuple[int, ...]]) -> None:
        joined = unite(len(self.board.nets), fuses)
        self.net_of = joined
        for net in {joined[net] for fuse in fuses for net in fuse}:
            self.members[net] = []
        for net, first in enumerate(joined):
            if first in self.members:
                self.members[first].append(net)
        for first, nets in self.members.items():
            self.at[first] = [pair for net in nets for pair in self.board.elements_at[net]]
            for element, _ in self.at[first]:
                here = self.terminals[element]
                self.terminals[element] = {role: joined[net] for role, net in here.items()}
