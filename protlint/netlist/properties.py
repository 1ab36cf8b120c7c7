"""Property values, names and texts as EDIF writes them."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from typing import Literal

from protlint.netlist.forms import Form
from protlint.netlist.model import Property, PropertyValue
from protlint.netlist.notes import Notes

Origin = Literal["cell", "interface", "instance"]
Scales = Mapping[str, float]
"""What one unit of a library's numbers is in SI units, by the lower-case name of the quantity."""

_INTEGER = re.compile(r"[+-]?[0-9]{1,300}")


def text_of(item: object) -> str | None:
    """Return the text of a string, a word, a ``string`` or a ``stringDisplay``; None where it holds none.

    A ``string`` form may be empty, which is an empty text, or hold several displays of the one text.
    """
    while isinstance(item, Form):
        if item.head not in ("string", "stringdisplay", "designator"):
            return None
        if len(item) == 1:
            return ""
        item = item[1]
    return item if isinstance(item, str) else None


def integer(item: object) -> int | None:
    """Return the integer an item is written as, None where it is none."""
    return int(item) if isinstance(item, str) and _INTEGER.fullmatch(item) else None


def number(item: object) -> float | str | None:
    """Return a number: an integer, or ``(e mantissa exponent)``, which is a text where no float can hold it."""
    if not isinstance(item, Form):
        whole = integer(item)
        return None if whole is None else float(whole)
    if item.head != "e" or len(item) < 3:
        return None
    mantissa, exponent = integer(item[1]), integer(item[2])
    if mantissa is None or exponent is None:
        return None
    written = f"{mantissa}e{exponent}"
    value = float(written)
    return value if math.isfinite(value) else written


def property_value(form: Form, scale: float = 1.0) -> PropertyValue | None:
    """Return the value of a ``property``, ``parameter`` or ``parameterAssign``; None where it has none that is known.

    A ``miNoMax`` gives its nominal, or a text with its least and most where it has no nominal; one that does not hold
    these three gives all that it holds as a text. ``scale`` multiplies what is written as a number.
    """
    for item in form[2:]:
        if not isinstance(item, Form):
            return text_of(item)
        match item.head:
            case "string" | "stringdisplay":
                return text_of(item)
            case "integer":
                whole = integer(item[1]) if len(item) > 1 else None
                return text_of(item[1]) if whole is None and len(item) > 1 else whole
            case "number":
                return _scaled(number(item[1]), scale) if len(item) > 1 else None
            case "boolean":
                return isinstance(item[1], Form) and item[1].head == "true" if len(item) > 1 else None
            case "minomax":
                return _nominal(item, scale)
            case "point":
                return _point(item)
    return None


def read_property(form: Form, name: str, origin: Origin, scales: Scales, notes: Notes) -> Property:
    """Return a property form as a property; the name is read by the caller, who knows how names are written.

    The least and the most that stand beside a nominal value are noted, as nothing is made of them.
    """
    line, column = form.places.at(form.offset)
    if len(form) == 3 and type(form[2]) is str:  # nearly all are so
        return Property(name, form[2], origin, line, column, None)
    unit = next((str(item[1]) for item in form if isinstance(item, Form) and item.head == "unit" and len(item) > 1), None)
    scale = scales.get(unit.lower(), 1.0) if unit else 1.0
    value = property_value(form, scale)
    for item in form[2:]:
        if isinstance(item, Form) and item.head == "minomax":
            ends = _least_nominal_most(item, scale)[::2]
            if isinstance(value, float) and any(end is not None for end in ends):
                notes.add("spread", form.offset, f"{name} is {value}, from {_listed(ends)}")
    return Property(name, "" if value is None else value, origin, line, column, unit)


def read_scales(technology: Form) -> dict[str, float]:
    """Return the scales of a library's ``technology``: ``(scale 1 (e 1 -9) (unit CAPACITANCE))`` is nanofarads.

    From memory of the standard; met in no real board file.
    """
    scales: dict[str, float] = {}
    for definition in technology:
        for item in definition if isinstance(definition, Form) and definition.head == "numberdefinition" else ():
            if not isinstance(item, Form) or item.head != "scale" or len(item) < 4:
                continue
            written, meant, unit = number(item[1]), number(item[2]), item[3]
            if (
                isinstance(written, float)
                and isinstance(meant, float)
                and written
                and isinstance(unit, Form)
                and len(unit) > 1
            ):
                scales[str(unit[1]).lower()] = meant / written
    return scales


def _scaled(value: float | str | None, scale: float) -> float | str | None:
    if not isinstance(value, float):
        return value
    return value * scale if math.isfinite(value * scale) else f"{value} times {scale}"


def _nominal(form: Form, scale: float) -> float | str | None:
    values = _least_nominal_most(form, scale)
    if len(values) == 3 and (values[1] is not None or values == [None] * 3):
        return values[1]
    return _listed(values[::2] if len(values) == 3 else values)


def _least_nominal_most(form: Form, scale: float) -> list[float | str | None]:
    """Return what a ``miNoMax`` holds, None for what is left open; a single number is a nominal."""
    inner = form[1] if len(form) > 1 else None
    if not isinstance(inner, Form) or inner.head != "mnm":
        return [None, _scaled(number(inner), scale), None]
    return [_scaled(number(item), scale) for item in inner[1:]]


def _listed(values: Sequence[float | str | None]) -> str:
    return " to ".join("?" if value is None else str(value) for value in values)


def _point(form: Form) -> str | None:
    inner = form[1] if len(form) > 1 else None
    if not isinstance(inner, Form):
        return None
    return " ".join(str(number(item)) for item in inner[1:])
