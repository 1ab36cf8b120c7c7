"""The safe operating area: how much current a pass device bears at a voltage, for a time, at a case temperature.

Published curves hold at a case of 25 degC. Between their corners current and voltage follow a straight line on logarithmic
scales. Above 25 degC the thermal bound (constant power) shrinks with (T_J,max - T_C) / (T_J,max - 25 degC); the bound of
second breakdown shrinks more slowly (makers' derating figures for power transistors). Below the first corner's voltage the
curve's greatest power and the current ratings bound it, beyond the last corner nothing is known but that it is less still.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

from protlint.findings import WorkingLine
from protlint.partdata.book import SafeArea
from protlint.quantities import format_quantity

BY_POWER = "power"
"""The thermal bound of a safe area."""

SAFE_AREA_DEGC = 25.0
"""Case temperature that safe areas are drawn for."""

SOURCE = "data sheets' derating: thermal bound times (T_J,max - T_C) / (T_J,max - 25 degC); of second breakdown from memory"

Corners = Sequence[tuple[float, float]]


@dataclass(frozen=True, slots=True)
class Bound:
    """What may flow at a voltage and what bounds it; where the curve ends before that voltage it is no more than this.

    ``cold_A`` is what may flow with the case at 25 degC, ``how`` where that comes from, ``left`` the share left of it.
    """

    current_A: float
    by: str
    cold_A: float = math.nan
    how: str = ""
    left: float = 1.0


def curve_for(curves: Sequence[SafeArea], lasts_s: float, dc_from_s: float) -> SafeArea | None:
    """Return the curve that holds for a time: the shortest that lasts as long, or None.

    One that lasts ``dc_from_s`` or longer holds for ever.
    """
    lasting = [(curve.lasts_s, place) for place, curve in enumerate(curves) if curve.lasts_s >= min(lasts_s, dc_from_s)]
    return curves[min(lasting)[1]] if lasting else None


def is_much_longer(curve: SafeArea, lasts_s: float, dc_from_s: float, times: float) -> bool:
    """Tell whether a curve is for so much longer, by more than ``times``, that what it forbids may be borne all the same."""
    return min(curve.lasts_s, dc_from_s) > times * lasts_s


def on_curve_A(corners: Corners, voltage_V: float) -> float | None:
    """Return the current of a curve at a voltage, straight between corners on log-log scales; None outside them."""
    if voltage_V == corners[0][0]:
        return corners[0][1]
    for (low_V, low_A), (high_V, high_A) in pairwise(corners):
        if low_V <= voltage_V <= high_V:
            part = math.log(voltage_V / low_V) / math.log(high_V / low_V)
            return low_A * math.exp(part * math.log(high_A / low_A))
    return None


def allowed(
    corners: Corners, voltage_V: float, *, thermal_left: float, breakdown_left: float, power_share: float = 1.0
) -> Bound:
    """Return what a curve allows at a voltage and a case temperature.

    ``thermal_left`` and ``breakdown_left`` are the shares of the thermal bound and of the curve itself that are left at that
    temperature; ``power_share`` derates the thermal bound once more.
    """
    greatest_W = max(volts * amperes for volts, amperes in corners)
    left = thermal_left * power_share
    cold_A = greatest_W / voltage_V if voltage_V > 0.0 else math.inf
    by_power = Bound(
        cold_A * left,
        BY_POWER,
        cold_A=cold_A,
        how=f"the curve's greatest power, {format_quantity(greatest_W, 'W')}, over the voltage",
        left=left,
    )
    at_A = on_curve_A(corners, voltage_V)
    if at_A is None:
        if voltage_V <= corners[0][0]:
            return by_power
        last_A = corners[-1][1]
        ends = Bound(
            last_A * breakdown_left,
            "what is left at the curve's last corner",
            cold_A=last_A,
            how=f"the curve's last corner, {format_quantity(corners[-1][0], 'V')}",
            left=breakdown_left,
        )
        return replace(ends, current_A=min(by_power.current_A, ends.current_A))
    by_breakdown = Bound(
        at_A * breakdown_left,
        "second breakdown",
        cold_A=at_A,
        how="on the curve, straight between corners on log-log scales",
        left=breakdown_left,
    )
    return by_power if by_power.current_A <= by_breakdown.current_A else by_breakdown


def thermal_share(case_degC: float, tj_max_degC: float) -> float:
    """Return the share of the thermal bound that is left at a case temperature."""
    return min(1.0, max(0.0, (tj_max_degC - case_degC) / (tj_max_degC - 25.0)))


def breakdown_share(case_degC: float, tj_max_degC: float, left_at_limit: float) -> float:
    """Return the share of the second-breakdown bound left at a case temperature: in a straight line to ``left_at_limit``."""
    return 1.0 - (1.0 - left_at_limit) * (1.0 - thermal_share(case_degC, tj_max_degC))


def allowed_lines(
    bound: Bound,
    curve: SafeArea,
    *,
    case_degC: float,
    tj_max_degC: float,
    left_at_limit: float,
    derated: tuple[float, float],
    standard: str,
) -> Iterator[WorkingLine]:
    """Yield how what a curve allows comes about: what it allows with the case at 25 degC, and what is left of that.

    ``left_at_limit`` is what :func:`breakdown_share` was given, ``derated`` the shares of power and current that a derating
    ``standard`` leaves.
    """
    lasts = "dc" if math.isinf(curve.lasts_s) else format_quantity(curve.lasts_s, "s")
    yield WorkingLine(
        "allowed with the case at 25 degC", f"safe area, {lasts}: {bound.how}", bound.cold_A, "A", curve.source
    )
    thermal = f"({tj_max_degC:g} - {case_degC:.4g}) / ({tj_max_degC:g} - 25)"
    share = derated[0 if bound.by == BY_POWER else 1]
    how = thermal
    if not math.isclose(bound.left, share * thermal_share(case_degC, tj_max_degC), rel_tol=1e-9, abs_tol=1e-12):
        how = f"1 - (1 - {left_at_limit:g}) * (1 - {thermal})"
    elif case_degC <= SAFE_AREA_DEGC:
        how = f"all: no warmer than {SAFE_AREA_DEGC:g} degC"
    times = "" if share == 1.0 else f", times {share:g} ({standard})"
    yield WorkingLine("left of it at that case", f"{how}{times}", bound.left, "", SOURCE)
    yield WorkingLine("allowed", "the product of the two", bound.current_A, "A")
