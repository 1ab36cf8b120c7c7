"""What every placed part is, by itself: its kind, roles, type and values. Parts that are written alike are seen alike."""

from __future__ import annotations

from collections.abc import Hashable, Mapping

from protlint.board.attributes import Habits, file_habits, part_number, read_values
from protlint.board.graph import SeenPart
from protlint.board.kinds import class_letters, identify
from protlint.board.parts_list import PartsList
from protlint.limits import Limits
from protlint.netlist.model import Netlist, Part
from protlint.partdata.book import Book


def see_parts(netlist: Netlist, *, limits: Limits, book: Book, parts_list: PartsList | None = None) -> list[SeenPart]:
    """Return what each part of a netlist is, in its order.

    A parts list fills what the netlist's properties leave open. A resistor without part data of its own goes by its size.
    Thousands of parts of a board are the same few dozen over and over; each kind of writing is looked into once.
    """
    habits = file_habits(netlist, limits)
    known: dict[Hashable, SeenPart] = {}
    seen = []
    for part in netlist.parts:
        listed = parts_list.listed(part) if parts_list is not None else None
        key = _as_written(part, listed)
        one = known.get(key)
        if one is None:
            one = known[key] = _see(part, listed, habits, limits, book)
        seen.append(one)
    return seen


def _see(part: Part, listed: Mapping[str, str] | None, habits: Habits, limits: Limits, book: Book) -> SeenPart:
    number = part_number(part, habits, book=book, listed=listed)
    entry = book.find(number) if number else None
    who = identify(part, number, entry, limits)
    values = read_values(part, who.kind, habits, listed=listed)
    if entry is None and values.footprint is not None:
        entry = book.find_size(who.kind, values.footprint)
    return SeenPart(who.kind, who.roles, who.kind_from, who.roles_from, number, values, entry, who.sections)


def _as_written(part: Part, listed: Mapping[str, str] | None) -> Hashable:
    """Return all that tells a part's kind, roles and values: two parts with one answer here are seen alike.

    Of its designator only the class letters count, and whether it stands in the place of a value; of its nets only whether
    there is more than one.
    """
    said = tuple([(item.name, item.value.__class__, item.value) for item in part.properties.values()])
    pins = tuple([(pin.name, pin.number) for pin in part.pins])
    own_name = any(value == part.designator for _, _, value in said)
    several = len({pin.net for pin in part.pins}) > 1
    return part.cell, class_letters(part), said, pins, own_name, several, tuple(listed.items()) if listed else ()
