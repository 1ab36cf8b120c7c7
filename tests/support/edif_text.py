"""Small boards as EDIF 2 0 0, in the habits of two exporters: a flat netlist, and schematic pages joined by connectors."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from protlint.netlist.model import Netlist


@dataclass(frozen=True, slots=True)
class Drawn:
    """A part to be written: ``pins`` pairs a pin's name with its net; the texts behind may be empty."""

    designator: str
    cell: str
    pins: tuple[tuple[str, str], ...]
    value: str = ""
    part_number: str = ""
    power: str = ""
    more: tuple[tuple[str, str], ...] = ()
    """Further properties, by name, for flat netlists."""


def flat_netlist(name: str, parts: Sequence[Drawn], *, remark: str) -> str:
    """Return the board as one flat NETLIST view: instances numbered, designators apart, properties in capitals."""
    numbers = {part.designator: f"I{place:03}" for place, part in enumerate(parts, 1)}
    lines = [
        f"(edif {name}", "  (edifVersion 2 0 0)", "  (edifLevel 0)", "  (keywordMap (keywordLevel 0))", "  (status",
        "    (written", "      (timeStamp 2026 4 21 9 40 12)", f'      (comment "{_escaped(remark)}")))', "  (library PARTS",
        "    (edifLevel 0)", "    (technology (numberDefinition (scale 1 1 (unit distance))))",
    ]  # fmt: skip
    for cell, pins in _cells(parts).items():
        lines += [
            f"    (cell {name_of(cell)}",
            "      (cellType GENERIC)",
            "      (view NETLIST",
            "        (viewType NETLIST)",
        ]
        lines += ["        (interface", *(f"          (port {name_of(pin)} (direction INOUT))" for pin in pins)]
        lines[-1] += ")))"
    lines[-1] += ")"
    lines += [
        "  (library DESIGN", "    (edifLevel 0)", "    (technology (numberDefinition (scale 1 1 (unit distance))))",
        f"    (cell {name}", "      (cellType GENERIC)", "      (view NETLIST", "        (viewType NETLIST)",
        "        (interface)", "        (contents",
    ]  # fmt: skip
    for part in parts:
        reference = f"(viewRef NETLIST (cellRef {identifier(part.cell)} (libraryRef PARTS)))"
        lines += [f"          (instance {numbers[part.designator]}", f"            {reference}"]
        lines += [f'            (designator "{part.designator}")']
        for key, text in (("VALUE", part.value), ("PART_NUMBER", part.part_number), ("POWER", part.power), *part.more):
            lines += [f'            (property {key} (string "{_escaped(text)}"))'] if text else []
        lines[-1] += ")"
    for net, pins_on in _nets(parts).items():
        lines += [f"          (net {name_of(net)}", "            (joined"]
        lines += [f"              (portRef {identifier(pin)} (instanceRef {numbers[part]}))" for part, pin in pins_on]
        lines[-1] += "))"
    lines[-1] += "))))"
    lines += [f"  (design {name}", f"    (cellRef {name} (libraryRef DESIGN))))"]
    return "\n".join(lines) + "\n"


def schematic_pages(name: str, parts: Sequence[Drawn], *, remark: str, pages: int = 2) -> str:
    """Return the board as SCHEMATIC pages: instances named by designator, wires and symbols drawn, nets numbered on their
    page and joined across pages by off-page connectors."""
    lines = [
        f"(EDIF {name}", "(EDIFVERSION 2 0 0)(EDIFLEVEL 0)(KEYWORDMAP (KEYWORDLEVEL 0))",
        f'(STATUS (WRITTEN (TIMESTAMP 2026 4 22 16 5 31) (COMMENT "{_escaped(remark)}")))',
        "(EXTERNAL DEVICES (EDIFLEVEL 0) (TECHNOLOGY (NUMBERDEFINITION) (FIGUREGROUP WIRE (COLOR 0 0 100)))",
    ]  # fmt: skip
    for cell, pins in _cells(parts).items():
        lines += [f"(CELL {name_of(cell)} (CELLTYPE GENERIC) (VIEW SYMBOL (VIEWTYPE SCHEMATIC) (INTERFACE"]
        lines += [f"  (PORT {name_of(pin)} (DIRECTION INOUT))" for pin in pins]
        lines += ["  (SYMBOL (FIGURE WIRE (RECTANGLE (PT 0 0) (PT 40 20)))))))"]
    nets = _nets(parts)
    page_of = {part.designator: place * pages // len(parts) for place, part in enumerate(parts)}
    shared = {net for net, pins in nets.items() if len({page_of[part] for part, _ in pins}) > 1}
    lines += [")", f"(LIBRARY BOARD (EDIFLEVEL 0) (TECHNOLOGY (NUMBERDEFINITION)) (CELL {name} (CELLTYPE GENERIC)"]
    lines += ["(VIEW DRAWING (VIEWTYPE SCHEMATIC) (INTERFACE) (CONTENTS"]
    lines += [f"  (OFFPAGECONNECTOR {name_of(net)})" for net in nets if net in shared]
    for page in range(pages):
        lines += [f"  (PAGE PAGE{page + 1} (PAGESIZE (RECTANGLE (PT 0 0) (PT 1600 1000)))"]
        for place, part in enumerate(one for one in parts if page_of[one.designator] == page):
            lines += list(_placed(part, place))
        for number, (net, pins_on) in enumerate(nets.items()):
            here = [(part, pin) for part, pin in pins_on if page_of[part] == page]
            if here:
                lines += list(_wired(net, here, number, connector=net in shared))
        lines += ["  )"]
    lines += [f"))))\n(DESIGN {name} (CELLREF {name} (LIBRARYREF BOARD))))"]
    return "\n".join(lines) + "\n"


def drawn(netlist: Netlist) -> list[Drawn]:
    """Return the parts of a netlist, to be written again."""
    parts = []
    for part in netlist.parts:
        said = {key: str(item.value) for key, item in part.properties.items()}
        number = said.get("part_number", said.get("part number", ""))
        pins = tuple((pin.name, netlist.nets[pin.net].name) for pin in part.pins)
        parts.append(Drawn(part.id, part.cell, pins, said.get("value", ""), number, said.get("power", "")))
    return parts


def _placed(part: Drawn, place: int) -> Iterator[str]:
    yield f"    (INSTANCE {part.designator} (VIEWREF SYMBOL (CELLREF {identifier(part.cell)} (LIBRARYREF DEVICES)))"
    yield f"      (TRANSFORM (ORIGIN (PT {100 + 60 * place} {200 + 20 * (place % 7)})))"
    named = {"Value": part.value, '(RENAME Part_Number "Part Number")': part.part_number, "Power": part.power}
    for key, text in named.items():
        if text:
            yield f'      (PROPERTY {key} (STRING "{_escaped(text)}"))'
    yield "    )"


def _wired(net: str, pins: Sequence[tuple[str, str]], number: int, *, connector: bool) -> Iterator[str]:
    yield f'    (NET (RENAME N{number:05} "{_escaped(net)}") (JOINED'
    yield from (f"        (PORTREF {identifier(pin)} (INSTANCEREF {part}))" for part, pin in pins)
    if connector:
        yield f"        (PORTREF {identifier(net)})"
    yield f"      ) (FIGURE WIRE (PATH (POINTLIST (PT {10 * number} 0) (PT {10 * number} 50)))))"


def _cells(parts: Sequence[Drawn]) -> dict[str, tuple[str, ...]]:
    cells: dict[str, tuple[str, ...]] = {}
    for part in parts:
        pins = tuple(pin for pin, _ in part.pins)
        cells[part.cell] = tuple(dict.fromkeys((*cells.get(part.cell, ()), *pins)))
    return cells


def _nets(parts: Sequence[Drawn]) -> dict[str, list[tuple[str, str]]]:
    nets: dict[str, list[tuple[str, str]]] = {}
    for part in parts:
        for pin, net in part.pins:
            nets.setdefault(net, []).append((part.designator, pin))
    return nets


def identifier(text: str) -> str:
    """Return an EDIF identifier for a name: what it cannot hold becomes an underscore, a digit in front gets ``&``."""
    safe = re.sub(r"[^A-Za-z0-9_]", lambda found: {"+": "P_", "-": "M_"}.get(found[0], "_"), text)
    return safe if safe[:1].isalpha() else f"&{safe}"


def name_of(text: str) -> str:
    """Return a name's definition: the identifier alone where that is the name."""
    safe = identifier(text)
    return safe if safe == text else f'(rename {safe} "{_escaped(text)}")'


def _escaped(text: str) -> str:
    return re.sub(r'["%]', lambda found: f"%{ord(found[0])}%", text)
