"""Pass devices in parallel of which the limiter senses only some."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from protlint.board.graph import Element
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.findings import Level, NotChecked, WorkingLine
from protlint.quantities import format_quantity, preferred
from protlint.solve.solution import Point

USUAL_STOP_OHM = 100.0
"""Averaging resistance proposed for each device where no base stop is there to go by; common practice of the trade."""


@dataclass(frozen=True, slots=True)
class Share:
    """One unsensed pass device: its part, its own emitter (source) resistor, and the drop across that in the held short."""

    part_id: str
    resistor: Element | None
    drop_V: float | None


def share_unsensed(case: Case) -> Iterator[Answer]:
    """Yield a finding where pass devices stand beside the sensed one with resistors of their own.

    They carry their share only as far as they are like the sensed one: types, emitter resistors and V_BE decide.
    """
    check = "share-unsensed"
    unsensed = case.limiter.elements.get("pass.unsensed", ())
    point = case.solution.held_short
    if not unsensed or point is None:
        return
    shares = [_share(case, index, point) for index in unsensed]
    sensed_A = sum(abs(point.states[name].current_A) for name in case.circuit.sense if name in point.states)
    total_A = abs(point.output_A)
    reasons, lines, lacking = _reasons(case, shares)
    for key in lacking:
        yield NotChecked(check, key)
    level: Level = "warning" if reasons else "note"
    highest_A = max(
        (row.holds_range_A[1] for row in case.solution.currents if row.holds_range_A is not None), default=total_A
    )
    cap_A = case.needs.cap_A
    if cap_A is not None and highest_A > cap_A:
        level = "error"
        reasons.insert(0, f"up to {format_quantity(highest_A, 'A')} flow where the cap is {format_quantity(cap_A, 'A')}")
        lines.append(
            WorkingLine("total, high end", "held short, every tolerance at its worst, worst ambient", highest_A, "A")
        )
        lines.append(WorkingLine("cap", "limits file", cap_A, "A"))
    names = ", ".join(share.part_id for share in shares)
    yield case.finding(
        check,
        f"of {format_quantity(total_A, 'A')} in the held short {', '.join(case.parts('sense'))} senses "
        f"{format_quantity(sensed_A, 'A')}; the rest goes through {names}, which nothing senses"
        + "".join(f"; {reason}" for reason in reasons),
        parts=(*(share.part_id for share in shares), *_resistor_parts(case, shares), *case.parts("sense", "shunt")),
        working=(
            WorkingLine("total", "output current in the held short, as drawn", total_A, "A"),
            WorkingLine("sensed", f"current of {', '.join(case.parts('sense'))} there", sensed_A, "A"),
            *lines,
        ),
        remedy=_remedy(case, len(unsensed)),
        level=level,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def _share(case: Case, index: int, point: Point) -> Share:
    element = case.board.elements[index]
    own = element.terminals.get("emitter", element.terminals.get("source"))
    resistors = (case.board.elements[one] for one in case.limiter.elements.get("others.emitter-resistor", ()))
    resistor = next((one for one in resistors if own in one.terminals.values()), None)
    names = [name for name, of in case.bench.element_of.items() if resistor is not None and of == resistor.index]
    drop_V = abs(point.states[names[0]].voltage_V) if names and names[0] in point.states else None
    return Share(case.board.parts[element.parts[0]].id, resistor, drop_V)


def _resistor_parts(case: Case, shares: list[Share]) -> tuple[str, ...]:
    return tuple(
        case.board.parts[part].id for share in shares if share.resistor is not None for part in share.resistor.parts
    )


def _reasons(case: Case, shares: list[Share]) -> tuple[list[str], list[WorkingLine], list[str]]:
    """Return why the devices may share badly, the working of that, and the keys that would tell what is not known."""
    reasons: list[str] = []
    lines: list[WorkingLine] = []
    lacking: list[str] = []
    sensed = case.board.elements[case.limiter.elements["pass"][0]]
    first = case.board.parts[sensed.parts[0]]
    others = [case.part(share.part_id) for share in shares]
    if any(part.part_number != first.part_number for part in others):
        types = dict.fromkeys(part.part_number or "no part number" for part in (first, *others))
        reasons.append(f"the types differ ({', '.join(types)})")
    sense_ohm = case.board.elements[case.limiter.elements["sense"][0]].value
    values = [share.resistor.value for share in shares if share.resistor is not None]
    if any(value is not None and sense_ohm is not None and abs(value / sense_ohm - 1.0) > 1e-6 for value in values):
        told = (format_quantity(value, "ohm") for value in (sense_ohm, *values) if value is not None)
        reasons.append(f"the emitter resistors differ ({', '.join(dict.fromkeys(told))})")
    most = case.threshold("share-unsensed", "mismatch")
    for share in shares:
        spread_V, key = _spread_V(case, share.part_id)
        if spread_V is None:
            lacking.append(key)
        elif share.drop_V is not None and share.drop_V > 0.0:
            ratio = spread_V / share.drop_V
            resistor = ", ".join(_resistor_parts(case, [share]))
            lines += [
                WorkingLine(f"drop across {resistor}", "held short, as drawn", share.drop_V, "V"),
                WorkingLine(f"mismatch of {share.part_id}", "spread of its control voltage over that drop", ratio, ""),
            ]
            if ratio > most:
                reasons.append(
                    f"the spread of {share.part_id} is {format_quantity(ratio, '%')} of the drop across {resistor}"
                )
    return reasons, lines, lacking


def _spread_V(case: Case, part_id: str) -> tuple[float | None, str]:
    """Return how far a device's V_BE (V_GS) may lie from its neighbour's, or the key that would tell."""
    devices = [case.device(name) for name in case.devices_of(part_id)]
    if devices and devices[0].kind in ("npn", "pnp"):
        return max(devices[0].vbe_spread_V), ""
    low, high = case.rating(part_id, "vgs_th_min"), case.rating(part_id, "vgs_th_max")
    if low is None or high is None:
        return None, case.rating_key(part_id, "vgs_th_min" if low is None else "vgs_th_max")
    return high.value - low.value, ""


def _remedy(case: Case, unsensed: int) -> str:
    """Say how to sense every device: the average of the drops, through one resistor from each."""
    count = unsensed + 1
    stops = case.limiter.elements.get("base-stop", ())
    now_ohm = case.board.elements[stops[0]].value if stops else None
    each_ohm = preferred(count * now_ohm) if now_ohm else USUAL_STOP_OHM
    there = f" in place of {', '.join(case.parts('base_stop'))}" if stops else ""
    return (
        f"sense them all: {count} resistors of {format_quantity(each_ohm, 'ohm')}, one from each emitter or source, to the "
        f"base of {', '.join(case.parts('shunt'))}{there}"
    )
