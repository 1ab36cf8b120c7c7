"""Does the load start, and stay started: its line against the locus, and what a load's capacitance asks of the limiter.

With the output d volts from the short, the load takes I_load(d) and the limiter gives I_lim(d) at most. The output moves on
while I_lim(d) > I_load(d); it stays where they are equal. A load line that meets the locus below the working point locks
the output there. Load lines: a resistance, V / R; a constant current; and a lamp, whose filament takes V / R_cold while
cold and I (V / V_0)^0.55 when it has settled at V (lamp makers' rule, from memory). What it has settled at decides: a
filament colder than that still warms up.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.ends import ends_of
from protlint.checks.sizing import meets, solve_again, with_resistance
from protlint.findings import Fit, NotChecked, Remedy, WorkingLine
from protlint.limits import LimiterLimits
from protlint.quantities import format_quantity, within
from protlint.solve.circuit import Circuit
from protlint.solve.parameters import CircuitError
from protlint.solve.range_ends import loci_at
from protlint.solve.solution import Point, Solution

CHECK = "foldback-locks-out"

LAMP_EXPONENT = 0.55
"""A tungsten filament's current goes as this power of its voltage; lamp makers' rule, from memory."""

MOST_TIMES = 20.0
"""By how much a preset's leg is raised at most."""

LEAST_SHARE = 0.5
"""To which share a sense resistance is lowered at most."""

STEPS = 200
BENDS = 0.95
"""A limit that falls below this share of that at the working point follows the output."""


@dataclass(frozen=True, slots=True)
class Line:
    """What the limiter gives at a distance from the short: rising distances in volts, currents in ampere."""

    distance_V: tuple[float, ...]
    current_A: tuple[float, ...]

    def at_A(self, distance_V: float) -> float:
        """Return the current at a distance, straight between points, level outside them."""
        place = bisect_right(self.distance_V, distance_V)
        if place == 0:
            return self.current_A[0]
        if place == len(self.distance_V):
            return self.current_A[-1]
        low_V, high_V = self.distance_V[place - 1 : place + 1]
        low_A, high_A = self.current_A[place - 1 : place + 1]
        return low_A + (high_A - low_A) * (distance_V - low_V) / (high_V - low_V)


@dataclass(frozen=True, slots=True)
class Least:
    """The limiter at its least: at one ambient, with the stated ranges at the ends that ``words`` tell; how far from the
    short the output then works."""

    ambient_degC: float
    words: str
    working_V: float
    line: Line


@dataclass(frozen=True, slots=True)
class StartUp:
    """How the output comes up into the load's capacitance: whether it does, how long that takes, what the pass devices take
    meanwhile altogether, and the greatest of their power."""

    starts: bool
    lasts_s: float | None
    pass_energy_J: float | None
    pass_peak_W: float | None


def foldback_locks_out(case: Case) -> Iterator[Answer]:
    """Yield a finding where the load line meets the locus below the working point."""
    if not follows_the_output(case):
        return
    needs = case.needs
    missing = _missing(case)
    if missing is not None:
        yield NotChecked(CHECK, missing)
        return
    lines = _least_lines(case)
    if not lines:
        yield NotChecked(CHECK, "the locus with every tolerance set for the least, which could not be solved")
        return
    found = []
    for one in lines:
        stuck_V = meets_at_V(one.line, needs, one.working_V)
        if stuck_V is not None:
            found.append((stuck_V, one))
    if not found:
        return
    stuck_V, worst = min(found, key=lambda pair: pair[0])
    line, working_V = worst.line, worst.working_V
    load_A, gives_A = load_A_at(needs, stuck_V, working_V), line.at_A(stuck_V)
    where = "in the short" if stuck_V < working_V / STEPS else f"{format_quantity(stuck_V, 'V')} from the short"
    remedy, fits = _remedy(case, line, working_V)
    yield case.finding(
        CHECK,
        f"the load locks the output out: {where} it takes "
        f"{format_quantity(load_A, 'A')} and the limiter gives {format_quantity(gives_A, 'A')} at "
        f"{format_quantity(worst.ambient_degC, 'degC')}; the output works at {format_quantity(working_V, 'V')}",
        parts=case.parts("preset", "sense", "shunt"),
        working=(
            WorkingLine("the limiter gives", f"solved there, every tolerance set for the least{worst.words}", gives_A, "A"),
            WorkingLine("the load takes", _formula(needs, working_V), load_A, "A"),
            WorkingLine("the limiter gives in the short", "the same", line.current_A[0], "A"),
            WorkingLine("the limiter gives at the working output", "the same", line.at_A(working_V), "A"),
        ),
        remedy=remedy,
        fits=fits,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
    )


def follows_the_output(case: Case) -> bool:
    """Tell whether the limit falls towards the short: by design, or as solved."""
    if case.circuit.ground_leg:
        return True
    at_work, short = case.solution.at_carry, case.solution.held_short
    return at_work is not None and short is not None and short.output_A < BENDS * at_work.output_A


def load_A_at(needs: LimiterLimits, distance_V: float, working_V: float) -> float:
    """Return what the load takes at a distance from the short; what is not stated takes nothing."""
    taken = needs.load_current_A or 0.0 if distance_V > 0.0 else 0.0
    if needs.load_ohm is not None and needs.load_cold_ohm is not None:
        settled = working_V / needs.load_ohm * (max(distance_V, 0.0) / working_V) ** LAMP_EXPONENT
        taken += min(settled, distance_V / needs.load_cold_ohm)
    elif needs.load_ohm is not None:
        taken += distance_V / needs.load_ohm
    return taken


def meets_at_V(line: Line, needs: LimiterLimits, working_V: float) -> float | None:
    """Return the least distance from the short, below the working point, at which the load takes what the limiter gives."""
    places = sorted(
        {working_V * step / STEPS for step in range(STEPS)} | {one for one in line.distance_V if one < working_V}
    )
    starts_V = places[1] * 1e-3 if len(places) > 1 else 0.0
    for distance_V in (starts_V, *places[1:]):
        if load_A_at(needs, distance_V, working_V) >= line.at_A(distance_V):
            return distance_V
    return None


def start_up(line: Line, needs: LimiterLimits, working_V: float, pass_V: Sequence[tuple[float, float]]) -> StartUp:
    """Return how the output comes up: t = C dV / (I_lim - I_load), summed from the short to the working point.

    ``pass_V`` are (distance, voltage across the pass device) pairs along the line.
    """
    assert needs.load_capacitance_F is not None
    if meets_at_V(line, needs, working_V) is not None:
        return StartUp(False, None, None, None)
    across = Line(tuple(one for one, _ in pass_V), tuple(volts for _, volts in pass_V))
    step_V = working_V / STEPS
    lasts_s = energy_J = peak_W = 0.0
    for step in range(STEPS):
        here_V = (step + 0.5) * step_V
        gives_A = line.at_A(here_V)
        taken_s = needs.load_capacitance_F * step_V / (gives_A - load_A_at(needs, here_V, working_V))
        power_W = gives_A * across.at_A(here_V)
        lasts_s += taken_s
        energy_J += power_W * taken_s
        peak_W = max(peak_W, power_W)
    return StartUp(True, lasts_s, energy_J, peak_W)


def start_up_of(case: Case) -> StartUp | None:
    """Return how a case's output comes up into its stated capacitance, as drawn at usual ambient; None where not known.

    A figure to tell, at the usual value of everything; the checks heat the pass device for that time at every end.
    """
    needs, short = case.needs, case.solution.short
    if needs.load_capacitance_F is None or needs.output_V is None or short is None or not case.solution.locus:
        return None
    short_V = case.circuit.held[short].usual
    line = _line(case.solution.locus, short_V)
    pass_V = sorted((abs(point.output_V - short_V), _pass_V(case, point)) for point in case.solution.locus)
    working_V = abs(needs.output_V - short_V)
    return start_up(line, needs, working_V, pass_V) if working_V > 0.0 else None


def _pass_V(case: Case, point: Point) -> float:
    return max(abs(point.states[name].voltage_V) for name in case.circuit.pass_devices)


def _line(points: Sequence[Point], short_V: float) -> Line:
    pairs = sorted((abs(point.output_V - short_V), point.output_A) for point in points)
    return Line(tuple(volts for volts, _ in pairs), tuple(amperes for _, amperes in pairs))


def _least_lines(case: Case) -> list[Least]:
    """Return the locus of a solved case at every ambient and every end of the stated ranges, with every other tolerance set
    for the least current."""
    solution, output_V = case.solution, case.needs.output_V
    if solution.short is None or output_V is None:
        return []
    try:
        ends = ends_of(case, at=solution.corners.get("low", {}))
        corners = [one.corner for one in ends]
        loci = loci_at(case.circuit, solution.short, case.limits.ambient_degC, corners, case.known)
    except CircuitError:
        return []
    found = []
    for one, by_ambient in zip(ends, loci, strict=True):
        short_V = one.held_V[solution.short]
        for ambient_degC, points in zip(case.limits.ambient_degC, by_ambient, strict=True):
            if len(points) > 1:
                found.append(Least(ambient_degC, one.words, abs(output_V - short_V), _line(points, short_V)))
    return found


def _missing(case: Case) -> str | None:
    needs = case.needs
    if needs.load_ohm is None and needs.load_current_A is None:
        return case.limits_key("load")
    return case.limits_key("output") if needs.output_V is None else None


def _formula(needs: LimiterLimits, working_V: float) -> str:
    terms = []
    if needs.load_ohm is not None and needs.load_cold_ohm is not None:
        cold, warm = format_quantity(needs.load_cold_ohm, "ohm"), format_quantity(working_V / needs.load_ohm, "A")
        terms.append(f"a lamp: {warm} (V / {format_quantity(working_V, 'V')})^{LAMP_EXPONENT}, at most V / {cold}")
    elif needs.load_ohm is not None:
        terms.append(f"V / {format_quantity(needs.load_ohm, 'ohm')}")
    if needs.load_current_A is not None:
        terms.append(f"a constant {format_quantity(needs.load_current_A, 'A')}")
    return " + ".join(terms)


def _remedy(case: Case, line: Line, working_V: float) -> Remedy:
    """Return the preset's leg, or the sense resistance, with which the load starts and carry and cap are still met, found by
    solving; else by how much the limit has to be raised."""
    for role, down_to, up_to in (("preset.lower", 1.0, MOST_TIMES), ("sense", LEAST_SHARE, 1.0)):
        indices = case.limiter.elements.get(role, ())
        names = tuple(name for name, index in case.bench.element_of.items() if index in indices)
        parts = [part for index in indices for part in case.board.elements[index].parts]
        if len(names) != 1 or len(parts) != 1:
            continue
        now_ohm = case.device(names[0]).model["R"]
        values = within(down_to * now_ohm, up_to * now_ohm, "E24")
        for ohm in sorted((one for one in values if one != now_ohm), key=lambda one: abs(one / now_ohm - 1.0)):
            if _starts(case, with_resistance(case.circuit, names, ohm / now_ohm)):
                name = case.board.parts[parts[0]].id
                return f"fit {format_quantity(ohm, 'ohm')} as {name}", (Fit(name, ohm),)
    places = [working_V * step / STEPS for step in range(1, STEPS)]
    times, at_V = max((load_A_at(case.needs, one, working_V) / max(line.at_A(one), 1e-9), one) for one in places)
    taken = format_quantity(load_A_at(case.needs, at_V, working_V), "A")
    return (
        f"fold back less: the limiter has to give more than {taken} at {format_quantity(at_V, 'V')} from the short, "
        f"{times:.3g} times what it does; or keep the load off until the output is up",
        (),
    )


def _starts(case: Case, circuit: Circuit) -> bool:
    """Tell whether the load starts with a changed circuit that still meets carry and cap."""

    def free(solution: Solution) -> bool:
        lines = _least_lines(case.changed(circuit, solution))
        return bool(lines) and all(meets_at_V(one.line, case.needs, one.working_V) is None for one in lines)

    if not free(case.solution):  # with the corners as they were: most values fall here, at little cost
        return False
    solution = solve_again(case, circuit)
    return free(solution) and meets(solution, case.needs.carry_A, case.needs.cap_A)
