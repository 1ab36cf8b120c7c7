"""Preferred values of resistors and capacitors: the series of IEC 60063."""

from __future__ import annotations

import math
from functools import cache
from typing import Literal

Direction = Literal["up", "down", "nearest"]

_E24 = (
    1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0,
    3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1,
)  # fmt: skip
"""The historic list; it leaves the rounded rule at 2.7 to 4.7 and at 8.2. E12, E6 and E3 are every second value in turn."""

SERIES = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")
"""Series names, coarse to fine."""

_SAME = 1e-9
"""Values closer than this, relatively, are one value: what a calculation leaves of 4.7 kohm is 4.7 kohm."""


@cache
def hundredths(series: str) -> tuple[int, ...]:
    """Return one decade of a series as integers from 100 to 999.

    Finer than E24 a value is ``round(10^(n/N), 2)`` with the one exception of IEC 60063: 9.20 in E192.

    Raises
    ------
    ValueError : no such series.
    """
    if series not in SERIES:
        raise ValueError(f"no such series of preferred values: {series}")
    count = int(series[1:])
    if count <= 24:
        return tuple(round(100 * value) for value in _E24[:: 24 // count])
    rounded = (round(100 * 10 ** (step / count)) for step in range(count))
    return tuple(920 if value == 919 and count == 192 else value for value in rounded)


def preferred(value: float, series: str = "E24", direction: Direction = "nearest") -> float:
    """Return the preferred value at or above, at or below, or nearest (in ratio) to a value.

    Raises
    ------
    ValueError : the value is not above zero, or there is no such series.
    """
    if not (value > 0.0 and math.isfinite(value)):
        raise ValueError("a preferred value stands beside a value above zero only")
    decade = math.floor(math.log10(value))
    candidates = [_exactly(step, power) for power in (decade - 1, decade, decade + 1) for step in hundredths(series)]
    above = min(candidate for candidate in candidates if candidate >= value * (1.0 - _SAME))
    below = max(candidate for candidate in candidates if candidate <= value * (1.0 + _SAME))
    if direction == "up":
        return above
    if direction == "down":
        return below
    return above if above / value < value / below else below


def within(low: float, high: float, series: str = "E24") -> tuple[float, ...]:
    """Return every preferred value from ``low`` to ``high``, both included, in rising order; empty where there is none.

    Raises
    ------
    ValueError : the ends are not above zero or not finite, or there is no such series.
    """
    if not (low > 0.0 and high > 0.0 and math.isfinite(low) and math.isfinite(high)):
        raise ValueError("preferred values lie between ends above zero only")
    decades = range(math.floor(math.log10(low)) - 1, math.floor(math.log10(high)) + 2)
    values = (_exactly(step, power) for power in decades for step in hundredths(series))
    return tuple(value for value in values if low * (1.0 - _SAME) <= value <= high * (1.0 + _SAME))


def _exactly(step: int, power: int) -> float:
    # From decimal text, so that 470 times ten to the 1 is the same float as 4.7e3 read from a schematic.
    return float(f"{step}e{power - 2}")
