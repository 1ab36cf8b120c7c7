"""Is the limiting loop damped: what its natural frequencies say, which part costs it, and what to fit."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.let_through import too_much
from protlint.findings import Fit, Level, NotChecked, Remedy, WorkingLine
from protlint.quantities import format_quantity, format_ratio
from protlint.solve.advice import AIM, DRIVE_FAR, GREATEST_F, LEAST_F, advise, elsewhere
from protlint.solve.solution import Advice, Loop, Step
from protlint.solve.solution import Fit as Cure

DAMPING = "damping ratio -Re(s) / |s| of the generalised eigenvalues of G + sC"
INJECTION = "R. D. Middlebrook, Int. J. Electronics 38, 1975"


def compensation_absent(case: Case) -> Iterator[Answer]:
    """Yield a finding where no capacitor shapes the loop: a note where the damping is good all the same, else a warning."""
    check = "compensation-absent"
    if case.parts("compensation") or any(device.kind == "capacitor" for device in case.circuit.devices):
        return
    loop = case.solution.loop
    if loop is None or loop.own_damping is None:
        yield from not_known(check, case.solution.loop_needs)
        return
    without = loop.worst_without_wiring
    poor = loop.own_damping < case.threshold(check, "warning") or (without is not None and without.damping < 0.0)
    advice = _advice(case, loop) if poor else None
    remedy, fits = _remedy(case, advice, _cure(case, advice)) if poor else (None, ())
    drawn, worst = said(loop)
    verdict = "is too little" if poor else "is enough"
    little = loop.worst is not None and loop.worst.damping < case.threshold(check, "warning")
    then = f"{', but ' if little and not poor else '; '}{worst}" if worst else ""
    yield case.finding(
        check,
        f"no capacitor shapes the limiting loop; as drawn its damping of {drawn} {verdict}{then}",
        parts=case.parts("shunt"),
        working=tuple(_working(case, loop)),
        remedy=remedy,
        fits=fits,
        level="warning" if poor else "note",
        assumption=rests_on_assumptions(case),
    )


def loop_undamped(case: Case) -> Iterator[Answer]:
    """Yield a finding where the loop rings or oscillates with the parts as drawn, or oscillates within their spread."""
    check = "loop-undamped"
    loop = case.solution.loop
    if loop is not None:
        # capacitors at the output: only fault wiring makes them swing
        yield from (NotChecked(check, f"the value of {part_id}") for part_id in case.bench.unread)
    if loop is None or loop.own_damping is None:
        yield from not_known(check, case.solution.loop_needs)
        return
    level = _level(case, check, loop)
    if level is None:
        return
    advice = _advice(case, loop)
    cure = _cure(case, advice)
    remedy, fits = _remedy(case, advice, cure)
    oscillates = "oscillates" if loop.own_damping < 0.0 else "can oscillate" if loop.can_grow else "rings"
    cause = f"; {advice.costs} costs it" if advice is not None and advice.costs is not None else ""
    yield case.finding(
        check,
        f"the limiting loop {oscillates}: as drawn its damping is {', '.join(filter(None, said(loop)))}{cause}",
        parts=(*case.parts("shunt"), *_costing_parts(case, advice)),
        working=(*_working(case, loop), *_effects(advice), *_delays(advice, cure)),
        remedy=remedy,
        fits=fits,
        level=level,
        assumption=rests_on_assumptions(case),
    )


def said(loop: Loop) -> tuple[str, str]:
    """Return a loop's damping in words, as drawn and at worst; the latter empty where nothing swings there."""
    assert loop.own_damping is not None
    at = (
        f" at {format_quantity(loop.at_Hz, 'Hz')}"
        if loop.at_Hz is not None and loop.own_damping == loop.least_damping
        else ""
    )
    drawn = f"{format_ratio(loop.own_damping)}{at}"
    worst = loop.worst
    if worst is None or worst.ambient_degC is None:
        return drawn, ""
    wiring = f", {format_quantity(worst.wiring_H, 'H')} in the short" if worst.wiring_H else ""
    return drawn, f"at worst it is {format_ratio(worst.damping)} ({format_quantity(worst.ambient_degC, 'degC')}{wiring})"


def not_known(check: str, needs: tuple[str, ...]) -> Iterator[NotChecked]:
    """Yield what keeps a check from being asked, each key by itself."""
    yield from (NotChecked(check, one) for one in needs or ("a held short that can be linearised",))


def rests_on_assumptions(case: Case) -> bool:
    """Tell whether loop and delay rest on something nobody stated: a device's charges, or anything the currents rest on.

    What was assumed of charges is noted with the case.
    """
    assumed = [f"{device.name}: {sentence}" for device in case.circuit.devices for sentence in device.charges_assumed]
    case.assumptions.extend(sentence for sentence in assumed if sentence not in case.assumptions)
    return bool(assumed) or case.assumes(*ALL_ASSUMPTIONS)


def charge_lines(case: Case) -> Iterator[WorkingLine]:
    """Yield where the charges of devices come from that no model states."""
    for device in case.circuit.devices:
        words = [one for one in device.derived if "T_F" in one or "C_" in one] + list(device.charges_assumed)
        if words:
            yield WorkingLine(f"charges of {device.name}", ", ".join(words), None, "", "derived from its data-sheet figures")


def _level(case: Case, check: str, loop: Loop) -> Level | None:
    """Return the level of a badly damped loop: a note where it is only wiring in the short that can make it oscillate."""
    assert loop.own_damping is not None
    without = loop.worst_without_wiring
    if loop.own_damping < case.threshold(check, "error") or (without is not None and without.damping < 0.0):
        return "error"
    if loop.own_damping < case.threshold(check, "warning"):
        return "warning"
    return "note" if loop.can_grow else None


def _working(case: Case, loop: Loop) -> Iterator[WorkingLine]:
    yield WorkingLine(
        "least damping", "of the limiter's own modes at the held short, as drawn", loop.own_damping, "", DAMPING
    )
    if loop.worst is not None:
        yield WorkingLine("worst damping", _where(loop), loop.worst.damping, "", DAMPING)
    if loop.low_frequency_gain is not None:
        at = f"double injection at the base of {', '.join(case.parts('shunt'))}"
        yield WorkingLine("loop gain at low frequency", at, loop.low_frequency_gain, "", INJECTION)
    if loop.crossover_Hz is not None:
        yield WorkingLine(
            "crossover", "last frequency at which the loop gain falls below 1", loop.crossover_Hz, "Hz", INJECTION
        )
        yield WorkingLine("phase margin", "180 deg and the phase there", loop.phase_margin_deg, "deg", INJECTION)
    yield from charge_lines(case)


def _where(loop: Loop) -> str:
    worst = loop.worst
    if worst is None or worst.ambient_degC is None:
        return "every spread, every ambient, every inductance in the short: no mode of the limiter's swings"
    corner = ", ".join(f"{name} {'high' if position > 0.0 else 'low'}" for name, position in worst.corner.items())
    wiring = f"{format_quantity(worst.wiring_H or 0.0, 'H')} in the short"
    return f"{format_quantity(worst.ambient_degC, 'degC')}, {wiring}" + (f", {corner}" if corner else "")


def _effects(advice: Advice | None) -> Iterator[WorkingLine]:
    for effect in advice.effects if advice is not None else ():
        how = f"with {effect.part} bridged" if effect.base_stop else f"without {effect.part}"
        yield WorkingLine(f"worst damping {how}", "solved again", effect.worst_damping, "", DAMPING)


def _delays(advice: Advice | None, cure: Cure | None) -> Iterator[WorkingLine]:
    if advice is None:
        return
    for when, step in (("as drawn", advice.step), ("with the remedy", cure.step if cure is not None else None)):
        if step is not None:
            how = "step into the short, until the current is below 1.1 times holds for good"
            yield WorkingLine(f"delay {when}", how if step.settles else "it does not settle", step.delay_s, "s")


def _advice(case: Case, loop: Loop) -> Advice | None:
    """Return the solution's advice, or work it out where the thresholds ask earlier than it does and the case wants any."""
    if case.solution.advice is not None or not case.advised:
        return case.solution.advice
    found = advise(
        case.circuit,
        case.limits.ambient_degC,
        short=case.solution.short,
        delay=case.solution.step is not None,
        loop=loop,
        step=case.solution.step,
    )
    return found if isinstance(found, Advice) else None


def _costing_parts(case: Case, advice: Advice | None) -> tuple[str, ...]:
    """Return the ids of the parts behind the device that costs the damping, where they are not the shunt's."""
    if advice is None or advice.costs is None:
        return ()
    return _parts_of(case, advice.costs)


def _parts_of(case: Case, device: str) -> tuple[str, ...]:
    """Return the ids of the parts behind a device; none where it is one that a remedy adds."""
    element = case.bench.element_of.get(device)
    return () if element is None else tuple(case.board.parts[index].id for index in case.board.elements[element].parts)


def _cure(case: Case, advice: Advice | None) -> Cure | None:
    """Return the first way to calm the loop that does not make the limiter act too late, another place's if need be, else
    the first."""
    cures = _in_order(advice.fits) if advice is not None else ()
    if not cures:
        return None
    quick = next((cure for cure in cures if not _too_late(case, cure)), None)
    if quick is None and cures[0].instead_of is None:
        others = elsewhere(case.circuit, case.limits.ambient_degC, cures[0].place, short=case.solution.short)
        quick = next((cure for cure in others if not _too_late(case, cure)), None)
    return quick if quick is not None else cures[0]


def _in_order(cures: Sequence[Cure]) -> Sequence[Cure]:
    """Return ways to calm the loop with one first that only takes a capacitor out, where none that fits one does more."""
    return sorted(cures, key=lambda cure: cure.farad is not None or cure != max(cures, key=lambda one: one.worst_damping))


def _too_late(case: Case, cure: Cure) -> bool:
    return cure.step is not None and too_much(case, cure.step)


def _remedy(case: Case, advice: Advice | None, cure: Cure | None) -> Remedy:
    """Return what calms the loop.

    Damping and delay with it are worked out already, and no current changes: only where it is too late, or where a peak must
    pass, is there more to ask of the circuit so changed.
    """
    if advice is None or advice.enough:
        return None, ()
    if cure is None:
        span = f"{format_quantity(LEAST_F, 'F')} to {format_quantity(GREATEST_F, 'F')}"
        return (
            f"none of the usual places does: no capacitor of {span} from collector to base, from the drive to the far end "
            f"or from base to emitter brings the damping to {AIM:g} at worst"
        ), ()
    todo, fits = [], []
    if cure.instead_of is not None:
        todo.append(f"take {cure.instead_of} out")
        fits += [Fit(part, 0.0) for part in _parts_of(case, cure.instead_of)]
    if cure.farad is not None:
        todo.append(f"fit {format_quantity(cure.farad, 'F')} {_place(case, cure)} ({' to '.join(cure.nodes)})")
        fits.append(Fit("", cure.farad, nodes=cure.nodes))
    if case.needs.peak is None and not _too_late(case, cure):
        fits = []
    then = f"damping {format_ratio(cure.own_damping)}, {format_ratio(cure.worst_damping)} at worst"
    return f"{' and '.join(todo)}: {then}{_change(advice.step, cure.step)}", tuple(fits)


def _place(case: Case, cure: Cure) -> str:
    if cure.place == DRIVE_FAR:
        return "from the drive to the far end of the sense resistance"
    return f"from {cure.place} of {', '.join(case.parts('shunt'))}"


def _change(before: Step | None, after: Step | None) -> str:
    """Return in words what a remedy does to the delay."""
    if before is None or after is None:
        return ""
    if before.delay_s == after.delay_s == 0.0:
        return ", and still no delay"
    was, becomes = _delay(before), _delay(after)
    return f"; the delay stays {becomes}" if was == becomes else f"; the delay goes from {was} to {becomes}"


def _delay(step: Step) -> str:
    if step.delay_s is None:
        return "no end"
    return format_quantity(step.delay_s, "s") if step.delay_s > 0.0 else "none"
