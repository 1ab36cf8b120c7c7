"""The value texts of a schematic: ``4K7``, ``R22``, ``0,1мк``, ``10K,1%``, ``3.9 1W``, ``150UF 35V``, ``..,DNI``.

Value codes follow IEC 60062 (a multiplier letter in the decimal point's place, then an optional tolerance letter), with SI
prefixes, unit words and the Cyrillic and Greek spellings met in real files. Upper-case M is mega for a resistance and is
refused for a capacitance or an inductance, where it may be meant for milli or for micro. Text that cannot be read says why
and has no value: nothing is guessed.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from functools import cache, lru_cache
from typing import Literal

Comma = Literal["decimal", "field"]

LONGEST = 200
"""A longer text is no value."""

CHIP_SIZES = frozenset(
    ("01005", "0201", "0402", "0603", "0805", "1206", "1210", "1218", "1806", "1808", "1812", "2010", "2220", "2512")
)
"""Chip sizes in hundredths of an inch, as they stand beside values."""


@dataclass(frozen=True, slots=True)
class ValueText:
    """What a value text says, in SI units; None where it does not say.

    ``tolerance`` is a fraction; ``fitted`` is False where the text marks the part as not fitted; ``unreadable`` says in
    plain words why there is no value (None where there is one, and for a part that is not fitted).
    """

    text: str
    value: float | None = None
    tolerance: float | None = None
    power_W: float | None = None
    voltage_V: float | None = None
    chip_size: str | None = None
    fitted: bool = True
    unreadable: str | None = None


_NUM = r"(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)"
_END = r"(?![\w.%])"
_POWERS: dict[str, dict[str, int]] = {
    "resistance": {"R": 0, "r": 0, "Ω": 0, "k": 3, "K": 3, "к": 3, "К": 3, "M": 6, "М": 6, "MEG": 6, "Meg": 6, "meg": 6,
                   "G": 9, "T": 12, "m": -3, "м": -3, "L": -3, "u": -6, "μ": -6},
    "capacitance": {"p": -12, "P": -12, "п": -12, "П": -12, "n": -9, "N": -9, "н": -9, "Н": -9, "u": -6, "U": -6, "μ": -6,
                    "мк": -6, "МК": -6, "m": -3, "м": -3, "F": 0},
    "inductance": {"n": -9, "N": -9, "н": -9, "u": -6, "U": -6, "μ": -6, "мк": -6, "МК": -6, "m": -3, "м": -3, "H": 0},
    "voltage": {"V": 0, "v": 0, "В": 0},
}  # fmt: skip
"""Multiplier letters that may stand in the decimal point's place (L is IEC 60062:2016's milliohm)."""
_UNITS = {
    "resistance": r"(?:ohms?|ом|Ω|R)",
    "capacitance": r"(?:F|FD|ф)",
    "inductance": r"(?:H|HY|гн)",
    "voltage": r"(?:V|VDC|в)",
}
_SPELLED = {"capacitance": {"MFD": -6}}  # microfarad in either case, never milli
_TOLERANCES = {
    "E": 5e-5, "L": 1e-4, "P": 2e-4, "W": 5e-4, "B": 1e-3, "C": 2.5e-3, "D": 5e-3, "F": 0.01, "G": 0.02, "H": 0.03,
    "J": 0.05, "K": 0.10, "M": 0.20, "N": 0.30, "Z": 0.80,
}  # fmt: skip
"""IEC 60062 tolerance letters; Z is -20/+80 %, of which the wider side counts."""
_PICOFARADS = {"B": 0.1e-12, "C": 0.25e-12, "D": 0.5e-12, "F": 1e-12, "G": 2e-12}
"""The same letters for a capacitor below 10 pF (IEC 60062)."""
_LONE_TOLERANCES = frozenset("BDFGJKM")
_NOT_FITTED = re.compile(
    r"(?:DN[IPFSM]|N/?F|N/?P|N/?M|N/?C|NO[ _-]?(?:POP|STUFF|FIT|LOAD|MOUNT)|UNFITTED|UNPOPULATED|OMIT(?:TED)?|OPEN"
    r"|(?:DO[ _]NOT|NOT)[ _](?:BE[ _])?(?:FIT|INSTALL|PLACE|POPULATE|STUFF|MOUNT|LOAD|USE)\w*|не[ _](?:уст|став|монт)\w*\.?)"
    + _END,
    re.I,
)
_FIELDS = (
    (
        "tolerance",
        re.compile(rf"(?:[+-](?P<over>{_NUM})\s*%?\s*/?\s*[+-]|\+/?-|[±+-])?\s*(?P<number>{_NUM})\s*%(?![\w.%])"),
    ),
    (
        "power",
        re.compile(
            rf"(?P<number>{_NUM})(?:\s*[/⁄]\s*(?P<over>[1-9][0-9]*))?\s*(?P<scale>[mk]?)(?:W(?:ATTS?)?|Вт){_END}", re.I
        ),
    ),
    ("power", re.compile(rf"(?P<number>[0-9]+)W(?P<rest>[0-9]+){_END}", re.I)),
    ("voltage", re.compile(rf"(?P<number>{_NUM})\s*(?P<scale>k?)(?:V(?:DC|AC)?|В){_END}", re.I)),
    ("voltage", re.compile(rf"(?P<number>[0-9]+)V(?P<rest>[0-9]+){_END}", re.I)),
    ("passed", re.compile(rf"[±+-]*{_NUM}\s*(?:ppm(?:/(?:K|°?C))?|[mμu]?A|[kM]?Hz|°C){_END}", re.I)),
)
_WORD = re.compile(r"[^\W\d_](?:[^\s,;|()/]|/(?![0-9.]))*")  # a stroke in front of a digit begins another field
_OTHER = re.compile(r"[^\s,;|()]+")
_SEPARATORS = re.compile(r"[\s,;|/()\[\]{}@*~=:]+|(?<!^)[+-]")
_HEADS = frozenset(
    (
        "res", "resistor", "cap", "capacitor", "ind", "inductor", "choke", "coil", "zener", "smd", "chip",
        "c0g", "cog", "np0", "npo", "x5r", "x6s", "x7r", "x7s", "y5v", "z5u",
    )
)  # fmt: skip
"""Words in front of a value that take nothing from it: what the part is, and classes of ceramic (EIA-198)."""
_SIZED = re.compile(rf"(?:smd|[rcl])?-?({'|'.join(sorted(CHIP_SIZES))})", re.I)
_MAYBE_THOUSANDS = re.compile(r"(?<![0-9.])[1-9][0-9]{0,2},[0-9]{3}(?![0-9])")


def read_value(text: str, dimension: str, *, comma: Comma | None = None) -> ValueText:
    """Return what a value text says.

    Parameters
    ----------
    text : as the netlist or the parts list has it.
    dimension : ``resistance``, ``capacitance``, ``inductance``, or ``voltage`` for a zener.
    comma : whether a comma between digits is a decimal mark or separates fields in this file. Where that is not known a
        text that reads differently either way is unreadable.

    Raises
    ------
    KeyError : another dimension.
    """
    if len(text) > LONGEST:
        return ValueText(text, unreadable="longer than any value")
    if comma is not None or not re.search(r"[0-9],[0-9]", text):
        return _read(text, dimension, comma or "field")
    decimal, field = (_read(text, dimension, habit) for habit in ("decimal", "field"))
    if decimal.unreadable:
        return field
    if field.unreadable and not _MAYBE_THOUSANDS.search(text):
        return decimal
    return ValueText(text, unreadable="the comma may be a decimal mark, part two fields or mark thousands")


@lru_cache(maxsize=8192)
def _read(text: str, dimension: str, comma: str) -> ValueText:
    shown = unicodedata.normalize("NFKC", text).replace("_", " ").replace("−", "-").strip()
    if comma == "decimal":
        shown = re.sub(r"(^|(?<=[0-9])),(?=[0-9])", ".", shown)
    fields = _fields(shown, dimension)
    values = [field for field in fields if field.kind == "value"]
    sizes = [size for field in fields if field.kind in ("value", "word") and (size := _chip_size(field.text))]
    if len(values) > 1 or any(field.kind == "word" and _chip_size(field.text) for field in fields):
        values = [field for field in values if not _chip_size(field.text)]
    tolerance = next((field.number for field in fields if field.kind == "tolerance"), None)
    letter = next((field.letter for field in values if field.letter), None) or next(
        (field.text for field in fields if field.kind == "letter"), None
    )
    fitted = not any(field.kind == "not fitted" for field in fields)
    reason = _why_not(shown, fields, values, dimension)
    value = values[0].number if reason is None and values else None
    if tolerance is None and letter:
        tolerance = _TOLERANCES[letter]
        if dimension == "capacitance" and value and value < 10e-12 and letter in _PICOFARADS:
            tolerance = _PICOFARADS[letter] / value
    return ValueText(
        text=text,
        value=value,
        tolerance=tolerance,
        power_W=next((field.number for field in fields if field.kind == "power"), None),
        voltage_V=next((field.number for field in fields if field.kind == "voltage"), None),
        chip_size=sizes[0] if len(sizes) == 1 and (not values or _chip_size(values[0].text) is None) else None,
        fitted=fitted,
        unreadable=reason if fitted else None,
    )


def _chip_size(text: str) -> str | None:
    """Return the chip size that a field names (``0603``, ``R0603``, ``SMD0805``), or None."""
    found = _SIZED.fullmatch(text)
    return found[1] if found else None


@dataclass(frozen=True, slots=True)
class _Field:
    kind: str
    text: str
    number: float | None = None
    letter: str | None = None
    bare: bool = False


def _fields(shown: str, dimension: str) -> list[_Field]:
    fields: list[_Field] = []
    position = 0
    while position < len(shown):
        field, end = _field_at(shown, position, dimension, after_value=any(field.kind == "value" for field in fields))
        if field is None:
            separators = _SEPARATORS.match(shown, position)
            position = separators.end() if separators else len(shown)
        else:
            fields.append(field)
            position = end
    return fields


def _field_at(shown: str, position: int, dimension: str, *, after_value: bool) -> tuple[_Field | None, int]:
    for kind, pattern in _FIELDS:
        if kind == dimension:
            continue
        found = pattern.match(shown, position)
        if found:
            return _Field(kind, found[0], _side(kind, found)), found.end()
    found = _NOT_FITTED.match(shown, position)
    if found:
        return _Field("not fitted", found[0]), found.end()
    for pattern in _value_patterns(dimension):
        found = pattern.match(shown, position)
        if found and not _is_other_unit(found, dimension):
            return _value(found, dimension), found.end()
    if _SEPARATORS.match(shown, position):
        return None, position
    word = _WORD.match(shown, position)
    if word:
        lone = after_value and word[0] in _LONE_TOLERANCES
        return _Field("letter" if lone else "word", word[0]), word.end()
    other = _OTHER.match(shown, position)
    assert other is not None  # every other character is a separator
    return _Field("other" if re.search(r"[\w?]", other[0]) else "mark", other[0]), other.end()


def _side(kind: str, found: re.Match[str]) -> float | None:
    """The number of a field beside the value: a fraction, watts or volts."""
    if kind == "passed":
        return None
    named = found.groupdict()
    number = float(f"{named['number']}.{named['rest']}" if named.get("rest") else named["number"])
    over = float(named.get("over") or 0.0)
    if kind == "tolerance":
        return max(number, over) / 100.0
    return number / (over or 1.0) * {"m": 1e-3, "k": 1e3}.get((named.get("scale") or "").lower(), 1.0)


@cache
def _value_patterns(dimension: str) -> tuple[re.Pattern[str], ...]:
    letters = "|".join(sorted(_POWERS[dimension], key=len, reverse=True))
    spelled = "|".join(_SPELLED.get(dimension, ())) or "(?!)"
    ohms = "E" if dimension == "resistance" else "(?!)"  # 22E is 22 ohm in some houses; 4E7 may be a power of ten
    unit, tolerance = f"(?i:{_UNITS[dimension]})", f"(?P<letter>[{''.join(_TOLERANCES)}])"
    return (
        re.compile(rf"(?P<number>{_NUM})\s*(?P<power>(?i:{spelled})){_END}"),
        re.compile(rf"(?P<whole>[0-9]{{1,4}})(?P<power>{letters})(?P<rest>[0-9]{{1,3}})(?:{unit}|{tolerance})?{_END}"),
        re.compile(rf"(?P<whole>)(?P<power>{letters})(?P<rest>[0-9]{{1,4}})(?:{unit}|{tolerance})?{_END}"),
        re.compile(
            rf"(?P<number>{_NUM}(?:[eE][+-]?[0-9]{{1,2}}(?=\s*{unit}))?)\s*(?P<power>{letters})?(?:(?<!\d)|\s*)?{unit}{_END}"
        ),
        re.compile(rf"(?P<number>{_NUM})\s*(?P<power>{letters}){tolerance}?{_END}"),
        re.compile(rf"(?P<number>{_NUM}){ohms}{_END}"),
        re.compile(rf"(?P<number>{_NUM}(?:[eE][+-][0-9]{{1,2}})?){_END}"),
    )


def _is_other_unit(found: re.Match[str], dimension: str) -> bool:
    """Whether a tolerance letter is rather the farad or the henry of another kind of part (``10uH``, ``4m7F``)."""
    named = found.groupdict()
    small = dimension != "resistance" or named.get("power") in ("u", "μ", "m", "м")
    return small and named.get("letter") in {"capacitance": ("H",), "inductance": ("F",)}.get(dimension, ("F", "H"))


def _value(found: re.Match[str], dimension: str) -> _Field:
    named = found.groupdict()
    letters = named.get("power")
    power = 0 if letters is None else _POWERS[dimension].get(letters, _SPELLED.get(dimension, {}).get(letters.upper(), 0))
    if named.get("rest") is not None:
        number = float(f"{named['whole'] or '0'}.{named['rest']}e{power}")
    else:
        digits, _, exponent = named["number"].lower().partition("e")
        number = float(f"{digits}e{int(exponent or 0) + power}")
    bare = found.re is _value_patterns(dimension)[-1]
    return _Field("value", found[0], number, named.get("letter"), bare)


@lru_cache(maxsize=8192)
def read_beside(text: str, kind: str) -> float | None:
    """Return the first tolerance (a fraction), power (W) or voltage (V) that a text states, or None.

    A tolerance may be an IEC 60062 letter. A comma between digits is a decimal mark here.
    """
    if len(text) > LONGEST:
        return None
    shown = re.sub(r"(?<=[0-9]),(?=[0-9])", ".", unicodedata.normalize("NFKC", text)).replace("_", " ").strip()
    if kind == "tolerance" and shown in _TOLERANCES:
        return _TOLERANCES[shown]
    return next((field.number for field in _fields(shown, "resistance") if field.kind == kind), None)


def _why_not(shown: str, fields: list[_Field], values: list[_Field], dimension: str) -> str | None:
    """Why no value can be taken from the fields; None where one can."""
    if not shown:
        return "empty"
    strange = [field.text for field in fields if field.kind == "other"]
    if len(values) > 1:
        return f'two values, "{values[0].text}" and "{values[1].text}"'
    if not values:
        return _no_value(strange[0] if strange else shown, dimension)
    value, first = values[0], next(field for field in fields if field.kind not in ("mark", "passed"))
    if strange:
        return f'"{strange[0]}" beside the value is not understood'
    if first.kind == "word" and first.text.casefold() not in _HEADS and not _chip_size(first.text):
        return f'"{first.text}" in front is no {dimension}'
    if value.number is None or value.number == float("inf"):
        return "too large"
    if dimension == "resistance" and _chip_size(value.text) and not (value.bare and value.text[0] in "12"):
        return "a chip size, no resistance"
    if dimension != "resistance" and value.bare:
        return "a number without a unit or a prefix"
    return None


def _no_value(piece: str, dimension: str) -> str:
    """Say why a piece of text is no value, naming what it is where that is plain; a bare number tells nothing."""
    if dimension in ("capacitance", "inductance") and re.search(r"[0-9]\s*[MМ]", piece):
        return "upper-case M may be meant for milli or for micro"
    for other in _POWERS:
        patterns = _value_patterns(other)[:-1] if other != dimension else ()
        if any((found := pattern.fullmatch(piece)) and not _is_other_unit(found, other) for pattern in patterns):
            return f"{'an' if other[0] in 'aeiou' else 'a'} {other}, no {dimension}"
    if dimension == "resistance" and re.fullmatch(r"[0-9]+E[0-9]+", piece):
        return "E may stand for ohm or for a power of ten"
    return f"no {dimension} can be read from it"
