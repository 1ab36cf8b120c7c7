"""The flat netlist: what is placed on the board and what is connected to what.

This is the whole of what the upper floors know of EDIF. Parts, pins and nets are kept in the order of the file. What a board
has by the hundred thousand is a named tuple, which is made three times as fast as a frozen dataclass; what it has most of,
pins and references to them, is made by ``tuple.__new__``, which is twice as fast again.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal, NamedTuple

from protlint.findings import Warning

PropertyValue = str | int | float | bool


class Property(NamedTuple):
    """A property of a part, with the place it was written and where it came from."""

    name: str
    value: PropertyValue
    origin: Literal["cell", "interface", "instance"]
    line: int
    column: int
    unit: str | None = None


class Pin(NamedTuple):
    """One connected pin of a part.

    ``name`` is the port's name as people see it; ``number`` the pin number where the file gives one; ``net`` the index of
    the pin's net in :attr:`Netlist.nets`.
    """

    name: str
    number: str | None
    net: int
    direction: str | None = None


class Part(NamedTuple):
    """A placed leaf instance. ``properties`` is keyed by the folded (lower-case) name.

    ``id`` is unique on the board: the designator, with the path in front inside hierarchy (``CH2/Q10``). Sections of one
    package are parts of their own with the package's ``designator``: their ids are the sections' names (``Q1A``, ``Q1B``),
    or ``Q1#1``, ``Q1#2`` by their lowest pins where the file names none; so are different parts of one designator, in the
    order of the file. ``designator`` is None where the file gives none, or one that nobody has numbered yet (``R?``).
    """

    id: str
    designator: str | None
    cell: str
    library: str
    properties: Mapping[str, Property]
    pins: tuple[Pin, ...]
    line: int
    column: int


class Net(NamedTuple):
    """A net of the board. ``pins`` are pairs of a part's index in :attr:`Netlist.parts` and a pin's in ``Part.pins``."""

    name: str
    pins: tuple[tuple[int, int], ...]
    line: int
    column: int


@dataclass(frozen=True, slots=True)
class PinOnTwoNets:
    """One pin that the file joins to two nets (their indices), with the line and column of the second joining.

    By the standard the two are one node. They are kept apart here, the pin on the first, so that both can be told; the board
    unites them.
    """

    part: int
    pin: str
    nets: tuple[int, int]
    line: int
    column: int


@dataclass(frozen=True, slots=True)
class DuplicateDesignator:
    """One designator that the file gives to different parts (their indices), which are no sections of one package."""

    designator: str
    parts: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Netlist:
    """One design, flattened. ``text_sha256`` is of the file's bytes."""

    file: str
    sha256: str
    design: str
    parts: tuple[Part, ...]
    nets: tuple[Net, ...]
    warnings: tuple[Warning, ...] = ()
    pins_on_two_nets: tuple[PinOnTwoNets, ...] = ()
    facts: Mapping[str, str] = field(default_factory=dict)
    """What the survey shows of the reading: a plain name to a plain sentence or count, in printing order."""
    duplicate_designators: tuple[DuplicateDesignator, ...] = ()
