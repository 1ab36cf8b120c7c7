"""Does the pass device stay inside its safe operating area, all along the locus."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from protlint.board.graph import BoardPart
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.derating import derated, share_of
from protlint.checks.pass_device import Stress, heating
from protlint.checks.safe_area import Bound, allowed, breakdown_share, curve_for, thermal_share
from protlint.findings import NotChecked, WorkingLine
from protlint.partdata.book import Figure
from protlint.quantities import format_quantity, preferred
from protlint.solve.solution import Point

CHECK = "pass-outside-safe-area"

WALLS = {"bipolar": ("vceo", "ic", "ic_peak"), "mosfet": ("vds", "id", "id_peak")}
"""The ratings for voltage, current for ever, and current for a short time."""

SOURCE = "log-log straight lines between the published corners; thermal bound times (T_J,max - T_C) / (T_J,max - 25 degC)"


@dataclass(frozen=True, slots=True)
class Place:
    """One point of the locus as a pass device sees it, with the bound that it comes nearest to or passes.

    ``careful_only`` tells that it is outside only with the thermal derating taken for second breakdown as well.
    """

    stress: Stress
    voltage_V: float
    current_A: float
    case_degC: float
    ratio: float
    bound: Bound
    source: str
    careful_only: bool = False


def pass_outside_safe_area(case: Case) -> Iterator[Answer]:
    """Yield a finding for each pass device that leaves its safe operating area, at its worst point."""
    points = list(locus_points(case))
    for part_id, _ in case.device_parts("pass"):
        part = case.part(part_id)
        family = "mosfet" if part.kind in ("nmos", "pmos") else "bipolar"
        voltage, current, peak = WALLS[family]
        places: list[Place] = []
        for name, quantity in ((voltage, "voltage"), (_current_name(case, part_id, current, peak), "current")):
            may = case.allowed(part_id, name, quantity)
            if may is None:
                yield NotChecked(CHECK, case.rating_key(part_id, name))
            else:
                places.append(_at_the_wall(case, part, may, quantity, points))
        found = _on_the_curve(case, part, points)
        if isinstance(found, str):
            yield NotChecked(CHECK, found)
        else:
            places.append(found)
        worst = max(places, key=lambda place: (place.ratio > 1.0, not place.careful_only, place.ratio), default=None)
        if worst is not None and worst.ratio > 1.0:
            yield _outside(case, part, worst)
        elif not isinstance(found, str) and found.bound.at_most:
            yield NotChecked(CHECK, f"{case.data_key(part_id, 'safe_area')} up to {format_quantity(found.voltage_V, 'V')}")


def locus_points(case: Case) -> Iterator[Stress]:
    """Yield every point of the locus at every ambient, every tolerance set for the most current."""
    for row, points in case.at_ambients(case.solution.high_locus):
        for place, point in enumerate(points):
            at = f"with the output at {format_quantity(point.output_V, 'V')}" if place else "in the held short"
            yield Stress(at, row.ambient_degC, point, case.lasts_s)


def _current_name(case: Case, part_id: str, name: str, peak: str) -> str:
    """Return which current rating holds for the short: the peak's where the short is short enough for it."""
    short_s = case.needs.short_s
    brief = short_s is not None and short_s <= case.threshold(CHECK, "peak_lasts")
    return peak if brief and case.rating(part_id, peak) is not None else name


def _seen(case: Case, part: BoardPart, point: Point) -> tuple[float, float]:
    """Return the voltage across a pass device and the current through it, both devices of a Darlington part together."""
    states = [point.states[name] for name in case.devices_of(part.id) if name in point.states]
    return max(abs(state.voltage_V) for state in states), sum(abs(state.current_A) for state in states)


def _at_the_wall(case: Case, part: BoardPart, may: Figure, quantity: str, points: list[Stress]) -> Place:
    """Return the point that comes nearest to a voltage or current rating."""
    bound = Bound(may.value if quantity == "current" else 0.0, f"its {quantity} rating")
    places = []
    for stress in points:
        voltage_V, current_A = _seen(case, part, stress.point)
        ratio = (voltage_V if quantity == "voltage" else current_A) / may.value
        places.append(Place(stress, voltage_V, current_A, stress.ambient_degC, ratio, bound, may.source))
    return max(places, key=lambda place: place.ratio)


def _on_the_curve(case: Case, part: BoardPart, points: list[Stress]) -> Place | str:
    """Return the point that comes nearest to the published curve, or the key of what is missing."""
    entry = part.entry
    limit = case.rating(part.id, "tj_max")
    if limit is None:
        return case.rating_key(part.id, "tj_max")
    lasts_s = case.lasts_s
    curve = curve_for(entry.safe_area if entry is not None else (), lasts_s, case.threshold(CHECK, "dc_from"))
    if curve is None:
        kind = "dc" if math.isinf(lasts_s) else format_quantity(lasts_s, "s")
        return f"{case.data_key(part.id, 'safe_area')} that lasts {kind}"
    derating = case.limits.derating
    shares = share_of(derating, part.kind, "power"), share_of(derating, part.kind, "current")
    places: list[Place] = []
    for stress in points:
        voltage_V, current_A = _seen(case, part, stress.point)
        case_degC = _case_degC(case, part, stress)
        left = thermal_share(case_degC, limit.value)
        milder = breakdown_share(case_degC, limit.value, case.threshold(CHECK, "second_breakdown_left"))
        if part.kind in ("nmos", "pmos"):
            milder = left
        for breakdown_left, careful_only in ((milder, False), (left, True)):
            bound = allowed(
                curve.points,
                voltage_V,
                thermal_left=left,
                breakdown_left=breakdown_left * shares[1],
                power_share=shares[0],
            )
            ratio = current_A / bound.current_A if bound.current_A > 0.0 else math.inf
            source = derated(derating, part.kind, "current", curve.source)
            places.append(Place(stress, voltage_V, current_A, case_degC, ratio, bound, source, careful_only))
    surely = max((place for place in places if not place.careful_only), key=lambda place: place.ratio)
    carefully = max((place for place in places if place.careful_only), key=lambda place: place.ratio)
    return surely if surely.ratio > 1.0 or carefully.ratio <= 1.0 else carefully


def _case_degC(case: Case, part: BoardPart, stress: Stress) -> float:
    """Return the temperature of the case, where nothing tells better the ambient: a case is no cooler than that."""
    heat = heating(case, part.id, stress)
    to_case, to_air = case.rating(part.id, "rth_jc"), case.rating(part.id, "rth_ja")
    for_ever = stress.lasts_s > case.threshold("pass-overheated", "case_holds")
    if heat.sink_K_per_W is not None:
        return heat.ambient_degC + heat.sink_K_per_W * (heat.shared_W if for_ever else heat.before_shared_W)
    if to_air is not None and to_case is not None and to_air.value <= 5.0 * to_case.value:
        return heat.ambient_degC + (to_air.value - to_case.value) * (heat.own_W if for_ever else heat.before_W)
    return heat.ambient_degC


def _outside(case: Case, part: BoardPart, worst: Place) -> Answer:
    stress, ambient = worst.stress, format_quantity(worst.stress.ambient_degC, "degC")
    lasts = "for ever" if math.isinf(stress.lasts_s) else f"for {format_quantity(stress.lasts_s, 's')}"
    at = f"{format_quantity(worst.current_A, 'A')} at {format_quantity(worst.voltage_V, 'V')}"
    careful = ", if second breakdown derates like its power" if worst.careful_only else ""
    return case.finding(
        CHECK,
        f"{part.id} is put to {at} {stress.condition} {lasts} at {ambient}, {worst.ratio:.2g} times what {worst.bound.by} "
        f"allows{careful}",
        parts=(part.id,),
        working=(
            WorkingLine("voltage across it", f"solved, {stress.condition}", worst.voltage_V, "V"),
            WorkingLine("current", "solved, every tolerance set for the most", worst.current_A, "A"),
            WorkingLine("case", "ambient + sink * power", worst.case_degC, "degC"),
            WorkingLine("allowed", f"by {worst.bound.by}, at that case", worst.bound.current_A, "A", worst.source),
            WorkingLine("current over allowed", "log-log between corners, derated", worst.ratio, "", SOURCE),
        ),
        remedy=_remedy(case, part, worst),
        level="warning" if worst.careful_only else None,
        assumption=case.assumes(*ALL_ASSUMPTIONS) or worst.careful_only,
        subject=part.id,
    )


def _remedy(case: Case, part: BoardPart, worst: Place) -> str:
    for quantity, value, unit in (("voltage", worst.voltage_V, "V"), ("current", worst.current_A, "A")):
        if worst.bound.by == f"its {quantity} rating":
            needed = preferred(value / share_of(case.limits.derating, part.kind, quantity), "E24", "up")
            return f"fit a device rated {format_quantity(needed, unit)} or more as {part.id}"
    lasts = "dc" if math.isinf(worst.stress.lasts_s) else format_quantity(worst.stress.lasts_s, "s")
    at = f"{format_quantity(preferred(worst.current_A, 'E24', 'up'), 'A')} at {format_quantity(worst.voltage_V, 'V')}"
    return (
        f"fit a device as {part.id} whose safe area ({lasts}) allows {at} with its case at "
        f"{format_quantity(worst.case_degC, 'degC')}, or lower the limit to {1.0 / worst.ratio:.2g} of what it is"
    )
