"""Is the limiter slow enough for the peaks that must pass, and quick enough for its pass device."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

from protlint.board.graph import BoardPart
from protlint.checks.case import Answer, Case
from protlint.checks.let_through import LATE, LetThrough, let_through, too_much
from protlint.checks.loop import charge_lines, not_known, rests_on_assumptions
from protlint.checks.sizing import fit_sense, least_carries_A, meets, resolve, sense_of, solve_again
from protlint.findings import Fit, NotChecked, Remedy, WorkingLine
from protlint.limits import Peak
from protlint.quantities import format_quantity, preferred
from protlint.quantities.series import within
from protlint.solve.advice import BASE_EMITTER, base_stop, places
from protlint.solve.circuit import Circuit, Device
from protlint.solve.delay import rc_delay, solve_step
from protlint.solve.loop import solve_loop
from protlint.solve.parameters import LINK_OHM
from protlint.solve.peak import ride_through
from protlint.solve.solution import Loop, Solution, Step

PEAKS = "trips-on-peaks"
FITTED = "fitted capacitor"
MOST_F = 100e-6
"""No larger capacitor is proposed at a shunt's base."""
LEAST_SENSE = 0.2
"""To which share of itself a sense resistance is lowered at most for a peak's sake."""
BY_HAND = "R C ln((m - p) / (m - 1)), the RC's answer to a step; any textbook on circuits"


def trips_late(case: Case) -> Iterator[Answer]:
    """Yield a finding for each pass device that what is let through before the limiter acts puts outside its safe area.

    The step is the solution's, everything at its usual value: following it at every end of the stated ranges would cost more
    than the whole review.
    """
    step = case.solution.step
    if step is None:
        yield from not_known(LATE, case.solution.step_needs)
        return
    if not step.settles:
        yield NotChecked(LATE, "a loop that settles in the short")
        return
    for part_id, names in case.device_parts("pass"):
        part = case.part(part_id)
        found = let_through(case, part, names, step)
        if isinstance(found, str):
            yield NotChecked(LATE, found)
        elif found is not None and found.ratio > case.threshold(LATE, "error"):
            yield _late(case, part, names, found) if found.wanted is None else NotChecked(LATE, found.wanted)


def trips_on_peaks(case: Case) -> Iterator[Answer]:
    """Yield a finding where a load peak that must pass is above what is carried and lasts longer than the delay.

    What is carried is the low end over every spread; the time at that overdrive is solved with everything as usual.
    """
    peak = case.needs.peak
    if peak is None:
        return
    if case.bench.unread:
        yield from not_known(PEAKS, tuple(f"the value of {part_id}" for part_id in case.bench.unread))
        return
    output_V = peak.output_V if peak.output_V is not None else case.circuit.output_V
    solution = _at_output(case, output_V)
    carries_A = least_carries_A(solution)
    usual_A = solution.currents[1].carries_A if len(solution.currents) == 3 else None
    if carries_A is None or usual_A is None:
        yield NotChecked(PEAKS, case.limits_key("output"))
        return
    if peak.current_A <= carries_A or carries_A <= 0.0:
        return
    overdrive = peak.current_A / carries_A
    before_A = min(case.needs.carry_A or 0.0, carries_A) / carries_A * usual_A
    asked = replace(peak, current_A=overdrive * usual_A, output_V=output_V)
    borne_s = _borne_s(case, case.circuit, asked, before_A)
    if isinstance(borne_s, str):
        yield from not_known(PEAKS, tuple(borne_s.split("; ")))
        return
    if borne_s >= peak.lasts_s:
        return
    remedy, fits = _peak_remedy(case, peak, asked, before_A, output_V)
    at = f" at {format_quantity(output_V, 'V')}" if output_V is not None else ""
    yield case.finding(
        PEAKS,
        f"a peak of {format_quantity(peak.current_A, 'A')} for {format_quantity(peak.lasts_s, 's')} does not pass: "
        f"{format_quantity(carries_A, 'A')}{at} is carried for ever, and the output gives way "
        f"{format_quantity(borne_s, 's')} into the peak",
        parts=case.parts("sense", "shunt"),
        working=(
            WorkingLine("carries, low end", f"solved{at}, at the worst ambient", carries_A, "A"),
            WorkingLine("overdrive", "peak over carries", overdrive, ""),
            WorkingLine("borne for", "solved in time at that overdrive, rising in a twentieth of its time", borne_s, "s"),
            *_by_hand(case, asked, before_A, usual_A),
            *charge_lines(case),
        ),
        remedy=remedy,
        fits=fits,
        assumption=rests_on_assumptions(case),
    )


def _late(case: Case, part: BoardPart, names: tuple[str, ...], found: LetThrough) -> Answer:
    lasts = format_quantity(found.lasts_s, "s")
    times = f"{found.ratio:.2g} times" if math.isfinite(found.ratio) else "more than"
    step = case.solution.step
    assert step is not None
    remedy, fits = _late_remedy(case, part, names, found)
    return case.finding(
        LATE,
        f"{part.id} is let into {format_quantity(found.energy_J, 'J')} within {lasts} before the limiter acts, as much as "
        f"{format_quantity(found.current_A, 'A')} at {format_quantity(found.voltage_V, 'V')}: {times} what its safe area "
        "allows",
        parts=(part.id,),
        working=(
            WorkingLine(
                "delay", "step into the short, until the current is below 1.1 times holds for good", found.lasts_s, "s"
            ),
            WorkingLine("peak", "greatest output current meanwhile", step.peak_A, "A"),
            WorkingLine("energy", "into the pass device until then", found.energy_J, "J"),
            WorkingLine("voltage across it", "solved in the held short, as drawn", found.voltage_V, "V"),
            WorkingLine(
                "current of a pulse of that energy", "energy / (delay * voltage in the short)", found.current_A, "A"
            ),
            *found.lines,
            WorkingLine("over what is allowed", "current over what is allowed", _ratio(found), ""),
            *charge_lines(case),
        ),
        remedy=remedy,
        fits=fits,
        assumption=rests_on_assumptions(case),
        subject=part.id,
    )


def _ratio(found: LetThrough) -> float | None:
    return found.ratio if math.isfinite(found.ratio) else None


def _late_remedy(case: Case, part: BoardPart, names: tuple[str, ...], found: LetThrough) -> Remedy:
    """Return the greatest smaller capacitor at the shunt's base that does, else the safe area to ask for."""
    slowing = _base_capacitor(case.circuit)
    if slowing is not None:
        smaller = reversed(within(1e-10, 0.99 * slowing.model["C"], "E6"))
        for farad in smaller:
            circuit = _with_value(case.circuit, slowing.name, farad)
            step = solve_step(circuit, case.limits.ambient_degC, short=case.solution.short)
            if not isinstance(step, Step) or not _calm(case, circuit):
                continue
            then = let_through(case, part, names, step)
            if then is None or (isinstance(then, LetThrough) and then.ratio <= case.threshold(LATE, "error")):
                acts = f"{format_quantity(step.delay_s, 's')} into the short" if step.delay_s else "at once"
                said = f"fit {format_quantity(farad, 'F')} as {slowing.name}: the limiter then acts {acts}"
                return said, _other_capacitor(case, slowing, farad)
    current = format_quantity(preferred(found.current_A, "E24", "up"), "A")
    return (
        f"fit a device as {part.id} whose safe area ({format_quantity(found.lasts_s, 's')}) allows {current} at "
        f"{format_quantity(found.voltage_V, 'V')}"
    ), ()


def _other_capacitor(case: Case, known: Device, farad: float) -> tuple[Fit, ...]:
    """Return what is fitted where a capacitor gets another value: the part it stands for, none where a remedy added it."""
    element = case.bench.element_of.get(known.name)
    parts = () if element is None else case.board.elements[element].parts
    return tuple(Fit(case.board.parts[index].id, farad) for index in parts)


def _peak_remedy(case: Case, peak: Peak, asked: Peak, before_A: float, output_V: float | None) -> Remedy:
    """Return the capacitor that lets the peak pass and keeps loop and pass device safe, else the sense resistance."""
    ends = places(case.circuit).get(BASE_EMITTER)
    known = _base_capacitor(case.circuit)
    if ends is not None:
        least_F = max(_by_hand_F(case, asked), known.model["C"] * 1.01 if known is not None else 0.0)
        for farad in within(min(least_F, MOST_F), MOST_F, "E6"):
            circuit = _slowed(case.circuit, known, ends, farad)
            borne_s = _borne_s(case, circuit, asked, before_A)
            if isinstance(borne_s, str):
                break
            if borne_s >= peak.lasts_s:
                if _calm(case, circuit) and _bears(case, circuit):
                    shunt = ", ".join(case.parts("shunt"))
                    what = f"as {known.name}" if known is not None else f"from base to emitter of {shunt}"
                    fits = (Fit("", farad, nodes=ends),) if known is None else _other_capacitor(case, known, farad)
                    return f"fit {format_quantity(farad, 'F')} {what} ({ends[0]} to {ends[1]})", fits
                break
    sense = sense_of(case)
    now_ohm = 0.0 if sense is None else sense.part_ohm(sense.now_ohm)
    for value_ohm in reversed(within(LEAST_SENSE * now_ohm, now_ohm, "E24")) if now_ohm > 0.0 else ():
        factor = value_ohm / now_ohm
        if sense is not None and meets(_at_output(case, output_V, factor=factor), peak.current_A, None):
            return fit_sense(case, sense, value_ohm, factor)
    neither = "neither a capacitor at the shunt's base nor a smaller sense resistance does"
    return f"{neither}: the drive gives out before the peak", ()


def _borne_s(case: Case, circuit: Circuit, asked: Peak, before_A: float) -> float | str:
    return ride_through(
        circuit,
        case.limits.ambient_degC,
        peak_A=asked.current_A,
        lasts_s=asked.lasts_s,
        before_A=before_A,
        output_V=asked.output_V,
        short=case.solution.short,
    )


def _by_hand(case: Case, asked: Peak, before_A: float, carries_A: float) -> Iterator[WorkingLine]:
    """Yield the RC formula's delay where there is an RC at the shunt's base."""
    R, slowing = _into_the_base(case.circuit), _base_capacitor(case.circuit)
    if R is None or slowing is None:
        return
    C = slowing.model["C"]
    delay_s = rc_delay(R, C, before_A / carries_A, asked.current_A / carries_A)
    yield WorkingLine(
        "delay by the RC alone", f"{format_quantity(R, 'ohm')}, {format_quantity(C, 'F')}, by hand", delay_s, "s", BY_HAND
    )


def _by_hand_F(case: Case, asked: Peak) -> float:
    """Return a capacitance well below what the RC formula asks for at the shunt's base, to begin the search with."""
    R = _into_the_base(case.circuit) or 1e3
    longest_s = rc_delay(max(R, 1.0), 1.0, 0.0, asked.current_A / (case.solution.currents[1].carries_A or asked.current_A))
    return max(1e-9, 0.1 * asked.lasts_s / longest_s)


def _into_the_base(circuit: Circuit) -> float | None:
    """Return the resistance (ohm) that a capacitor at the shunt's base is charged through: the base stop, in parallel with
    the other leg of a divider; None where there is no base stop."""
    stop = base_stop(circuit)
    base = next((one.nodes[1] for one in circuit.devices if one.name in circuit.shunt), None)
    legs = [one.model["R"] for one in circuit.devices if one.kind == "resistor" and base in one.nodes]
    return None if stop is None else 1.0 / sum(1.0 / max(ohm, LINK_OHM) for ohm in legs)


def _at_output(case: Case, output_V: float | None, *, factor: float = 1.0) -> Solution:
    """Return the solution at an output voltage, with the sense resistance multiplied by a factor."""
    if factor == 1.0 and output_V == case.circuit.output_V:
        return case.solution
    there = case.changed(replace(case.circuit, output_V=output_V), case.solution)
    return resolve(there, factor) if factor != 1.0 else solve_again(there, there.circuit)


def _base_capacitor(circuit: Circuit) -> Device | None:
    """Return the capacitor from base to emitter of the shunt, None where there is none."""
    ends = places(circuit).get(BASE_EMITTER)
    capacitors = (device for device in circuit.devices if device.kind == "capacitor")
    return next((device for device in capacitors if ends is not None and set(device.nodes) == set(ends)), None)


def _slowed(circuit: Circuit, known: Device | None, ends: tuple[str, str], farad: float) -> Circuit:
    if known is not None:
        return _with_value(circuit, known.name, farad)
    return replace(circuit, devices=(*circuit.devices, Device(FITTED, "capacitor", ends, {"C": farad})))


def _with_value(circuit: Circuit, name: str, farad: float) -> Circuit:
    devices = tuple(replace(device, model={"C": farad}) if device.name == name else device for device in circuit.devices)
    return replace(circuit, devices=devices)


def _calm(case: Case, circuit: Circuit) -> bool:
    """Tell whether a changed circuit's loop would give no finding."""
    loop = solve_loop(circuit, case.limits.ambient_degC, short=case.solution.short)
    if not isinstance(loop, Loop) or loop.own_damping is None or loop.worst is None:
        return False
    return loop.own_damping >= case.threshold("loop-undamped", "warning") and not loop.can_grow


def _bears(case: Case, circuit: Circuit) -> bool:
    """Tell whether the pass devices of a changed circuit would stay inside their safe areas, as far as those are known."""
    step = solve_step(circuit, case.limits.ambient_degC, short=case.solution.short)
    return isinstance(step, Step) and step.settles and not too_much(case, step)
