"""Is the shunt's base protected in the instant before the loop acts, and does what protects it spoil the limit."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from protlint.checks.case import DRAWN, Answer, Case
from protlint.checks.stop_range import Moves, StopRange, moves_for_the_stop, stop_range
from protlint.checks.surge import Surge, shunt_of, surge
from protlint.findings import Fit, Level, NotChecked, Remedy, WorkingLine
from protlint.partdata.book import Figure
from protlint.quantities import format_quantity
from protlint.solve.circuit import Device


@dataclass(frozen=True, slots=True)
class Base:
    """The shunt's part and device, its base current rating (None: not known), and the instant before the loop acts."""

    part_id: str
    device: Device
    rating: Figure | None
    surge: Surge


def base_stop_absent(case: Case) -> Iterator[Answer]:
    """Yield a finding where nothing stands between the sense resistance and the shunt's base.

    A preset's upper leg counts as a base stop; a diode string has no base.
    """
    check = "base-stop-absent"
    if case.parts("base_stop") or case.limiter.elements.get("preset.upper"):
        return
    base = _base(case, check)
    if isinstance(base, Base):
        level: Level = "warning"
        if base.surge.drop_V < case.threshold(check, "small_drop"):
            level = "note"
        elif base.rating is None:
            yield NotChecked(check, case.rating_key(base.part_id, "ib"))
        elif base.surge.base_A > base.rating.value:
            level = "error"
        yield _finding(case, check, base, f"{base.part_id} has no base stop", level)
    elif base is not None:
        yield base


def base_stop_low(case: Case) -> Iterator[Answer]:
    """Yield a finding where a base stop lets more through than half of what the shunt's base may take."""
    check = "base-stop-low"
    if not case.parts("base_stop") and not case.limiter.elements.get("preset.upper"):
        return
    base = _base(case, check)
    if not isinstance(base, Base):
        if base is not None:
            yield base
        return
    if base.rating is None:
        if base.surge.base_A > 0.0:
            yield NotChecked(check, case.rating_key(base.part_id, "ib"))
        return
    if base.surge.base_A > case.threshold(check, "share") * base.rating.value:
        level: Level = "error" if base.surge.base_A > base.rating.value else "warning"
        stops = case.parts("base_stop") or case.parts("preset")
        be = "is" if len(stops) == 1 else "together are"
        yield _finding(case, check, base, f"{', '.join(stops)} {be} too low for the base of {base.part_id}", level, stops)


def base_stop_high(case: Case) -> Iterator[Answer]:
    """Yield a finding where the limit follows the shunt's current gain for the base stop's sake."""
    check = "base-stop-high"
    shunt = shunt_of(case)
    stops = case.parts("base_stop")
    if shunt is None or not stops or case.part(case.parts("shunt")[0]).kind == "thyristor":  # its gain is no rating
        return
    part_id = case.parts("shunt")[0]
    moves = moves_for_the_stop(case, shunt)
    if moves is None:
        entry = case.part(part_id).entry
        lacking = "hfe_max" if entry is not None and "hfe_min" in entry.ratings else "hfe_min"
        yield NotChecked(check, case.rating_key(part_id, lacking))
        return
    most = case.threshold(check, "share")
    if moves.share <= most:
        return
    low, high = moves.hfe
    remedy, fits = _what_will_do(case, shunt)
    yield case.finding(
        check,
        f"{', '.join(stops)} lets the limit move by {format_quantity(moves.share, '%', 2)} with the gain of {part_id}, "
        f"from {low:g} to {high:g}",
        parts=(*stops, part_id),
        working=(
            WorkingLine(
                f"holds, hFE {low:g}",
                f"solved with the base stop, {moves.ambient_degC:g} degC{moves.words}",
                moves.with_A[0],
                "A",
            ),
            WorkingLine(f"holds, hFE {high:g}", "the same", moves.with_A[1], "A"),
            WorkingLine("moves without it", "the same with the base stop bridged", moves.without, ""),
            WorkingLine("moves for its sake", _share_of_holds(moves), moves.share, ""),
        ),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*DRAWN),
    )


def _share_of_holds(moves: Moves) -> str:
    least, most = (format_quantity(amperes, "A") for amperes in sorted(moves.with_A))
    return f"({most} - {least}) / {format_quantity(moves.with_A[1], 'A')} - {moves.without:.3g}"


def _base(case: Case, check: str) -> Base | NotChecked | None:
    """Return the shunt's base in the instant before the loop acts; None where the shunt has none."""
    shunt = shunt_of(case)
    if shunt is None:
        return None
    instant = surge(case, shunt, case.threshold("base-stop-absent", "junction"))
    if instant is None:
        return NotChecked(check, "the unlimited current, which could not be solved")
    part_id = case.parts("shunt")[0]
    return Base(part_id, shunt, case.rating(part_id, "ib"), instant)


def _finding(case: Case, check: str, base: Base, said: str, level: Level, stops: tuple[str, ...] = ()) -> Answer:
    may = "" if base.rating is None else f", its rating is {format_quantity(base.rating.value, 'A')}"
    lines = base.surge.lines()
    remedy, fits = _what_will_do(case, base.device, base.surge)
    if base.rating is not None:
        lines += (WorkingLine("base current rating", "part data", base.rating.value, "A", base.rating.source),)
    return case.finding(
        check,
        f"{said}: up to {format_quantity(base.surge.base_A, 'A')} into the base before the loop acts{may}",
        parts=(*stops, base.part_id),
        working=lines,
        remedy=remedy,
        fits=fits,
        level=level,
        assumption=level == "error" and case.assumes(*DRAWN),
    )


def _what_will_do(case: Case, shunt: Device, instant: Surge | None = None) -> Remedy:
    """Return the base stops that will do, as a remedy."""
    known = instant or surge(case, shunt, case.threshold("base-stop-absent", "junction"))
    stops, part_id = case.parts("base_stop"), case.parts("shunt")[0]
    found: StopRange = stop_range(case, shunt, known)
    least = format_quantity(found.least_ohm, "ohm")
    if found.most_ohm is not None and found.most_ohm < found.least_ohm:
        most = format_quantity(found.most_ohm, "ohm")
        return (
            f"no base stop does both: {least} or more keeps the base current down, {most} or less keeps the limit from "
            f"following the gain; fit a shunt with less spread of gain, or one that bears more base current",
            (),
        )
    where = f"in series with the base of {part_id}"
    if stops:
        where = f"as {stops[0]}" if len(stops) == 1 else f"for {', '.join(stops)} together"
    upto = "" if found.most_ohm is None else f" ({least} to {format_quantity(found.most_ohm, 'ohm')} will do, E24)"
    fits = (Fit(stops[0], found.to_fit_ohm),) if len(stops) == 1 else ()
    return f"fit {format_quantity(found.to_fit_ohm, 'ohm')} {where}{upto}", fits
