"""Does the pass device stand what the limiter puts it to: its junction, and its safe operating area."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace

from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.derating import share_of
from protlint.checks.ends import NOT_SOLVED, at_carry, held_shorts
from protlint.checks.load import start_up_of
from protlint.checks.thermal import Heating, Junction, allowed_rise_K, hottest_case_degC, junction, made_for_a_sink
from protlint.findings import NotChecked, WorkingLine
from protlint.quantities import format_quantity, preferred, within
from protlint.solve.solution import Point

ASSUMED_IMPEDANCE = "{part}: the transient thermal impedance is bounded by the square root of time up to rth_jc"

WORTH_SAYING = 1.01
"""A point of the locus counts beside the short where it heats the device this much more."""

LEAST_SINK_K_PER_W = 0.1
"""No sink is better than this without water; common practice of the trade."""


@dataclass(frozen=True, slots=True)
class Stress:
    """One solved point that heats the pass devices: in words, at an ambient, for a time, at which ends of stated ranges."""

    condition: str
    ambient_degC: float
    point: Point
    lasts_s: float
    words: str = ""

    @property
    def how(self) -> str:
        """Tell how its figures come about."""
        return f"solved {self.condition}, every tolerance set for the most{self.words}"


def pass_overheated(case: Case) -> Iterator[Answer]:
    """Yield a finding for each pass device or driver whose junction gets too hot."""
    check = "pass-overheated"
    settles_s, holds_s = case.threshold(check, "settles"), case.threshold(check, "case_holds")
    for part_id, _ in case.device_parts("pass", "driver"):
        found: list[tuple[Stress, Heating, Junction]] = []
        for stress in stresses(case):
            heat = heating(case, part_id, stress)
            answer = junction(case, part_id, heat, settles_s=settles_s, case_holds_s=holds_s)
            if isinstance(answer, str):
                yield NotChecked(check, answer)
                continue
            found.append((stress, heat, answer))
        if not found:
            if not case.at_ambients(case.solution.high_short):
                yield NotChecked(check, NOT_SOLVED)
            continue
        if any(one.assumed for _, _, one in found):
            case.assumptions.append(ASSUMED_IMPEDANCE.format(part=part_id))
        stress, heat, worst = max(found, key=lambda one: one[2].ratio)
        if worst.too_hot:
            yield _overheated(case, part_id, stress, worst, _cooler(case, part_id, found))


def stresses(case: Case) -> Iterator[Stress]:
    """Yield the held short, and the point of greatest pass dissipation where it is another, at every ambient and every end
    of the stated ranges.

    The latter also for as long as a stated capacitance charges, as drawn and at usual ambient, where that is longer than a
    short lasts.
    """
    charging = start_up_of(case)
    for held in held_shorts(case):
        ambient_degC, short = held.row.ambient_degC, held.short
        worst = max(held.locus, key=lambda point: pass_power_W(case, point))
        yield Stress("in the held short", ambient_degC, short, case.lasts_s, held.words)
        if pass_power_W(case, worst) > WORTH_SAYING * pass_power_W(case, short):
            at = f"with the output at {format_quantity(worst.output_V, 'V')}"
            yield Stress(at, ambient_degC, worst, case.lasts_s, held.words)
        if charging is not None and charging.lasts_s is not None and charging.lasts_s > case.lasts_s:
            yield Stress("while the load's capacitance charges", ambient_degC, worst, charging.lasts_s, held.words)


def heating(case: Case, part_id: str, stress: Stress) -> Heating:
    """Return what heats a part at a solved point; a stated sink is shared by all that is on it.

    What it takes before is the most at any end of the stated ranges.
    """
    before = [point for point, _ in at_carry(case)]
    return Heating(
        own_W=case.power_W(stress.point, part_id),
        shared_W=pass_power_W(case, stress.point),
        ambient_degC=stress.ambient_degC,
        lasts_s=stress.lasts_s,
        sink_K_per_W=case.needs.sink_K_per_W if on_the_sink(case, part_id) else None,
        before_W=max((case.power_W(point, part_id) for point in before), default=0.0),
        before_shared_W=max((pass_power_W(case, point) for point in before), default=0.0),
    )


def on_the_sink(case: Case, part_id: str) -> bool:
    """Tell whether the limiter's sink, where it has one, cools a part: every pass device, and a driver made for a sink."""
    if part_id in case.parts("pass"):
        return True
    return made_for_a_sink(case.rating(part_id, "rth_jc"), case.rating(part_id, "rth_ja"))


def on_the_sink_names(case: Case) -> tuple[str, ...]:
    """Return the names of the devices on the limiter's sink."""
    return tuple(
        name
        for part_id in dict.fromkeys(case.parts("pass", "driver"))
        if on_the_sink(case, part_id)
        for name in case.devices_of(part_id)
    )


def pass_power_W(case: Case, point: Point) -> float:
    """Return what everything on the sink dissipates together."""
    return sum(point.states[name].power_W for name in on_the_sink_names(case))


def _overheated(case: Case, part_id: str, stress: Stress, worst: Junction, remedy: str) -> Answer:
    state = next(stress.point.states[name] for name in reversed(case.devices_of(part_id)))
    ambient = format_quantity(stress.ambient_degC, "degC")
    lasts = "" if math.isinf(stress.lasts_s) else f" for {format_quantity(stress.lasts_s, 's')}"
    said = f"it may take {format_quantity(worst.allowed_W, 'W')} there"
    if worst.degC > worst.limit_degC:
        reaches, may = format_quantity(worst.degC, "degC"), format_quantity(worst.limit_degC, "degC")
        said = f"its junction reaches {reaches}, it may reach {may}"
    return case.finding(
        "pass-overheated",
        f"{part_id} takes {format_quantity(worst.own_W, 'W')} {stress.condition}{lasts} at {ambient}: {said}",
        parts=(part_id,),
        working=(
            WorkingLine(
                "current",
                stress.how,
                abs(state.current_A),
                "A",
            ),
            WorkingLine("voltage across it", "solved", abs(state.voltage_V), "V"),
            WorkingLine("power", "all that flows into it", worst.own_W, "W", "Joule's law"),
            *worst.lines,
            WorkingLine("it may take", worst.allowed_how, worst.allowed_W, "W"),
        ),
        remedy=remedy,
        assumption=case.assumes(*ALL_ASSUMPTIONS) or worst.assumed,
        subject=part_id,
    )


def _cooler(case: Case, part_id: str, found: list[tuple[Stress, Heating, Junction]]) -> str:
    """Return the sink that will do in every condition; else the device that would, or for how long this one can."""
    _, heat, worst = max(found, key=lambda one: one[2].ratio)
    if all(one.on_sink for _, _, one in found):
        needed = min(_sink_for(case, part_id, heating, one) for _, heating, one in found)
        if needed >= LEAST_SINK_K_PER_W:
            value = preferred(needed, "E24", "down")
            return f"give {part_id} a sink of {format_quantity(value, 'K/W')} or less, case to ambient"
    limit = case.rating(part_id, "tj_max")
    assert limit is not None

    def room_K(from_degC: float) -> float:
        return allowed_rise_K(case.limits.derating, case.part(part_id).kind, limit.value, from_degC)

    brief = not math.isinf(heat.lasts_s)
    cold_degC = worst.from_degC if brief else heat.ambient_degC
    if room_K(cold_degC) <= 0.0:
        return f"{part_id} cannot work at {format_quantity(heat.ambient_degC, 'degC')}: its junction may reach no more"
    on_this_sink = worst.on_sink and room_K(worst.from_degC) > 0.0
    from_degC = worst.from_degC if on_this_sink else cold_degC
    per_W = preferred(room_K(from_degC) / worst.own_W, "E24", "down")
    to = "case" if worst.on_sink or brief else "free air"
    why = "no sink will do: " if worst.on_sink else ""
    sink = " on the same sink" if on_this_sink and heat.sink_K_per_W else ""
    shared_K_per_W = (worst.from_degC - cold_degC) / worst.own_W
    bearable_W = room_K(cold_degC) / (worst.per_W + shared_K_per_W)
    lasts_s = _time_for(case, part_id, heat)
    shorter = f", or end the short within {format_quantity(lasts_s, 's')}" if lasts_s is not None else ""
    return (
        f"{why}fit a device with {format_quantity(per_W, 'K/W')} or less from junction to {to}{sink} as {part_id}, or let "
        f"it take no more than {format_quantity(bearable_W, 'W')}{shorter}"
    )


def _sink_for(case: Case, part_id: str, heat: Heating, one: Junction) -> float:
    """Return the thermal resistance from case to ambient with which the junction just stays at what it may reach."""
    limit, rated = case.rating(part_id, "tj_max"), case.rating(part_id, "power_case")
    assert limit is not None
    derating, kind = case.limits.derating, case.part(part_id).kind
    if rated is not None and one.own_W > share_of(derating, kind, "power") * rated.value:
        return 0.0
    case_degC = hottest_case_degC(derating, kind, limit.value, one.own_W * one.per_W)
    return (case_degC - heat.ambient_degC) / heat.shared_W


def _time_for(case: Case, part_id: str, heat: Heating) -> float | None:
    """Return how long the part stands this power, in steps of E6, or None where no time is found."""
    check = "pass-overheated"
    settles_s, holds_s = case.threshold(check, "settles"), case.threshold(check, "case_holds")
    for lasts_s in sorted(within(1e-4, holds_s, "E6"), reverse=True):
        answer = junction(case, part_id, replace(heat, lasts_s=lasts_s), settles_s=settles_s, case_holds_s=holds_s)
        if lasts_s < heat.lasts_s and not isinstance(answer, str) and not answer.too_hot:
            return lasts_s
    return None
