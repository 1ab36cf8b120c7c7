"""What drives the stage: does it leave the shunt too much to take away, and does it stand that itself."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from protlint.board.graph import BoardPart
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.drive_resistor import least_drive_resistance
from protlint.checks.ends import HELD_MOST, NOT_SOLVED, Held, held_shorts
from protlint.checks.shunt import Taken, current_rating, hottest, taken_by_shunt
from protlint.checks.sizing import meets
from protlint.checks.thermal import Junction
from protlint.findings import Level, NotChecked, Remedy, WorkingLine
from protlint.limits import DriveLimits, Range, driver_of
from protlint.quantities import format_pair, format_quantity, preferred
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
    value, allowed = format_pair(worst.value, worst.allowed, worst.unit)
    remedy, fits = _resistance_to_fit(case, part_id, worst)
    what = "half its current rating" if worst.quantity == "current" else "what it may dissipate there"
    return case.finding(
        "drive-unlimited",
        f"{named} leaves {part_id} {value} to take away in the held short at {ambient}, more than {allowed}, {what}",
        parts=(*drive, part_id),
        working=(
            WorkingLine("the drive gives", f"{HELD_MOST}{worst.taken.words}", abs(worst.taken.point.drive_A), "A"),
            WorkingLine(f"shunt {worst.quantity}", "the same", worst.value, worst.unit),
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
    def does(changed: Case) -> bool:
        rows = taken_by_shunt(changed)[part_id]
        if not rows:
            return False
        found = [one for one in _excesses(case, "drive-unlimited", part_id, rows) if isinstance(one, Excess)]
        if case.needs.carry_A is not None and meets(case.solution, case.needs.carry_A, None):
            found = found if meets(changed.solution, case.needs.carry_A, None) else []
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
    around = survey_surroundings(case.board, case.limiter)
    parts = [case.board.parts[index] for index, _ in around.drive_pins if case.board.parts[index].kind == "ic"]
    entry = around.drive_entry
    if not parts and (entry is None or entry.power_W is None):
        return
    part = parts[0] if parts else None
    power_W = _allowed_W(case, part, entry)
    if power_W is None:
        yield NotChecked(check, _power_key(case, part, around))
        return
    rails, below_V = _rails(case, part), _below_rails_V(case, part, entry)

    def takes_W(held: Held) -> float:
        return _stays_V(rails, below_V, held) * abs(held.short.drive_A)

    worst = max(_with_rails(case), key=takes_W, default=None)
    if worst is None:
        yield NotChecked(check, NOT_SOLVED)
        return
    row, point, taken_W = worst.row, worst.short, takes_W(worst)
    if taken_W <= power_W:
        return
    name = part.id if part is not None else f"what drives {case.circuit.drive.node}"
    drop_V, given = _stays_V(rails, below_V, worst), format_quantity(abs(point.drive_A), "A")

    def does(changed: Case) -> bool:
        return all(takes_W(held) <= power_W for held in _with_rails(changed))

    less = f"let it give no more than {format_quantity(power_W / drop_V, 'A')}"
    remedy, fits = least_drive_resistance(case, taken_W / power_W, does) or (less, ())
    yield case.finding(
        check,
        f"{name} takes {format_quantity(taken_W, 'W')} itself while the short is held at "
        f"{format_quantity(row.ambient_degC, 'degC')}, it may take {format_quantity(power_W, 'W')}",
        parts=(part.id,) if part is not None else case.parts("drive"),
        working=(
            WorkingLine("the drive gives", f"{HELD_MOST}{worst.words}", point.drive_A, "A"),
            WorkingLine("at", "solved at the drive's net", point.drive_V, "V"),
            WorkingLine("power", f"{format_quantity(drop_V, 'V')} * {given}", taken_W, "W", "Joule's law"),
            WorkingLine("it may take", "limits file or part data", power_W, "W"),
        ),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def _with_rails(case: Case) -> list[Held]:
    """Return the held shorts, of those at stated ends these alone: the driver's rails are at the same ends then."""
    found = held_shorts(case)
    return [held for held in found if held.ends is not None] or found


def _stays_V(rails: Sequence[tuple[str, Range]], below_V: float | None, held: Held) -> float:
    """Return what stays across a driver that sources from its upper rail or sinks to its lower one.

    Where its swing is stated from its rails, by ``below_V``, these move with it.
    """
    sources, ends = held.short.drive_A > 0.0, held.ends
    if ends is not None and below_V is not None:
        rail_V = ends.high_V + below_V if sources else ends.low_V - below_V
    else:
        known_V = {} if ends is None else ends.held_V
        volts = [known_V.get(name, limits.high if sources else limits.low) for name, limits in rails]
        rail_V = max(volts) if sources else min(volts)
    return abs(rail_V - held.short.drive_V)


def _below_rails_V(case: Case, part: BoardPart | None, entry: DriveLimits | None) -> float | None:
    """Return how near its rails a driver reaches, where its swing is stated so."""
    stated = entry or _entry_of(case, part)
    return None if stated is None else stated.from_rails_V


def _entry_of(case: Case, part: BoardPart | None) -> DriveLimits | None:
    """Return what the limits file says of a driving part's type."""
    return driver_of(case.limits, None if part is None else part.part_number)


def _allowed_W(case: Case, part: BoardPart | None, entry: DriveLimits | None) -> float | None:
    for stated in (entry, _entry_of(case, part)):
        if stated is not None and stated.power_W is not None:
            return stated.power_W
    rating = None if part is None else case.rating(part.id, "power")
    return None if rating is None else rating.value


def _power_key(case: Case, part: BoardPart | None, around: Surroundings) -> str:
    if part is not None and part.part_number:
        return f"[driver.{toml_key(part.part_number)}] power"
    net = around.drive
    return f"[drive.{toml_key(case.board.nets[net].name if net is not None else '?')}] power"


def _rails(case: Case, part: BoardPart | None) -> list[tuple[str, Range]]:
    """Return the driver's supplies by net: those on its own pins, else the circuit's."""
    nets = [case.board.nets[net] for net in part.roles.values()] if part is not None else []
    own = [(net.name, net.supply.voltage_V) for net in nets if net.supply is not None]
    return own if len(own) > 1 else list(case.circuit.held.items())
