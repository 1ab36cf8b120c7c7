"""The ports of a cell with their elements numbered through, so that a pin is one integer whatever array it is part of."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterable, Iterator, Sequence

from protlint.joining import root
from protlint.netlist.definitions import Name, Port, Scope
from protlint.netlist.forms import Places

ELEMENTS_LIMIT = 1_000_000
"""Most elements of arrays and ends of globals that one file may name, however few characters that takes."""


def element_of(dimensions: tuple[int, ...], member: tuple[int, ...]) -> int | None:
    """Return the position of an array's element, the last index running fastest; None where there is no such element."""
    position = 0
    if len(dimensions) != len(member):
        return None
    for size, index in zip(dimensions, member, strict=True):
        if not 0 <= index < size:
            return None
        position = position * size + index
    return position


class Slot:
    """A port with the bits it stands for: one for a plain port, as many as elements for an array or a bundle."""

    __slots__ = ("dimensions", "identifier", "inner", "port", "start", "stop", "text")

    def __init__(self, name: Name, start: int, port: Port | None) -> None:
        self.identifier, self.text, self.dimensions = name
        self.start = start
        self.stop = start
        self.port = port
        self.inner: Scope[Slot] = Scope()

    def bits(self, member: tuple[int, ...]) -> range | None:
        """Return the bits of the whole port, or of one element; None where there is no such element."""
        if not member:
            return range(self.start, self.stop)
        position = element_of(self.dimensions, member)
        return None if position is None else range(self.start + position, self.start + position + 1)


class Ports:
    """The ports of a cell, their elements numbered through as bits. Views of one cell share ports by name."""

    def __init__(self, views: Iterable[Sequence[Port]] = (), *, start: int = 0) -> None:
        self.width = start
        self.plain: dict[str, int] = {}
        """The bits of ports that are no arrays, by identifier as declared: most references need no more."""
        self._scope: Scope[Slot] = Scope()
        self._namesakes: dict[str, dict[str, Slot]] = {}
        self._by_text: dict[tuple[str, tuple[int, ...]], Slot] = {}
        self._slots: list[Slot] = []
        self._bundles: list[Slot] = []
        self._starts: list[int] = []
        for ports in views:
            before = self.width
            for port in ports:
                found = self._scope.find(port.name.identifier)
                # Two of one view that differ in case or in what people see are two; of different views they are one.
                if found is None or (found.start >= before and (found.identifier, found.text) != port.name[:2]):
                    self._add(port, self._scope)

    def _add(self, port: Port, scope: Scope[Slot]) -> None:
        slot = Slot(port.name, self.width, port)
        for inner in port.ports:
            self._add(inner, slot.inner)
        if not port.ports:
            self._fill(slot, port.name.width)
        elif scope is self._scope:
            self._bundles.append(slot)
        slot.stop = self.width
        identifier = port.name.identifier
        if scope.add(identifier, slot) == "duplicate":
            self._namesakes.setdefault(identifier, {}).setdefault(slot.text, slot)
            self.plain.pop(identifier, None)
        elif scope is self._scope and not port.ports and not port.name.dimensions:
            self.plain[identifier] = slot.start

    def _fill(self, slot: Slot, width: int) -> None:
        self._slots.append(slot)
        self._starts.append(slot.start)
        self.width += width
        slot.stop = self.width

    def connect(self, name: Name) -> None:
        """Add an off-page connector: those that people see under one name are one, whatever their identifiers."""
        slot = self._by_text.get(name[1:])
        if slot is None:
            slot = self._by_text[name[1:]] = Slot(name, self.width, None)
            self._fill(slot, name.width)
        if self._scope.add(name.identifier, slot) == "duplicate" and self._scope.find(name.identifier) is not slot:
            self._namesakes.setdefault(name.identifier, {}).setdefault(slot.text, slot)

    def undeclared(self, port: str, member: tuple[int, ...]) -> range:
        """Add the port, or the one element, that a reference means and no interface declares; return its bit."""
        name = port + "".join(f"[{index}]" for index in member)
        slot = self._scope.find(name)
        if slot is None:
            slot = Slot(Name(name, name.removeprefix("&")), self.width, None)
            self._scope.add(name, slot)
            self._fill(slot, 1)
        return range(slot.start, slot.stop)

    def find(
        self, port: str, member: tuple[int, ...] = (), bundle: str | None = None, *, text: str | None = None
    ) -> range | None:
        """Return the bits that a reference means, None where it leads nowhere.

        Of two ports under one identifier, the one that people see as ``text``, the name of the net that refers to it.
        """
        scope = self._scope
        if bundle is not None:
            holder = scope.find(bundle)
            if holder is None:
                return None
            scope = holder.inner
        slot = scope.find(port)
        if slot is None and bundle is None:  # a port in a bundle, by its own name alone
            inside = [inner for each in self._bundles if (inner := each.inner.find(port)) is not None]
            slot = inside[0] if len(inside) == 1 else None
        if slot is None:
            return None
        if text is not None and slot.text != text and port in self._namesakes:
            slot = self._namesakes[port].get(text, slot)
        return slot.bits(member)

    def slot(self, bit: int) -> tuple[Slot, int]:
        """Return the port that a bit belongs to and its element."""
        slot = self._slots[bisect_right(self._starts, bit) - 1]
        return slot, bit - slot.start

    def text(self, bit: int) -> str:
        """Return what a bit is called."""
        slot, element = self.slot(bit)
        return f"{slot.text}[{element}]" if slot.dimensions else slot.text


class Globals:
    """What ``globalPortRef`` names: one node in the whole design for each name, as a bit below zero, which no port has."""

    def __init__(self) -> None:
        self._bits: dict[str, int] = {}

    def bit(self, name: str) -> int:
        """Return the bit of a name; EDIF compares names without regard to case."""
        return self._bits.setdefault(name.removeprefix("&").lower(), -1 - len(self._bits))


class Budget:
    """How many elements of arrays, and ends of globals, a file may still name."""

    def __init__(self, places: Places) -> None:
        self.places = places
        self.left = ELEMENTS_LIMIT

    def spend(self, elements: int, offset: int) -> None:
        """Take ``elements`` off what is left.

        Raises
        ------
        InputError : there is not so much left.
        """
        self.left -= elements
        if self.left < 0:
            message = f"the arrays and globals of this file name more than {ELEMENTS_LIMIT} elements; protlint reads no more"
            raise self.places.error(message, offset)


class Shorts:
    """Which bits of a cell's ports are one node inside it."""

    def __init__(self) -> None:
        self._parents: dict[int, int] = {}

    def add(self, bits: Iterable[int]) -> None:
        """Make bits one."""
        first: int | None = None
        for bit in bits:
            top = self._root(bit)
            first = top if first is None else first
            self._parents[top] = first

    def __bool__(self) -> bool:
        return bool(self._parents)

    def groups(self, nodes: Iterable[tuple[int, int]]) -> Iterator[tuple[int, int]]:
        """Yield, of (bit, node) pairs, the nodes that are one because their bits are, two at a time."""
        if not self._parents:
            return
        seen: dict[int, int] = {}
        for bit, node in nodes:
            if bit in self._parents:
                first = seen.setdefault(self._root(bit), node)
                if first != node:
                    yield first, node

    def _root(self, bit: int) -> int:
        self._parents.setdefault(bit, bit)
        return root(self._parents, bit)
