"""Which cell an instance means, what stands inside it, and in which order the cells of a design are to be worked through."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import chain

from protlint.findings import some_of
from protlint.netlist.definitions import Cell, Contents, Edif, GlobalRef, Instance, Library, Name, Scope, View, ViewRef
from protlint.netlist.notes import Notes
from protlint.netlist.ports import Budget, Globals, Ports, Shorts
from protlint.sources import UsageError

DEPTH_LIMIT = 100
"""Most levels of a hierarchy."""

_KINDS_OF_CONTENTS = {"netlist": 0, "schematic": 1}
"""The kinds of view whose contents say what is placed and connected, the better one first."""


def _has_contents(view: View) -> bool:
    """Tell whether anything stands inside a view; an empty ``contents`` is a black box."""
    return view.contents is not None and any(sheet.instances or sheet.nets for sheet in view.contents.sheets)


def _best_inside(cell: Cell, *, any_kind: bool = False) -> View | None:
    """Return the view of a cell whose contents count where no reference names one: NETLIST before SCHEMATIC.

    ``any_kind`` takes contents in a view of any kind as a last resort.
    """
    inside = [view for view in cell.views if _has_contents(view) and (any_kind or view.kind in _KINDS_OF_CONTENTS)]
    return min(inside, key=lambda view: _KINDS_OF_CONTENTS.get(view.kind, 2), default=None)


class Block:
    """A cell as instances see it: its ports, its contents where it has any, and which of its bits are one node.

    A block without contents is a leaf. ``shorts`` tells which of its bits are one; what the contents short is added when
    they are wired, and so are the ``globals`` that reach out of it, by bit. ``known`` holds, where a cell has several views,
    the bits of ports that the one with the contents declares, and those it uses once it is wired. ``children`` holds, sheet
    by sheet, the block that each instance places, ``levels`` how deep they go.
    """

    def __init__(self, cell: Cell, library: Library, view: View | None, ports: Ports, budget: Budget, *, leaf: bool) -> None:
        self.cell = cell
        self.library = library
        self.view = view
        self.ports = ports
        self.contents: Contents | None = None if leaf or view is None else view.contents
        self.children: list[list[Block]] = []
        self.levels = 0
        self.globals: dict[int, GlobalRef] = {}
        self.known: set[int] | None = None
        if self.contents is not None and view is not None and len(cell.views) > 1:
            self.known = {bit for port in view.ports for bit in ports.find(port.name.identifier) or ()}
        self.shorts = Shorts()
        for joined in view.shorts if view is not None else ():
            bits = [[self.ports.find(ref.port, ref.member, ref.bundle) or () for ref in item.refs] for item in joined]
            items = [list(chain.from_iterable(item)) for item in bits]
            budget.spend(sum(map(len, items)) - len(items), cell.offset)
            for together in zip(*filter(None, items), strict=False):
                self.shorts.add(together)

    @property
    def is_part(self) -> bool:
        """Whether an instance of it is a part of the board."""
        return self.contents is None and self.cell.kind not in ("ripper", "tie")

    @property
    def sections(self) -> int:
        """How many sections of a package its ports list pin numbers for; 1 where no two ports list more than one.

        A single port that lists several is on several pins of one device, unless it is the only one.
        """
        ports = (port for view in self.cell.views for port in view.ports if port.name.width == 1)
        listed = sorted(len(" ".join(port.designators).split()) for port in ports)
        return max([1, *(listed[-2:-1] or listed)])


class _KnownCell:
    """What is worked out once of a cell that is referred to: its views by name, its ports, its blocks by view."""

    def __init__(self, cell: Cell) -> None:
        self.views = Scope((view.name.identifier, view) for view in cell.views)
        self.ports = Ports(view.ports for view in cell.views)
        self.best = {any_kind: _best_inside(cell, any_kind=any_kind) for any_kind in (False, True)}
        self.blocks: dict[tuple[int, bool], Block] = {}


class Directory:
    """All cells of a file, to look up what references mean."""

    def __init__(self, edif: Edif, notes: Notes) -> None:
        self.edif = edif
        self.budget = Budget(edif.places)
        self.globals = Globals()
        self._notes = notes
        self._libraries = Scope((library.name.identifier, library) for library in edif.libraries)
        self._cells = {id(each): Scope((cell.name.identifier, cell) for cell in each.cells) for each in edif.libraries}
        self._known: dict[int, _KnownCell] = {}
        self._everywhere: Scope[tuple[Cell, Library]] | None = None
        self._unknown: dict[str, Block] = {}

    def find(self, cell: str, library: str | None, here: Library | None) -> tuple[Cell, Library] | None:
        """Return the cell of a name in the library named, else in the one the reference stands in."""
        home = here if library is None else self._libraries.find(library)
        found = None if home is None else self._cells[id(home)].find(cell)
        return None if found is None or home is None else (found, home)

    def find_anywhere(self, cell: str) -> tuple[Cell, Library] | None:
        """Return the first cell of a name in any library."""
        if self._everywhere is None:
            cells = ((each, library) for library in self.edif.libraries for each in library.cells)
            self._everywhere = Scope((each.name.identifier, (each, library)) for each, library in cells)
        return self._everywhere.find(cell)

    def block(self, cell: Cell, library: Library, wanted: str | None, offset: int, *, any_kind: bool = False) -> Block:
        """Return a cell with the view to go by chosen; noted at ``offset`` where the one wanted is absent.

        The view wanted, if it has contents; else the best with contents; else the one wanted or the first, as a leaf.
        """
        known = self._known.get(id(cell))
        if known is None:
            known = self._known[id(cell)] = _KnownCell(cell)
        named = None if wanted is None else known.views.find(wanted)
        if wanted is not None and named is None:
            self._notes.add("view", offset, f"{wanted} of the cell {cell.name.text}")
        inside = named if named is not None and _has_contents(named) else known.best[any_kind]
        view = inside or named or next(iter(cell.views), None)
        key = (id(view), inside is not None)
        if key not in known.blocks:
            known.blocks[key] = Block(cell, library, view, known.ports, self.budget, leaf=inside is None)
        return known.blocks[key]

    def meant(self, instance: Instance, inside: Block) -> Block:
        """Return the block that an instance inside another block places.

        Where none of its references leads anywhere, an unknown cell of that name: the part is on the board all the same.
        """
        own = inside.cell.name.identifier
        for ref in instance.views:
            found = self.find(ref.cell or own, ref.library, inside.library)
            if found is not None:
                return self.block(*found, ref.view, instance.offset)
        for ref in instance.views:
            found = self.find_anywhere(ref.cell or own)
            if found is not None:
                library = ref.library or inside.library.name.text
                detail = f"{ref.cell}, sought in {library}, found in {found[1].name.text}"
                self._notes.add("library", instance.offset, detail)
                return self.block(*found, ref.view, instance.offset)
        ref = instance.views[0] if instance.views else ViewRef(None, "", None)
        name, library = ref.cell or "", ref.library or inside.library.name.identifier
        detail = f"{name} for {instance.name.text}" if name else f"{instance.name.text} names no cell"
        self._notes.add("cell", instance.offset, detail)
        return self._unknown_block(name, library)

    def _unknown_block(self, name: str, library: str) -> Block:
        key = name.lower()
        if key not in self._unknown:
            cell = Cell(Name(name, name.removeprefix("&")), "generic", (), (), 0)
            home = self._libraries.find(library) or Library(Name(library, library.removeprefix("&")), True, (), 0)
            self._unknown[key] = Block(cell, home, None, Ports(), self.budget, leaf=True)
        return self._unknown[key]

    def bottom_up(self, top: Block) -> list[Block]:
        """Return the blocks with contents under ``top``, it included, each after all that it places; fill in ``children``.

        Raises
        ------
        InputError : a cell contains itself, at the instance that closes the circle, or the hierarchy is too deep.
        """
        done: dict[int, Block] = {}
        road: list[tuple[Block, Iterator[tuple[Instance, Block]]]] = [(top, self.placed(top))]
        on_road = {id(top)}
        while road:
            block, instances = road[-1]
            for instance, child in instances:
                if id(child) in on_road:
                    names = [each.cell.name.text for each, _ in road]
                    circle = " > ".join([*names[names.index(child.cell.name.text) :], child.cell.name.text])
                    raise self.edif.places.error(f"a cell contains itself: {circle}", instance.offset)
                if child.contents is not None and id(child) not in done:
                    road.append((child, self.placed(child)))
                    on_road.add(id(child))
                    break
            else:
                road.pop()
                on_road.discard(id(block))
                done[id(block)] = block
                block.levels = 1 + max((child.levels for children in block.children for child in children), default=0)
                if block.levels > DEPTH_LIMIT:
                    message = (
                        f"{block.cell.name.text} is the top of more than {DEPTH_LIMIT} levels of hierarchy, the most read"
                    )
                    raise self.edif.places.error(message, block.cell.offset)
        return list(done.values())

    def placed(self, block: Block) -> Iterator[tuple[Instance, Block]]:
        """Yield the instances inside a block with the blocks they place; fill in its ``children``."""
        sheets = block.contents.sheets if block.contents is not None else ()
        if not block.children:
            block.children = [[self.meant(instance, block) for instance in sheet.instances] for sheet in sheets]
        for sheet, children in zip(sheets, block.children, strict=True):
            yield from zip(sheet.instances, children, strict=True)


def choose_top(directory: Directory, notes: Notes, wanted: str | None) -> tuple[Block, str, str]:
    """Return the block a board begins with, the board's name, and how it was chosen.

    Raises
    ------
    UsageError : no design is called ``wanted``.
    InputError : there is no design, and no cell with contents.
    """
    edif = directory.edif
    designs = edif.designs
    if wanted is not None:
        sought = wanted.removeprefix("&").lower()
        designs = tuple(
            design for design in designs
            if sought in (design.name.text.lower(), design.name.identifier.removeprefix("&").lower())
        )  # fmt: skip
        if not designs:
            known = some_of(list(dict.fromkeys(design.name.text for design in edif.designs))) or "none"
            raise UsageError(f"no design is called {wanted!r}; designs in the file: {known}", file=edif.places.file)
    elif len(designs) > 1:
        names = some_of([design.name.text for design in designs])
        told = f"several designs, {names}: the first is taken, --design NAME takes another"
        notes.add("designs", designs[1].offset, told)
    for design in designs:
        found = directory.find(design.cell, design.library, None) or directory.find_anywhere(design.cell)
        if found is not None:
            return directory.block(*found, None, design.offset, any_kind=True), design.name.text, "the design statement"
        notes.add("reference", design.offset, f"the design {design.name.text} is of the cell {design.cell}, not in the file")
        if wanted is not None:
            raise edif.places.error(f"the cell {design.cell} of the design {wanted} is not in the file", design.offset)
    return _top_without_design(directory, notes)


def _top_without_design(directory: Directory, notes: Notes) -> tuple[Block, str, str]:
    """Return the cell with contents that no other places; of several the one that places most."""
    edif = directory.edif
    cells = [(cell, library) for library in edif.libraries for cell in library.cells]
    inside: list[Block] = []
    for any_kind in (False, True):
        blocks = (directory.block(*each, None, each[0].offset, any_kind=any_kind) for each in cells)
        inside = inside or [block for block in blocks if block.contents is not None]
    if not inside:
        raise edif.places.error("there is no design in it, and no cell with contents: nothing is placed or connected", 0)
    placed = {id(child.cell) for block in inside for _, child in directory.placed(block) if child is not block}
    tops = [block for block in inside if id(block.cell) not in placed] or inside
    top = max(tops, key=lambda block: sum(map(len, block.children)))
    if len(tops) > 1:
        names = some_of([block.cell.name.text for block in tops])
        notes.add("designs", top.cell.offset, f"no design, and no cell places these: {names}; {top.cell.name.text} is taken")
    return top, top.cell.name.text, "no design statement; the cell that no other places"
