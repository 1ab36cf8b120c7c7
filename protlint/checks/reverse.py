"""Is any base-emitter junction driven backwards, and does the shunt's collector junction then conduct more than it may.

Solved with the drive at its off end while the load holds the output at its return; and, where something holds the output up
(a capacitor of some size), with the output at its highest, no load, and the drive at its off end, or every supply at 0 V.
In a push-pull stage the other half keeps the drive near the output: there it is solved with that half at work.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from protlint.checks.case import VOLTAGES, Answer, Case
from protlint.findings import Level, NotChecked, WorkingLine
from protlint.partdata.book import Figure
from protlint.quantities import format_quantity, preferred
from protlint.solve.conditions import Condition
from protlint.solve.parameters import CircuitError
from protlint.solve.solution import Point, State

CHECK = "reverse-base-emitter"

DIODE_DROP_V = 1.0
"""What a diode from the output to the supply leaves across itself, at most."""

EMITTER_OHM = 100.0
"""Emitter resistors of output stages are smaller."""

LEAST_A = 1e-6
"""A junction current below this is leakage."""


@dataclass(frozen=True, slots=True)
class Stressed:
    """One condition in words, and its operating point."""

    words: str
    point: Point


def reverse_base_emitter(case: Case) -> Iterator[Answer]:
    """Yield findings for each bipolar transistor of the limiter whose emitter is driven above its base too far, and for a
    shunt whose collector junction then conducts too much."""
    states = list(_states(case))
    yield from (one for one in states if isinstance(one, NotChecked))
    solved = [one for one in states if isinstance(one, Stressed)]
    if not solved:
        return
    for part_id, names in case.device_parts("shunt", "pass", "driver"):
        part = case.part(part_id)
        if not part.kind.startswith(("npn", "pnp")):
            continue
        worst = max(solved, key=lambda one: _reverse_V(case, one.point, names))
        yield from _junction(case, part_id, names, worst)
    for part_id, names in case.device_parts("shunt"):
        if case.part(part_id).kind.startswith(("npn", "pnp")):
            yield from _collector_junction(case, part_id, names[0], solved)


def _states(case: Case) -> Iterator[Stressed | NotChecked]:
    short = case.solution.short
    if short is None:
        return
    short_V = case.circuit.held[short].usual
    off, on = case.drive_ends_V
    try:
        if has_other_half(case):
            yield from _solved(case, f"the other half at work and the output at {short_V:g} V", _mirrored_V(case), short_V)
            return
        off_V = off.low if off.usual < on.usual else off.high
        yield from _solved(case, f"the output at {short_V:g} V", off_V, short_V)
        if not case.solution.sources:
            return
        if not _held_up(case):
            if case.needs.load_capacitance_F is None:
                yield NotChecked(CHECK, f"{case.limits_key('load_capacitance')}, which may hold the output up")
            return
        highest_V = _highest_V(case)
        if highest_V is None:
            yield NotChecked(CHECK, case.limits_key("output"))
            return
        yield from _solved(case, f"the output held at {highest_V:.3g} V without a load", off_V, highest_V)
        if _returned_by_a_diode(case):
            highest_V = min(DIODE_DROP_V, abs(highest_V)) * (1.0 if highest_V >= 0.0 else -1.0)
        yield from _solved(case, f"the output held at {highest_V:.3g} V", 0.0, highest_V, supplied=False)
    except CircuitError as reason:
        yield NotChecked(CHECK, f"the circuit with its drive off: {reason}")


def _solved(
    case: Case, output: str, drive_V: float, output_V: float, *, supplied: bool = True
) -> Iterator[Stressed | NotChecked]:
    words = f"with the drive at {drive_V:g} V and {output}" if supplied else f"with the supplies off and {output}"
    point = case.under([Condition(case.limits.ambient_degC[1], drive_V, output_V, supplied)])[0]
    yield Stressed(words, point) if point is not None else NotChecked(CHECK, f"the circuit {words}, which was not solved")


def has_other_half(case: Case) -> bool:
    """Tell whether a transistor of the other polarity follows the same drive onto the output: a push-pull stage.

    It then keeps the drive from parting with the output by more than its own drops.
    """
    board, output = case.board, case.limiter.nets["output"]
    if output is None or output != case.limiter.nets["far"]:
        return False
    others = ("pnp", "pnp-darlington", "pmos") if case.limiter.polarity == "n" else ("npn", "npn-darlington", "nmos")
    nets = [output]
    for index, _ in board.elements_at[output]:
        element = board.elements[index]
        if element.kind == "resistor" and element.value is not None and element.value < EMITTER_OHM:
            nets += element.terminals.values()
    return any(
        board.elements[index].kind in others and role in ("emitter", "source")
        for net in dict.fromkeys(nets)
        for index, role in board.elements_at[net]
    )


def _mirrored_V(case: Case) -> float:
    """Return the drive's voltage while an equal other half holds the short: as far on the other side of the output as this
    half's own drops, from base to emitter and across the sense resistance."""
    held = case.solution.held_short
    if held is None:
        return 0.0
    drops = [sum(abs(held.states[name].control_V) for name in names) for _, names in case.device_parts("pass", "driver")]
    sensed = max((abs(held.states[name].voltage_V) for name in case.circuit.sense), default=0.0)
    sign = 1.0 if case.limiter.polarity == "n" else -1.0
    return held.output_V - sign * (sum(drops) + sensed)


def _held_up(case: Case) -> bool:
    """Tell whether enough capacitance hangs at the output to hold it while drive or supply go."""
    held_F = case.circuit.output_capacitance_F + (case.needs.load_capacitance_F or 0.0)
    return held_F >= case.threshold(CHECK, "holds_up")


def _highest_V(case: Case) -> float | None:
    """Return the highest voltage the output can have: as stated, else what the stage gives with its drive on and no load."""
    if case.needs.output_V is not None:
        return case.needs.output_V
    off, on = case.drive_ends_V
    on_V = on.high if on.usual > off.usual else on.low
    point = case.under([Condition(case.limits.ambient_degC[1], on_V, None)])[0]
    return None if point is None else point.output_V


def _returned_by_a_diode(case: Case) -> bool:
    """Tell whether a diode returns the output's charge to the supply side of the stage."""
    board, limiter = case.board, case.limiter
    output, load = limiter.nets["output"], limiter.bound.get("load")
    if output is None:
        return False
    power = limiter.nets["far"] if limiter.nets["far"] != output else load
    towards = ("anode", "cathode") if _sources_upwards(case) else ("cathode", "anode")
    for index, role in board.elements_at[output]:
        element = board.elements[index]
        if element.kind == "diode" and role == towards[0] and element.terminals.get(towards[1]) == power:
            return True
    return False


def _sources_upwards(case: Case) -> bool:
    """Tell whether the output is above its return when the stage works."""
    short, circuit = case.solution.short, case.circuit
    assert short is not None
    return max(one.usual for one in circuit.held.values()) > circuit.held[short].usual


def _reverse_V(case: Case, point: Point, names: tuple[str, ...]) -> float:
    """Return how far the emitter lies on the wrong side of the base, the worse of a Darlington part's two devices."""
    return max(-point.states[name].control_V * (1.0 if case.device(name).kind == "npn" else -1.0) for name in names)


def _junction(case: Case, part_id: str, names: tuple[str, ...], worst: Stressed) -> Iterator[Answer]:
    reverse_V = _reverse_V(case, worst.point, names)
    allowed = case.allowed(part_id, "vebo", "voltage")
    if allowed is None:
        if reverse_V > DIODE_DROP_V:
            yield NotChecked(CHECK, case.rating_key(part_id, "vebo"))
        return
    ratio = reverse_V / allowed.value
    if ratio <= case.threshold(CHECK, "warning"):
        return
    level: Level = "error" if ratio > case.threshold(CHECK, "error") else "warning"
    ends = ("emitter", "base") if case.part(part_id).kind.startswith("npn") else ("base", "emitter")
    rated = format_quantity(preferred(reverse_V * 1.5, "E6", "up"), "V")
    yield case.finding(
        CHECK,
        f"the base-emitter junction of {part_id} has {format_quantity(reverse_V, 'V')} in reverse {worst.words}, "
        f"{format_quantity(ratio, '%')} of the {format_quantity(allowed.value, 'V')} it may have",
        parts=(part_id,),
        working=(
            WorkingLine("reverse voltage", f"solved {worst.words}", reverse_V, "V"),
            WorkingLine("it may have", "V_EBO", allowed.value, "V", allowed.source),
        ),
        remedy=f"fit a diode of {rated} or more across it: anode to the {ends[0]} of {part_id}, cathode to its {ends[1]}",
        level=level,
        assumption=case.assumes(*VOLTAGES),
        subject=part_id,
    )


def _collector_junction(case: Case, part_id: str, name: str, solved: list[Stressed]) -> Iterator[Answer]:
    """Yield a finding where the shunt's collector junction, turned forward, conducts more than base and collector may."""
    sign = 1.0 if case.part(part_id).kind.startswith("npn") else -1.0
    forward = [(one.point.states[name], one.words) for one in solved]
    forward = [(state, words) for state, words in forward if sign * (state.control_V - state.voltage_V) > 0.0]
    found: list[tuple[float, str, float, Figure, State, str]] = []
    for pin, rating_name in (("collector", "ic"), ("base", "ib")):
        currents = [(abs(one.control_A if pin == "base" else one.current_A), one, words) for one, words in forward]
        if not currents or (worst := max(currents, key=lambda row: row[0]))[0] < LEAST_A:
            continue
        current_A, state, words = worst
        may = case.allowed(part_id, rating_name, "current")
        if may is None:
            yield NotChecked(CHECK, case.rating_key(part_id, rating_name))
        elif current_A > may.value:
            found.append((current_A / may.value, pin, current_A, may, state, words))
    if not found:
        return
    _, pin, current_A, may, state, words = max(found, key=lambda row: row[0])
    rated = format_quantity(preferred(max(1.5 * abs(state.voltage_V), 10.0), "E6", "up"), "V")
    yield case.finding(
        CHECK,
        f"the collector junction of {part_id} conducts {format_quantity(current_A, 'A')} {words}, its {pin} may take "
        f"{format_quantity(may.value, 'A')}",
        parts=(part_id,),
        working=(
            WorkingLine(f"{pin} current", f"solved {words}", current_A, "A"),
            WorkingLine("it may take", f"its {pin} current rating", may.value, "A", may.source),
        ),
        remedy=f"fit a diode of {rated} or more in series with the collector of {part_id}, the way the shunt conducts",
        assumption=case.assumes(*VOLTAGES),
        subject=f"{part_id} collector junction",
    )
