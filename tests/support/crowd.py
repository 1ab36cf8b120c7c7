"""Boards of any size made by seed: mostly a crowd of parts at random, with limiters of known designators among them."""

from __future__ import annotations

import random
from collections.abc import Mapping, Sequence

from protlint.board.assemble import assemble
from protlint.board.graph import Board, SeenPart, Values
from protlint.limits import Limits
from protlint.netlist.model import Part, Pin
from tests.support.boards import TERMINALS, netlist, supply_of
from tests.support.edif_text import Drawn

KINDS = {
    "resistor": 46, "capacitor": 26, "npn": 8, "pnp": 5, "nmos": 3, "pmos": 2, "diode": 6, "zener": 1, "inductor": 1,
    "ic": 2,
}  # fmt: skip
"""How often each kind comes, in a hundred: with many transistors, so that much lies together as a limiter's parts do."""

ORDINARY = {"resistor": 50, "capacitor": 34, "npn": 3, "pnp": 1, "nmos": 2, "diode": 4, "inductor": 2, "ic": 4}
"""How often on a board as most are."""

ON_GROUND, ON_SUPPLY = 0.15, 0.05
"""The share of all pins on ground, and on each of two supplies."""

NEAR = 4
"""How many nets away a part is joined on a board that is drawn."""

Made = tuple[str, str, list[tuple[str, str]], float | None]
"""A part: its kind, designator, (pin, net) pairs, and ohms where it is a resistor."""

Properties = tuple[tuple[str, str], ...]
EXPORTED: Properties = (
    ("FOOTPRINT", "SMD_0805"), ("TOLERANCE", "1 %"), ("MANUFACTURER", "An invented maker"), ("STOCK_CODE", "AB-0047-1133"),
    ("DESCRIPTION", "A part as stock lists describe it, with a few words"), ("ROOM", "SHEET 12"), ("FITTED", "yes"),
)  # fmt: skip
"""What exporters write of every part besides its value: such boards have some 700 bytes a part."""

TYPES = {
    "QP": "BD139",
    "QS": "BC337-25",
    "npn": "BC847B",
    "pnp": "BC857B",
    "nmos": "2N7002",
    "pmos": "BSS84",
    "diode": "1N4148",
}
"""Part numbers, by kind and for the limiters' own transistors."""


def crowd(parts: int, *, limiters: int = 8, seed: int = 1) -> Board:
    """Return a board of ``parts`` parts with emitter-sensed limiters ``QP1``, ``QP2`` ... among them."""
    return _board(_made(parts, limiters, seed, KINDS))


def crowd_drawn(
    parts: int, *, limiters: int = 8, seed: int = 1, more: Properties = (), kinds: Mapping[str, int] = KINDS
) -> list[Drawn]:
    """Return such a board to be written as EDIF, with part numbers and values, its limiters driven from a supply.

    Its nets are short, as those of real boards: a part is joined to those drawn near it, or to a supply. Every part has
    ``more`` properties besides.
    """
    drawn = []
    for kind, designator, joins, value_ohm in _made(parts, limiters, seed, kinds, reach=NEAR):
        if designator.startswith("RD"):
            joins = [("1", "+12V"), *joins[1:]]
        value = "" if value_ohm is None else f"{value_ohm:g}"
        value = "100n" if kind == "capacitor" else value
        number = TYPES.get(designator[:2], TYPES.get(kind, ""))
        drawn.append(Drawn(designator, kind.upper(), tuple(joins), value, number, more=more))
    return drawn


def _made(parts: int, limiters: int, seed: int, mix: Mapping[str, int], *, reach: int | None = None) -> list[Made]:
    """Return the parts; ``reach`` is how far a part's nets lie from its own place among the nets, anywhere where None."""
    chance = random.Random(seed)
    made: list[Made] = []
    kinds, weights = list(mix), list(mix.values())
    free_nets = max(4, parts * 7 // 10)
    for number in range(parts - 5 * limiters):
        kind = chance.choices(kinds, weights)[0]
        pins = TERMINALS.get(kind, tuple(str(pin + 1) for pin in range(8 if kind == "ic" else 2)))
        value = chance.choice((10.0, 100.0, 1e3, 1e4)) if kind == "resistor" else None
        place = number * 7 // 10
        free = range(free_nets) if reach is None else range(max(0, place - reach), place + reach + 1)
        made.append((kind, f"X{number}", [(pin, _net(chance, free)) for pin in pins], value))
    for number in range(1, limiters + 1):
        out, base, near, tap = (f"{name}{number}" for name in ("OUT", "BASE", "NEAR", "TAP"))
        npn = TERMINALS["npn"]
        made += [
            ("npn", f"QP{number}", list(zip(npn, (out, base, near), strict=True)), None),
            ("npn", f"QS{number}", list(zip(npn, (base, tap, "GND"), strict=True)), None),
            ("resistor", f"RS{number}", [("1", near), ("2", "GND")], 2.0 + number / 10.0),
            ("resistor", f"RB{number}", [("1", near), ("2", tap)], 220.0),
            ("resistor", f"RD{number}", [("1", _net(chance, range(free_nets))), ("2", base)], 1e3),
        ]
    chance.shuffle(made)
    return made


def _net(chance: random.Random, free: range) -> str:
    where = chance.random()
    if where < ON_GROUND:
        return "GND"
    if where < ON_GROUND + ON_SUPPLY:
        return "+12V"
    if where < ON_GROUND + 2 * ON_SUPPLY:
        return "-12V"
    return f"N{chance.choice(free)}"


def _board(made: Sequence[Made]) -> Board:
    numbers: dict[str, int] = {}
    parts, seen = [], []
    for kind, designator, joins, value in made:
        pins = tuple(Pin(pin, None, numbers.setdefault(net, len(numbers))) for pin, net in joins)
        parts.append(Part(designator, designator, kind, "LIB", {}, pins, 1, 1))
        roles = {pin: (place,) for place, (pin, _) in enumerate(joins)}
        seen.append(SeenPart(kind, roles, values=Values(value=value)))
    return assemble(netlist(parts, numbers), seen, limits=Limits(), supply_of=supply_of)
