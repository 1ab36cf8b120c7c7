"""How figures read: three significant digits, engineering prefixes, a dash for what is not known.

Units are written in plain letters (ohm, degC, uA), the spelling that limits files and part data use.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

PREFIXES = {-12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}
PREFIXED = frozenset({"A", "V", "W", "ohm", "F", "H", "Hz", "s", "J", "C"})
"""Units that take a prefix; any other stands behind the plain number."""

UNKNOWN = "-"

MOST_DECIMALS = 4


def figure(value: float | None, unit: str = "") -> str:
    """Return a value as people write it: ``figure(0.3671, "A")`` is ``367 mA``."""
    if value is None or not math.isfinite(value):
        return UNKNOWN
    if unit not in PREFIXED:
        return f"{plain(value)} {unit}".rstrip()
    if value == 0.0:
        return f"0 {unit}"
    exponent = _engineering_exponent(value)
    digits = three_digits(value / 10.0**exponent)
    return f"{digits} {PREFIXES[exponent]}{unit}"


def unit_for(values: Iterable[float | None], unit: str) -> tuple[str, float]:
    """Return the prefixed unit that shows values up to the greatest with no more than four digits, and its size."""
    greatest = max((abs(value) for value in values if value is not None), default=0.0)
    exponent = _engineering_exponent(greatest)
    if greatest < 9.995 * 10.0**exponent:
        exponent = max(exponent - 3, min(PREFIXES))
    return PREFIXES[exponent] + unit, 10.0**exponent


def triple(ends: Sequence[float] | None, usual: float | None) -> str:
    """Return low, usual and high with the high end's decimals: ``349 / 367 / 385``; without ends just the usual value."""
    if usual is None:
        return UNKNOWN
    if ends is None:
        return three_digits(usual)
    decimals = min(_decimals(max(abs(ends[0]), abs(ends[1]))), 2)
    return " / ".join(f"{value:.{decimals}f}" for value in (ends[0], usual, ends[1]))


def plain(value: float) -> str:
    """Return a number of three significant digits without a prefix, in plain notation from 0.001 to below a million."""
    rounded = float(f"{value:.3g}")
    if rounded != 0.0 and not 1e-3 <= abs(rounded) < 1e6:
        return f"{value:.3g}"
    return f"{rounded:.6f}".rstrip("0").rstrip(".")


def three_digits(value: float) -> str:
    """Return a number with three significant digits, noughts kept: ``1.20``."""
    return "0" if value == 0.0 else f"{value:.{_decimals(value)}f}"


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


def _engineering_exponent(value: float) -> int:
    if value == 0.0:
        return 0
    rounded = float(f"{abs(value):.3g}")
    exponent = 3 * math.floor(math.log10(rounded) / 3.0)
    return min(max(exponent, min(PREFIXES)), max(PREFIXES))


def _decimals(value: float) -> int:
    rounded = float(f"{value:.3g}")
    return 2 if rounded == 0.0 else min(max(0, 2 - math.floor(math.log10(abs(rounded)))), MOST_DECIMALS)
