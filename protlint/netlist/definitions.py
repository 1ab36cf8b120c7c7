"""What an EDIF file defines, before anything is looked up: libraries, cells, views, ports, instances, nets.

Identifiers stand here as written; :class:`Scope` knows how EDIF compares them. Offsets are into the file's text.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from math import prod
from typing import Generic, NamedTuple, TypeVar

from protlint.netlist.forms import Places
from protlint.netlist.model import Property

T = TypeVar("T")


class Name(NamedTuple):
    """What something is called: the identifier that references use, the text people see, and an array's dimensions."""

    identifier: str
    text: str
    dimensions: tuple[int, ...] = ()

    @property
    def width(self) -> int:
        """How many elements it has; 1 for what is no array."""
        return prod(self.dimensions) if self.dimensions else 1


class PortRef(NamedTuple):
    """A reference to a port: of an instance, or with ``instance`` None of the cell itself. Empty members mean the whole."""

    port: str
    instance: str | None
    offset: int
    member: tuple[int, ...] = ()
    bundle: str | None = None
    instance_member: tuple[int, ...] = ()

    @property
    def refs(self) -> tuple[PortRef, ...]:
        """Itself: a reference counts as a port list of one."""
        return (self,)


class GlobalRef(NamedTuple):
    """A reference to what goes by one name in the whole design."""

    port: str
    offset: int

    @property
    def refs(self) -> tuple[GlobalRef, ...]:
        """Itself: it is as wide as one port."""
        return (self,)


@dataclass(frozen=True, slots=True)
class PortList:
    """Several references that count as one array."""

    refs: tuple[PortRef, ...]

    @property
    def offset(self) -> int:
        """Where the first of them stands."""
        return self.refs[0].offset

    @property
    def port(self) -> str:
        """The ports' identifiers."""
        return " ".join(ref.port for ref in self.refs)


Shorted = tuple[PortRef | PortList, ...]
Joined = tuple[PortRef | PortList | GlobalRef, ...]


@dataclass(frozen=True, slots=True)
class Port:
    """A port of a view; a bundle is one with ``ports`` of its own."""

    name: Name
    direction: str | None
    designators: tuple[str, ...]
    properties: tuple[Property, ...]
    ports: tuple[Port, ...]
    offset: int


class PortInstance(NamedTuple):
    """What an instance says of one of its ports."""

    port: str
    member: tuple[int, ...]
    designators: tuple[str, ...]
    properties: tuple[Property, ...]


class ViewRef(NamedTuple):
    """A reference to a view of a cell; what is not said is None and means the enclosing one."""

    view: str | None
    cell: str | None
    library: str | None


class Instance(NamedTuple):
    """A cell placed in another. ``views`` lists the references it offers; the first that leads somewhere counts."""

    name: Name
    views: tuple[ViewRef, ...]
    designators: tuple[str, ...]
    properties: tuple[Property, ...]
    ports: tuple[PortInstance, ...]
    offset: int


class Net(NamedTuple):
    """A net with all that it and its subnets join."""

    name: Name
    joined: Joined
    offset: int


@dataclass(frozen=True, slots=True)
class Sheet:
    """One page, or what stands in the contents outside any page: a scope of instance and net names."""

    instances: tuple[Instance, ...]
    nets: tuple[Net, ...]


@dataclass(frozen=True, slots=True)
class Contents:
    """The inside of a cell: its sheets, of which ``pages`` are pages, and the connectors that join sheets by name.

    The list of sheets is emptied while they are wired.
    """

    sheets: list[Sheet]
    pages: int
    connectors: tuple[Name, ...]


@dataclass(frozen=True, slots=True)
class View:
    """One view of a cell: its ports, which of them are ``shorts``, and its contents."""

    name: Name
    kind: str
    ports: tuple[Port, ...]
    shorts: tuple[Shorted, ...]
    properties: tuple[Property, ...]
    contents: Contents | None
    offset: int


@dataclass(frozen=True, slots=True)
class Cell:
    """A cell. ``kind`` is ``generic``, ``tie`` or ``ripper``."""

    name: Name
    kind: str
    views: tuple[View, ...]
    properties: tuple[Property, ...]
    offset: int


@dataclass(frozen=True, slots=True)
class Library:
    """A library of cells, of the file's own or external."""

    name: Name
    external: bool
    cells: tuple[Cell, ...]
    offset: int


@dataclass(frozen=True, slots=True)
class Design:
    """A design: the name of a board and the cell it begins with."""

    name: Name
    cell: str
    library: str | None
    offset: int


@dataclass(frozen=True, slots=True)
class Edif:
    """A whole file."""

    name: Name
    level: str
    program: str | None
    libraries: tuple[Library, ...]
    designs: tuple[Design, ...]
    places: Places


class Scope(Generic[T]):
    """Things by identifier, in one place where identifiers must differ.

    EDIF compares identifiers without regard to case, and a leading ``&`` only escapes. A reference goes to the thing whose
    identifier is the same to the letter, else to the first that EDIF takes as the same: so files that declare
    ``netListView`` and refer to ``NetlistView`` work, and so do files that tell ``clk`` from ``CLK``.
    """

    def __init__(self, things: Iterable[tuple[str, T]] = ()) -> None:
        self._exact: dict[str, T] = {}
        self._folded: dict[str, T] = {}
        for identifier, thing in things:
            self.add(identifier, thing)

    def add(self, identifier: str, thing: T) -> str | None:
        """Add a thing; return ``duplicate`` or ``case`` where its identifier was taken, to the letter or but for case."""
        bare = identifier.removeprefix("&")
        if bare in self._exact:
            return "duplicate"
        self._exact[bare] = thing
        return None if self._folded.setdefault(bare.lower(), thing) is thing else "case"

    def find(self, identifier: str) -> T | None:
        """Return the thing an identifier refers to, None where there is none."""
        found = self._exact.get(identifier)
        if found is None:
            bare = identifier.removeprefix("&")
            found = self._exact.get(bare)
            if found is None:
                found = self._folded.get(bare.lower())
        return found
