"""A board as the search sees it: nets joined across fuses, and the plain lists that finding runs on."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

from protlint.board.graph import Board
from protlint.board.merge import unite
from protlint.topology.terms import PINS

CROWDED = 64
"""A net with more terminals than this is searched last, as an unnamed rail would be; never left out."""

CONTROLLED = frozenset({"npn", "pnp", "npn-darlington", "pnp-darlington", "nmos", "pmos", "thyristor"})
"""The kinds that control a current; a path of resistors does not run on past one."""

FREE, CROWD, RAIL = 0, 1, 2
"""How freely a net may be walked: an ordinary net, a crowded one (last), a supply (never)."""


_BIT = {pair: 1 << place for place, pair in enumerate((kind, pin) for kind in PINS for pin in sorted(PINS[kind]))}


@cache
def pin_bits(kinds: tuple[str, ...], pin: str | None = None) -> int:
    """Return the bits that stand in the mask of a net where a part of these kinds has such a pin (any, where None)."""
    return sum(_BIT[kind, one] for kind in set(kinds) for one in PINS[kind] if pin in (None, one))


class Index:
    """The lists of one board. A *net* here is the lowest board net among those that fuses join.

    ``kind[e]`` and ``terminals[e]`` (role to net) are an element's; ``at[n]`` lists (element, role) on a net; ``flag[n]`` is
    :data:`FREE`, :data:`CROWD` or :data:`RAIL`; ``mask[n]`` holds the :func:`pin_bits` of what is on the net;
    ``voltage_V[n]`` is a supply's usual voltage.
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
        self.mask = self._masks()
        self._open: dict[int, bool] = {}
        self._transistors: dict[int, tuple[int, ...]] = {}
        self._between: dict[tuple[int, int], list[int]] | None = None
        self._by_pin: dict[int, dict[tuple[str, str], list[int]]] = {}

    def board_nets(self, net: int) -> Sequence[int]:
        """Return the board nets that a net here stands for."""
        return self.members.get(net, (net,))

    def _masks(self) -> list[int]:
        """Return for every net a bit for each (kind, pin) on it, to tell at once what is not there."""
        bit, kind = _BIT, self.kind
        masks = []
        for on_net in self.at:
            mask = 0
            for element, role in on_net:
                mask |= bit.get((kind[element], role), 0)
            masks.append(mask)
        return masks

    def is_open(self, net: int) -> bool:
        """Tell whether a path may run through a net: not a supply, not crowded, and no transistor hangs on it."""
        known = self._open.get(net)
        if known is None:
            kind = self.kind
            known = self.flag[net] == FREE and all(kind[element] not in CONTROLLED for element, _ in self.at[net])
            self._open[net] = known
        return known

    def transistors(self, net: int) -> tuple[int, ...]:
        """Return the elements on a net that control a current and have all their pins."""
        known = self._transistors.get(net)
        if known is None:
            kind, terminals = self.kind, self.terminals
            found = dict.fromkeys(one for one, _ in self.at[net] if kind[one] in CONTROLLED)
            known = tuple([one for one in found if PINS[kind[one]] <= terminals[one].keys()])
            self._transistors[net] = known
        return known

    def on_pin(self, net: int, kind: str, pin: str) -> Sequence[int]:
        """Return the elements of a kind with that pin on a crowded net; the table is made once a net."""
        table = self._by_pin.get(net)
        if table is None:
            table = self._by_pin[net] = {}
            for element, role in self.at[net]:
                table.setdefault((self.kind[element], role), []).append(element)
        return table.get((kind, pin), ())

    def ends(self, element: int) -> tuple[int, int] | None:
        """Return the two nets of a two-terminal element, anode first; None for any other element."""
        roles = self.terminals[element]
        if len(roles) != 2:
            return None
        if "anode" in roles and "cathode" in roles:
            return roles["anode"], roles["cathode"]
        first, second = roles.values()
        return first, second

    def between(self, net: int, other: int, kinds: Sequence[str]) -> Sequence[int]:
        """Return candidates for the two-terminal elements between two nets: what hangs on the emptier one, or, where both
        are crowded, exactly those between (from a table made once)."""
        start = min(net, other, key=lambda one: len(self.at[one]))
        if len(self.at[start]) <= CROWDED:
            return self.on_net(start, kinds)
        if self._between is None:
            self._between = {}
            for element in range(len(self.kind)):
                ends = self.ends(element)
                if ends is not None and all(len(self.at[end]) > CROWDED for end in ends):
                    self._between.setdefault((min(ends), max(ends)), []).append(element)
        return [one for one in self._between.get((min(net, other), max(net, other)), ()) if self.kind[one] in kinds]

    def on_net(self, net: int, kinds: Sequence[str]) -> Sequence[int]:
        """Return the two-terminal elements of some kinds on a net, one with both ends there once."""
        on_net = self.at[net]
        if len(on_net) <= CROWDED:
            kind = self.kind
            found = [element for element, _ in on_net if kind[element] in kinds]
        else:
            found = [element for one in kinds for pin in sorted(PINS[one]) for element in self.on_pin(net, one, pin)]
        return list(dict.fromkeys(found)) if len(found) > 1 else found

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
