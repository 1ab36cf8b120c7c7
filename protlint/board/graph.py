"""The board as circuit people see it: parts with kinds and roles, nets with voltages, banks and chains as one.

Two views of one board: the public networkx ``MultiGraph`` (part nodes, net nodes, the pin as edge key), and the plain
index of nets and elements that matching and solving run on.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from protlint.board.merge import Resistance, merge_resistances, parts_of, unite
from protlint.limits import Limits, Range
from protlint.netlist.model import Netlist, Part
from protlint.partdata.book import Book, PartEntry

if TYPE_CHECKING:
    from protlint.board.parts_list import PartsList
    import networkx as nx

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


@dataclass(frozen=True, slots=True)
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


@dataclass(frozen=True, slots=True)
class Supply:
    """A net held at a voltage, and how that is known: ``limits file``, ``net name`` or ``assumed``."""

    voltage_V: Range
    known_from: str


@dataclass(frozen=True, slots=True)
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


@dataclass(frozen=True, slots=True)
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


@dataclass(frozen=True, slots=True)
class Board:
    """The whole board. ``elements_at[n]`` lists (element index, role) on net n; not-fitted parts and links are in none."""

    netlist: Netlist
    parts: tuple[BoardPart, ...]
    nets: tuple[BoardNet, ...]
    elements: tuple[Element, ...]
    elements_at: tuple[tuple[tuple[int, str], ...], ...]
    assumed: tuple[str, ...] = ()

    def graph(self) -> nx.MultiGraph[object]:
        """Return the public graph: nodes ``("part", id)`` and ``("net", name)``, one edge per pin, the pin as its key.

        Node attributes are ``kind`` for a part and ``names`` for a net; an edge's key is the terminal's role or the pin's
        name. A second net of one name is called ``name (2)``.
        """
        import networkx as nx

        graph: nx.MultiGraph[object] = nx.MultiGraph()
        for part in self.parts:
            graph.add_node(("part", part.id), kind=part.kind)
        count: dict[str, int] = {}
        for net in self.nets:
            count[net.name] = count.get(net.name, 0) + 1
            name = net.name if count[net.name] == 1 else f"{net.name} ({count[net.name]})"
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

    A parts list fills what the netlist's properties leave open. A resistor without part data of its own goes by its size.
    """
    from protlint.board.attributes import file_habits, part_number, read_values
    from protlint.board.kinds import identify
    from protlint.board.supplies import supply_of

    habits = file_habits(netlist, limits)
    seen = []
    for part in netlist.parts:
        listed = parts_list.listed(part) if parts_list is not None else None
        number = part_number(part, habits, book=book, listed=listed)
        entry = book.find(number) if number else None
        who = identify(part, number, entry, limits)
        values = read_values(part, who.kind, habits, listed=listed)
        if entry is None and values.footprint is not None:
            entry = book.find_size(who.kind, values.footprint)
        seen.append(
            SeenPart(who.kind, who.roles, who.kind_from, who.roles_from, number, values, entry, who.sections)
        )
    return assemble(netlist, seen, limits=limits, supply_of=supply_of)


def assemble(
    netlist: Netlist,
    seen: Sequence[SeenPart],
    *,
    limits: Limits,
    supply_of: Callable[[Sequence[str], Limits], Supply | None],
) -> Board:
    """Return the board of a netlist whose parts are identified: ``seen`` stands in the order of ``netlist.parts``.

    A link is a part of kind ``link`` or a resistor of 0 ohm that is fitted; the nets on its pins become one. A pin that
    the file joins to two nets makes one node of them, as the EDIF standard has it, unless both are supplies.
    """
    root, assumed = _united_nets(netlist, seen, limits, supply_of)
    order = {net: index for index, net in enumerate(sorted(set(root)))}
    index_of = [order[net] for net in root]
    parts = tuple(
        BoardPart(
            index, part, known.kind, known.kind_from, _roles(part, known, index_of), known.roles_from, known.part_number,
            known.values, known.entry, _sections(part, known, index_of),
        )
        for index, (part, known) in enumerate(zip(netlist.parts, seen, strict=True))
    )  # fmt: skip
    nets = _nets(netlist, parts, index_of, len(order), limits, supply_of)
    elements = _elements(parts, nets, limits)
    at: list[list[tuple[int, str]]] = [[] for _ in nets]
    for element in elements:
        for role, net in element.terminals.items():
            at[net].append((element.index, role))
    return Board(netlist, parts, nets, elements, tuple(map(tuple, at)), tuple(assumed))


def is_link(part: BoardPart | SeenPart) -> bool:
    """Tell whether a part joins its nets into one: a fitted link, or a fitted resistor of 0 ohm."""
    return part.values.fitted and (part.kind == "link" or (part.kind == "resistor" and part.values.value == 0.0))


def _united_nets(
    netlist: Netlist,
    seen: Sequence[SeenPart],
    limits: Limits,
    supply_of: Callable[[Sequence[str], Limits], Supply | None],
) -> tuple[list[int], list[str]]:
    """Return for each netlist net the first net it is one with, and what had to be assumed for that."""

    def voltage_V(net: int) -> float | None:
        supply = supply_of((netlist.nets[net].name,), limits)
        return None if supply is None else supply.voltage_V.usual

    assumed: list[str] = []
    joined: list[tuple[int, ...]] = []
    for twice in netlist.pins_on_two_nets:
        voltages_V = [voltage_V(net) for net in twice.nets]
        if None in voltages_V or voltages_V[0] == voltages_V[1]:
            joined.append(twice.nets)
        else:
            names = " and ".join(netlist.nets[net].name for net in twice.nets)
            whose = netlist.parts[twice.part].id
            assumed.append(f"pin {twice.pin} of {whose} is on two supplies, {names}; they are taken as apart")
    for part, known in zip(netlist.parts, seen, strict=True):
        nets = tuple(sorted({pin.net for pin in part.pins}))
        if not is_link(known) or len(nets) < 2:
            continue
        joined.append(nets)
        if len({voltage_V(net) for net in nets} - {None}) > 1:
            names = " and ".join(netlist.nets[net].name for net in nets if voltage_V(net) is not None)
            assumed.append(f"{part.id} joins supplies of different voltage, {names}; the first is taken to hold")
    return unite(len(netlist.nets), joined), assumed


def _roles(part: Part, known: SeenPart, index_of: Sequence[int]) -> dict[str, int]:
    """Return every terminal's net by role; a pin without a role, or a second net under one, goes by the pin's own name."""
    roles: dict[str, int] = {}
    placed: set[int] = set()
    for role, positions in known.roles.items():
        for position in positions:
            net = index_of[part.pins[position].net]
            if roles.setdefault(role, net) == net:
                placed.add(position)
    for position, pin in enumerate(part.pins):
        if position in placed:
            continue
        net = index_of[pin.net]
        for name in (pin.name, f"{pin.name} (pin {pin.number or position + 1})"):
            if roles.setdefault(name, net) == net:
                break
    return roles


def _sections(part: Part, known: SeenPart, index_of: Sequence[int]) -> tuple[dict[str, int], ...]:
    return tuple(
        {role: index_of[part.pins[positions[0]].net] for role, positions in section.items()} for section in known.sections
    )


def _nets(
    netlist: Netlist,
    parts: Sequence[BoardPart],
    index_of: Sequence[int],
    count: int,
    limits: Limits,
    supply_of: Callable[[Sequence[str], Limits], Supply | None],
) -> tuple[BoardNet, ...]:
    names: list[list[str]] = [[] for _ in range(count)]
    for net, index in zip(netlist.nets, index_of, strict=True):
        if net.name not in names[index]:
            names[index].append(net.name)
    pins: list[list[tuple[int, str]]] = [[] for _ in range(count)]
    for part in parts:
        for role, index in part.roles.items():
            pins[index].append((part.index, role))
    nets = []
    for index in range(count):
        if len(names[index]) > 1:
            names[index].sort(key=lambda name: supply_of((name,), limits) is None)
        nets.append(BoardNet(index, tuple(names[index]), tuple(pins[index]), supply_of(names[index], limits)))
    return tuple(nets)


def _elements(parts: Sequence[BoardPart], nets: Sequence[BoardNet], limits: Limits) -> tuple[Element, ...]:
    """Return the elements in the board order of their first part."""
    made: list[tuple[int, str, Mapping[str, int], float | None, object]] = []
    resistances = []
    for part in parts:
        if not part.values.fitted or is_link(part):
            continue
        if _is_plain_resistor(part):
            ends = part.roles["1"], part.roles["2"]
            resistances.append(Resistance(ends, part.values.value, part.index, part.index))
        else:
            for roles in part.sections or (part.roles,):
                made.append((part.index, part.kind, roles, part.values.value, part.index))
    for one in merge_resistances(resistances, _passable(parts, nets, limits)):
        made.append((one.first, "resistor", {"1": one.ends[0], "2": one.ends[1]}, one.value, one.tree))
    made.sort(key=lambda one: one[0])
    return tuple(
        Element(index, kind, terminals, parts_of(tree), value, tree)
        for index, (_, kind, terminals, value, tree) in enumerate(made)
    )


def _is_plain_resistor(part: BoardPart) -> bool:
    return part.kind == "resistor" and set(part.roles) == {"1", "2"}


def _passable(parts: Sequence[BoardPart], nets: Sequence[BoardNet], limits: Limits) -> list[bool]:
    """Tell by net whether a chain of resistors may run through it.

    It may not where the net is held, where the limits file speaks of it, or where anything but a resistor hangs on it. A
    test point, a link and a part that is not fitted take no current: they do not count.
    """
    spoken_of = limits.drives.keys() | limits.limiters.keys()
    passable = []
    for net in nets:
        others = (parts[part] for part, _ in net.pins)
        free = all(_takes_no_current(part) or _is_plain_resistor(part) for part in others)
        passable.append(free and net.supply is None and spoken_of.isdisjoint(net.names))
    return passable


_TEST_POINT = re.compile(r"(?i)(?:.*/)?(?:TP|TEST)[-_]?[0-9]+[A-Z]?$|.*test[ _-]?(?:point|pad)")


def _takes_no_current(part: BoardPart) -> bool:
    if not part.values.fitted or is_link(part):
        return True
    one_pin = len(part.part.pins) == 1 and part.kind in ("connector", "unknown")
    return one_pin and any(_TEST_POINT.match(name) for name in (part.id, part.part.cell))
