"""The identities that thermal ratings have to satisfy, and the careful choice where they do not.

A thermal resistance is the reciprocal of the derating slope, and (T_J,max - T) / P at the temperature T for which P is
stated. Data sheets contradict themselves here; the greatest resistance and the least power are kept, and it is said.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from protlint.partdata.ratings import Figure

ROUNDING = 0.03
"""Figures closer than this, relatively, differ by the data sheet's rounding only."""

FREE_AIR_W = 5.0
"""No transistor package dissipates more than this in free air: a greater ``power`` holds at the case."""


@dataclass(frozen=True, slots=True)
class Contradiction:
    """Ratings of one part that cannot all be true: their names, and in plain words what they say and what was kept."""

    ratings: tuple[str, ...]
    says: str


def careful(stated: Mapping[str, Figure]) -> tuple[dict[str, Figure], tuple[Contradiction, ...]]:
    """Return the ratings of a semiconductor with its thermal figures made consistent, and the contradictions met.

    A missing thermal resistance is worked out where slope, or power and tj_max, give it; its source says so.
    """
    ratings = _power_at_its_place(dict(stated))
    contradictions = []
    for resistance, power, at, slope in (
        ("rth_jc", "power_case", "power_case_at", "slope_case"),
        ("rth_ja", "power", "power_at", "slope"),
    ):
        found = _settle(ratings, resistance, power, at, slope)
        if found is not None:
            contradictions.append(found)
    return ratings, tuple(contradictions)


def _power_at_its_place(ratings: dict[str, Figure]) -> dict[str, Figure]:
    """Take ``power`` for ``power_case`` where it cannot hold in free air; users write the headline figure of the sheet."""
    if "power" not in ratings or "power_case" in ratings:
        return ratings
    at_case = ratings["power"].value > FREE_AIR_W
    if not at_case and "rth_jc" in ratings and "rth_ja" not in ratings and "tj_max" in ratings:
        rise_K = ratings["tj_max"].value - _at(ratings, "power_at")
        at_case = abs(rise_K / ratings["power"].value / ratings["rth_jc"].value - 1.0) < 0.1
    if at_case:
        moved = {"power": "power_case", "power_at": "power_case_at", "slope": "slope_case"}
        ratings = {moved.get(name, name): figure for name, figure in ratings.items()}
    return ratings


def _settle(ratings: dict[str, Figure], resistance: str, power: str, at: str, slope: str) -> Contradiction | None:
    candidates: dict[str, Figure] = {}
    if resistance in ratings:
        candidates[f"{resistance} itself"] = ratings[resistance]
    if slope in ratings:
        candidates[f"1 / {slope}"] = Figure(1.0 / ratings[slope].value, f"1 / {slope}; {ratings[slope].source}")
    if power in ratings and "tj_max" in ratings:
        value = (ratings["tj_max"].value - _at(ratings, at)) / ratings[power].value
        candidates[f"(tj_max - {at}) / {power}"] = Figure(value, f"(tj_max - {at}) / {power}; {ratings[power].source}")
    if not candidates:
        return None
    values = [figure.value for figure in candidates.values()]
    greatest = max(candidates.values(), key=lambda figure: figure.value)
    if resistance not in ratings or ratings[resistance].value * (1.0 + ROUNDING) < greatest.value:
        ratings[resistance] = greatest
    if max(values) <= min(values) * (1.0 + ROUNDING):
        return None
    if power in ratings and "tj_max" in ratings:
        allowed_W = (ratings["tj_max"].value - _at(ratings, at)) / ratings[resistance].value
        if ratings[power].value > allowed_W * (1.0 + ROUNDING):
            ratings[power] = Figure(allowed_W, f"(tj_max - {at}) / {resistance}; {ratings[resistance].source}")
    told = ", ".join(f"{how} gives {figure.value:.3g} K/W" for how, figure in candidates.items())
    names = tuple(name for name in (resistance, slope, power) if name in ratings)
    return Contradiction(names, f"{told}; {ratings[resistance].value:.3g} K/W is kept")


def _at(ratings: Mapping[str, Figure], at: str) -> float:
    return ratings[at].value if at in ratings else 25.0
