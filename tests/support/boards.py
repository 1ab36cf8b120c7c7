"""Boards for tests, from compact descriptions, without EDIF, part data or name rules.

A description is one part a line: ``kind designator net net ... [=value] [unfitted]``, the nets in the order of the kind's
roles: ``npn Q1 OUT DRV SNS`` is collector, base, emitter; ``nmos`` drain, gate, source; ``diode`` anode, cathode. For
``ic`` and ``connector`` the pins are ``name=net``, and so is a pin added to another kind. ``#`` begins a remark.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from protlint.board.assemble import assemble
from protlint.board.graph import Board, SeenPart, Supply, Values
from protlint.limits import Limits, Range
from protlint.netlist.model import Net, Netlist, Part, Pin

BIPOLAR = ("collector", "base", "emitter")
FIELD = ("drain", "gate", "source")
TERMINALS = {
    "npn": BIPOLAR, "pnp": BIPOLAR, "npn-darlington": BIPOLAR, "pnp-darlington": BIPOLAR, "nmos": FIELD, "pmos": FIELD,
    "diode": ("anode", "cathode"), "zener": ("anode", "cathode"), "thyristor": ("anode", "cathode", "gate"),
}  # fmt: skip
_SUPPLY = re.compile(r"([+-])([0-9.]+)V?")


def supply_of(names: Sequence[str], limits: Limits) -> Supply | None:
    """Return the supply of nets called GND, +12V, -15V or as the limits say."""
    for name in names:
        if name in limits.supplies_V:
            return Supply(limits.supplies_V[name], "limits file")
        stated = _SUPPLY.fullmatch(name)
        if name == "GND" or stated:
            volts = float(stated[1] + stated[2]) if stated else 0.0
            return Supply(Range(volts, volts, volts), "net name")
    return None


def board(text: str, *, limits: Limits | None = None) -> Board:
    """Return the board of a description."""
    limits = limits or Limits()
    rows = [line.split("#")[0].split() for line in text.splitlines()]
    parts, seen = [], []
    numbers: dict[str, int] = {}
    for row in filter(None, rows):
        kind, designator, *rest = row
        values: dict[str, object] = {}
        if rest[-1] == "unfitted":
            values["fitted"] = False
            rest.pop()
        if rest[-1].startswith("="):
            values["value"] = float(rest.pop()[1:])
        names = TERMINALS.get(kind, ("1", "2", "3", "4"))
        pairs = [one.split("=") if "=" in one else [names[place], one] for place, one in enumerate(rest)]
        pins = tuple(Pin(name, None, numbers.setdefault(net, len(numbers))) for name, net in pairs)
        parts.append(Part(designator, designator, kind.upper(), "LIB", {}, pins, 1, 1))
        roles: dict[str, tuple[int, ...]] = {}
        for place, (name, _) in enumerate(pairs):
            roles[name] = (*roles.get(name, ()), place)
        seen.append(SeenPart(kind, roles, values=Values(**values)))  # type: ignore[arg-type]
    return assemble(netlist(parts, numbers), seen, limits=limits, supply_of=supply_of)


def netlist(parts: Sequence[Part], numbers: Mapping[str, int]) -> Netlist:
    """Return the netlist of parts whose pins name nets by number."""
    pins: list[list[tuple[int, int]]] = [[] for _ in numbers]
    for index, part in enumerate(parts):
        for place, pin in enumerate(part.pins):
            pins[pin.net].append((index, place))
    nets = tuple(Net(name, tuple(pins[number]), 1, 1) for name, number in numbers.items())
    return Netlist("made.edf", "0" * 64, "MADE", tuple(parts), nets)
