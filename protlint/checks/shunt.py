"""What the shunt has to take away while the limiter holds, and what it has to block while it does not."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from protlint.checks.case import ALL_ASSUMPTIONS, VOLTAGES, Answer, Case
from protlint.checks.ends import HELD_MOST, NOT_SOLVED, ends_of, held_shorts
from protlint.checks.thermal import Heating, Junction, in_free_air, junction
from protlint.findings import NotChecked, WorkingLine
from protlint.partdata.book import Figure
from protlint.partdata.ratings import RATINGS_OF
from protlint.quantities import format_pair, format_quantity, preferred
from protlint.solve.conditions import Condition
from protlint.solve.parameters import CircuitError
from protlint.solve.solution import Currents, Point


@dataclass(frozen=True, slots=True)
class Taken:
    """What one shunt part takes in the held short at one ambient; ``words`` say at which ends of stated ranges."""

    part_id: str
    row: Currents
    point: Point
    current_A: float
    voltage_V: float
    power_W: float
    words: str


def current_rating(kind: str) -> str:
    """Return the name of the rating that bounds the current of a part of a kind."""
    return next(name for name in ("ic", "id", "if") if name in RATINGS_OF[kind])


def taken_by_shunt(case: Case) -> Mapping[str, tuple[Taken, ...]]:
    """Return what each shunt part takes in the held short, every tolerance set for the most and at every end of the stated
    ranges, at every ambient."""
    table: dict[str, tuple[Taken, ...]] = {}
    for part_id, names in case.device_parts("shunt"):
        rows = []
        for held in held_shorts(case):
            point = held.short
            state = max((point.states[name] for name in names), key=lambda one: abs(one.current_A))
            power_W = case.power_W(point, part_id)
            rows.append(Taken(part_id, held.row, point, abs(state.current_A), abs(state.voltage_V), power_W, held.words))
        table[part_id] = tuple(rows)
    return table


def shunt_overloaded(case: Case) -> Iterator[Answer]:
    """Yield findings for each shunt part that takes too much current or power in the held short, or too much voltage."""
    check = "shunt-overloaded"
    for part_id, rows in taken_by_shunt(case).items():
        if not rows:
            yield NotChecked(check, NOT_SOLVED)
            continue
        part = case.part(part_id)
        name = current_rating(part.kind)
        allowed = case.allowed(part_id, name, "current")
        if allowed is None:
            yield NotChecked(check, case.rating_key(part_id, name))
        else:
            yield from _too_much_current(case, max(rows, key=lambda one: one.current_A), allowed)
        hot = hottest(case, part_id, rows)
        if isinstance(hot, str):
            yield NotChecked(check, hot)
        elif hot is not None and hot[1].too_hot:
            yield _too_much_power(case, *hot)
        if part.kind.startswith(("npn", "pnp")):
            yield from _voltage(case, part_id)


def hottest(case: Case, part_id: str, rows: tuple[Taken, ...]) -> tuple[Taken, Junction] | str | None:
    """Return the ambient at which a shunt part comes nearest to what it may take, or the key of what is missing."""
    found = []
    for one in rows:
        answer = _heated(case, part_id, one)
        if isinstance(answer, str):
            return answer
        found.append((one, answer))
    return max(found, key=lambda pair: pair[1].ratio, default=None)


def _heated(case: Case, part_id: str, one: Taken) -> Junction | str:
    settles_s, holds_s = case.threshold("pass-overheated", "settles"), case.threshold("pass-overheated", "case_holds")
    ambient_degC = one.row.ambient_degC + (case.needs.shunt_rise_K or 0.0)
    heat = Heating(one.power_W, one.power_W, ambient_degC, case.lasts_s)
    if case.lasts_s > holds_s:
        return in_free_air(case, part_id, heat)
    return junction(case, part_id, heat, settles_s=settles_s, case_holds_s=holds_s)


def _too_much_current(case: Case, worst: Taken, allowed: Figure) -> Iterator[Answer]:
    if worst.current_A <= allowed.value:
        return
    takes, may = format_pair(worst.current_A, allowed.value, "A")
    needed = format_quantity(preferred(worst.current_A / case.share(worst.part_id, "current"), "E24", "up"), "A")
    yield case.finding(
        "shunt-overloaded",
        f"{worst.part_id} takes {takes} in the held short at {format_quantity(worst.row.ambient_degC, 'degC')}, "
        f"it may take {may}",
        parts=(worst.part_id,),
        working=(
            WorkingLine("shunt current", f"{HELD_MOST}{worst.words}", worst.current_A, "A"),
            WorkingLine("it may take", "its current rating", allowed.value, "A", allowed.source),
        ),
        remedy=f"fit a shunt rated {needed} or more as {worst.part_id}",
        assumption=case.assumes(*ALL_ASSUMPTIONS),
        subject=f"{worst.part_id} current",
    )


def _too_much_power(case: Case, worst: Taken, hot: Junction) -> Answer:
    takes, may = format_pair(worst.power_W, hot.allowed_W, "W")
    remedy = f"{worst.part_id} cannot work so hot: give it a cooler place"
    if hot.allowed_W > 0.0:
        per_W = preferred(hot.allowed_W * hot.per_W / worst.power_W, "E24", "down")
        remedy = (
            f"fit a shunt with {format_quantity(per_W, 'K/W')} or less from junction to free air as {worst.part_id}, "
            f"or let it take no more than {may}"
        )
    return case.finding(
        "shunt-overloaded",
        f"{worst.part_id} takes {takes} in the held short at {format_quantity(worst.row.ambient_degC, 'degC')}, "
        f"it may take {may} there",
        parts=(worst.part_id,),
        working=(
            WorkingLine("shunt current", "solved in the held short", worst.current_A, "A"),
            WorkingLine("voltage across it", "solved", worst.voltage_V, "V"),
            WorkingLine("power", "all that flows into it", worst.power_W, "W", "Joule's law"),
            *hot.lines,
            WorkingLine("it may take", hot.allowed_how, hot.allowed_W, "W"),
        ),
        remedy=remedy,
        assumption=case.assumes(*ALL_ASSUMPTIONS) or hot.assumed,
        subject=f"{worst.part_id} power",
    )


def _voltage(case: Case, part_id: str) -> Iterator[Answer]:
    """Yield a finding where the shunt, the limiter off, has more than V_CEO across it anywhere in the drive's and output's
    range: the drive at either end, the output in the short or open, at every end of what is stated as a range."""
    check = "shunt-overloaded"
    allowed = case.allowed(part_id, "vceo", "voltage")
    if allowed is None:
        yield NotChecked(check, case.rating_key(part_id, "vceo"))
        return
    found = _greatest_voltage(case, part_id)
    if found is None:
        yield NotChecked(check, "an operating point with the limiter off, which could not be solved")
        return
    volts, said = found
    if volts <= allowed.value:
        return
    has, may = format_pair(volts, allowed.value, "V")
    needed = preferred(volts / case.share(part_id, "voltage"), "E24", "up")
    yield case.finding(
        check,
        f"{part_id} has {has} from collector to emitter {said}, it may have {may}",
        parts=(part_id,),
        working=(
            WorkingLine("collector to emitter", f"solved {said}", volts, "V"),
            WorkingLine("it may have", "V_CEO", allowed.value, "V", allowed.source),
        ),
        remedy=f"fit a shunt rated {format_quantity(needed, 'V')} or more as {part_id}",
        assumption=case.assumes(*VOLTAGES),
        subject=f"{part_id} voltage",
    )


def _greatest_voltage(case: Case, part_id: str) -> tuple[float, str] | None:
    short = case.solution.short
    if short is None:
        return None
    words, conditions = [], []
    try:
        for ends in ends_of(case, off_end=True):
            short_V = ends.held_V[short]
            for end, drive_V in (("low", ends.low_V), ("high", ends.high_V)):
                at = f"the output at {format_quantity(short_V, 'V')}"
                for where, output_V in ((at, short_V), ("the output open", None)):
                    words.append(f"with the drive at its {end} end and {where}{ends.words}")
                    conditions.append(Condition(case.limits.ambient_degC[1], drive_V, output_V, corner=ends.corner))
        points = case.under(conditions)
    except CircuitError:
        return None
    names = case.devices_of(part_id)
    sign = 1.0 if case.part(part_id).kind.startswith("npn") else -1.0
    volts = [
        (sign * point.states[name].voltage_V, said)
        for point, said in zip(points, words, strict=True)
        if point is not None
        for name in names
    ]
    return max(volts, key=lambda pair: pair[0], default=None)
