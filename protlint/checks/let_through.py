"""What a pass device is let into before its limiter acts, against its safe area for that time."""

from __future__ import annotations

from dataclasses import dataclass

from protlint.board.graph import BoardPart
from protlint.checks.case import Case
from protlint.checks.derating import share_of
from protlint.checks.safe_area import allowed, allowed_lines, breakdown_share, curve_for, is_much_longer, thermal_share
from protlint.findings import WorkingLine
from protlint.quantities import format_quantity
from protlint.solve.solution import Step

LATE = "trips-late"
AREA = "pass-outside-safe-area"


@dataclass(frozen=True, slots=True)
class LetThrough:
    """What a pass device is let into: for how long, the energy, the voltage across it in the short, the current of a pulse
    of that energy, the current its safe area allows for that time, and how that comes about.

    ``wanted`` is the key of a safe area for that time where the only one known is for a much longer time: a device that such
    a curve does not clear may still stand it.
    """

    lasts_s: float
    energy_J: float
    voltage_V: float
    current_A: float
    allowed_A: float
    lines: tuple[WorkingLine, ...]
    wanted: str | None = None

    @property
    def ratio(self) -> float:
        """Return the current over what is allowed; infinite where nothing is."""
        return self.current_A / self.allowed_A if self.allowed_A > 0.0 else float("inf")


def let_through(case: Case, part: BoardPart, names: tuple[str, ...], step: Step) -> LetThrough | str | None:
    """Return what a pass device is let into, the key of what is missing for it, or None where it is nothing."""
    held = case.solution.held_short
    if held is None or not step.delay_s or not step.pass_energy_J:
        return None
    limit = case.rating(part.id, "tj_max")
    if limit is None:
        return case.rating_key(part.id, "tj_max")
    dc_from_s = case.threshold(AREA, "dc_from")
    curve = curve_for(part.entry.safe_area if part.entry is not None else (), step.delay_s, dc_from_s)
    wanted = f"{case.data_key(part.id, 'safe_area')} that lasts {format_quantity(step.delay_s, 's')}"
    if curve is None:
        return wanted
    voltage_V = max(abs(held.states[name].voltage_V) for name in names)
    hottest_degC = max(case.limits.ambient_degC)
    left = thermal_share(hottest_degC, limit.value)
    fet = part.kind in ("nmos", "pmos")
    breakdown = left if fet else breakdown_share(hottest_degC, limit.value, case.threshold(AREA, "second_breakdown_left"))
    derating = case.limits.derating
    bound = allowed(
        curve.points,
        voltage_V,
        thermal_left=left,
        breakdown_left=breakdown * share_of(derating, part.kind, "current"),
        power_share=share_of(derating, part.kind, "power"),
    )
    current_A = step.pass_energy_J / (step.delay_s * voltage_V)
    lines = allowed_lines(
        bound,
        curve,
        case_degC=hottest_degC,
        tj_max_degC=limit.value,
        left_at_limit=case.threshold(AREA, "second_breakdown_left"),
        derated=(share_of(derating, part.kind, "power"), share_of(derating, part.kind, "current")),
        standard=derating,
    )
    at_case = WorkingLine("case", "the highest ambient", hottest_degC, "degC")
    return LetThrough(
        lasts_s=step.delay_s,
        energy_J=step.pass_energy_J,
        voltage_V=voltage_V,
        current_A=current_A,
        allowed_A=bound.current_A,
        lines=(at_case, *lines),
        wanted=wanted if is_much_longer(curve, step.delay_s, dc_from_s, case.threshold(AREA, "curve_lasts")) else None,
    )


def too_much(case: Case, step: Step) -> bool:
    """Tell whether a step lets any pass device into more than its safe area allows, as far as that is known.

    What is to be fitted has to be cleared: here a curve for a longer time counts too.
    """
    found = [let_through(case, case.part(part_id), names, step) for part_id, names in case.device_parts("pass")]
    return any(one.ratio > case.threshold(LATE, "error") for one in found if isinstance(one, LetThrough))
