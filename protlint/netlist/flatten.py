"""Hierarchy to one flat netlist: each placed cell unfolded with the nets that reach into it, no recursion, file order."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from protlint.netlist.connect import Node, Wiring, wire
from protlint.netlist.definitions import Edif
from protlint.netlist.hierarchy import Block, Directory, choose_top
from protlint.netlist.model import DuplicateDesignator, Net, Part, Pin, PinOnTwoNets, Property
from protlint.netlist.naming import NamedCell, name_cell
from protlint.netlist.notes import Notes

SIZE_LIMIT = 4_000_000
"""Most parts, nets and pins together of a flattened design: a short file can describe more than any memory holds."""


def flatten(edif: Edif, notes: Notes, *, design: str | None = None) -> Flat:
    """Return one design of a file, flattened.

    Raises
    ------
    UsageError : no design is called ``design``.
    InputError : nothing is placed or connected, a cell contains itself, or the design is past a stated limit.
    """
    directory = Directory(edif, notes)
    top, name, chosen_by = choose_top(directory, notes, design)
    order = [block for block in directory.bottom_up(top) if block.contents is not None]
    wirings = {id(block): wire(block, notes, directory.budget) for block in order}
    _refuse_too_large(order, wirings, edif)
    designated = any(
        any(placement.instance.designators)
        for wiring in wirings.values()
        for placement in wiring.placements
        if placement.block.is_part
    )
    cells = {}
    for key, wiring in wirings.items():
        named = name_cell(wiring, notes, edif.places, designated=designated)
        cells[key] = UnfoldedCell(wiring, named, _templates(wiring, named, edif, notes))
    unfolder = _Unfolder(cells)
    if id(top) in cells:
        unfolder.unfold(cells[id(top)])
    return unfolder.flat(name, top, chosen_by, designated=designated)


def _refuse_too_large(order: Iterable[Block], wirings: Mapping[int, Wiring], edif: Edif) -> None:
    """Add up, bottom up and before anything is unfolded, what each block holds."""
    size: dict[int, int] = {}
    for block in order:
        wiring = wirings[id(block)]
        size[id(block)] = len(wiring.nodes) + sum(
            1 + len(placement.pins) + size.get(id(placement.block), 0) for placement in wiring.placements
        )
        if size[id(block)] > SIZE_LIMIT:
            message = (
                f"flattened, {block.cell.name.text} has more than {SIZE_LIMIT} parts, nets and pins; protlint reads no more"
            )
            raise edif.places.error(message, block.cell.offset)


def _templates(wiring: Wiring, named: NamedCell, edif: Edif, notes: Notes) -> list[_Template | None]:
    """Return what is the same of a part wherever its cell is unfolded; None for placements that are no parts."""
    inherited: dict[int, dict[str, Property]] = {}
    templates: list[_Template | None] = []
    for placement, label in zip(wiring.placements, named.labels, strict=True):
        block, instance = placement.block, placement.instance
        if label is None or not block.is_part:
            templates.append(None)
            continue
        if id(block) not in inherited:
            of_view = _by_name(block.view.properties, notes) if block.view is not None else {}
            inherited[id(block)] = _by_name(block.cell.properties, notes) | of_view
        own = _by_name(instance.properties, notes)
        line, column = edif.places.at(instance.offset)
        templates.append(
            _Template(
                designator=label.designator,
                cell=block.cell.name.text,
                library=block.library.name.text,
                properties=inherited[id(block)] | own if own else inherited[id(block)],
                line=line,
                column=column,
            )
        )
    return templates


def _by_name(properties: Iterable[Property], notes: Notes) -> dict[str, Property]:
    """Return properties by name, in lower case; of two values the first counts."""
    result: dict[str, Property] = {}
    for each in properties:
        first = result.setdefault(each.name.lower(), each)
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
        result.append(replace(part, id=name))
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
class UnfoldedCell:
    """A cell with contents, ready to unfold."""

    wiring: Wiring
    named: NamedCell
    templates: Sequence[_Template | None]


@dataclass(frozen=True, slots=True)
class _Template:
    """What all the parts have in common that one instance becomes."""

    designator: str | None
    cell: str
    library: str
    properties: Mapping[str, Property]
    line: int
    column: int


@dataclass(slots=True)
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
        self.levels = 0
        self.parts: list[Part] = []
        self.nets: list[Node] = []
        self.pins: list[list[tuple[int, int]]] = []
        self.on_two_nets: list[PinOnTwoNets] = []
        self.duplicates: list[DuplicateDesignator] = []

    def unfold(self, top: UnfoldedCell) -> None:
        """Unfold the cell a board begins with, and every cell placed in it, each in the order of the file."""
        stack = [self._frame(top, "", {})]
        while stack:
            self.levels = max(self.levels, len(stack))
            frame = stack[-1]
            for position in frame.remaining:
                label = frame.cell.named.labels[position]
                if label is None:
                    continue
                template = frame.cell.templates[position]
                if template is not None:
                    self._part(frame, position, template, label.id)
                    continue
                placement = frame.cell.wiring.placements[position]
                given = {bit: frame.nets[node] for bit, (node, _) in placement.pins.items()}
                stack.append(self._frame(self.cells[id(placement.block)], f"{frame.path}{label.id}/", given))
                break
            else:
                self._close(frame)
                stack.pop()

    def _frame(self, cell: UnfoldedCell, path: str, given: Mapping[int, int]) -> _Frame:
        nets = [-1] * len(cell.wiring.nodes)
        for bit, node in cell.wiring.ports.items():
            nets[node] = given.get(bit, nets[node])
        for node, net in enumerate(cell.wiring.nodes):
            if nets[node] < 0:
                nets[node] = len(self.nets)
                self.nets.append(replace(net, name=path + net.name) if path else net)
                self.pins.append([])
        return _Frame(cell, path, nets, iter(range(len(cell.wiring.placements))), {})

    def _part(self, frame: _Frame, position: int, template: _Template, name: str) -> None:
        index = frame.parts[position] = len(self.parts)
        pins = []
        for number, pin in enumerate(frame.cell.named.pins[position]):
            net = frame.nets[pin.node]
            self.pins[net].append((index, number))
            pins.append(Pin(pin.name, pin.number, net, pin.line, pin.column, pin.direction))
        self.parts.append(
            Part(
                frame.path + name,
                template.designator,
                template.cell,
                template.library,
                template.properties,
                tuple(pins),
                template.line,
                template.column,
            )
        )

    def _close(self, frame: _Frame) -> None:
        """Tell, of a cell that is unfolded, what the file joins or calls twice."""
        for twice in frame.cell.wiring.on_two_nets:
            first, second = (frame.nets[node] for node in twice.nodes)
            if first != second and twice.placement in frame.parts:
                pin = frame.cell.wiring.placements[twice.placement].block.ports.text(twice.bit)
                part = frame.parts[twice.placement]
                self.on_two_nets.append(PinOnTwoNets(part, pin, (first, second), twice.line, twice.column))
        for positions in frame.cell.named.twice:
            label = frame.cell.named.labels[positions[0]]
            if label is not None and label.designator is not None:
                parts = tuple(frame.parts[position] for position in positions)
                self.duplicates.append(DuplicateDesignator(label.designator, parts))

    def flat(self, design: str, top: Block, chosen_by: str, *, designated: bool) -> Flat:
        """Return what was gathered."""
        nets = (Net(net.name, tuple(pins), net.line, net.column) for net, pins in zip(self.nets, self.pins, strict=True))
        return Flat(
            design=design,
            cell=top.cell.name.text,
            chosen_by=chosen_by,
            designated=designated,
            levels=self.levels,
            parts=_distinct(self.parts),
            nets=tuple(nets),
            pins_on_two_nets=tuple(self.on_two_nets),
            duplicate_designators=tuple(self.duplicates),
            cells=tuple(self.cells.values()),
        )
