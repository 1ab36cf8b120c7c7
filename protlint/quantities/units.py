"""Quantities as people write them (``24 V``, ``2.5 K/W``, ``-10 degC``), and as reports print them.

A number, an SI prefix and one of the units below is read here; any other unit is handed to pint, which is loaded only then.
Only the unit goes to pint, never an expression and never a value text of a schematic.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Decimal
from functools import cache
from typing import Any


@dataclass(frozen=True, slots=True)
class Dimension:
    """A kind of quantity: what to call it, an example, its unit for pint, and the units read here with their scale.

    ``units`` maps a spelling to its size in the SI unit; those in ``prefixed`` take an SI prefix in front.
    """

    called: str
    example: str
    pint_unit: str
    units: dict[str, float]
    prefixed: tuple[str, ...] = ()


def _plain(called: str, example: str, pint_unit: str, *symbols: str) -> Dimension:
    return Dimension(called, example, pint_unit, dict.fromkeys(symbols, 1.0), symbols)


DIMENSIONS: dict[str, Dimension] = {
    "voltage": _plain("a voltage", "24 V", "volt", "V"),
    "current": _plain("a current", "20 mA", "ampere", "A"),
    "resistance": _plain("a resistance", "8 ohm", "ohm", "ohm", "Ω"),
    "power": _plain("a power", "0.5 W", "watt", "W"),
    "time": _plain("a time", "20 ms", "second", "s"),
    "capacitance": _plain("a capacitance", "100 nF", "farad", "F"),
    "inductance": _plain("an inductance", "10 uH", "henry", "H"),
    "frequency": _plain("a frequency", "3 MHz", "hertz", "Hz"),
    "conductance": _plain("a conductance", "5 S", "siemens", "S"),
    "charge": _plain("a charge", "70 nC", "coulomb", "C"),
    "temperature": Dimension("a temperature", "85 degC", "degC", {"degC": 1.0, "°C": 1.0}),
    "temperature rise": Dimension("a temperature difference", "20 K", "delta_degC", {"K": 1.0}),
    "thermal resistance": Dimension(
        "a thermal resistance", "2.5 K/W", "kelvin/watt", {"K/W": 1.0, "degC/W": 1.0, "°C/W": 1.0}
    ),
    "thermal conductance": _plain("a power per kelvin", "5 mW/K", "watt/kelvin", "W/K", "W/degC", "W/°C"),
    "voltage per kelvin": _plain("a voltage per kelvin", "-2 mV/K", "volt/kelvin", "V/K", "V/degC", "V/°C"),
    "per kelvin": Dimension(
        "a change per kelvin", "100 ppm/K", "1/kelvin",
        {"ppm/K": 1e-6, "ppm/degC": 1e-6, "ppm/°C": 1e-6, "%/K": 1e-2},
    ),
    "fraction": Dimension("a percentage", "1 %", "dimensionless", {"%": 1e-2, "ppm": 1e-6}),
}  # fmt: skip
"""Every kind of quantity a user's file can hold."""

_PREFIXES = {
    "f": -15, "p": -12, "n": -9, "u": -6, "µ": -6, "μ": -6, "m": -3, "": 0, "k": 3, "M": 6, "G": 9, "T": 12,
}  # fmt: skip
_PRINTED = {-15: "f", -12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}
_WITHOUT_PREFIX = ("", "%", "degC", "K", "K/W", "1/K", "dB", "deg")
_PLAIN_FROM_A_TENTH = ("A", "V", "W")
_NUMBER = r"[+\-−]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?"
_QUANTITY = re.compile(rf"\s*({_NUMBER})\s*([^\s0-9.,+\-].*?)?\s*")
_SPREAD = re.compile(rf"(.*\S)\s+(?:±|\+/?-)?\s*({_NUMBER})\s*%\s*")
_UNIT_FOR_PINT = re.compile(r"[A-Za-zµμΩ°%/*^()·_ 0-9.-]{1,40}")
_FOREVER = ("continuous", "dc")


def read_quantity(text: str, dimension: str) -> float:
    """Return a quantity that a person wrote with its unit, as an SI float (a temperature in degC).

    For a time, ``continuous`` and ``dc`` are infinite.

    Raises
    ------
    ValueError : there is no number, no unit, or a unit of another dimension; the message says what was expected.
    KeyError : no such dimension in :data:`DIMENSIONS`.
    """
    wanted = DIMENSIONS[dimension]
    text = text.replace("\u2126", "Ω")
    if dimension == "time" and text.strip().casefold() in _FOREVER:
        return math.inf
    found = _QUANTITY.fullmatch(text)
    if not found:
        hint = " (with a decimal point)" if re.search(r"[0-9],[0-9]", text) else ""
        raise ValueError(f'expected {wanted.called} such as "{wanted.example}"{hint}, not "{text}"')
    number, unit = found[1].replace("−", "-"), found[2]
    if unit is None:
        raise ValueError(f'expected {wanted.called} with its unit, such as "{wanted.example}", not "{text}"')
    value = _by_symbol(number, unit, wanted)
    if value is None:
        value = _by_pint(float(number), unit, dimension)
    if not math.isfinite(value):
        raise ValueError(f'expected {wanted.called} such as "{wanted.example}", not the endless "{text}"')
    return value


def read_range(text: str, dimension: str) -> tuple[float, float, float]:
    """Return (low, usual, high) of a quantity with an optional spread: ``24 V``, ``24 V 10 %``, ``24 V +-10 %``.

    Raises
    ------
    ValueError : as :func:`read_quantity`; or the spread is negative.
    """
    spread = _SPREAD.fullmatch(text)
    if spread is None:
        value = read_quantity(text, dimension)
        return value, value, value
    usual = read_quantity(spread[1], dimension)
    part = float(spread[2].replace("−", "-")) / 100.0
    if not 0.0 <= part < math.inf:
        raise ValueError(f'expected a spread such as "10 %", not "{spread[2]} %"')
    return usual - abs(usual) * part, usual, usual + abs(usual) * part


def read_any(text: str) -> float:
    """Return a quantity of whatever dimension its unit has, as an SI float; for thresholds, whose unit their check knows.

    Raises
    ------
    ValueError : the text is no number with a unit of :data:`DIMENSIONS`.
    """
    found = _QUANTITY.fullmatch(text.replace("\u2126", "Ω"))
    if found and found[2]:
        for wanted in DIMENSIONS.values():
            value = _by_symbol(found[1].replace("−", "-"), found[2], wanted)
            if value is not None and math.isfinite(value):
                return value
    raise ValueError(f'expected a quantity with its unit, such as "80 %" or "0.3 V", not "{text}"')


def format_ratio(value: float) -> str:
    """Return a ratio that is near 1 or 0, such as a damping, for people: two digits, no more than three decimals."""
    return f"{round(float(f'{value:.2g}'), 3) + 0.0:g}"


def format_quantity(value: float, unit: str, digits: int = 3) -> str:
    """Return a quantity for people: ``digits`` significant figures and an SI prefix in steps of a thousand.

    Amperes, volts and watts stay without a prefix from a tenth upward (``0.565 W``); temperatures, ratios and compound units
    with kelvin never take one; with the unit ``%`` a fraction of 1 prints as ``100 %``. An infinite time is ``continuous``.
    """
    if math.isnan(value):
        return "not known"
    if math.isinf(value):
        return "continuous" if unit == "s" and value > 0 else f"{'-' if value < 0 else ''}infinite {unit}".rstrip()
    number = Decimal(f"{100.0 * value if unit == '%' else value:.{max(digits, 1) - 1}e}")
    power = 0
    if unit not in _WITHOUT_PREFIX and number:
        power = min(max(3 * (number.adjusted() // 3), -15), 12)
        if unit in _PLAIN_FROM_A_TENTH and number.adjusted() == -1:
            power = 0
    shown = format(number.scaleb(-power), "f")
    if "." in shown:
        shown = shown.rstrip("0").rstrip(".")
    if shown in ("-0", "0"):
        shown = "0"
    return f"{shown} {_PRINTED[power]}{unit}".rstrip()


def format_pair(one: float, other: float, unit: str) -> tuple[str, str]:
    """Return two quantities that are held against each other, with as many figures as tell them apart: three to six."""
    for digits in (3, 4, 5, 6):
        pair = format_quantity(one, unit, digits), format_quantity(other, unit, digits)
        if pair[0] != pair[1] or one == other:
            break
    return pair


def _by_symbol(number: str, unit: str, wanted: Dimension) -> float | None:
    if unit in wanted.units:
        return float(number) * wanted.units[unit]
    for symbol in wanted.prefixed:
        prefix = unit.removesuffix(symbol)
        if prefix != unit and prefix in _PREFIXES:
            return float(Decimal(number).scaleb(_PREFIXES[prefix]))
    return None


@cache
def _registry() -> Any:
    import pint

    return pint.UnitRegistry(cache_folder=None)


def _by_pint(number: float, unit: str, dimension: str) -> float:
    wanted = DIMENSIONS[dimension]
    expected = f'expected {wanted.called} such as "{wanted.example}"'
    for name, other in DIMENSIONS.items():
        if (
            name != dimension
            and _by_symbol("1", unit, other) is not None
            and not (unit == "K" and dimension == "temperature")
        ):
            raise ValueError(f'{expected}; "{unit}" is the unit of {other.called}')
    registry = _registry()
    try:
        if not _UNIT_FOR_PINT.fullmatch(unit):
            raise ValueError("not the letters of a unit")
        given = registry.parse_units(unit.replace("·", "*").replace("°", "deg"))
    except Exception:  # pint raises errors of many families for what it cannot parse
        raise ValueError(f'{expected}; the unit "{unit}" is not known') from None
    try:
        return float(registry.Quantity(number, given).to(wanted.pint_unit).magnitude)
    except Exception:
        raise ValueError(f'{expected}; "{unit}" does not measure {wanted.called}') from None
