"""A parts list in CSV: values, ratings and part numbers by designator, beside what the netlist says.

The columns are found by their headings, wherever the heading row stands; delimiter and encoding are found out. A row may
name many parts: ``R1-R4, R7``. What the netlist states counts; where the list says something else, that is a difference.
"""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from protlint.board.attributes import SPELLINGS, Habits, plain_name, read_values
from protlint.limits import ATTRIBUTES
from protlint.netlist.model import Part
from protlint.sources import InputError, read_bytes

DESIGNATORS = (
    "designator", "designators", "reference", "references", "refdes", "ref des", "reference designator",
    "reference designators", "part reference", "ref", "refs", "parts", "part", "position",
)  # fmt: skip
"""Headings of the column that names the parts."""

LARGEST = 100_000_000
"""Bytes of a file; the parts list of a large board is a thousandth of it."""

MOST_IN_A_RANGE = 10_000
"""``R1-R20000`` is a typing error."""

_HEADING_ROWS = 40
_DELIMITERS = (",", ";", "\t", "|")
_RANGE = re.compile(r"([A-Za-z]+)([0-9]{1,9})\s*(?:-|–|\.{2,3}|…|\bto\b)\s*(?:([A-Za-z]+))?([0-9]{1,9})")


@dataclass(frozen=True, slots=True)
class ListedPart:
    """One part's row: what it tells by attribute, and the line it stands in."""

    attributes: Mapping[str, str]
    line: int


@dataclass(frozen=True, slots=True)
class Difference:
    """A part of which parts list and netlist say different things; ``attribute`` is a key of ``[attributes]``."""

    part: str
    attribute: str
    netlist: str
    parts_list: str
    file: str
    line: int


@dataclass(frozen=True, slots=True)
class PartsList:
    """A parts list. ``parts`` is keyed by the folded designator; ``columns`` maps an attribute to its heading.

    ``remarks`` tell what was met and passed over: a part named twice, a row without a designator.
    """

    file: str
    parts: Mapping[str, ListedPart]
    columns: Mapping[str, str]
    remarks: tuple[str, ...] = field(default_factory=tuple)

    def row(self, part: Part) -> ListedPart | None:
        """Return the row of a part, by its id with the path, else by its designator."""
        by_id = self.parts.get(part.id.casefold())
        return by_id or (self.parts.get(part.designator.casefold()) if part.designator else None)

    def listed(self, part: Part) -> Mapping[str, str]:
        """Return what the list tells of a part by attribute; empty where it has no row."""
        row = self.row(part)
        return row.attributes if row is not None else {}


def read_parts_list(path: str | Path) -> PartsList:
    """Return the parts list in a CSV file.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : no row has the headings of a parts list, or the file is no CSV text, with the line.
    """
    content, name = read_bytes(path, limit=LARGEST)
    text = _decoded(content, name)
    delimiter, heading, columns, designators = _heading(text, name)
    parts: dict[str, ListedPart] = {}
    remarks: list[str] = []
    for line, row in _rows(text, delimiter, name):
        if line <= heading:
            continue
        attributes = {
            attribute: row[column].strip()
            for attribute, column in columns.items()
            if column < len(row) and row[column].strip()
        }
        named = row[designators] if designators < len(row) else ""
        if not named.strip():
            if attributes:
                remarks.append(f"{name}:{line}: a row without a designator is passed over")
            continue
        for designator in expand(named, file=name, line=line):
            known = parts.setdefault(designator.casefold(), ListedPart(attributes, line))
            if known.line != line and known.attributes != attributes:
                remarks.append(f"{name}:{line}: {designator} stands in line {known.line} already, which counts")
    titles = next(row for line, row in _rows(text, delimiter, name) if line == heading)
    return PartsList(name, parts, {key: titles[column].strip() for key, column in columns.items()}, tuple(remarks))


def expand(text: str, *, file: str | None = None, line: int | None = None) -> tuple[str, ...]:
    """Return the designators that a text names: ``R1-R4, R7`` is R1 R2 R3 R4 R7.

    Raises
    ------
    InputError : a range that runs backwards, changes its letters, or names more than :data:`MOST_IN_A_RANGE` parts.
    """
    found: list[str] = []
    for piece in re.split(r"[,;\n]+", text):
        ranges = list(_RANGE.finditer(piece))
        for one in ranges:
            letters, first, other, last = one[1], int(one[2]), one[3], int(one[4])
            if (other or letters).casefold() != letters.casefold() or not 0 <= last - first < MOST_IN_A_RANGE:
                raise InputError(f'"{one[0]}" is no range of designators', file=file, line=line)
            width = len(one[2]) if one[2].startswith("0") else 0
            found += [f"{letters}{number:0{width}d}" for number in range(first, last + 1)]
        found += _RANGE.sub(" ", piece).split()
    return tuple(dict.fromkeys(found))


def differences(parts: Sequence[Part], kinds: Sequence[str], habits: Habits, listed: PartsList) -> tuple[Difference, ...]:
    """Return where netlist and parts list contradict each other, in board order; ``kinds`` stands in the order of ``parts``.

    Numbers are compared as read, part numbers and footprints without regard to case. What only one of them tells is no
    contradiction.
    """
    found: list[Difference] = []
    for part, kind in zip(parts, kinds, strict=True):
        row = listed.row(part)
        if row is None:
            continue
        bare = part._replace(properties={})
        drawn, written = read_values(part, kind, habits), read_values(bare, kind, habits, listed=row.attributes)
        pairs: dict[str, tuple[float | None, float | None]] = {
            "value": (drawn.value, written.value),
            "tolerance": (drawn.tolerance, written.tolerance),
            "power": (drawn.power_W, written.power_W),
            "voltage": (drawn.voltage_V, written.voltage_V),
        }
        for attribute, (one, other) in pairs.items():
            if one is not None and other is not None and not math.isclose(one, other, rel_tol=1e-6, abs_tol=1e-18):
                texts = (drawn.text or "", written.text or "") if attribute == "value" else (f"{one:g}", f"{other:g}")
                found.append(Difference(part.id, attribute, *texts, listed.file, row.line))
        if drawn.fitted != written.fitted and written.text:
            words = {True: "fitted", False: "not fitted"}
            found.append(Difference(part.id, "fitted", words[drawn.fitted], words[written.fitted], listed.file, row.line))
        stated = _stated_number(part, habits)
        number = row.attributes.get("part_number", "")
        if stated and number and stated.casefold() != number.casefold():
            found.append(Difference(part.id, "part_number", stated, number, listed.file, row.line))
    return tuple(found)


def _stated_number(part: Part, habits: Habits) -> str | None:
    for key in habits.names["part_number"]:
        item = part.properties.get(key)
        if item is not None and plain_name(key) not in ("comment", "name") and str(item.value).strip():
            return str(item.value).strip()
    return None


def _decoded(content: bytes, name: str) -> str:
    if b"\0" in content and content[:2] not in (b"\xff\xfe", b"\xfe\xff"):
        raise InputError("a binary file, no CSV", file=name)
    for encoding in ("utf-16",) if content[:2] in (b"\xff\xfe", b"\xfe\xff") else ("utf-8-sig", "cp1252"):
        try:
            return content.decode(encoding)
        except UnicodeDecodeError:
            continue
    return content.decode("latin-1")


def _rows(text: str, delimiter: str, name: str) -> Iterator[tuple[int, list[str]]]:
    """Yield (line where the row ends, cells) of every row."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    try:
        for row in reader:
            yield reader.line_num, row
    except csv.Error as error:
        raise InputError(f"not CSV: {error}", file=name, line=reader.line_num) from None


def _heading(text: str, name: str) -> tuple[str, int, dict[str, int], int]:
    """Return delimiter, line, attribute columns and designator column of the row that holds the headings."""
    best: tuple[int, str, int, dict[str, int], int] | None = None
    for delimiter in _DELIMITERS:
        for count, (line, row) in enumerate(_rows(text, delimiter, name)):
            if count >= _HEADING_ROWS:
                break
            columns, designators = _columns(row)
            if designators is not None and columns and (best is None or len(columns) > best[0]):
                best = (len(columns), delimiter, line, columns, designators)
    if best is None:
        raise InputError(
            "no row with the headings of a parts list: a designator column and one of value, part number, power, tolerance, "
            "footprint, voltage",
            file=name,
            line=1,
        )
    return best[1:]


def _columns(row: Sequence[str]) -> tuple[dict[str, int], int | None]:
    titles = [plain_name(title) for title in row]
    designators = next((titles.index(title) for title in DESIGNATORS if title in titles), None)
    columns: dict[str, int] = {}
    for attribute in ATTRIBUTES:
        for spelling in SPELLINGS[attribute]:
            if spelling in titles and titles.index(spelling) not in (designators, *columns.values()):
                columns[attribute] = titles.index(spelling)
                break
    return columns, designators
