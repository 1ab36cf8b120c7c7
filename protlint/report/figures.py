"""How figures read in a report: as ``format_quantity`` writes them, a dash for what is not known, columns in one unit."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from protlint.quantities.units import format_quantity

PREFIXES = {-12: "p", -9: "n", -6: "u", -3: "m", 0: ""}

UNKNOWN = "-"

MOST_DECIMALS = 3

LEAST, LEAST_RATIO = 1e-18, 1e-4
"""Of quantities that take prefixes (a thousandth of the least one) and of those that take none: less prints as 0."""

PLAIN = ("", "%", "deg", "degC", "K")


def figure(value: float | None, unit: str = "") -> str:
    """Return a value with its unit as people write it, ``367 mA``, or a dash; what is next to nothing is 0."""
    if value is None or not math.isfinite(value):
        return UNKNOWN
    return format_quantity(0.0 if abs(value) < (LEAST_RATIO if unit in PLAIN else LEAST) else value, unit)


def current(value: float, beside: float | None, share: float = 1e-6) -> str:
    """Return a current, or that it is nothing to speak of beside another: below a share of it."""
    return "next to nothing" if beside and abs(value) < share * abs(beside) else figure(value, "A")


def unit_for(values: Iterable[float | None], unit: str) -> tuple[str, float]:
    """Return the prefixed unit for a column of values, and its size: the plain unit from a tenth upward."""
    greatest = max((abs(value) for value in values if value is not None), default=0.0)
    exponent = max(3 * math.floor(math.log10(greatest) / 3.0), min(PREFIXES)) if 0.0 < greatest < 0.0995 else 0
    return PREFIXES[exponent] + unit, 10.0**exponent


def triple(ends: Sequence[float] | None, usual: float | None) -> str:
    """Return low, usual and high with the high end's decimals: ``349 / 367 / 385``; without ends just the usual value."""
    if usual is None:
        return UNKNOWN
    if ends is None:
        return three_digits(usual)
    decimals = _decimals(max(abs(ends[0]), abs(ends[1])))
    return " / ".join(f"{value:.{decimals}f}" for value in (ends[0], usual, ends[1]))


def three_digits(value: float) -> str:
    """Return a number with three significant digits, noughts kept: ``1.20``."""
    return "0" if value == 0.0 else f"{value:.{_decimals(value)}f}"


def aligned(value: float | None, unit: str = "A") -> str:
    """Return a value with its unit and noughts kept, so that a column of them stands in line, or a dash."""
    if value is None:
        return UNKNOWN
    prefixed, scale = unit_for([value], unit)
    return f"{three_digits(value / scale)} {prefixed}"


def percent(ratio: float) -> str:
    """Return a ratio as a percentage, whole from ten per cent up."""
    figure_percent = ratio * 100.0
    return f"{figure_percent:.0f} %" if abs(figure_percent) >= 10.0 else f"{figure_percent:.1f} %"


def ambient(degC: float) -> str:
    """Return a temperature as the user wrote it: ``27 degC``."""
    return f"{degC:g} degC"


def counted(count: int, word: str) -> str:
    """Return ``1 error`` or ``3 errors``."""
    return f"{count} {word}" if count == 1 else f"{count} {word}s"


def _decimals(value: float) -> int:
    rounded = float(f"{value:.3g}")
    return 2 if rounded == 0.0 else min(max(0, 2 - math.floor(math.log10(abs(rounded)))), MOST_DECIMALS)
