"""Is any base-emitter junction driven backwards, and does the shunt's collector junction then conduct more than it may.

Solved with the drive at its off end while the load holds the output at its return; and, where something holds the output up
(a capacitor of some size), with the output at its highest, no load, and the drive at its off end, or every supply at 0 V.
That a supply which is off takes back whatever flows is an assumption: what rests on it alone is no error.
In a push-pull stage the other half keeps the drive near the output: there it is solved with that half at work. Each is
solved at every end of the supplies' and the drive's stated ranges, and the worst counts.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from protlint.checks.case import VOLTAGES, Answer, Case
from protlint.checks.ends import drive_V, ends_of
from protlint.findings import Finding, Level, NotChecked, WorkingLine
from protlint.partdata.book import Figure
from protlint.quantities import format_quantity, preferred
from protlint.solve.conditions import Condition
from protlint.solve.parameters import CircuitError
from protlint.solve.range_ends import Ends
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
    assumed: bool = False


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
        certain = max(solved, key=lambda one: (not one.assumed, _reverse_V(case, one.point, names)))
        found = list(_junction(case, part_id, names, certain))
        is_error = any(isinstance(one, Finding) and one.level == "error" for one in found)
        yield from found if is_error else _junction(case, part_id, names, worst)
    for part_id, names in case.device_parts("shunt"):
        if case.part(part_id).kind.startswith(("npn", "pnp")):
            yield from _collector_junction(case, part_id, names[0], solved)


def _states(case: Case) -> Iterator[Stressed | NotChecked]:
    """Yield the points at which a junction may be driven backwards, each at every end of the stated ranges."""
    short = case.solution.short
    if short is None:
        return
    try:
        ends = ends_of(case, on_end=False, off_end=True)
        if has_other_half(case):
            below_V = _mirrored_V(case)
            yield from _solved(
                case,
                [
                    _asked(
                        case, one, "the other half at work and the output", one.held_V[short], one.held_V[short] - below_V
                    )
                    for one in ends
                ],
            )
            return
        off: list[tuple[str, Condition]] = []
        asked = [_asked(case, one, "the output", one.held_V[short]) for one in ends]
        if case.solution.sources and not _held_up(case):
            if case.needs.load_capacitance_F is None:
                yield NotChecked(CHECK, f"{case.limits_key('load_capacitance')}, which may hold the output up")
        elif case.solution.sources:
            highest_V = _highest_V(case, ends)
            if highest_V is None:
                yield NotChecked(CHECK, case.limits_key("output"))
            else:
                asked += [
                    _asked(case, one, "the output held", output_V, load=" without a load")
                    for one, output_V in zip(ends, highest_V, strict=True)
                ]
                off = [_supplies_off(case, ends, highest_V)]
        yield from _solved(case, asked)
        yield from _solved(case, off, assumed=True)
    except CircuitError as reason:
        yield NotChecked(CHECK, f"the circuit with its drive off: {reason}")


def _supplies_off(case: Case, ends: Sequence[Ends], highest_V: Sequence[float]) -> tuple[str, Condition]:
    """Return the condition that every supply is gone while something still holds the output up, and its words."""
    left_V, charged = max(zip(highest_V, ends, strict=True), key=lambda pair: abs(pair[0]))
    left = f", left by {charged.words.strip(' ()')}" if charged.words and case.needs.output_V is None else ""
    if _returned_by_a_diode(case):
        left_V, left = min(DIODE_DROP_V, abs(left_V)) * (1.0 if left_V >= 0.0 else -1.0), ""
    words = f"with the supplies off and the output held at {format_quantity(left_V, 'V')}{left}"
    return words, Condition(case.limits.ambient_degC[1], 0.0, left_V, supplied=False)


def _asked(
    case: Case, ends: Ends, output: str, output_V: float, off_V: float | None = None, load: str = ""
) -> tuple[str, Condition]:
    """Return a condition with the drive at its off end, or where the other half keeps it, and its words."""
    at_V = drive_V(case, ends, on=False) if off_V is None else off_V
    drive, held = format_quantity(at_V, "V"), format_quantity(output_V, "V")
    words = f"with the drive at {drive} and {output} at {held}{load}{ends.words}"
    return words, Condition(case.limits.ambient_degC[1], at_V, output_V, corner=ends.corner)


def _solved(case: Case, asked: Sequence[tuple[str, Condition]], *, assumed: bool = False) -> Iterator[Stressed | NotChecked]:
    points = case.under([condition for _, condition in asked])
    for (words, _), point in zip(asked, points, strict=True):
        yield (
            Stressed(words, point, assumed)
            if point is not None
            else NotChecked(CHECK, f"the circuit {words}, which was not solved")
        )


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
    """Return how far the drive's voltage lies below the output's while an equal other half holds the short: as far on the
    other side of it as this half's own drops, from base to emitter and across the sense resistance."""
    held = case.solution.held_short
    if held is None:
        return 0.0
    drops = [sum(abs(held.states[name].control_V) for name in names) for _, names in case.device_parts("pass", "driver")]
    sensed = max((abs(held.states[name].voltage_V) for name in case.circuit.sense), default=0.0)
    return (1.0 if case.limiter.polarity == "n" else -1.0) * (sum(drops) + sensed)


def _held_up(case: Case) -> bool:
    """Tell whether enough capacitance hangs at the output to hold it while drive or supply go."""
    held_F = case.circuit.output_capacitance_F + (case.needs.load_capacitance_F or 0.0)
    return held_F >= case.threshold(CHECK, "holds_up")


def _highest_V(case: Case, ends: Sequence[Ends]) -> list[float] | None:
    """Return the highest voltage the output can have at each of some ends: as stated, else what the stage gives with its
    drive on, at the end of that which gives the most, and no load."""
    if case.needs.output_V is not None:
        return [case.needs.output_V] * len(ends)
    drive, on = case.circuit.drive, case.drive_ends_V[1]
    is_high = case.solution.on_end == "high"
    follows = (drive.high_follows if is_high else drive.low_follows) is not None
    most_V = on.high if is_high else on.low
    asked = [(drive_V(case, one, on=True) if follows else most_V, one.corner) for one in ends]
    points = case.under([Condition(case.limits.ambient_degC[1], on_V, None, corner=corner) for on_V, corner in asked])
    found = [point.output_V for point in points if point is not None]
    return found if len(found) == len(ends) else None


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
    anode, cathode = ("emitter", "base") if case.part(part_id).kind.startswith("npn") else ("base", "emitter")
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
        remedy=f"fit a diode of {rated} or more between base and emitter of {part_id}: anode to its {anode} "
        f"({_net(case, names[0], anode)}), cathode to its {cathode} ({_net(case, names[0], cathode)})",
        level=level,
        assumption=worst.assumed or case.assumes(*VOLTAGES),
        subject=part_id,
    )


def _collector_junction(case: Case, part_id: str, name: str, solved: list[Stressed]) -> Iterator[Answer]:
    """Yield a finding where the shunt's collector junction, turned forward, conducts more than base and collector may."""
    sign = 1.0 if case.part(part_id).kind.startswith("npn") else -1.0
    stressed = [(one.point.states[name], one) for one in solved]
    forward = [(state, one) for state, one in stressed if sign * (state.control_V - state.voltage_V) > 0.0]
    found: list[tuple[float, str, float, Figure, State, Stressed]] = []
    for pin, rating_name in (("collector", "ic"), ("base", "ib")):
        currents = [(abs(state.control_A if pin == "base" else state.current_A), state, one) for state, one in forward]
        if not currents or (worst := max(currents, key=lambda row: row[0]))[0] < LEAST_A:
            continue
        current_A, state, at = worst
        may = case.allowed(part_id, rating_name, "current")
        if may is None:
            yield NotChecked(CHECK, case.rating_key(part_id, rating_name))
        elif current_A > may.value:
            found.append((current_A / may.value, pin, current_A, may, state, at))
    if not found:
        return
    _, pin, current_A, may, state, at = max(found, key=lambda row: row[0])
    rated = format_quantity(preferred(max(1.5 * abs(state.voltage_V), 10.0), "E6", "up"), "V")
    net, collector = _net(case, name, "collector"), f"the collector of {part_id}"
    anode, cathode = (net, collector) if sign > 0.0 else (collector, net)
    yield case.finding(
        CHECK,
        f"the collector junction of {part_id} conducts {format_quantity(current_A, 'A')} {at.words}, its {pin} may take "
        f"{format_quantity(may.value, 'A')}",
        parts=(part_id,),
        working=(
            WorkingLine(f"{pin} current", f"solved {at.words}", current_A, "A"),
            WorkingLine("it may take", f"its {pin} current rating", may.value, "A", may.source),
        ),
        remedy=f"fit a diode of {rated} or more in series with {collector}: anode to {anode}, cathode to {cathode}",
        assumption=at.assumed or case.assumes(*VOLTAGES),
        subject=f"{part_id} collector junction",
    )


def _net(case: Case, device: str, terminal: str) -> str:
    """Return the name of the net at a terminal of the part that a device stands for."""
    element = case.board.elements[case.bench.element_of[device]]
    return case.board.nets[element.terminals[terminal]].name
