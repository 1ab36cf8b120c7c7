"""Is the shunt's base protected in the instant before the loop acts."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.findings import Level, NotChecked, WorkingLine
from protlint.quantities import format_quantity, preferred
from protlint.solve.circuit import Device

USUAL_LEAST_OHM = 47.0
"""The least base stop that is usual in limiters; common practice of the trade, from memory."""


def base_stop_absent(case: Case) -> Iterator[Answer]:
    """Yield a finding where nothing stands between the sense resistance and the shunt's base.

    A preset's upper leg counts as a base stop; a diode string has no base.
    """
    check = "base-stop-absent"
    shunt = _shunt(case)
    if shunt is None or case.parts("base_stop") or case.limiter.elements.get("preset.upper"):
        return
    drop = _unlimited_drop(case)
    if drop is None:
        yield NotChecked(check, "the unlimited current, which could not be solved")
        return
    drop_V, current_A, sense_ohm, ambient_degC = drop
    junction_V = case.threshold(check, "junction")
    base_ohm = shunt.model.get("RB", 0.0)
    base_A = max(0.0, drop_V - junction_V) / (sense_ohm + base_ohm)
    part = case.parts("shunt")[0]
    rating = case.rating(part, "ib")
    level: Level = "warning"
    if drop_V < case.threshold(check, "small_drop"):
        level = "note"
    elif rating is None:
        yield NotChecked(check, case.rating_key(part, "ib"))
    elif base_A > rating.value:
        level = "error"
    yield case.finding(
        check,
        f"{part} has no base stop: up to {format_quantity(base_A, 'A')} into its base before the loop acts"
        + (f", its rating is {format_quantity(rating.value, 'A')}" if rating is not None else ""),
        parts=(part,),
        working=(
            WorkingLine("unlimited current", f"shunt taken out, output shorted, {ambient_degC:g} degC", current_A, "A"),
            WorkingLine(
                "drop across the sense resistance",
                f"{format_quantity(current_A, 'A')} * {format_quantity(sense_ohm, 'ohm')}",
                drop_V,
                "V",
            ),
            WorkingLine(
                "base current",
                f"({format_quantity(drop_V, 'V')} - {format_quantity(junction_V, 'V')}) / "
                f"({format_quantity(sense_ohm, 'ohm')} + {format_quantity(base_ohm, 'ohm')})",
                base_A,
                "A",
                "Kirchhoff's voltage law",
            ),
        ),
        remedy=_stop_to_fit(case, part, drop_V - junction_V, base_ohm),
        level=level,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def _shunt(case: Case) -> Device | None:
    circuit = case.bench.circuit
    if circuit is None:
        return None
    return next((one for one in circuit.devices if one.name in circuit.shunt and one.kind in ("npn", "pnp")), None)


def _unlimited_drop(case: Case) -> tuple[float, float, float, float] | None:
    """Return (drop in V, current in A, sense resistance in ohm, ambient in degC) at the ambient where the drop is greatest.

    Where the sense resistance is several (one for each parallel device) the current divides among them.
    """
    circuit = case.bench.circuit
    rows = [row for row in case.solution.currents if row.unlimited_A is not None]
    sense = [device for device in circuit.devices if device.name in circuit.sense] if circuit is not None else []
    if not rows or not sense:
        return None
    row = max(rows, key=lambda one: one.unlimited_A or 0.0)
    current_A = (row.unlimited_A or 0.0) / len(sense)
    sense_ohm = sense[0].model["R"]
    return current_A * sense_ohm, current_A, sense_ohm, row.ambient_degC


def _stop_to_fit(case: Case, part: str, excess_V: float, base_ohm: float) -> str:
    """Return the base stop that keeps the base current under half its rating, at least the usual least value."""
    rating = case.rating(part, "ib")
    least_ohm = max(0.0, excess_V) / (0.5 * rating.value) - base_ohm if rating is not None else 0.0
    value = preferred(max(least_ohm, USUAL_LEAST_OHM), "E6", "up")
    return f"fit {format_quantity(value, 'ohm')} in series with the base of {part}"
