"""Placed parts and netlists for tests of what properties, cells and pins say."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.netlist.model import Netlist, Part, Pin, Property, PropertyValue


def placed(
    designator: str, cell: str, pins: Sequence[str], properties: dict[str, PropertyValue] | None = None, *, path: str = ""
) -> Part:
    """Return a part each of whose pins, written ``name`` or ``name/number``, is on a net of its own."""
    connected = []
    for index, pin in enumerate(pins):
        name, _, number = pin.partition("/")
        connected.append(Pin(name, number or None, index))
    named = {name.casefold(): Property(name, value, "instance", 1, 1) for name, value in (properties or {}).items()}
    return Part(path + designator, designator, cell, "LIB", named, tuple(connected), 1, 1)


def board_of(*parts: Part) -> Netlist:
    """Return a netlist of parts, without nets: enough for the habits of a file."""
    return Netlist("made.edf", "0" * 64, "MADE", parts, ())
