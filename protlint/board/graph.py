"""The board as circuit people see it: parts with kinds and roles, nets with voltages, banks and chains as one.

Two views of one board: the public networkx ``MultiGraph`` (part nodes, net nodes, the pin as edge key), and the plain
index of nets and elements that matching and solving run on. Parts, nets and elements are never changed once they are made;
they are not frozen because a board has tens of thousands, and freezing costs more than all that is in them.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

from protlint.board.pins import FROM_MEMORY
from protlint.limits import DriveLimits, Limits, Range
from protlint.netlist.model import Netlist, Part
from protlint.partdata.book import Book, PartEntry

if TYPE_CHECKING:
    import networkx as nx

    from protlint.board.parts_list import PartsList

KINDS = (
    "npn", "pnp", "npn-darlington", "pnp-darlington", "nmos", "pmos", "diode", "zener", "thyristor",
    "resistor", "capacitor", "inductor", "fuse", "link", "connector", "ic", "unknown",
)  # fmt: skip
"""What a part can be. Terminal roles: collector base emitter; drain gate source; anode cathode (gate); 1 2; pin names."""


@dataclass(frozen=True, slots=True)
class Values:
    """A part's values as its properties state them, SI units; None where not stated.

    ``text`` is the value text as written, ``unreadable`` says why it could not be read (None where it could), and
    ``fitted`` is False for a part the text marks as not fitted.
    """

    text: str | None = None
    value: float | None = None
    """ohm, farad or henry, by kind; volt for a zener."""
    tolerance: float | None = None
    power_W: float | None = None
    voltage_V: float | None = None
    footprint: str | None = None
    fitted: bool = True
    unreadable: str | None = None


@dataclass(slots=True)
class BoardPart:
    """A placed part with what protlint made of it. ``roles`` maps a terminal's role to the index of its board net."""

    index: int
    part: Part
    kind: str
    kind_from: str
    roles: Mapping[str, int]
    roles_from: str
    part_number: str | None
    values: Values
    entry: PartEntry | None
    sections: tuple[Mapping[str, int], ...] = ()
    """The roles of each device where one package has several; ``roles`` then goes by pin names."""

    @property
    def id(self) -> str:
        """The part's id, unique on the board."""
        return self.part.id

    @property
    def pins_from_memory(self) -> bool:
        """Whether its pins are told apart by a pin order that protlint knows from memory only."""
        return self.roles_from == FROM_MEMORY


@dataclass(frozen=True, slots=True)
class Supply:
    """A net held at a voltage, and how that is known: ``limits file``, ``net name`` or ``assumed``."""

    voltage_V: Range
    known_from: str


@dataclass(slots=True)
class BoardNet:
    """A net after links are gone. ``names`` holds every united netlist net's name, the shown one first."""

    index: int
    names: tuple[str, ...]
    pins: tuple[tuple[int, str], ...]
    """(board part index, terminal role or pin name) in board order."""
    supply: Supply | None = None

    @property
    def name(self) -> str:
        """The name shown to people."""
        return self.names[0]


@dataclass(slots=True)
class Element:
    """What matching and solving see: one part, or resistors merged from banks and unbranched chains.

    ``terminals`` maps role to board net index; ``parts`` the board part indices it stands for, in board order;
    ``value`` the merged value in SI units (None where any of them is unknown); ``tree`` how it was merged, nested tuples
    ``("bank" | "chain", (child, ...))`` with board part indices as leaves, so that every part's own share of current,
    voltage and power can be worked out.
    """

    index: int
    kind: str
    terminals: Mapping[str, int]
    parts: tuple[int, ...]
    value: float | None
    tree: object


@dataclass(frozen=True)
class Board:
    """The whole board. ``elements_at[n]`` lists (element index, role) on net n; not-fitted parts and links are in none.

    ``net_of`` gives for every net of the netlist the index of the board net that it became; ``drives`` what the limits file
    states of the drive of a net, by net index.
    """

    netlist: Netlist
    parts: tuple[BoardPart, ...]
    nets: tuple[BoardNet, ...]
    elements: tuple[Element, ...]
    elements_at: tuple[tuple[tuple[int, str], ...], ...]
    assumed: tuple[str, ...] = ()
    net_of: tuple[int, ...] = ()
    drives: Mapping[int, DriveLimits] = field(default_factory=dict)

    @cached_property
    def part_of(self) -> Mapping[str, BoardPart]:
        """The parts by id."""
        return {part.id: part for part in self.parts}

    @cached_property
    def supplies(self) -> tuple[BoardNet, ...]:
        """The nets that are held at a voltage."""
        return tuple(net for net in self.nets if net.supply is not None)

    @cached_property
    def net_names(self) -> tuple[str, ...]:
        """One name for every net, unlike any other's: a second net of a name is called ``name (2)``."""
        count: dict[str, int] = {}
        names = []
        for net in self.nets:
            name = net.names[0]
            count[name] = count.get(name, 0) + 1
            names.append(name if count[name] == 1 else f"{name} ({count[name]})")
        return tuple(names)

    def graph(self) -> nx.MultiGraph[object]:
        """Return the public graph: nodes ``("part", id)`` and ``("net", name)``, one edge per pin, the pin as its key.

        A net goes by its name in ``net_names``. Node attributes are ``kind`` for a part and ``names`` for a net; an edge's
        key is the terminal's role or the pin's name.
        """
        import networkx as nx

        graph: nx.MultiGraph[object] = nx.MultiGraph()
        for part in self.parts:
            graph.add_node(("part", part.id), kind=part.kind)
        for net, name in zip(self.nets, self.net_names, strict=True):
            graph.add_node(("net", name), names=net.names)
            for part_index, role in net.pins:
                graph.add_edge(("part", self.parts[part_index].id), ("net", name), key=role)
        return graph


@dataclass(frozen=True, slots=True)
class SeenPart:
    """What is known of a placed part before nets are united; ``roles`` maps a role to positions in ``Part.pins``.

    ``sections`` holds the roles of each device where one package has several, and ``roles`` is then empty.
    """

    kind: str
    roles: Mapping[str, tuple[int, ...]]
    kind_from: str = "given"
    roles_from: str = "given"
    part_number: str | None = None
    values: Values = Values()
    entry: PartEntry | None = None
    sections: tuple[Mapping[str, tuple[int, ...]], ...] = ()


def build_board(netlist: Netlist, *, limits: Limits, book: Book, parts_list: PartsList | None = None) -> Board:
    """Return the board of a netlist: kinds, roles, values, supplies, links gone, banks and chains merged.

    A parts list fills what the netlist's properties leave open.
    """
    from protlint.board.assemble import assemble
    from protlint.board.seeing import see_parts
    from protlint.board.supplies import supply_of

    seen = see_parts(netlist, limits=limits, book=book, parts_list=parts_list)
    return assemble(netlist, seen, limits=limits, supply_of=supply_of)
