"""Which pin of a part is which.

Pin roles come from the limits file, the part data, the pins' names, or properties that name them. Numbers alone tell
nothing: such a part has no roles.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from functools import lru_cache

from protlint.limits import Limits, fits
from protlint.netlist.model import Part
from protlint.partdata.book import PartEntry

Roles = dict[str, tuple[int, ...]]
"""A terminal's role to the positions of its pins in ``Part.pins``."""

NO_ROLES = "no roles"
"""How the roles are known of what has none: a connector, an IC, an unknown part."""

BY_NAMES = "pin names"
"""How the roles are known of what bears its terminals' names."""

FROM_MEMORY = "part data, pin order from memory"
"""How the roles are known of what has only numbers, and a type whose pin order nobody has looked up yet."""

_BIPOLAR = ("npn", "pnp", "npn-darlington", "pnp-darlington")
_MOSFET = ("nmos", "pmos")
_TWO_TERMINALS = ("resistor", "capacitor", "inductor", "fuse", "link")
_PIN_NAMES: dict[str, dict[str, str]] = {
    "bipolar": {
        "b": "base", "base": "base", "basis": "base", "c": "collector", "coll": "collector", "col": "collector",
        "collector": "collector", "e": "emitter", "emit": "emitter", "emitter": "emitter",
    },
    "mosfet": {"g": "gate", "gate": "gate", "d": "drain", "drain": "drain", "s": "source", "source": "source"},
    "diode": {
        "a": "anode", "an": "anode", "anode": "anode", "+": "anode", "k": "cathode", "c": "cathode", "ca": "cathode",
        "cat": "cathode", "kat": "cathode", "cath": "cathode", "cathode": "cathode", "kathode": "cathode", "-": "cathode",
    },
    "thyristor": {
        "a": "anode", "anode": "anode", "mt2": "anode", "k": "cathode", "c": "cathode", "cathode": "cathode",
        "mt1": "cathode", "g": "gate", "gate": "gate",
    },
    "two": {"1": "1", "2": "2", "+": "1", "-": "2", "p": "1", "n": "2", "pos": "1", "neg": "2", "plus": "1", "minus": "2"},
}  # fmt: skip

FAMILY = {
    **dict.fromkeys(_BIPOLAR, "bipolar"),
    **dict.fromkeys(_MOSFET, "mosfet"),
    **dict.fromkeys(_TWO_TERMINALS, "two"),
    "diode": "diode",
    "zener": "diode",
    "thyristor": "thyristor",
}
"""A kind to the family whose terminals and pin names it has."""

TERMINALS = {
    "bipolar": ("collector", "base", "emitter"), "mosfet": ("drain", "gate", "source"), "diode": ("anode", "cathode"),
    "thyristor": ("anode", "cathode", "gate"), "two": ("1", "2"),
}  # fmt: skip
"""The roles of a family's terminals; of a transistor first what the load is on, then what steers it, then its lead."""


def roles_of_pins(
    part: Part, part_number: str | None, entry: PartEntry | None, limits: Limits, family: str | None
) -> tuple[Roles, tuple[Roles, ...], str]:
    """Return the roles of a part's pins, those of each device where one package holds several, and how they are known.

    ``family`` is the part's in :data:`FAMILY`, None where its kind has none.
    """
    for table, known_from in _tables(part, part_number, entry, limits, family):
        roles, sections = _by_table(part, table)
        if roles or sections:
            return roles, sections, known_from
    if family is None:
        return {}, (), NO_ROLES
    if family == "two" and len(part.pins) <= 2:
        return _two_terminals(part), (), "two terminals, alike"
    roles, sections = _by_names(part, family)
    if roles or sections:
        return roles, sections, BY_NAMES
    return {}, (), "the pins are numbered and nothing says which is which"


def numbers_at_odds(part: Part, entry: PartEntry, family: str) -> tuple[tuple[str, str, str], ...]:
    """Return (pin number, role by the pin's name, role by the part data) of every pin that the two tell different things of.

    The number is what the footprint goes by: a symbol drawn for another package connects the wrong pads.
    """
    names = _PIN_NAMES[family]
    found = []
    for pin in part.pins:
        by_name = names.get(pin.name.strip().casefold())
        by_number = entry.pins.get(pin.number or "", "none").partition(".")[0]
        if by_name and by_number != "none" and by_name != by_number:
            found.append((str(pin.number), by_name, by_number))
    return tuple(sorted(found))


def family_by_names(part: Part) -> str | None:
    """Return ``bipolar`` or ``mosfet`` where the pins bear all the names of such a transistor."""
    for family in ("bipolar", "mosfet"):
        roles, sections = _by_names(part, family)
        if sections or all(role in roles for role in TERMINALS[family]):
            return family
    return None


def _tables(
    part: Part, part_number: str | None, entry: PartEntry | None, limits: Limits, family: str | None
) -> Iterator[tuple[Mapping[str, str], str]]:
    """Yield the tables of pin roles that speak of a part, the strongest first.

    Pin orders that protlint itself knows from memory give way to pins that bear their names.
    """
    for pattern, table in limits.pins.items():
        if fits(pattern, part.cell) or (part_number is not None and fits(pattern, part_number)):
            yield table, "limits file"
    if entry is not None and entry.pins:
        named = family is not None and family != "two" and any(_by_names(part, family))
        if not (named and entry.pins_source == "memory"):
            yield entry.pins, f"part data, pin order from {entry.pins_source}"
    stated = {
        found[1]: str(item.value)
        for key, item in part.properties.items()
        if key.startswith("pin") and (found := re.fullmatch(r"pin[ _]?([0-9]+)", key))
    }
    names = _PIN_NAMES.get(family or "", {})
    if stated and all(value.casefold() in names for value in stated.values()):
        yield {pin: names[value.casefold()] for pin, value in stated.items()}, "pin properties"


def _by_table(part: Part, table: Mapping[str, str]) -> tuple[Roles, tuple[Roles, ...]]:
    """Return the roles a table of pin numbers or names gives, and those of each section where it tells sections apart."""
    by_fold = {pin.casefold(): role for pin, role in table.items()}
    grouped: dict[str, dict[str, list[int]]] = {}
    for position, pin in enumerate(part.pins):
        role = by_fold.get((pin.number or "").casefold()) or by_fold.get(pin.name.casefold())
        if role and role != "none":
            name, _, section = role.partition(".")
            grouped.setdefault(section, {}).setdefault(name, []).append(position)
    return _grouped(grouped)


def _by_names(part: Part, family: str) -> tuple[Roles, tuple[Roles, ...]]:
    return _roles_of(tuple(pin.name for pin in part.pins), family)


@lru_cache(maxsize=4096)
def _roles_of(pins: tuple[str, ...], family: str) -> tuple[Roles, tuple[Roles, ...]]:
    """Return the roles that pin names tell: one device, or several where every terminal's name is numbered.

    A terminal that several numbered ones share (a common cathode) belongs to each. Nothing is returned where a terminal is
    missing although a pin's name tells nothing.
    """
    names = _PIN_NAMES[family]
    grouped: dict[str, dict[str, list[int]]] = {}
    for position, pin in enumerate(pins):
        name = pin.strip().casefold()
        numbered = re.fullmatch(r"(.*?[^0-9])[ _.@-]?([0-9]*)", name)
        stem, number = (numbered[1], numbered[2]) if numbered and name not in names else (name, "")
        role = names.get(stem) or names.get(stem.rstrip(" _.@-"))
        if role:
            grouped.setdefault(number, {}).setdefault(role, []).append(position)
    known = {role for section in grouped.values() for role in section}
    needed = TERMINALS[family]
    seen = sum(len(positions) for section in grouped.values() for positions in section.values())
    if not known or (seen < len(pins) and not known.issuperset(needed)):
        return {}, ()
    shared = grouped.get("", {})
    several = {number: section for number, section in grouped.items() if number}
    whole = all(set(section) | set(shared) >= set(needed) for section in several.values())
    if len(several) > 1 and whole and (not shared or (family == "diode" and len(shared) == 1)):
        return _grouped({number: {**shared, **section} for number, section in several.items()})
    merged: dict[str, list[int]] = {}
    for section in grouped.values():
        for role, positions in section.items():
            merged.setdefault(role, []).extend(positions)
    return _grouped({"": merged})


def _grouped(grouped: Mapping[str, Mapping[str, list[int]]]) -> tuple[Roles, tuple[Roles, ...]]:
    sections = tuple(
        {role: tuple(sorted(positions)) for role, positions in grouped[section].items()} for section in sorted(grouped)
    )
    return (sections[0], ()) if len(sections) == 1 else ({}, sections)


def _two_terminals(part: Part) -> Roles:
    """Return the ends of a part with two pins: as named, else in the order of the file."""
    names = [_PIN_NAMES["two"].get(pin.name.strip().casefold()) for pin in part.pins]
    if len(set(names)) == len(names) and None not in names:
        return {str(name): (position,) for position, name in enumerate(names)}
    return {str(position + 1): (position,) for position in range(len(part.pins))}
