"""Random boards of any size, written as EDIF 2 0 0 in the habits of different exporters.

The boards are invented: random parts on random nets, with a few rails that carry much of the board. What is written is
known beforehand, so a reader can be held to it: :func:`write` returns the text with the connections it must give.
"""

from __future__ import annotations

import random
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

CELLS = {
    "RES": ("1", "2"),
    "CAP": ("1", "2"),
    "DIODE": ("A", "K"),
    "NPN": ("B", "C", "E"),
    "NMOS": ("G", "D", "S"),
    "OPAMP": ("IN+", "IN-", "OUT", "V+", "V-"),
}
LETTERS = {"RES": "R", "CAP": "C", "DIODE": "D", "NPN": "Q", "NMOS": "M", "OPAMP": "U"}
VALUES = ("10K", "4K7", "0R68 1W", "100n", "22uF 35V", 'say "so"', "1%", "R\\E\\S\\", "", "two\nlines", "47к")
RAILS = ("GND", "+24V", "-15V", "VCC")
ALIASES = {"net": "N", "instance": "I", "joined": "J", "portRef": "P", "property": "PR", "view": "GND", "figure": "F"}
"""Other words for keywords, some of them identifiers as well."""

Truth = dict[str, dict[str, str]]
"""Part id to pin name to the name of a net; two pins are connected where the names are the same."""


@dataclass(frozen=True, slots=True)
class Habits:
    """How an exporter writes. ``case`` is ``as is``, ``upper``, ``lower`` or ``mixed``, of keywords and of references.

    With ``globals`` rails go by ``globalPortRef`` wherever they are, and by no port or connector.
    """

    wrap: int = 0
    line_end: str = "\n"
    case: str = "as is"
    pages: int = 0
    blocks: int = 0
    designators: bool = True
    renames: bool = False
    drawing: bool = False
    globals: bool = False
    aliases: bool = False


@dataclass(frozen=True, slots=True)
class Placed:
    """A part of the board that is to be written; ``nets`` in the order of its cell's pins, None for an open pin."""

    designator: str
    cell: str
    value: str
    nets: tuple[str | None, ...]


def random_board(parts: int, seed: int) -> list[Placed]:
    """Return ``parts`` parts, wired at random: mostly to near neighbours, often to a rail, sometimes not at all."""
    chance = random.Random(seed)
    kinds = list(CELLS)
    board = []
    for number in range(1, parts + 1):
        cell = chance.choice(kinds)
        nets = []
        for _ in CELLS[cell]:
            where = chance.random()
            near = max(1, number + chance.randint(-3, 3))
            nets.append(chance.choice(RAILS) if where < 0.25 else None if where < 0.3 else f"N{near}")
        board.append(Placed(f"{LETTERS[cell]}{number}", cell, chance.choice(VALUES), tuple(nets)))
    return board


def random_habits(seed: int) -> Habits:
    """Return the habits of some exporter."""
    chance = random.Random(seed)
    return Habits(
        wrap=chance.choice((0, 0, 80, 33)),
        line_end=chance.choice(("\n", "\r\n", "\r")),
        case=chance.choice(("as is", "upper", "lower", "mixed")),
        pages=chance.choice((0, 0, 1, 4)),
        blocks=chance.choice((0, 0, 2, 5)),
        designators=chance.random() < 0.6,
        renames=chance.random() < 0.5,
        drawing=chance.random() < 0.5,
        globals=chance.random() < 0.25,
        aliases=chance.random() < 0.25,
    )


def write(board: Sequence[Placed], habits: Habits, seed: int = 0) -> tuple[str, Truth]:
    """Return the board as EDIF, and what a reader must find in it."""
    writer = _Writer(habits, random.Random(seed))
    text = writer.file(board)
    if habits.aliases:
        text = _aliased(text)
    if habits.case != "as is":
        text = _recased(text, habits.case, random.Random(seed + 1))
    if habits.wrap:
        text = _wrapped(text, habits.wrap)
    return text.replace("\n", habits.line_end), writer.truth


def groups(truth: Truth) -> set[frozenset[str]]:
    """Return the connected pins of a truth, net by net, as ``part.pin``."""
    nets: dict[str, set[str]] = {}
    for part, pins in truth.items():
        for pin, net in pins.items():
            nets.setdefault(net, set()).add(f"{part}.{pin}")
    return {frozenset(pins) for pins in nets.values()}


def escaped(text: str) -> str:
    """Return a text as it stands in an EDIF string."""
    return re.sub(r'[%"\n\r]', lambda match: f"%{ord(match[0])}%", text)


class _Writer:
    def __init__(self, habits: Habits, chance: random.Random) -> None:
        self.habits = habits
        self.chance = chance
        self.truth: Truth = {}
        self.lines: list[str] = []
        self.view = "SCHEMATIC" if habits.pages else "NETLIST"

    def name(self, text: str) -> str:
        """A name's definition: an identifier where the text is one and nothing is renamed."""
        identifier = self.identifier(text)
        if identifier == text and not (self.habits.renames and self.chance.random() < 0.5):
            return text
        return f'(rename {identifier} "{escaped(text)}")'

    def identifier(self, text: str) -> str:
        if re.fullmatch("[A-Za-z][A-Za-z0-9_]*", text):
            return f"X_{text}" if self.habits.renames else text
        return "&" + re.sub("[^A-Za-z0-9_]", lambda match: f"_{ord(match[0])}_", text)

    def file(self, board: Sequence[Placed]) -> str:
        self.lines.append('(edif (rename BOARD_ "an invented board") (edifVersion 2 0 0) (edifLevel 0)')
        self.lines.append("(keywordMap (keywordLevel 0))")
        self.lines.append('(status (written (timeStamp 2026 1 1 0 0 0) (program "board_writer" (version "1"))))')
        self.lines.append("(external PARTS (edifLevel 0) (technology (numberDefinition))")
        for cell, pins in CELLS.items():
            ports = " ".join(f"(port {self.name(pin)} (direction INOUT))" for pin in pins)
            drawn = "(symbol (figure WIRE (path (pointList (pt 0 0) (pt 9 9)))))" if self.habits.drawing else ""
            self.lines.append(
                f"(cell {cell} (cellType GENERIC) (view V (viewType {self.view}) (interface {ports} {drawn})))"
            )
        self.lines.append(")\n(library BOARD (edifLevel 0) (technology (numberDefinition))")
        blocks = self.split(board)
        crossing = self.crossing(blocks)
        for number, block in enumerate(blocks[1:], 1):
            ports = sorted(crossing & {net for part in block for net in part.nets if net})
            self.cell(f"BLOCK{number}", block, ports, f"B{number}/", {})
        inner = {
            f"B{number}": (f"BLOCK{number}", sorted(crossing & {net for part in block for net in part.nets if net}))
            for number, block in enumerate(blocks[1:], 1)
        }
        self.cell("TOP", blocks[0], [], "", inner)
        self.lines.append(")\n(design BOARD_ (cellRef TOP (libraryRef BOARD))))\n")
        return "\n".join(self.lines)

    def split(self, board: Sequence[Placed]) -> list[list[Placed]]:
        """The parts of the top cell first, then those of each block."""
        count = self.habits.blocks + 1
        blocks: list[list[Placed]] = [[] for _ in range(count)]
        for part in board:
            blocks[self.chance.randrange(count)].append(part)
        return [blocks[0], *filter(None, blocks[1:])]

    def crossing(self, blocks: Sequence[Sequence[Placed]]) -> set[str]:
        seen: dict[str, int] = {}
        crossing = set()
        for number, block in enumerate(blocks):
            for part in block:
                for net in part.nets:
                    if net and seen.setdefault(net, number) != number:
                        crossing.add(net)
        return crossing - set(RAILS) if self.habits.globals else crossing

    def cell(
        self, name: str, parts: Sequence[Placed], ports: Sequence[str], path: str, inner: dict[str, tuple[str, list[str]]]
    ) -> None:
        declared = " ".join(f"(port {self.name('P_' + net)})" for net in ports)
        self.lines.append(f"(cell {name} (cellType GENERIC) (view V (viewType {self.view}) (interface {declared})")
        self.lines.append("(contents")
        sheets: list[list[Placed]] = [[] for _ in range(max(1, self.habits.pages))]
        for part in parts:
            sheets[self.chance.randrange(len(sheets))].append(part)
        joined = [self.sheet_nets(sheet, path) for sheet in sheets]
        for instance, (_, nets) in inner.items():
            for net in nets:
                joined[0].setdefault(net, []).append(f"(portRef {self.identifier('P_' + net)} (instanceRef {instance}))")
        several = {net for each in joined for net in each if sum(net in other for other in joined) > 1}
        several -= set(RAILS) if self.habits.globals else set()
        for net in sorted(several - set(ports)):
            self.lines.append(f"(offPageConnector {self.name('O_' + net)})")
        for number, (sheet, nets) in enumerate(zip(sheets, joined, strict=True), 1):
            if self.habits.pages:
                self.lines.append(f"(page PAGE{number} (pageSize (rectangle (pt 0 0) (pt 1000 700)))")
            for part in sheet:
                self.lines.append(self.instance(part))
            if number == 1:
                for instance, (cell, _) in inner.items():
                    self.lines.append(f"(instance {instance} (viewRef V (cellRef {cell})))")
            for net, ends in nets.items():
                out = f"(portRef {self.identifier('P_' + net)})" if net in ports else ""
                out = f"(portRef {self.identifier('O_' + net)})" if not out and net in several else out
                out = f"(globalPortRef {self.identifier(net)})" if self.habits.globals and net in RAILS else out
                self.lines.append(f"(net {self.name(net)} (joined {out} {' '.join(ends)}){self.furniture()})")
            if self.habits.pages:
                self.lines.append(")")
        self.lines.append(")))")

    def sheet_nets(self, sheet: Sequence[Placed], path: str) -> dict[str, list[str]]:
        nets: dict[str, list[str]] = {}
        for part in sheet:
            pins = {}
            for pin, net in zip(CELLS[part.cell], part.nets, strict=True):
                if net:
                    pins[pin] = net
                    reference = f"(portRef {self.identifier(pin)} (instanceRef {self.instance_identifier(part)}))"
                    nets.setdefault(net, []).append(reference)
            self.truth[path + part.designator] = pins
        return nets

    def instance_identifier(self, part: Placed) -> str:
        return f"INS{part.designator}" if self.habits.designators else self.identifier(part.designator)

    def instance(self, part: Placed) -> str:
        if self.habits.designators:
            named, designator = f"INS{part.designator}", f'(designator "{part.designator}")'
        else:
            named, designator = self.name(part.designator), ""
        placed = f"(viewRef V (cellRef {part.cell} (libraryRef PARTS)))"
        value = f'(property VALUE (string "{escaped(part.value)}"))'
        more = '(property (rename PCB_FOOTPRINT "PCB FOOTPRINT") (string "RC0805"))'
        drawn = "(transform (scaleX 1 1) (orientation R90) (origin (pt 10 20)))" if self.habits.drawing else ""
        return f"(instance {named} {placed} {designator} {value} {more} {drawn})"

    def furniture(self) -> str:
        if not self.habits.drawing:
            return ""
        dot = "(instance DOT (viewRef V (cellRef RES (libraryRef PARTS))))" if self.chance.random() < 0.2 else ""
        return f"(figure WIRE (path (pointList (pt 1 2) (pt 3 4)))){dot}"


def _tokens(text: str) -> Iterator[str]:
    yield from re.findall(r'"[^"]*"|[()]|[^\s()"]+', text)


def _aliased(text: str) -> str:
    """Write keywords by other words."""
    said = " ".join(f"(keywordAlias {alias} {known})" for known, alias in ALIASES.items())

    def token(match: re.Match[str]) -> str:
        return f"({ALIASES.get(match[1], match[1])}" if match[1] else match[0]

    plain = re.sub(r'"[^"]*"|\((\w+)', token, text)
    return plain.replace("(keywordLevel 0)", f"(keywordLevel 1) {said}")


def _recased(text: str, case: str, chance: random.Random) -> str:
    """Change the case of keywords and of the identifiers that references use; nobody sees either."""

    def recase(word: str) -> str:
        if case == "mixed":
            return "".join(letter.upper() if chance.random() < 0.5 else letter.lower() for letter in word)
        return word.upper() if case == "upper" else word.lower()

    def token(match: re.Match[str]) -> str:
        return match[1] + recase(match[2]) + recase(match[3] or "") if match[2] else match[0]

    return re.sub(r'"[^"]*"|(\(\s*)([A-Za-z]+)((?<=Ref) [^\s()]+)?', token, text)


def _wrapped(text: str, width: int) -> str:
    """Break lines at a column as exporters do: between tokens, and inside a string wherever the column falls."""
    lines, line = [], ""
    for word in _tokens(text):
        if line and len(line) + 1 + len(word) > width and not word.startswith('"'):
            lines.append(line)
            line = ""
        line += (" " if line else "") + word
        while len(line) > width and word.startswith('"'):
            lines.append(line[:width])
            line = line[width:]
    return "\n".join([*lines, line]) + "\n"
