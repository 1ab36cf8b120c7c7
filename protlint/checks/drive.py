"""What drives the stage: does it leave the shunt too much to take away, and does it stand that itself."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

from protlint.board.graph import BoardPart
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.drive_resistor import least_drive_resistance
from protlint.checks.shunt import NOT_SOLVED, Taken, current_rating, hottest, taken_by_shunt
from protlint.checks.sizing import meets
from protlint.checks.thermal import Junction
from protlint.findings import Level, NotChecked, Remedy, WorkingLine
from protlint.limits import DriveLimits
from protlint.quantities import format_quantity, preferred
from protlint.solve.solution import Solution
from protlint.solve.surroundings import Surroundings, survey_surroundings
from protlint.toml.text import toml_key


@dataclass(frozen=True, slots=True)
class Excess:
    """What the shunt takes of one quantity, what it may take at all, and what it is left with here."""

    quantity: str
    value: float
    rated: float
    allowed: float
    unit: str
    source: str | None
    taken: Taken
    junction: Junction | None = None

    @property
    def ratio(self) -> float:
        """Return the value over what is allowed here."""
        return self.value / self.allowed if self.allowed > 0.0 else float("inf")


def drive_unlimited(case: Case) -> Iterator[Answer]:
    """Yield a finding where a drive with no current limit of its own leaves the shunt more than half its current rating to
    take, or more than its derated power."""
    check = "drive-unlimited"
    if case.circuit.drive.current_A is not None:
        return
    if case.unbounded:
        yield _unbounded(case)
        return
    for part_id, rows in taken_by_shunt(case).items():
        if not rows:
            yield NotChecked(check, NOT_SOLVED)
            continue
        found = list(_excesses(case, check, part_id, rows))
        yield from (one for one in found if isinstance(one, NotChecked))
        over = [one for one in found if isinstance(one, Excess) and one.ratio > 1.0]
        if over:
            yield _unlimited(case, part_id, max(over, key=lambda one: one.ratio))


def _unbounded(case: Case) -> Answer:
    """Say that nothing at all stands between the drive and the junctions."""
    parts = case.parts("shunt")
    node = case.circuit.drive.node
    return case.finding(
        "drive-unlimited",
        f"nothing bounds what the drive on {node} gives: neither a resistance nor a stated limit stands between it and "
        f"{', '.join(parts)}",
        parts=parts,
        working=(),
        remedy=f"fit a resistor in series with the drive, or state {case.drive_bound}",
        assumption=case.assumes(*ALL_ASSUMPTIONS),
        subject="unbounded",
    )


def _excesses(case: Case, check: str, part_id: str, rows: tuple[Taken, ...]) -> Iterator[Excess | NotChecked]:
    name = current_rating(case.part(part_id).kind)
    rated = case.allowed(part_id, name, "current")
    if rated is None:
        yield NotChecked(check, case.rating_key(part_id, name))
    else:
        worst = max(rows, key=lambda one: one.current_A)
        half_A = case.threshold(check, "share") * rated.value
        yield Excess("current", worst.current_A, rated.value, half_A, "A", rated.source, worst)
    hot = hottest(case, part_id, rows)
    if isinstance(hot, str):
        yield NotChecked(check, hot)
    elif hot is not None:
        taken, junction = hot
        yield Excess("power", taken.power_W, junction.allowed_W, junction.allowed_W, "W", None, taken, junction)


def _unlimited(case: Case, part_id: str, worst: Excess) -> Answer:
    drive = case.parts("drive")
    named = f"the drive through {', '.join(drive)}" if drive else f"the drive on {case.circuit.drive.node}"
    level: Level = "error" if worst.value > worst.rated else "warning"
    ambient = format_quantity(worst.taken.row.ambient_degC, "degC")
    value, allowed = format_quantity(worst.value, worst.unit), format_quantity(worst.allowed, worst.unit)
    remedy, fits = _resistance_to_fit(case, part_id, worst)
    what = "half its current rating" if worst.quantity == "current" else "what it may dissipate there"
    return case.finding(
        "drive-unlimited",
        f"{named} leaves {part_id} {value} to take away in the held short at {ambient}, more than {allowed}, {what}",
        parts=(*drive, part_id),
        working=(
            WorkingLine("the drive gives", "solved in the held short", abs(worst.taken.point.drive_A), "A"),
            WorkingLine(f"shunt {worst.quantity}", "solved, every tolerance set for the most", worst.value, worst.unit),
            *(worst.junction.lines if worst.junction is not None else ()),
            WorkingLine(
                "it may take",
                worst.junction.allowed_how if worst.junction is not None else what,
                worst.allowed,
                worst.unit,
                worst.source,
            ),
        ),
        remedy=remedy,
        fits=fits,
        level=level,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
        subject=worst.quantity,
    )


def _resistance_to_fit(case: Case, part_id: str, worst: Excess) -> Remedy:
    def does(solution: Solution) -> bool:
        rows = taken_by_shunt(replace(case, solution=solution))[part_id]
        if not rows:
            return False
        found = [one for one in _excesses(case, "drive-unlimited", part_id, rows) if isinstance(one, Excess)]
        if case.needs.carry_A is not None and meets(case.solution, case.needs.carry_A, None):
            found = found if meets(solution, case.needs.carry_A, None) else []
        return bool(found) and all(one.ratio <= 1.0 for one in found)

    fit = least_drive_resistance(case, worst.ratio, does)
    if fit is not None:
        return fit
    if worst.quantity == "current":
        needed_A = preferred(
            worst.value / (case.threshold("drive-unlimited", "share") * case.share(part_id, "current")), "E24", "up"
        )
        return f"the stage needs that drive: fit a shunt rated {format_quantity(needed_A, 'A')} or more as {part_id}", ()
    limit_A = worst.allowed / max(worst.taken.voltage_V, 0.1)
    return f"limit the drive's current: {part_id} may take {format_quantity(limit_A, 'A')} of it", ()


def driver_overloaded(case: Case) -> Iterator[Answer]:
    """Yield a finding where the IC that drives the stage dissipates more than it may while the limiter holds."""
    check = "driver-overloaded"
    around = survey_surroundings(case.board, case.limiter, case.limits)
    parts = [case.board.parts[index] for index, _ in around.drive_pins if case.board.parts[index].kind == "ic"]
    entry = around.drive_entry
    if not parts and (entry is None or entry.power_W is None):
        return
    part = parts[0] if parts else None
    power_W = _allowed_W(case, part, entry)
    if power_W is None:
        yield NotChecked(check, _power_key(case, part, around))
        return
    upper_V, lower_V = _rails(case, part)
    worst = max(
        case.at_ambients(case.solution.high_short),
        key=lambda pair: _driver_W(pair[1].drive_A, pair[1].drive_V, upper_V, lower_V),
        default=None,
    )
    if worst is None:
        yield NotChecked(check, NOT_SOLVED)
        return
    row, point = worst
    taken_W = _driver_W(point.drive_A, point.drive_V, upper_V, lower_V)
    if taken_W <= power_W:
        return
    name = part.id if part is not None else f"what drives {case.circuit.drive.node}"
    drop_V = abs((upper_V if point.drive_A > 0.0 else lower_V) - point.drive_V)

    def does(solution: Solution) -> bool:
        return all(_driver_W(one.drive_A, one.drive_V, upper_V, lower_V) <= power_W for one in solution.high_short)

    less = f"let it give no more than {format_quantity(power_W / drop_V, 'A')}"
    remedy, fits = least_drive_resistance(case, taken_W / power_W, does) or (less, ())
    yield case.finding(
        check,
        f"{name} takes {format_quantity(taken_W, 'W')} itself while the short is held at "
        f"{format_quantity(row.ambient_degC, 'degC')}, it may take {format_quantity(power_W, 'W')}",
        parts=(part.id,) if part is not None else case.parts("drive"),
        working=(
            WorkingLine("the drive gives", "solved in the held short, every tolerance set for the most", point.drive_A, "A"),
            WorkingLine("at", "solved at the drive's net", point.drive_V, "V"),
            WorkingLine("power", f"{drop_V:.3g} V * {abs(point.drive_A):.3g} A", taken_W, "W", "Joule's law"),
            WorkingLine("it may take", "limits file or part data", power_W, "W"),
        ),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def _driver_W(drive_A: float, drive_V: float, upper_V: float, lower_V: float) -> float:
    """Return what stays in a driver that sources from its upper rail or sinks to its lower one."""
    return abs((upper_V if drive_A > 0.0 else lower_V) - drive_V) * abs(drive_A)


def _allowed_W(case: Case, part: BoardPart | None, entry: DriveLimits | None) -> float | None:
    if entry is not None and entry.power_W is not None:
        return entry.power_W
    if part is None:
        return None
    drivers = {name.casefold(): one for name, one in case.limits.drivers.items()}
    stated = drivers.get((part.part_number or "").casefold())
    if stated is not None and stated.power_W is not None:
        return stated.power_W
    rating = case.rating(part.id, "power")
    return None if rating is None else rating.value


def _power_key(case: Case, part: BoardPart | None, around: Surroundings) -> str:
    if part is not None and part.part_number:
        return f"[driver.{toml_key(part.part_number)}] power"
    net = around.drive
    return f"[drive.{toml_key(case.board.nets[net].name if net is not None else '?')}] power"


def _rails(case: Case, part: BoardPart | None) -> tuple[float, float]:
    """Return the driver's upper and lower supply: those on its own pins, else the circuit's farthest."""
    supplies = [case.board.nets[net].supply for net in part.roles.values()] if part is not None else []
    volts = [one.voltage_V for one in supplies if one is not None]
    volts = volts if len(volts) > 1 else list(case.circuit.held.values())
    return max(one.high for one in volts), min(one.low for one in volts)
