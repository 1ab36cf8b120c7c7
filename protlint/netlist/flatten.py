"""Hierarchy to one flat netlist: each placed cell unfolded with the nets that reach into it, no recursion, file order."""

from __future__ import annotations

import sys
from collections import ChainMap
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass

from protlint.netlist.connect import Node, TwoNets, Wiring, wire
from protlint.netlist.definitions import Edif
from protlint.netlist.hierarchy import Block, Directory, choose_top
from protlint.netlist.model import DuplicateDesignator, Net, Part, Pin, PinOnTwoNets, Property
from protlint.netlist.naming import designators_in_properties, name_cell, stated_designators
from protlint.netlist.notes import Notes

SIZE_LIMIT = 4_000_000
"""Most parts, nets and pins together of a flattened design: a short file can describe more than any memory holds."""
COPIED_PROPERTIES = 100
"""Most properties of a cell that each of its parts gets a copy of; real cells have twenty."""
NAMES_LIMIT = 500_000_000
"""Most characters of the names of its parts and nets, which grow with every level of hierarchy."""


def flatten(edif: Edif, notes: Notes, *, design: str | None = None) -> Flat:
    """Return one design of a file, flattened. The definitions are used up: a file is flattened once.

    Raises
    ------
    UsageError : no design is called ``design``.
    InputError : nothing is placed or connected, a cell contains itself, or the design is past a stated limit.
    """
    directory = Directory(edif, notes)
    top, name, chosen_by = choose_top(directory, notes, design)
    order = [block for block in directory.bottom_up(top) if block.contents is not None]
    designated = any(
        child.is_part and any(stated_designators(instance)) for block in order for instance, child in directory.placed(block)
    )
    cells: dict[int, UnfoldedCell] = {}
    sizes: dict[int, _Size] = {}
    for block in order:
        cell = _unfolded(wire(block, notes, directory.budget, directory.globals), edif, notes, designated=designated)
        cells[id(block)], sizes[id(block)] = cell, _size(cell, sizes)
        if sizes[id(block)].things > SIZE_LIMIT or sizes[id(block)].characters > NAMES_LIMIT:
            message = f"flattened, {block.cell.name.text} has more than {SIZE_LIMIT} parts, nets and pins, or {NAMES_LIMIT}"
            raise edif.places.error(f"{message} characters of names; no more is read", block.cell.offset)
    unfolder = _Unfolder(cells)
    if id(top) in cells:
        unfolder.unfold(cells[id(top)])
    flat = unfolder.flat(name, top, chosen_by, designated=designated)
    for twice in flat.pins_on_two_nets:
        names = " and ".join(flat.nets[net].name for net in twice.nets)
        notes.add_at("two nets", (twice.line, twice.column), f"{flat.parts[twice.part].id}.{twice.pin} on {names}")
    return flat


def _size(cell: UnfoldedCell, sizes: Mapping[int, _Size]) -> _Size:
    """Return what a cell unfolds to, from the sizes of those it places."""
    things, named = len(cell.nodes), len(cell.nodes)
    characters = sum(len(node.name) for node in cell.nodes)
    for item in cell.items:
        if isinstance(item, _InnerCell):
            inner = sizes[item.cell]
            things += inner.things
            named += inner.named
            characters += inner.characters + inner.named * (len(item.id) + 1)
        elif item is not None:
            things += 1 + len(item.pins)
            named += 1
            characters += len(item.id)
    return _Size(things, named, characters)


def _unfolded(wiring: Wiring, edif: Edif, notes: Notes, *, designated: bool) -> UnfoldedCell:
    """Return a cell with all that is the same wherever it is placed; the wiring is not needed after it."""
    named = name_cell(wiring, notes, designated=designated)
    inherited: dict[int, dict[str, Property]] = {}
    items: list[Part | _InnerCell | None] = []
    for placement, label, pins in zip(wiring.placements, named.labels, named.pins, strict=True):
        block, instance = placement.block, placement.instance
        if label is None:
            items.append(None)
        elif block.contents is not None:
            items.append(_InnerCell(label.id, id(block), placement.pins))
        else:
            if id(block) not in inherited:
                of_view = () if block.view is None else block.view.properties
                inherited[id(block)] = _by_name(block.cell.properties, notes) | _by_name(of_view, notes)
            own = _by_name(instance.properties, notes)
            properties = _inheriting(own, inherited[id(block)])
            line, column = edif.places.at(instance.offset)
            cell, library = block.cell.name.text, block.library.name.text
            items.append(Part(label.id, label.designator, cell, library, properties, pins, line, column))
    duplicates = [
        (designator, members)
        for members in named.twice
        if (label := named.labels[members[0]]) is not None and (designator := label.designator) is not None
    ]
    return UnfoldedCell(
        block=wiring.block,
        nodes=wiring.nodes,
        ports=wiring.ports,
        items=items,
        on_two_nets=wiring.on_two_nets,
        duplicates=duplicates,
        packages=[len(members) for members in named.packages],
        shorted=sum(placement.block.is_part and bool(placement.block.shorts) for placement in wiring.placements),
        in_properties=sum(
            placement.block.is_part
            and label is not None
            and label.designator is not None
            and not any(placement.instance.designators)
            and bool(designators_in_properties(placement.instance))
            for placement, label in zip(wiring.placements, named.labels, strict=True)
        ),
    )


def _inheriting(own: dict[str, Property], inherited: dict[str, Property]) -> Mapping[str, Property]:
    """Return a part's properties, its own before its cell's: copied, unless many copies of many would outgrow the file."""
    if not own or not inherited:
        return own or inherited
    return inherited | own if len(inherited) <= COPIED_PROPERTIES else ChainMap(own, inherited)


def _by_name(properties: Iterable[Property], notes: Notes) -> dict[str, Property]:
    """Return properties by name, in lower case; of two values the first counts."""
    result: dict[str, Property] = {}
    for each in properties:
        first = result.setdefault(sys.intern(each.name.lower()), each)
        if first is not each and first.value != each.value:
            notes.add_at("property", (each.line, each.column), f"{each.name} is {first.value!r} and {each.value!r}")
    return result


def _distinct(parts: Sequence[Part]) -> tuple[Part, ...]:
    """Return the parts with ids that differ even where a name holds the slash that stands between the levels of a path."""
    taken = {part.id for part in parts}
    if len(taken) == len(parts):
        return tuple(parts)
    seen: set[str] = set()
    result = []
    for part in parts:
        name, number = part.id, 1
        while name in seen or (number > 1 and name in taken):
            number += 1
            name = f"{part.id}#{number}"
        seen.add(name)
        result.append(part._replace(id=name))
    return tuple(result)


@dataclass(frozen=True, slots=True)
class Flat:
    """A flattened design, the cells it was unfolded from, and how it came about.

    ``levels`` is the deepest nesting of cells with contents, the board's own counted; ``designated`` tells whether parts of
    this file have designators or go by their instance's name.
    """

    design: str
    cell: str
    chosen_by: str
    designated: bool
    levels: int
    parts: tuple[Part, ...]
    nets: tuple[Net, ...]
    pins_on_two_nets: tuple[PinOnTwoNets, ...]
    duplicate_designators: tuple[DuplicateDesignator, ...]
    cells: tuple[UnfoldedCell, ...]


@dataclass(frozen=True, slots=True)
class _Size:
    """What a cell unfolds to: parts, nets and pins together, how many of them have a name, and the names' characters."""

    things: int
    named: int
    characters: int


@dataclass(frozen=True, slots=True)
class _InnerCell:
    """A cell with contents placed in another: its name there, and the node that each bit of its ports is on."""

    id: str
    cell: int
    pins: Mapping[int, int]


@dataclass(frozen=True, slots=True)
class UnfoldedCell:
    """A cell with contents, ready to unfold.

    ``items`` holds its parts as they would be if it were the whole board, what else it places, and None for what only joins
    nets; the other positions are positions in it. ``packages`` holds the number of sections of each
    package, ``shorted`` how many parts join nets inside, because their cell says that some of its ports are one,
    ``in_properties`` how many have their designator in a property.
    """

    block: Block
    nodes: Sequence[Node]
    ports: Mapping[int, int]
    items: Sequence[Part | _InnerCell | None]
    on_two_nets: Sequence[TwoNets]
    duplicates: Sequence[tuple[str, tuple[int, ...]]]
    packages: Sequence[int]
    shorted: int
    in_properties: int


@dataclass(frozen=True, slots=True)
class _Frame:
    """One place where a cell is unfolded: the path to it, the board's net of each of its nodes, and what is still to do."""

    cell: UnfoldedCell
    path: str
    nets: list[int]
    remaining: Iterator[int]
    parts: dict[int, int]


class _Unfolder:
    """Gathers the parts and nets of a design while its cells are unfolded."""

    def __init__(self, cells: Mapping[int, UnfoldedCell]) -> None:
        self.cells = cells
        self.parts: list[Part] = []
        self.nets: list[Node] = []
        self.pins: list[list[tuple[int, int]]] = []
        self.on_two_nets: list[PinOnTwoNets] = []
        self.duplicates: list[DuplicateDesignator] = []

    def unfold(self, top: UnfoldedCell) -> None:
        """Unfold the cell a board begins with, and every cell placed in it, each in the order of the file."""
        stack = [self._frame(top, "", {})]
        while stack:
            frame = stack[-1]
            for position in frame.remaining:
                item = frame.cell.items[position]
                if isinstance(item, _InnerCell):
                    given = {bit: frame.nets[node] for bit, node in item.pins.items()}
                    stack.append(self._frame(self.cells[item.cell], f"{frame.path}{item.id}/", given))
                    break
                if item is not None:
                    self._part(frame, position, item)
            else:
                self._close(frame)
                stack.pop()

    def _frame(self, cell: UnfoldedCell, path: str, given: Mapping[int, int]) -> _Frame:
        nets = [-1] * len(cell.nodes)
        for bit, node in cell.ports.items():
            nets[node] = given.get(bit, nets[node])
        for node, net in enumerate(cell.nodes):
            if nets[node] < 0:
                nets[node] = len(self.nets)
                self.nets.append(net._replace(name=path + net.name) if path else net)
                self.pins.append([])
        return _Frame(cell, path, nets, iter(range(len(cell.items))), {})

    def _part(self, frame: _Frame, position: int, part: Part) -> None:
        index = frame.parts[position] = len(self.parts)
        if frame.path:  # the nodes of the first cell are the board's first nets, so its parts are what they will be
            pins = (Pin(pin.name, pin.number, frame.nets[pin.net], pin.direction) for pin in part.pins)
            part = part._replace(id=frame.path + part.id, pins=tuple(pins))
        self.parts.append(part)
        for number, pin in enumerate(part.pins):
            self.pins[pin.net].append((index, number))

    def _close(self, frame: _Frame) -> None:
        """Tell, of a cell that is unfolded, what the file joins or calls twice."""
        for twice in frame.cell.on_two_nets:
            first, second = (frame.nets[node] for node in twice.nodes)
            if first != second:
                part = frame.parts[twice.placement]
                self.on_two_nets.append(PinOnTwoNets(part, twice.pin, (first, second), twice.line, twice.column))
        for designator, members in frame.cell.duplicates:
            self.duplicates.append(DuplicateDesignator(designator, tuple(frame.parts[member] for member in members)))

    def flat(self, design: str, top: Block, chosen_by: str, *, designated: bool) -> Flat:
        """Return what was gathered."""
        nets = (Net(net.name, tuple(pins), net.line, net.column) for net, pins in zip(self.nets, self.pins, strict=True))
        return Flat(
            design=design,
            cell=top.cell.name.text,
            chosen_by=chosen_by,
            designated=designated,
            levels=top.levels,
            parts=_distinct(self.parts),
            nets=tuple(nets),
            pins_on_two_nets=tuple(self.on_two_nets),
            duplicate_designators=tuple(self.duplicates),
            cells=tuple(self.cells.values()),
        )
