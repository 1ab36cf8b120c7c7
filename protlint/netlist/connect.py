"""The inside of one cell: which pins of what it places, and which of its own ports, are one node.

Each cell is wired once, after all that it places, however often it is itself placed. A cell's own ports and its off-page
connectors join its sheets; ripper cells, and placed cells whose ports are one node inside, join what hangs on those ports.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

from protlint.joining import root
from protlint.netlist.definitions import GlobalRef, Instance, Name, Net, PortRef, Scope
from protlint.netlist.hierarchy import Block
from protlint.netlist.notes import Notes
from protlint.netlist.ports import Budget, Globals, Ports, element_of


def wire(block: Block, notes: Notes, budget: Budget, design_wide: Globals) -> Wiring:
    """Return the inside of a block whose ``children`` are known and wired; add to it what its inside shorts and leads out.

    The sheets of its contents are used up, which halves what is in memory when the netlist is made.

    Raises
    ------
    InputError : the file names more elements of arrays than ``budget`` has left.
    """
    wirer = _Wirer(block, notes, budget, design_wide)
    sheets = block.contents.sheets if block.contents is not None else []
    pages = block.contents.pages if block.contents is not None else 0
    sheets.reverse()
    for children in block.children:
        instances: Scope[_Placed] = wirer.beside if len(sheets) > pages else Scope()
        sheet = sheets.pop()
        for instance, child in zip(sheet.instances, children, strict=True):
            wirer.place(instance, child, instances)
        for net in sheet.nets:
            wirer.join(net, instances)
    return wirer.finish()


class Placement(NamedTuple):
    """One thing placed: an instance, or with ``element`` one of an array of them. ``pins`` maps a bit of its ports to the
    node it is on."""

    instance: Instance
    element: int | None
    block: Block
    pins: dict[int, int]


class Node(NamedTuple):
    """What is one inside a cell, with the name and place of one of its nets."""

    name: str
    line: int
    column: int


@dataclass(frozen=True, slots=True)
class TwoNets:
    """A pin of a part (its position in the placements) on two nets: their nodes, the second one's place."""

    placement: int
    pin: str
    nodes: tuple[int, int]
    line: int
    column: int


@dataclass(frozen=True, slots=True)
class Wiring:
    """The inside of a block: its nodes, what is placed with pins on them, and the nodes that its own ports are."""

    block: Block
    nodes: tuple[Node, ...]
    placements: tuple[Placement, ...]
    ports: dict[int, int]
    on_two_nets: tuple[TwoNets, ...]


class _Placed(NamedTuple):
    """An instance as references see it: its block, where its elements begin among the placements, and the bits of plain
    ports, where it is no array."""

    instance: Instance
    block: Block
    first: int
    plain: Mapping[str, int]


_OWN = -1


class _Wirer:
    """Gathers the nodes of one block. A node is a member of a union-find forest until :meth:`finish` numbers them."""

    def __init__(self, block: Block, notes: Notes, budget: Budget, design_wide: Globals) -> None:
        self.block = block
        self.notes = notes
        self.budget = budget
        self.design_wide = design_wide
        self.placements: list[Placement] = []
        self.parents: list[int] = []
        self.nets: list[tuple[int, Net]] = []
        self.own: dict[int, int] = {}
        self.on_two_nets: dict[tuple[int, int, int], TwoNets] = {}
        self.joined_at: dict[tuple[int, int], int] = {}
        """Where the file first joins a bit of a placement (its position), of those whose ports may not all be known."""
        self.beside: Scope[_Placed] = Scope()
        """What is placed beside the pages, if there are any: nets on a page may mean that too."""
        self.connectors = Ports(start=block.ports.width)
        for name in block.contents.connectors if block.contents is not None else ():
            self.connectors.connect(name)

    def place(self, instance: Instance, block: Block, instances: Scope[_Placed]) -> None:
        """Add what an instance places; of two with one identifier the first is what references mean."""
        plain = {} if instance.name.dimensions else block.ports.plain
        instances.add(instance.name.identifier, _Placed(instance, block, len(self.placements), plain))
        if instance.name.dimensions:
            self.budget.spend(instance.name.width - 1, instance.offset)
        if not block.is_part and block.contents is None and block.ports.width > 1 and not block.shorts:
            self.notes.add("ripper", instance.offset, f"{instance.name.text}, a {block.cell.name.text}")
        for element in range(instance.name.width) if instance.name.dimensions else (None,):
            self.placements.append(Placement(instance, element, block, {}))

    def join(self, net: Net, instances: Scope[_Placed]) -> None:
        """Add a net: a node, or for an array of nets one each element, with all that is joined to it."""
        width = net.name.width
        if width > 1:
            self.budget.spend(width - 1, net.offset)
        start = len(self.parents)
        self.parents.extend(range(start, start + width))
        self.nets.append((start, net))
        for item in net.joined:
            if width == 1 and type(item) is PortRef and self._join_plain(item, start, instances):
                continue
            ends = [end for ref in item.refs for end in self._ends(ref, net.name.text, instances)]
            if len(ends) != width and ends:
                self.notes.add("width", item.offset, f"{item.port}, {len(ends)} wide, to {net.name.text}, {width} wide")
            # A plain net takes every element of what is wider; else elements meet in their order as far as both go.
            nodes = range(start, start + width) if width > 1 else [start] * len(ends)
            for node, (position, bit) in zip(nodes, ends, strict=False):
                self._attach(position, bit, node, item.offset)

    def _join_plain(self, ref: PortRef, node: int, instances: Scope[_Placed]) -> bool:
        """Join a plain port of a plain instance, which most references are; False where it takes a closer look."""
        port, instance, offset, member, bundle, _ = ref
        placed = None if instance is None or member or bundle else instances.find(instance)
        bit = None if placed is None else placed.plain.get(port)
        if placed is None or bit is None:
            return False
        self._attach(placed.first, bit, node, offset)
        return True

    def _ends(self, ref: PortRef | GlobalRef, net: str, instances: Scope[_Placed]) -> Sequence[tuple[int, int]]:
        """Return what a reference means: positions of placements, :data:`_OWN` for the block itself, each with a bit."""
        if isinstance(ref, GlobalRef):
            self.notes.add("global", ref.offset, ref.port)
            return [(_OWN, self._lead_out(self.design_wide.bit(ref.port), ref))]
        wanted = (ref.port, ref.member, ref.bundle)
        if ref.instance is None:
            bits = self.block.ports.find(*wanted, text=net) or self.connectors.find(*wanted, text=net)
            if bits is None:
                self.notes.add("port", ref.offset, f"{ref.port} of the cell {self._name}")
                bits = self.connectors.undeclared(ref.port, ref.member)
            self.budget.spend(len(bits) - 1, ref.offset)
            return [(_OWN, bit) for bit in bits]
        placed = instances.find(ref.instance) or self.beside.find(ref.instance)
        elements = None if placed is None else self._elements(placed, ref)
        if placed is None or elements is None:
            self.notes.add("reference", ref.offset, f"the port {ref.port} of {ref.instance}, which is not there")
            return ()
        bits = placed.block.ports.find(*wanted, text=net)
        if bits is None:
            port = ref.port + "".join(f"[{index}]" for index in ref.member)
            cell = placed.block.cell.name.text
            if placed.block.contents is not None:
                self.notes.add("reference", ref.offset, f"the port {port} of {ref.instance}, which the cell {cell} has not")
                return ()
            if placed.block.view is not None:  # of a cell that is not in the file no port is known
                self.notes.add("port", ref.offset, f"{port} of {ref.instance}, a {cell}")
            bits = placed.block.ports.undeclared(ref.port, ref.member)
        self.budget.spend(len(elements) * len(bits) - 1, ref.offset)
        return [(element, bit) for element in elements for bit in bits]

    def _lead_out(self, bit: int, ref: GlobalRef) -> int:
        """Let what is of one name in the whole design reach out of the block, by a node of that name; return its bit."""
        if bit not in self.own:
            self.block.globals[bit] = ref
            self.own[bit] = len(self.parents)
            self.nets.append((len(self.parents), Net(Name(ref.port, ref.port.removeprefix("&")), (), ref.offset)))
            self.parents.append(len(self.parents))
        return bit

    def _elements(self, placed: _Placed, ref: PortRef) -> range | None:
        name = placed.instance.name
        if not ref.instance_member:
            return range(placed.first, placed.first + name.width)
        element = element_of(name.dimensions, ref.instance_member)
        return None if element is None else range(placed.first + element, placed.first + element + 1)

    def _attach(self, position: int, bit: int, node: int, offset: int) -> None:
        if position == _OWN:
            self._unite(self.own.setdefault(bit, node), node)
            return
        instance, _, block, pins = self.placements[position]
        first = pins.setdefault(bit, node)
        if block.known is not None:
            self.joined_at.setdefault((position, bit), offset)
        if first == node:
            return
        if block.is_part:
            pin = block.ports.text(bit)
            twice = TwoNets(position, pin, (first, node), *self.budget.places.at(offset))
            self.on_two_nets.setdefault((position, bit, node), twice)
            return
        self._unite(first, node)
        if block.contents is not None:
            self.notes.add("block pin", offset, f"{block.ports.text(bit)} of {instance.name.text}")

    def _note_strange(self, placement: Placement, bit: int, offset: int) -> None:
        block = placement.block
        view = "the view with contents" if block.view is None else block.view.name.text
        port = f"the port {block.ports.text(bit)} of {placement.instance.name.text}"
        self.notes.add("reference", offset, f"{port}, which the view {view} of the cell {block.cell.name.text} has not")

    def _unite(self, one: int, other: int) -> None:
        one, other = root(self.parents, one), root(self.parents, other)
        self.parents[max(one, other)] = min(one, other)

    @property
    def _name(self) -> str:
        return self.block.cell.name.text

    def finish(self) -> Wiring:
        """Unite what is shorted, number the nodes in the order of the file, and return the wiring."""
        for position, placement in enumerate(self.placements):
            if placement.block.known is not None:
                for bit in sorted(placement.pins.keys() - placement.block.known):
                    self._note_strange(placement, bit, self.joined_at[position, bit])
            if placement.block.globals:
                self.budget.spend(len(placement.block.globals), placement.instance.offset)
            for bit, ref in placement.block.globals.items():
                placement.pins[bit] = self.own[self._lead_out(bit, ref)]
            if placement.block.shorts:
                for one, other in placement.block.shorts.groups(placement.pins.items()):
                    self._unite(one, other)
        for one, other in self.block.shorts.groups(self.own.items()):
            self._unite(one, other)
        top_number, nodes = self._numbered()
        number = [top_number[root(self.parents, node)] for node in range(len(self.parents))]
        ports = {bit: number[node] for bit, node in self.own.items() if bit < self.block.ports.width}
        together: dict[int, list[int]] = {}
        for bit, node in ports.items():
            together.setdefault(node, []).append(bit)
        for bits in together.values():
            self.block.shorts.add(bits)
        if self.block.known is not None:
            self.block.known.update(ports)
        if number != list(range(len(number))):  # where nothing was united, as in most flat netlists, they stay as they are
            for placement in self.placements:
                for bit, node in placement.pins.items():
                    placement.pins[bit] = number[node]
        twice = []
        for each in self.on_two_nets.values():
            first, second = (number[node] for node in each.nodes)
            if first != second:
                twice.append(replace(each, nodes=(first, second)))
        return Wiring(self.block, tuple(nodes), tuple(self.placements), ports, tuple(twice))

    def _numbered(self) -> tuple[dict[int, int], list[Node]]:
        """Return the number of each root, and the nodes.

        A node goes by its first net named like a port or connector it leads to; else by its first net; elements of arrays,
        whose names are made up here, come last.
        """
        led_out: dict[int, set[str]] = {}
        for bit, node in self.own.items():
            ports = self.block.ports if bit < self.block.ports.width else self.connectors
            text = ports.text(bit) if bit >= 0 else self.block.globals[bit].port.removeprefix("&")
            led_out.setdefault(root(self.parents, node), set()).add(text)
        places = self.budget.places
        number: dict[int, int] = {}
        nodes: list[Node] = []
        ranks: list[int] = []
        for start, net in self.nets:
            for element in range(net.name.width):
                top = root(self.parents, start + element)
                name = f"{net.name.text}[{element}]" if net.name.dimensions else net.name.text
                rank = 2 if net.name.dimensions else 0 if name in led_out.get(top, ()) else 1
                if top not in number:
                    number[top] = len(nodes)
                    nodes.append(Node(name, *places.at(net.offset)))
                    ranks.append(rank)
                elif rank < ranks[number[top]]:
                    nodes[number[top]] = Node(name, *places.at(net.offset))
                    ranks[number[top]] = rank
        return number, nodes
