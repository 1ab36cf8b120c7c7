"""An invented board of 10,000 parts: a rack of cards that watch contacts and feed lamps, drawn on pages, four levels deep.

No such rack exists. It is written as ``fixtures/survey/contact-rack.edf``, small because a cell stands there once and is
placed many times. Eight cards on one bus of sixteen bits; on each card sixteen inputs of five filters, and two lamp outputs,
each with a limiter. What is connected is known from the lists here, without any reader. ``python -m tests.support.rack``
writes the file and its twin.
"""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from tests.support.board_writer import Truth, escaped, groups
from tests.support.edif_text import identifier, name_of
from tests.support.paths import FIXTURES

RACK = FIXTURES / "survey" / "contact-rack.edf"
BITS = 16
LEAVES = {
    "RES": ("1", "2"),
    "CAP": ("1", "2"),
    "DIODE": ("A", "K"),
    "LED": ("A", "K"),
    "NPN": ("B", "C", "E"),
    "OPAMP": ("IN+", "IN-", "OUT", "V+", "V-"),
    "REGULATOR": ("IN", "GND", "OUT"),
    "CONN8": tuple("12345678"),
    "BUFFER16": ("A*", "Y*", "OE", "VCC", "GND"),
    "CPU": ("D*", "CMD*", "SEL*", "VCC", "GND"),
}
"""The parts' cells with their pins; a star marks an array of sixteen."""


@dataclass(frozen=True, slots=True)
class Place:
    """A part, or with no ``value`` a cell of :data:`CELLS`: its name, its cell, the net of each pin, value, type number."""

    name: str
    cell: str
    nets: Sequence[str]
    value: str = ""
    number: str = ""


@dataclass(frozen=True, slots=True)
class Drawn:
    """A cell of the board: its ports (a star as for pins), its pages, and the buses that have a ripper on each page."""

    ports: Sequence[str]
    pages: Sequence[Sequence[Place]]
    rippers: Mapping[int, Sequence[str]]


SUPPLY = ("+12V", "-12V", "GND")


def _resistor(number: int, one: str, other: str, value: str) -> Place:
    return Place(f"R{number}", "RES", (one, other), value)


def _capacitor(number: int, one: str, other: str, value: str) -> Place:
    return Place(f"C{number}", "CAP", (one, other), value)


def _filter() -> Drawn:
    places = [
        _resistor(1, "IN", "A1", "10K,1%"),
        _resistor(2, "A1", "A2", "10K,1%"),
        _capacitor(1, "A2", "GND", "10n,50V"),
        _capacitor(2, "A1", "MID", "22n,50V"),
        Place("U1", "OPAMP", ("A2", "MID", "MID", "+12V", "-12V"), "OPQ-7", "OPQ-7"),
        Place("D1", "DIODE", ("A2", "+12V"), "1N4148", "1N4148"),
        Place("D2", "DIODE", ("-12V", "A2"), "1N4148", "1N4148"),
        _resistor(3, "MID", "B1", "15K,1%"),
        _resistor(4, "B1", "B2", "15K,1%"),
        _capacitor(3, "B2", "GND", "4n7,50V"),
        _capacitor(4, "B1", "OUT", "10n,50V"),
        Place("U2", "OPAMP", ("B2", "OUT", "OUT", "+12V", "-12V"), "OPQ-7", "OPQ-7"),
        _capacitor(5, "+12V", "GND", "100n,50V"),
        _capacitor(6, "-12V", "GND", "100n,50V"),
    ]
    return Drawn(("IN", "OUT", *SUPPLY), [places], {})


def _input() -> Drawn:
    chain = ("IN", "T1", "T2", "T3", "T4", "OUT")
    filters = [Place(f"F{step + 1}", "FILTER", (chain[step], chain[step + 1], *SUPPLY)) for step in range(5)]
    return Drawn(("IN", "OUT", *SUPPLY), [filters[:3], filters[3:]], {})


def _output() -> Drawn:
    places = [
        Place("Q1", "NPN", ("DRIVE", "LOAD", "NEAR"), "BD139", "BD139"),
        Place("Q2", "NPN", ("TAP", "DRIVE", "GND"), "BC547B", "BC547B"),
        _resistor(1, "NEAR", "GND", "1R5 1W"),
        _resistor(2, "NEAR", "TAP", "470"),
        _resistor(3, "CMD", "DRIVE", "470"),
        _resistor(4, "DRIVE", "GND", "47K"),
        _capacitor(1, "DRIVE", "TAP", "1n,50V"),
        Place("D1", "DIODE", ("LOAD", "+24V"), "1N4004", "1N4004"),
        _resistor(5, "+24V", "LAMP", "4K7"),
        Place("D2", "LED", ("LAMP", "LOAD"), "red", "LQ-3"),
        _resistor(6, "LOAD", "CALM", "100"),
        _capacitor(2, "CALM", "GND", "10n,100V"),
    ]
    return Drawn(("CMD", "LOAD", "+24V", "GND"), [places], {})


def _card() -> Drawn:
    outside = [f"IN{bit}" for bit in range(BITS)]
    power = [
        Place("J1", "CONN8", ("+24V", "+24V", "GND", "GND", "LAMP1", "LAMP2", "GND", "GND"), "CONN8"),
        Place("O1", "OUTPUT", ("CMD1", "LAMP1", "+24V", "GND")),
        Place("O2", "OUTPUT", ("CMD2", "LAMP2", "+24V", "GND")),
        Place("U2", "REGULATOR", ("+12V", "GND", "+5V"), "RGX-05", "RGX-05"),
        *(_capacitor(number, ("+24V", "+12V", "+5V")[number % 3], "GND", "100n,50V") for number in range(1, 16)),
    ]
    inputs = [
        Place("J2", "CONN8", outside[:8], "CONN8"),
        Place("J3", "CONN8", outside[8:], "CONN8"),
        *(_resistor(1 + bit, outside[bit], f"A{bit}", "2K2") for bit in range(BITS)),
        *(_resistor(17 + bit, outside[bit], "GND", "100K") for bit in range(BITS)),
        *(_capacitor(16 + bit, f"A{bit}", "GND", "1n,50V") for bit in range(BITS)),
        *(Place(f"IN{1 + bit}", "INPUT", (f"A{bit}", f"S[{bit}]", *SUPPLY)) for bit in range(BITS)),
    ]
    lamps = [
        Place("U1", "BUFFER16", ("S", "D", "SEL", "+5V", "GND"), "BFX-16", "BFX-16"),
        *(_resistor(33 + bit, f"S[{bit}]", f"L{bit}", "1K") for bit in range(BITS)),
        *(Place(f"D{1 + bit}", "LED", (f"L{bit}", "GND"), "green", "LQ-2") for bit in range(BITS)),
    ]
    return Drawn(("D*", "SEL", "CMD1", "CMD2", "+24V", *SUPPLY), [power, inputs, lamps], {1: ("S",)})


def _rack() -> Drawn:
    control = [
        Place("J1", "CONN8", ("RAW24", "+24V", "RAW12", "+12V", "-12V", "GND", "GND", "EARTH"), "CONN8"),
        Place("U1", "CPU", ("D", "CMD", "SEL", "+5V", "GND"), "MCU-90", "MCU-90"),
        *(_resistor(1 + bit, f"D[{bit}]", "+5V", "10K") for bit in range(BITS)),
        *(_resistor(17 + bit, f"CMD[{bit}]", f"K{bit}", "100") for bit in range(BITS)),
        *(_capacitor(1 + number, ("+24V", "+12V", "+5V", "-12V")[number % 4], "GND", "10u,50V") for number in range(10)),
        Place("D1", "DIODE", ("RAW24", "+24V"), "1N4004", "1N4004"),
        Place("D2", "DIODE", ("RAW12", "+12V"), "1N4004", "1N4004"),
        Place("D3", "DIODE", ("GND", "EARTH"), "1N4004", "1N4004"),
        Place("D4", "DIODE", ("EARTH", "GND"), "1N4004", "1N4004"),
    ]
    cards = [
        Place(f"CARD{1 + card}", "CARD", ("D", f"SEL[{card}]", f"K{2 * card}", f"K{2 * card + 1}", "+24V", *SUPPLY))
        for card in range(8)
    ]
    return Drawn((), [control, cards], {0: ("D", "CMD")})


CELLS = {"FILTER": _filter(), "INPUT": _input(), "OUTPUT": _output(), "CARD": _card(), "RACK": _rack()}
"""The cells of the board, each after those it places; the last is the board."""


def truth() -> Truth:
    """Return the net of every pin of the board, from the lists alone."""
    found: Truth = {}
    work: list[tuple[str, str, dict[str, str]]] = [("RACK", "", {})]
    while work:
        cell, path, bound = work.pop()
        for place in (place for page in CELLS[cell].pages for place in page):
            inside = CELLS.get(place.cell)
            pins = dict(_pins(LEAVES[place.cell] if inside is None else inside.ports, place.nets))
            nets = {pin: bound.get(net, path + net) for pin, net in pins.items()}
            if inside is None:
                found[path + place.name] = nets
            else:
                work.append((place.cell, f"{path}{place.name}/", nets))
    return found


def twin() -> dict[str, object]:
    """Return what a reader must count in the file."""
    pins = truth()
    cells = Counter(place.cell for path in pins for place in _leaf(path))
    nets = groups(pins)
    supplies = {name: next(len(net) for net in nets if end in net) for name, end in SUPPLY_ENDS.items()}
    return {
        "design": "RACK",
        "levels": 4,
        "parts": len(pins),
        "pins": sum(map(len, pins.values())),
        "nets_with_pins": len(nets),
        "parts_by_cell": dict(sorted(cells.items())),
        "pins_on_supplies": supplies,
        "ends_of_bus_bit_5": sorted(next(net for net in nets if "U1.D[5]" in net)),
        "limiters": [f"CARD{card}/O{output}/Q1" for card in range(1, 9) for output in (1, 2)],
        "types_without_data": sorted({place.number for place in _leaves() if place.cell == "LED"}),
    }


SUPPLY_ENDS = {"+24V": "J1.2", "+12V": "J1.4", "-12V": "J1.5", "GND": "J1.6", "+5V": "U1.VCC"}
"""A pin on each supply of the rack."""


def _leaves() -> Iterator[Place]:
    yield from (place for cell in CELLS.values() for page in cell.pages for place in page if place.cell in LEAVES)


def _leaf(path: str) -> Iterator[Place]:
    """Yield the part at a path."""
    cell = CELLS["RACK"]
    for name in path.split("/"):
        place = next(each for page in cell.pages for each in page if each.name == name)
        cell = CELLS.get(place.cell, cell)
    yield place


def _pins(pins: Sequence[str], nets: Sequence[str]) -> Iterator[tuple[str, str]]:
    """Yield the pins and their nets, arrays element by element."""
    for pin, net in zip(pins, nets, strict=True):
        if pin.endswith("*"):
            yield from ((f"{pin[:-1]}[{bit}]", f"{net}[{bit}]") for bit in range(BITS))
        else:
            yield pin, net


def text() -> str:
    """Return the rack as EDIF, SCHEMATIC views on pages."""
    lines = [
        "(edif CONTACT_RACK (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))",
        "(status (written (timeStamp 2026 5 4 8 0 0)",
        '  (comment "Invented board: no such rack exists. Written by tests/support/rack.py")))',
        "(external PARTS (edifLevel 0) (technology (numberDefinition (scale 1 1 (unit distance))))",
    ]
    for cell, pins in LEAVES.items():
        lines += [f"(cell {cell} (cellType GENERIC) (view SYMBOL (viewType SCHEMATIC) (interface {_ports(pins)}"]
        lines += ["  (symbol (figure WIRE (rectangle (pt 0 0) (pt 40 20)))))))"]
    taps = " ".join(f"(port B{bit}) (joined (portRef B{bit}) (portRef (member BUS {bit})))" for bit in range(BITS))
    lines += ["(cell RIP16 (cellType RIPPER) (view SYMBOL (viewType SCHEMATIC)"]
    lines += [f"  (interface (port (array BUS {BITS})) {taps})))", ")"]
    lines += ["(library RACK (edifLevel 0) (technology (numberDefinition (scale 1 1 (unit distance))))"]
    for name, cell in CELLS.items():
        lines += [
            f"(cell {name} (cellType GENERIC) (view SHEETS (viewType SCHEMATIC) (interface {_ports(cell.ports)})",
            "(contents",
        ]
        lines += _contents(cell)
        lines += [")))"]
    return "\n".join([*lines, ")", "(design RACK (cellRef RACK (libraryRef RACK))))"]) + "\n"


def _ports(pins: Sequence[str]) -> str:
    return " ".join(f"(port (array {pin[:-1]} {BITS}))" if pin.endswith("*") else f"(port {name_of(pin)})" for pin in pins)


def _stem(net: str) -> str:
    """The bus that a bit is of; a plain net itself."""
    return net.partition("[")[0]


def _contents(cell: Drawn) -> Iterator[str]:
    wide = {net for page in cell.pages for place in page for net in place.nets}
    buses = {_stem(net) for net in wide if "[" in net} | {port[:-1] for port in cell.ports if port.endswith("*")}
    used = [{_stem(net) for place in page for net in place.nets} for page in cell.pages]
    ports = {port.removesuffix("*") for port in cell.ports}
    shared = {net for page in used for net in page if sum(net in other for other in used) > 1}
    for net in sorted(shared - ports):
        yield f"  (offPageConnector {f'(array {net} {BITS})' if net in buses else name_of(net)})"
    for number, page in enumerate(cell.pages):
        yield f"  (page SHEET{number + 1} (pageSize (rectangle (pt 0 0) (pt 1600 1000)))"
        yield "    (commentGraphics (instance FRAME (viewRef SYMBOL (cellRef RES (libraryRef PARTS)))))"
        ripped = cell.rippers.get(number, ())
        for place, at in zip(page, range(len(page)), strict=True):
            yield _instance(place, at)
        for bus in ripped:
            yield f"    (instance X_{bus} (viewRef SYMBOL (cellRef RIP16 (libraryRef PARTS))))"
        yield from _nets(page, buses, ripped, ports | shared)
        yield "  )"


def _instance(place: Place, at: int) -> str:
    drawn = f"(transform (origin (pt {100 + 60 * (at % 20)} {200 + 90 * (at // 20)})))"
    if place.cell in CELLS:
        return f'    (instance (rename B{at} "{place.name}") (viewRef SHEETS (cellRef {place.cell})) {drawn})'
    said = f'(property Value (string "{escaped(place.value)}"))'
    if place.number:
        said += f' (property (rename Part_Number "Part Number") (string "{place.number}"))'
    of = f"(viewRef SYMBOL (cellRef {place.cell} (libraryRef PARTS)))"
    return f'    (instance B{at} {of} (designator "{place.name}") {said} {drawn})'


def _nets(page: Sequence[Place], buses: set[str], ripped: Sequence[str], out: set[str]) -> Iterator[str]:
    """Write the nets of a page, numbered on the page; those in ``out`` reach others by a port or an off-page connector."""
    ends: dict[str, list[str]] = {f"{bus}": [f"(portRef BUS (instanceRef X_{bus}))"] for bus in ripped}
    for at, place in enumerate(page):
        pins = LEAVES[place.cell] if place.cell in LEAVES else CELLS[place.cell].ports
        for pin, net in zip(pins, place.nets, strict=True):
            ends.setdefault(net, []).append(f"(portRef {identifier(pin.removesuffix('*'))} (instanceRef B{at}))")
    for number, (net, joined) in enumerate(ends.items()):
        bus, _, bit = net.rstrip("]").partition("[")
        if bit:
            joined.append(f"(portRef B{bit} (instanceRef X_{bus}))" if bus in ripped else f"(portRef (member {bus} {bit}))")
        elif net in out:
            joined.append(f"(portRef {identifier(net)})")
        name = f'(array (rename N{number:03} "{net}") {BITS})' if net in buses else f'(rename N{number:03} "{net}")'
        yield f"    (net {name} (joined {' '.join(joined)})"
        yield f"      (figure WIRE (path (pointList (pt {10 * number} 0) (pt {10 * number} 50)))))"


def main() -> None:
    """Write the file and its twin."""
    RACK.write_bytes(text().encode())
    RACK.with_suffix(".json").write_bytes((json.dumps(twin(), indent=2) + "\n").encode())


if __name__ == "__main__":
    main()
