"""Does the pass device stay inside its safe operating area, all along the locus."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

from protlint.board.graph import BoardPart
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.derating import derated
from protlint.checks.ends import at_carry, held_shorts
from protlint.checks.pass_device import LEAST_SINK_K_PER_W, Stress, on_the_sink_names
from protlint.checks.safe_area import (
    Bound,
    allowed,
    allowed_lines,
    breakdown_share,
    curve_for,
    is_much_longer,
    thermal_share,
)
from protlint.checks.thermal import made_for_a_sink
from protlint.findings import NotChecked, WorkingLine
from protlint.partdata.book import Figure, SafeArea
from protlint.quantities import format_quantity, preferred

CHECK = "pass-outside-safe-area"

WALLS = {"bipolar": ("vceo", "ic", "ic_peak"), "mosfet": ("vds", "id", "id_peak")}
"""The ratings for voltage, current for ever, and current for a short time."""

VOLTAGE = "its voltage rating"

HALVINGS = 30


@dataclass(frozen=True, slots=True)
class Seen:
    """One point of the locus as a pass device sees it: both devices of a Darlington part together."""

    stress: Stress
    voltage_V: float
    current_A: float


@dataclass(frozen=True, slots=True)
class Place:
    """A point of the locus with the bound that it comes nearest to or passes, and the case's temperature there.

    ``careful_only`` tells that it is outside only with the thermal derating taken for second breakdown as well.
    """

    seen: Seen
    case_degC: float
    ratio: float
    bound: Bound
    source: str
    careful_only: bool = False


def pass_outside_safe_area(case: Case) -> Iterator[Answer]:
    """Yield a finding for each pass device that leaves its safe operating area, at its worst point."""
    for part_id, _ in case.device_parts("pass"):
        part = case.part(part_id)
        points = list(_along_the_locus(case, part))
        if not points:
            yield NotChecked(CHECK, "the locus at every ambient, which could not be solved")
            continue
        places: list[Place] = []
        for quantity, name in _walls(case, part):
            may = case.allowed(part_id, name, quantity)
            if may is None:
                yield NotChecked(CHECK, case.rating_key(part_id, name))
            else:
                places.append(_at_the_wall(may, quantity, points))
        curve = _curve(case, part)
        if isinstance(curve, str):
            yield NotChecked(CHECK, curve)
        else:
            place = _on_the_curve(case, part, curve, points)
            dc_from_s, times = (case.threshold(CHECK, name) for name in ("dc_from", "curve_lasts"))
            if place.ratio > 1.0 and is_much_longer(curve, case.lasts_s, dc_from_s, times):
                yield NotChecked(CHECK, _wanted(case, part))
            else:
                places.append(place)
        worst = max(places, key=lambda place: (place.ratio > 1.0, not place.careful_only, place.ratio), default=None)
        greatest_V = max(seen.voltage_V for seen in points)
        if worst is not None and worst.ratio > 1.0:
            yield _outside(case, part, worst)
        elif not isinstance(curve, str) and greatest_V > curve.points[-1][0]:
            yield NotChecked(CHECK, f"{case.data_key(part_id, 'safe_area')} up to {format_quantity(greatest_V, 'V')}")


def _along_the_locus(case: Case, part: BoardPart) -> Iterator[Seen]:
    """Yield every point of the locus at every ambient, every tolerance set for the most current, and at every end of the
    stated ranges."""
    names = case.devices_of(part.id)
    for held in held_shorts(case):
        for place, point in enumerate(held.locus):
            at = f"with the output at {format_quantity(point.output_V, 'V')}" if place else "in the held short"
            states = [point.states[name] for name in names]
            yield Seen(
                Stress(at, held.row.ambient_degC, point, case.lasts_s, held.words),
                max(abs(state.voltage_V) for state in states),
                sum(abs(state.current_A) for state in states),
            )


def _walls(case: Case, part: BoardPart) -> Iterator[tuple[str, str]]:
    """Yield (quantity, rating) for voltage and current; a short that is brief enough is judged by the peak current."""
    voltage, current, peak = WALLS["mosfet" if part.kind in ("nmos", "pmos") else "bipolar"]
    brief = case.lasts_s <= case.threshold(CHECK, "peak_lasts")
    yield "voltage", voltage
    yield "current", peak if brief and case.rating(part.id, peak) is not None else current


def _at_the_wall(may: Figure, quantity: str, points: list[Seen]) -> Place:
    """Return the point that comes nearest to a voltage or current rating."""
    bound = Bound(may.value if quantity == "current" else 0.0, f"its {quantity} rating")
    worst = max(points, key=lambda seen: seen.voltage_V if quantity == "voltage" else seen.current_A)
    ratio = (worst.voltage_V if quantity == "voltage" else worst.current_A) / may.value
    return Place(worst, worst.stress.ambient_degC, ratio, bound, may.source)


def _curve(case: Case, part: BoardPart) -> SafeArea | str:
    """Return the curve that holds for the short, or the key of what is missing."""
    if case.rating(part.id, "tj_max") is None:
        return case.rating_key(part.id, "tj_max")
    curves = part.entry.safe_area if part.entry is not None else ()
    curve = curve_for(curves, case.lasts_s, case.threshold(CHECK, "dc_from"))
    return _wanted(case, part) if curve is None else curve


def _wanted(case: Case, part: BoardPart) -> str:
    """Return the key of a curve for as long as the short lasts."""
    lasts = "dc" if math.isinf(case.lasts_s) else format_quantity(case.lasts_s, "s")
    return f"{case.data_key(part.id, 'safe_area')} that lasts {lasts}"


def _on_the_curve(case: Case, part: BoardPart, curve: SafeArea, points: list[Seen]) -> Place:
    """Return the point that comes nearest to the published curve, or passes it most surely."""
    source = derated(case.limits.derating, part.kind, "current", curve.source)
    found: dict[bool, Place] = {}
    case_at = _case_at(case, part)
    for seen in points:
        case_degC = case_at(seen)
        for careful in (False, True):
            bound = _bound(case, part, curve, seen.voltage_V, case_degC, careful=careful)
            ratio = seen.current_A / bound.current_A if bound.current_A > 0.0 else math.inf
            if careful not in found or ratio > found[careful].ratio:
                found[careful] = Place(seen, case_degC, ratio, bound, source, careful)
    return found[False] if found[False].ratio > 1.0 or found[True].ratio <= 1.0 else found[True]


def _bound(
    case: Case, part: BoardPart, curve: SafeArea, voltage_V: float, case_degC: float, *, careful: bool = False
) -> Bound:
    """Return what a curve allows at a case temperature; ``careful`` derates second breakdown like the power."""
    limit = case.rating(part.id, "tj_max")
    assert limit is not None
    left = thermal_share(case_degC, limit.value)
    if not careful and part.kind not in ("nmos", "pmos"):
        breakdown_left = breakdown_share(case_degC, limit.value, case.threshold(CHECK, "second_breakdown_left"))
    else:
        breakdown_left = left
    return allowed(
        curve.points,
        voltage_V,
        thermal_left=left,
        breakdown_left=breakdown_left * case.share(part.id, "current"),
        power_share=case.share(part.id, "power"),
    )


def _case_at(case: Case, part: BoardPart) -> Callable[[Seen], float]:
    """Return the function that gives the case's temperature at a point of the locus: by what heats it there, or, in a brief
    short, before it, at the end of the stated ranges that heats it most.

    Where nothing tells better it is the ambient: a case is no cooler than that.
    """
    to_case, to_air = case.rating(part.id, "rth_jc"), case.rating(part.id, "rth_ja")
    before = [point for point, _ in at_carry(case)]
    for_ever = case.lasts_s > case.threshold("pass-overheated", "case_holds")
    own, shared, per_W = case.devices_of(part.id), on_the_sink_names(case), case.needs.sink_K_per_W
    heats = shared if per_W is not None else own
    if per_W is None:
        in_air = to_air is not None and to_case is not None and not made_for_a_sink(to_case, to_air)
        per_W = to_air.value - to_case.value if in_air and to_air is not None and to_case is not None else 0.0
    assert per_W is not None

    def at(seen: Seen) -> float:
        points = [seen.stress.point] if for_ever else before
        watts = max((sum(point.states[name].power_W for name in heats) for point in points), default=0.0)
        return seen.stress.ambient_degC + per_W * watts

    return at


def _outside(case: Case, part: BoardPart, worst: Place) -> Answer:
    stress, ambient = worst.seen.stress, format_quantity(worst.seen.stress.ambient_degC, "degC")
    lasts = "continuously" if math.isinf(stress.lasts_s) else f"for {format_quantity(stress.lasts_s, 's')}"
    at = f"{format_quantity(worst.seen.current_A, 'A')} at {format_quantity(worst.seen.voltage_V, 'V')}"
    too_much = f"{worst.ratio:.2g} times what {worst.bound.by} allows"
    if math.isinf(worst.ratio):
        too_much = f"and its case at {format_quantity(worst.case_degC, 'degC')} leaves it nothing"
    careful = ", if second breakdown derates like its power" if worst.careful_only else ""
    return case.finding(
        CHECK,
        f"{part.id} is put to {at} {stress.condition} {lasts} at {ambient}, {too_much}{careful}",
        parts=(part.id,),
        working=(
            WorkingLine(
                "voltage across it",
                stress.how,
                worst.seen.voltage_V,
                "V",
            ),
            WorkingLine("current", "the same", worst.seen.current_A, "A"),
            *_allowed_working(case, part, worst),
            WorkingLine(
                "over what is allowed",
                "voltage over its rating" if worst.bound.by == VOLTAGE else "current over what is allowed",
                None if math.isinf(worst.ratio) else worst.ratio,
                "",
            ),
        ),
        remedy=_remedy(case, part, worst),
        level="warning" if worst.careful_only else None,
        assumption=case.assumes(*ALL_ASSUMPTIONS) or worst.careful_only,
        subject=part.id,
    )


def _allowed_working(case: Case, part: BoardPart, worst: Place) -> Iterator[WorkingLine]:
    """Yield how what is allowed comes about: a rating, or the curve at 25 degC and the share that the case leaves of it."""
    bound, case_degC = worst.bound, worst.case_degC
    if bound.by == VOLTAGE:
        yield WorkingLine("allowed", bound.by, worst.seen.voltage_V / worst.ratio, "V", worst.source)
        return
    if math.isnan(bound.cold_A):
        yield WorkingLine("allowed", bound.by, bound.current_A, "A", worst.source)
        return
    limit, ambient_degC, sink_K_per_W = (
        case.rating(part.id, "tj_max"),
        worst.seen.stress.ambient_degC,
        case.needs.sink_K_per_W,
    )
    assert limit is not None
    heated = "the ambient, and what heats it before or in free air"
    if sink_K_per_W:
        watts = format_quantity((case_degC - ambient_degC) / sink_K_per_W, "W")
        heated = f"{format_quantity(ambient_degC, 'degC')} + {watts} * {format_quantity(sink_K_per_W, 'K/W')}"
    yield WorkingLine("case", heated, case_degC, "degC")
    curve = _curve(case, part)
    assert not isinstance(curve, str)  # something was held against it
    yield from allowed_lines(
        bound,
        curve,
        case_degC=case_degC,
        tj_max_degC=limit.value,
        left_at_limit=case.threshold(CHECK, "second_breakdown_left"),
        derated=(case.share(part.id, "power"), case.share(part.id, "current")),
        standard=case.limits.derating,
    )


def _remedy(case: Case, part: BoardPart, worst: Place) -> str:
    seen = worst.seen
    for quantity, value, unit in (("voltage", seen.voltage_V, "V"), ("current", seen.current_A, "A")):
        if worst.bound.by == f"its {quantity} rating":
            needed = preferred(value / case.share(part.id, quantity), "E24", "up")
            return f"fit a device rated {format_quantity(needed, unit)} or more as {part.id}"
    curve = _curve(case, part)
    sink = None if isinstance(curve, str) else _sink_that_does(case, part, curve)
    if sink is not None and sink >= LEAST_SINK_K_PER_W:
        fit = format_quantity(preferred(sink, "E24", "down"), "K/W")
        return f"give {part.id} a sink of {fit} or less, case to ambient"
    lasts = "dc" if math.isinf(case.lasts_s) else format_quantity(case.lasts_s, "s")
    at = f"{format_quantity(preferred(seen.current_A, 'E24', 'up'), 'A')} at {format_quantity(seen.voltage_V, 'V')}"
    return (
        f"fit a device as {part.id} whose safe area ({lasts}) allows {at} with its case at "
        f"{format_quantity(worst.case_degC, 'degC')}"
    )


def _sink_that_does(case: Case, part: BoardPart, curve: SafeArea) -> float | None:
    """Return the thermal resistance from case to ambient that keeps the locus inside the curve, second breakdown derated
    like the power; None where none does or the sink is not what heats the case."""
    if case.needs.sink_K_per_W is None or case.lasts_s <= case.threshold("pass-overheated", "case_holds"):
        return None
    least = math.inf
    case_at = _case_at(case, part)
    for seen in _along_the_locus(case, part):
        cold, hot = seen.stress.ambient_degC, case_at(seen)
        shared_W = (hot - cold) / case.needs.sink_K_per_W

        def inside(case_degC: float, seen: Seen = seen) -> bool:
            return _bound(case, part, curve, seen.voltage_V, case_degC, careful=True).current_A >= seen.current_A

        if inside(hot):
            continue
        if not inside(cold):
            return None
        for _ in range(HALVINGS):
            middle = 0.5 * (cold + hot)
            cold, hot = (middle, hot) if inside(middle) else (cold, middle)
        least = min(least, (cold - seen.stress.ambient_degC) / shared_W)
    return least if math.isfinite(least) else None
