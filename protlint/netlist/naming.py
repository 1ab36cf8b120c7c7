"""What the parts of a cell are called: reference designators, sections of packages, pin names and pin numbers.

The designator is the ``designator`` of an instance; of two, the first is the section (``Q1A``), the second its package
(``Q1``). An instance that has no such form may have it in a property (``RefDes``). Where a file uses no designators at all,
the instance's own name is the designator; where it does, a part without one has none, and neither has one that ends in a
question mark, as parts have that nobody has numbered yet.

Ids are unique within the cell: the section where one is given, else the designator, else the instance's name; what would
then be the same twice gets ``#1``, ``#2`` behind it.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

from protlint.netlist.connect import Placement, Wiring
from protlint.netlist.definitions import Instance, PortInstance
from protlint.netlist.hierarchy import Block
from protlint.netlist.model import Pin, Property
from protlint.netlist.notes import Notes

_SECTION = re.compile(r"[A-Za-z]+[0-9]+[A-Za-z]$")
"""A designator that may name a section of a package."""
_PIN_NAME = ("name", "pin name", "pin_name", "pinname")
"""What a pin's property that names it is called, where its port has only a number."""


_REFERENCE = frozenset({"refdes", "referencedesignator", "partreference", "reference", "designator"})
"""What a property that holds an instance's designator is called, blanks and marks left out: practice of exporters, from
memory. The standard's own place is the ``designator`` form."""

_DESIGNATOR = re.compile(r"[^\W\d_][^\s?]{0,30}(?:[0-9][^\s?]{0,8}|\?)")
"""A designator: one word that begins with a letter and has a number, or a question mark in its place."""


def stated_designators(instance: Instance) -> tuple[str, ...]:
    """Return the texts that name an instance: of its designators, or else of properties that hold one."""
    return instance.designators if any(instance.designators) else designators_in_properties(instance)


def designators_in_properties(instance: Instance) -> tuple[str, ...]:
    """Return the texts of an instance's properties that hold its designator."""
    texts = [str(each.value) for each in instance.properties if _is_reference(each.name)]
    return tuple(dict.fromkeys(text for text in map(str.strip, texts) if _DESIGNATOR.fullmatch(text)))


@lru_cache(maxsize=1024)
def _is_reference(name: str) -> bool:
    return re.sub(r"[\W_]", "", name.lower()) in _REFERENCE


def name_cell(wiring: Wiring, notes: Notes, *, designated: bool) -> NamedCell:
    """Return the names of what a cell places; ``designated`` tells whether the file's parts have designators."""
    labels = [_label(placement, notes, designated=designated) for placement in wiring.placements]
    groups = _groups(wiring.placements, labels)
    together = {member for members in groups for member in members}
    known: dict[int, dict[int, _PortFacts]] = {}
    pins = [
        () if label is None or placement.block.contents is not None
        else _pins(placement, label, known, sectioned=position in together or label.section is not None)
        for position, (placement, label) in enumerate(zip(wiring.placements, labels, strict=True))
    ]  # fmt: skip
    packages: list[tuple[int, ...]] = []
    twice: list[tuple[int, ...]] = []
    for members in groups:
        blocks = {id(wiring.placements[member].block) for member in members}
        listed = wiring.placements[members[0]].block.sections if len(blocks) == 1 else 0
        sections = [label.section for member in members if (label := labels[member]) is not None]
        alike = _are_sections(sections, [pins[member] for member in members], listed)
        (packages if alike else twice).append(members)
        if not alike and (label := labels[members[0]]) is not None:
            notes.add("namesakes", wiring.placements[members[1]].instance.offset, label.designator or label.id)
    return NamedCell(_unique(labels, packages, pins), tuple(pins), tuple(packages), tuple(twice))


def _section_and_package(instance: Instance, notes: Notes) -> tuple[str | None, str | None]:
    """Return the section and the package that an instance's designators name, None where they name none."""
    texts = [text for text in stated_designators(instance) if text]
    if len(texts) < 2:
        return None, texts[0] if texts else None
    for section, package in ((texts[0], texts[1]), (texts[1], texts[0])):
        if section.startswith(package):
            return section, package
    notes.add("designators", instance.offset, f"{texts[0]} and {texts[1]}")
    return None, texts[0]


def _section_position(section: str, package: str) -> int | None:
    """Return the place of a section in its package from 0: ``Q1A`` and ``U2-1`` are the first of Q1 and U2."""
    rest = section[len(package) :].strip(" -_.:/").lower()
    if len(rest) == 1 and "a" <= rest <= "z":
        return ord(rest) - ord("a")
    return int(rest) - 1 if re.fullmatch("[1-9][0-9]?", rest) else None


def _label(placement: Placement, notes: Notes, *, designated: bool) -> Label | None:
    if placement.block.contents is None and not placement.block.is_part:
        return None
    instance = placement.instance
    section, package = _section_and_package(instance, notes)
    if section is None and package and _SECTION.match(package):
        place = _section_position(package, package[:-1])
        if place is not None and place < placement.block.sections > 1:  # the cell lists pin numbers for each section
            section, package = package, package[:-1]
    each = _split((package or "",))
    if placement.element is not None and len(each) == instance.name.width and section is None:
        package = name = each[placement.element]  # one designator for each element of an array
    else:
        name = section or package or instance.name.text
        name = name if placement.element is None else f"{name}[{placement.element}]"
    if package is None and not designated:
        package = name
    position = _section_position(section, package) if section and package else None
    return Label(name, None if package is None or package.endswith("?") else package, section, position)


def _groups(placements: Sequence[Placement], labels: Sequence[Label | None]) -> list[tuple[int, ...]]:
    """Return the positions of the parts that share a designator; an array under one counts as its first element."""
    members: dict[str, list[int]] = {}
    for position, (placement, label) in enumerate(zip(placements, labels, strict=True)):
        if label is None or label.designator is None or not placement.block.is_part:
            continue
        if not placement.element or label.id == label.designator:
            members.setdefault(label.designator, []).append(position)
    return [tuple(positions) for positions in members.values() if len(positions) > 1]


def _are_sections(sections: Sequence[str | None], pins: Sequence[Sequence[Pin]], listed: int) -> bool:
    """Tell whether parts of one designator are sections of one package, not different parts that were named alike.

    They are if each has a section's name of its own; if their one cell lists pin numbers for so many sections; or if each
    has a pin of its own, by number, and the pins they share (a supply's) are on one net.
    """
    if None not in sections and len(set(sections)) == len(sections):
        return True
    if listed >= len(sections):
        return True
    holders: Counter[str] = Counter()
    node_of: dict[str, int] = {}
    for pin in (pin for each in pins for pin in each):
        if pin.number is None or node_of.setdefault(pin.number, pin.net) != pin.net:
            return False
        holders[pin.number] += 1
    return all(any(holders[pin.number or ""] == 1 for pin in each) for each in pins)


def _unique(
    labels: Sequence[Label | None], packages: Sequence[Sequence[int]], pins: Sequence[Sequence[Pin]]
) -> tuple[Label | None, ...]:
    """Return the labels with ids that differ: sections numbered by their lowest pin, other namesakes in file order."""
    order = list(range(len(labels)))
    for members in packages:
        slots = sorted(members)
        for slot, member in zip(slots, sorted(members, key=lambda member: _lowest(pins[member])), strict=True):
            order[slot] = member
    times = Counter(label.id for label in labels if label is not None)
    taken = {name for name, count in times.items() if count == 1}
    result = list(labels)
    last: Counter[str] = Counter()
    for position in order:
        label = labels[position]
        if label is None or times[label.id] == 1:
            continue
        name = label.id
        while name == label.id or name in taken:
            last[label.id] += 1
            name = f"{label.id}#{last[label.id]}"
        result[position] = label._replace(id=name)
    return tuple(result)


def _lowest(pins: Sequence[Pin]) -> tuple[int, int]:
    numbers = [int(pin.number) for pin in pins if pin.number is not None and pin.number.isdecimal() and len(pin.number) < 9]
    return (0, min(numbers)) if numbers else (1, 0)


def _pins(
    placement: Placement, label: Label, known: dict[int, dict[int, _PortFacts]], *, sectioned: bool
) -> tuple[Pin, ...]:
    """Return the connected pins of a placement in the order of its cell's ports."""
    block = placement.block
    said: dict[int, PortInstance] = {}
    for each in placement.instance.ports:
        for bit in block.ports.find(each.port, each.member) or ():
            said.setdefault(bit, each)
    result = []
    of_block = known.setdefault(id(block), {})
    for bit, node in sorted(placement.pins.items()):
        facts = of_block.get(bit)
        if facts is None:
            facts = of_block[bit] = _port_facts(block, bit)
        here = said.get(bit) if said else None
        if here is None and facts.called is not None:
            name, number = facts.called
        else:
            number = None if here is None else _number(_split(here.designators), facts, label.position, sectioned=sectioned)
            number = number or _number(facts.numbers, facts, label.position, sectioned=sectioned)
            named = (None if here is None else _pin_name(here.properties)) or facts.named
            name, number = _called(facts.text, number, named)
        result.append(tuple.__new__(Pin, (name, number, node, facts.direction)))
    return tuple(result)


def _port_facts(block: Block, bit: int) -> _PortFacts:
    slot, element = block.ports.slot(bit)
    port = slot.port
    text = block.ports.text(bit)
    if port is None:
        return _PortFacts(text, None, (), None, element, 1, _called(text, None, None))
    numbers, named = _split(port.designators), _pin_name(port.properties)
    called = _called(text, next(iter(numbers), None), named) if len(numbers) < 2 else None
    return _PortFacts(text, port.direction, numbers, named, element, port.name.width, called)


def _called(text: str, number: str | None, named: str | None) -> tuple[str, str | None]:
    """Return a pin's name and number; where a port is called by its number, the pin's Name property is its name."""
    return (named or text, number or text) if text.isdecimal() else (text, number)


def _number(numbers: tuple[str, ...], facts: _PortFacts, position: int | None, *, sectioned: bool) -> str | None:
    """Return the pin number out of those listed: one an element of an array, or one a section of a package."""
    if len(numbers) < 2:
        return numbers[0] if numbers else None
    if len(numbers) == facts.width:
        return numbers[facts.element]
    if position is not None and position < len(numbers):
        return numbers[position]
    return None if sectioned or facts.width > 1 else _together(numbers)


@lru_cache(maxsize=64)
def _together(numbers: tuple[str, ...]) -> str:
    return " ".join(numbers)


@lru_cache(maxsize=64)
def _split(designators: tuple[str, ...]) -> tuple[str, ...]:
    """Return the texts of a blank-separated list, the same object for all elements of an array, which all ask for it."""
    return tuple(" ".join(designators).split())


def _pin_name(properties: Sequence[Property]) -> str | None:
    for each in properties:
        if each.name.lower() in _PIN_NAME and isinstance(each.value, str) and each.value.strip():
            return each.value.strip()
    return None


class Label(NamedTuple):
    """What a placement is called inside its cell; ``position`` is its place in its package where it is a section of one."""

    id: str
    designator: str | None
    section: str | None
    position: int | None


@dataclass(frozen=True, slots=True)
class NamedCell:
    """The names inside one cell.

    A label for each placement (None for rippers and ties), the pins of each, and which positions share a designator: those
    that are sections of one package, and those that are not.
    """

    labels: tuple[Label | None, ...]
    pins: tuple[tuple[Pin, ...], ...]
    packages: tuple[tuple[int, ...], ...]
    twice: tuple[tuple[int, ...], ...]


@dataclass(frozen=True, slots=True)
class _PortFacts:
    """What a cell says of one bit of its ports: its name, the pin numbers listed for it, and a Name property.

    ``called`` is the name and number of a pin of which its instance says nothing; None where that takes a closer look.
    """

    text: str
    direction: str | None
    numbers: tuple[str, ...]
    named: str | None
    element: int
    width: int
    called: tuple[str, str | None] | None
