"""What a part's properties say: value, part number, power, tolerance, footprint, voltage, and whether it is fitted.

Every exporter has its own names and habits. They are found out once per file, stated, and then followed.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from functools import lru_cache

from protlint.board.graph import Values
from protlint.limits import ATTRIBUTES, Limits
from protlint.netlist.model import Netlist, Part, PropertyValue
from protlint.partdata.book import Book
from protlint.quantities import Comma, ValueText, read_beside, read_value

SPELLINGS: dict[str, tuple[str, ...]] = {
    "value": ("value", "val", "part value", "partvalue", "comment", "resistance", "capacitance", "inductance"),
    "part_number": (
        "part number", "partnumber", "mpn", "manufacturer part number", "manufacturer part", "mfr part number", "mfr part",
        "mfr pn", "mfg part number", "mfg pn", "manufacturer pn", "part no", "partno", "device", "device type", "part type",
        "component name", "component", "comment", "name",
    ),
    "power": ("power", "wattage", "power rating", "rated power", "watts", "watt", "pwr", "rating"),
    "tolerance": ("tolerance", "tol", "toler"),
    "footprint": ("pcb footprint", "footprint", "prt", "package", "pkg type", "jedec type", "case", "case style", "decal"),
    "voltage": ("voltage", "voltage rating", "rated voltage", "working voltage", "vmax", "rating"),
}  # fmt: skip
"""Property names by what they tell, in the order they are believed; case, blanks, dots and dashes do not count."""

_LOOSE = ("comment", "name", "device", "component", "component name", "part type")
_ABSENT = ("dnp", "dni", "dnf", "do not populate", "do not fit", "no pop", "nopop", "no stuff", "nostuff", "not fitted")
_PRESENT = (
    "fit", "fitted", "populate", "populated", "mount", "mounted", "place", "placed", "assemble", "assembled", "stuff",
    "stuffed", "install", "installed",
)  # fmt: skip
_OPTION = (
    "bom", "bom option", "bom status", "variant", "option", "assembly", "assembly option", "population", "mounting",
    "placement", "status", "part status",
)  # fmt: skip
"""Properties that may hold anything, a mark of a part that is not fitted among others."""
_YES, _NO = ("1", "true", "yes", "y", "x"), ("0", "false", "no", "n")
_DIMENSIONS = {"resistor": "resistance", "capacitor": "capacitance", "inductor": "inductance", "zener": "voltage"}
_TYPE_NUMBER = re.compile(r"(?=[^\s]*[0-9])(?=[^\s]*[A-Za-z])[A-Za-z0-9][\w./+#-]{2,39}", re.ASCII)
_INSTANCE = re.compile(r"I(?:NS)?[0-9]{4,}", re.IGNORECASE)
"""What some exporters write as a part's Name: the number of its instance."""
_JEDEC = re.compile(r"[12]N[0-9]{3,4}(?![0-9])", re.IGNORECASE)
"""Type numbers that would read as capacitances (``1N914``)."""
_ZENER_CODE = re.compile(r"BZ[A-Z][0-9]{2}[-/ ]?([A-E])([0-9]{1,3}(?:V[0-9]{1,2})?)(?![0-9])", re.IGNORECASE)
_ZENER_TOLERANCES = {"A": 0.01, "B": 0.02, "C": 0.05, "D": 0.10, "E": 0.20}
"""Pro Electron type codes: a letter for the tolerance, then the zener voltage with V in the decimal point's place."""


@dataclass(frozen=True, slots=True)
class Habits:
    """How one file writes.

    ``comma`` is what a comma between digits means here and ``comma_from`` says how that was decided. ``names`` maps what a
    property tells to the folded property names of this file that tell it, first believed first; ``found`` the same to the
    names as written, with the number of parts that have them; ``others`` does so for the properties that tell none of it.
    """

    comma: Comma
    comma_from: str
    names: Mapping[str, tuple[str, ...]]
    found: Mapping[str, Mapping[str, int]] = field(default_factory=dict)
    others: Mapping[str, int] = field(default_factory=dict)


def file_habits(netlist: Netlist, limits: Limits) -> Habits:
    """Return the habits of a file: its property names, the limits file's own first, and what its commas mean."""
    counted = Counter([(key, item.name) for part in netlist.parts for key, item in part.properties.items()])
    written: dict[str, Counter[str]] = {}
    for (key, name), count in counted.items():
        written.setdefault(key, Counter())[name] = count
    by_plain: dict[str, list[str]] = {}
    for key in written:
        by_plain.setdefault(plain_name(key), []).append(key)
    names: dict[str, tuple[str, ...]] = {}
    for attribute in ATTRIBUTES:
        spelled = (*(plain_name(name) for name in limits.attributes.get(attribute, ())), *SPELLINGS[attribute])
        names[attribute] = tuple(dict.fromkeys(key for name in spelled for key in by_plain.get(name, ())))
    names["absent"] = tuple(key for name in _ABSENT for key in by_plain.get(name, ()))
    names["present"] = tuple(key for name in _PRESENT for key in by_plain.get(name, ()))
    names["option"] = tuple(key for name in _OPTION for key in by_plain.get(name, ()))
    found = {
        attribute: {written[key].most_common(1)[0][0]: written[key].total() for key in names[attribute]}
        for attribute in ATTRIBUTES
    }
    telling = {key for keys in names.values() for key in keys}
    others = {spelled.most_common(1)[0][0]: spelled.total() for key, spelled in written.items() if key not in telling}
    comma, comma_from = _comma(netlist, names["value"])
    return Habits(comma, comma_from, names, found, others)


def read_values(part: Part, kind: str, habits: Habits, *, listed: Mapping[str, str] | None = None) -> Values:
    """Return what a part's properties say of its values; ``listed`` is its row of a parts list, which fills what they leave.

    Nothing is raised: a text that cannot be read is in ``Values.unreadable``.
    """
    listed = listed or {}
    read = _value(part, kind, habits, listed)
    tolerance, power, voltage = (_beside(part, name, habits, listed) for name in ("tolerance", "power", "voltage"))
    return Values(
        text=read.text or None,
        value=read.value,
        tolerance=read.tolerance if tolerance is None else tolerance,
        power_W=read.power_W if power is None else power,
        voltage_V=read.voltage_V if voltage is None else voltage,
        footprint=next((text for _, text in _texts(part, "footprint", habits, listed)), None) or read.chip_size,
        fitted=read.fitted and _fitted(part, habits),
        unreadable=read.unreadable,
    )


def part_numbers(part: Part, habits: Habits, *, listed: Mapping[str, str] | None = None) -> tuple[str, ...]:
    """Return every text that may be a part's type, most believed first: its properties, its value text, its cell's name.

    A property that may hold other things as well (``Comment``, ``Name``), the value and the cell's name count only where
    they look like a type: letters and digits in one word, and no resistance.
    """
    stated = list(_texts(part, "part_number", habits, listed or {}))
    certain = [text for key, text in stated if plain_name(key) not in _LOOSE]
    loose = [text for key, text in stated if plain_name(key) in _LOOSE]
    loose += [text for _, text in _texts(part, "value", habits, {})]
    loose.append(part.cell)
    return tuple(dict.fromkeys((*certain, *(text for text in loose if _is_type(text)))))


def part_number(
    part: Part, habits: Habits, *, book: Book | None = None, listed: Mapping[str, str] | None = None
) -> str | None:
    """Return a part's type: of :func:`part_numbers` the first that the book knows, else the first, else None.

    The book is asked for a text and for what stands in front of its first blank, comma or stroke (``BC547B,112``).
    """
    candidates = part_numbers(part, habits, listed=listed)
    if book is not None:
        for text in candidates:
            for asked in (text.strip(), _head(text)):
                if book.find(asked) is not None:
                    return asked
    return candidates[0] if candidates else None


def part_number_from(part: Part, number: str, habits: Habits) -> str:
    """Return where a part's type, as :func:`part_number` gives it, stands: the property's name, the cell, a parts list."""
    for attribute in ("part_number", "value"):
        for key, text in _texts(part, attribute, habits, {}):
            if number in (text, _head(text)):
                return part.properties[key].name
    return "the cell's name" if number in (part.cell, _head(part.cell)) else "the parts list"


@lru_cache(maxsize=4096)
def plain_name(name: str) -> str:
    """Return a property's name or a heading as names are compared: folded, with single blanks."""
    return " ".join(filter(None, re.split(r"[\s._-]+", name.casefold())))


def _texts(part: Part, attribute: str, habits: Habits, listed: Mapping[str, str]) -> Iterator[tuple[str, str]]:
    """Yield (property name, text) of what tells an attribute, blanks left out; the parts list's last, without a name."""
    for key in habits.names[attribute]:
        item = part.properties.get(key)
        if item is not None and not isinstance(item.value, bool) and (text := str(item.value).strip()):
            yield key, text
    if listed and listed.get(attribute, "").strip():
        yield "", listed[attribute].strip()


@lru_cache(maxsize=8192)
def _is_type(text: str) -> bool:
    """Whether a text looks like a type number: one word of letters and digits that is no value of any kind of part."""
    head = _head(text)
    if not _TYPE_NUMBER.fullmatch(head) or _INSTANCE.fullmatch(head):
        return False
    return bool(_JEDEC.match(head)) or all(
        read_value(head, dimension).value is None for dimension in ("resistance", "capacitance", "inductance", "voltage")
    )


@lru_cache(maxsize=8192)
def _head(text: str) -> str:
    return re.split(r"[\s,/;(]", text.strip(), maxsplit=1)[0]


def _value(part: Part, kind: str, habits: Habits, listed: Mapping[str, str]) -> ValueText:
    """Return the first value text that can be read, else the first there is."""
    dimension = _DIMENSIONS.get(kind)
    reads = []
    for key, text in _texts(part, "value", habits, listed):
        item = part.properties.get(key)
        if dimension is None:
            read = _read(text, "resistance", habits.comma)
            reads.append(replace(read, value=None, tolerance=None, unreadable=None))
        elif item is not None and not isinstance(item.value, str):
            reads.append(_number(text, item.value, dimension))
        elif text == part.designator:
            reads.append(ValueText(text, unreadable="the part's own designator stands in the place of a value"))
        else:
            reads.append(_read(text, dimension, habits.comma))
    best = next((read for read in reads if read.value is not None), None)
    if best is None and kind == "zener":
        best = _zener_value(part, habits, listed)
    best = best or (reads[0] if reads else ValueText(""))
    return best if all(read.fitted for read in reads) else replace(best, fitted=False, unreadable=None)


def _read(text: str, dimension: str, comma: Comma) -> ValueText:
    read = read_value(text, dimension, comma=comma)
    if read.unreadable is not None:
        either = read_value(text, dimension)  # good where only the other meaning of the comma makes sense
        return read if either.unreadable is not None else either
    return read


def _number(text: str, value: PropertyValue, dimension: str) -> ValueText:
    """A value that the file holds as a number: of a whole number the unit is known only for a resistance."""
    if isinstance(value, int) and dimension != "resistance":
        return read_value(text, dimension)
    if isinstance(value, str) or not 0.0 <= value < float("inf"):
        return ValueText(text, unreadable=f"no {dimension}")
    return ValueText(text, value=float(value))


def _zener_value(part: Part, habits: Habits, listed: Mapping[str, str]) -> ValueText | None:
    for text in part_numbers(part, habits, listed=listed):
        found = _ZENER_CODE.search(text)
        if found:
            volts = float(found[2].upper().replace("V", "."))
            return ValueText(text, value=volts, tolerance=_ZENER_TOLERANCES[found[1].upper()])
    return None


def _beside(part: Part, attribute: str, habits: Habits, listed: Mapping[str, str]) -> float | None:
    """A tolerance, power or voltage from the properties that tell it."""
    if not (listed or habits.names[attribute]):
        return None
    for key, text in _texts(part, attribute, habits, listed):
        number = read_beside(text, attribute)
        if number is None and plain_name(key) != "rating":
            number = _bare(text, attribute)
        if number is not None:
            return number
    return None


def _bare(text: str, attribute: str) -> float | None:
    """A number without its unit in a property whose name says what it is: watts, volts, per cent (1 to 100)."""
    found = re.fullmatch(r"([0-9]+(?:[.,][0-9]+)?)(?:/([1-9][0-9]*))?", text.replace(" ", ""))
    if found is None:
        return None
    number = float(found[1].replace(",", ".")) / float(found[2] or 1.0)
    if attribute == "tolerance":
        return number / 100.0 if 1.0 <= number <= 100.0 else None
    return number if number > 0.0 else None


def _fitted(part: Part, habits: Habits) -> bool:
    if not (habits.names["absent"] or habits.names["present"] or habits.names["option"]):
        return True

    def said(key: str) -> str:
        item = part.properties.get(key)
        return "" if item is None else str(item.value).strip().casefold()

    if any(said(key) in _YES for key in habits.names["absent"]) or any(said(key) in _NO for key in habits.names["present"]):
        return False
    marks = (plain_name(said(key)) for name in ("absent", "present", "option") for key in habits.names[name])
    return not any(mark in _ABSENT for mark in marks)


def _comma(netlist: Netlist, names: tuple[str, ...]) -> tuple[Comma, str]:
    """Decide what a comma between digits means in a file, by the value texts that read one way only."""
    votes: Counter[str] = Counter()
    hints: Counter[str] = Counter()
    for part in netlist.parts:
        for key in names:
            item = part.properties.get(key)
            if item is not None and isinstance(item.value, str) and "," in item.value:
                vote, hint = _vote(item.value)
                votes[vote] += 1
                hints[hint] += 1
    deciding = votes if votes["decimal"] != votes["field"] else hints
    if deciding["decimal"] == deciding["field"]:
        told = "as many value texts say one as the other of" if deciding["decimal"] else "no value text tells"
        return "field", f"{told} what a comma between digits means; it is taken to part fields"
    comma: Comma = "decimal" if deciding["decimal"] > deciding["field"] else "field"
    means = {"decimal": "is a decimal mark", "field": "parts fields"}
    other = {"decimal": "field", "field": "decimal"}[comma]
    against = f", against {deciding[other]} where it {means[other]}" if deciding[other] else ""
    count = deciding[comma]
    return comma, f"a comma between digits {means[comma]}: {count} value text{'s say' if count > 1 else ' says'} so{against}"


@lru_cache(maxsize=8192)
def _vote(text: str) -> tuple[str, str]:
    """What one value text says of the comma, surely and by hint; empty where it says nothing."""
    if not re.search(r"[0-9],[0-9]", text):
        return "", "field" if re.search(r"[^\W\d],[0-9]", text) else ""
    reads = {
        comma: [read_value(text, dimension, comma=comma) for dimension in ("resistance", "capacitance", "inductance")]
        for comma in ("decimal", "field")
    }
    decimal, field_ = (any(read.value is not None for read in reads[comma]) for comma in ("decimal", "field"))
    if any(read.chip_size for read in reads["field"]):
        return "field", "field"  # nobody writes a value to so many places
    if decimal and not field_ and not re.fullmatch(r"[1-9][0-9]{0,2},[0-9]{3}", text.strip()):
        return "decimal", "decimal"
    if field_ and not decimal:
        return "field", "field"
    return "", "field" if field_ else ""
