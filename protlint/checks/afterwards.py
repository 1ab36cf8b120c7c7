"""What comes of a remedy: the board with other values fitted is judged again before they are advised."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

from protlint.board.graph import BoardPart
from protlint.board.shares import merged_resistance
from protlint.checks.asking import ask
from protlint.checks.case import Case
from protlint.checks.let_through import LATE
from protlint.checks.table import CHECKS
from protlint.checks.timing import PEAKS
from protlint.findings import LEVELS, Finding, Fit
from protlint.quantities import format_quantity
from protlint.solve.answers import solve
from protlint.solve.bench import build_bench
from protlint.solve.circuit import Device
from protlint.solve.dynamics import with_dynamics

MOST_TOLD = 2
"""Of more remedies that another remedy asks for, only the checks are named."""

POWER_CHECKS = ("sense-resistor-power", "resistor-power")

ADVISED = ("compensation-absent", "loop-undamped")
"""Checks whose remedy is worked out only where they find something worth telling, and is the same of both."""

SHAPED = (*ADVISED, PEAKS, LATE)
"""All that a capacitor changes: it carries no steady current, so that every operating point stays where it is."""

UNRATED_W = {True: 1e-9, False: 0.1}
"""Stand for the rating of a resistor that states none, so that the rating it needs is found: of a sense resistor any, of
another one that is more than the small ones have."""


def foretold(case: Case, findings: Sequence[Finding], before: Sequence[Finding]) -> list[Finding]:
    """Return some findings of a limiter with remedies that say what rating a new value needs, and what else it asks for.

    ``before`` is all that was found of the limiter as drawn.
    """
    return [_foretold(case, one, before) if one.remedy and _changes(case, one) else one for one in findings]


def told_once(findings: Sequence[Finding]) -> list[Finding]:
    """Return findings where of two on one limiter's loop the graver alone tells the remedy, which is that of both."""
    tells: dict[str | None, str] = {}
    of_loops = [one for one in findings if one.check in ADVISED and one.remedy]
    for one in sorted(of_loops, key=lambda one: (_rank(one), -ADVISED.index(one.check))):
        tells.setdefault(one.limiter, one.check)
    return [
        replace(one, remedy=f"see {tells[one.limiter]}, whose remedy does for both")
        if one.check in ADVISED and one.remedy and tells[one.limiter] != one.check
        else one
        for one in findings
    ]


def _changes(case: Case, finding: Finding) -> bool:
    """Tell whether a remedy gives a part another value or adds one, not a rating alone."""
    return any(fit.nodes or fit.value != case.part(fit.part).values.value for fit in finding.fits)


def _foretold(case: Case, finding: Finding, findings: Sequence[Finding]) -> Finding:
    shapes = all(fit.nodes or case.part(fit.part).kind == "capacitor" for fit in finding.fits)
    changed = shaped(case, finding.fits) if shapes else fitted(case, finding.fits)
    if changed is None:
        return finding
    asked_of = SHAPED if shapes else tuple(CHECKS)
    after, _ = ask(changed, asked_of)
    if any(one.check in ADVISED and one.level != "note" for one in after):
        after, _ = ask(_advised(changed), asked_of)
    own = {fit.part for fit in finding.fits}
    burns = [one for one in after if one.check in POWER_CHECKS and own.issuperset(one.parts) and one.fits]
    smaller = any(fit.part and fit.value < (case.part(fit.part).values.value or 0.0) for fit in finding.fits)
    before = {(one.check, one.parts, one.subject): one for one in findings}
    asked: dict[str, list[str]] = {}
    for one in after:
        known = before.get((one.check, one.parts, one.subject))
        worse = known is None or _rank(one) < _rank(known) or (smaller and one.remedy != known.remedy)
        if one.remedy and one not in burns and one.level != "note" and one.check != finding.check and worse:
            asked.setdefault(one.remedy, []).append(one.check)
    return replace(finding, remedy=f"{finding.remedy}{rated(burns, finding.fits)}{_also(asked)}")


def _also(asked: Mapping[str, Sequence[str]]) -> str:
    """Tell what else comes of a value: each remedy with its checks, of many the checks alone."""
    if len(asked) > MOST_TOLD:
        return f"; then also {', '.join(dict.fromkeys(check for checks in asked.values() for check in checks))} come up"
    told = (f"{', '.join(dict.fromkeys(checks))}: {remedy}" for remedy, checks in asked.items())
    return f"; then also {'; and '.join(told)}" if asked else ""


def rated(burns: Sequence[Finding], fits: Sequence[Fit]) -> str:
    """Return the rating that the parts fitted need, where it is more than they have; of equal ones the greatest."""
    needed_W: dict[str, float] = {}
    for fit in (fit for one in burns for fit in one.fits):
        needed_W[fit.part] = max(needed_W.get(fit.part, 0.0), fit.power_W or 0.0)
    if not needed_W:
        return ""
    if len({fit.value for fit in fits}) == 1:
        return f", {'each ' if len(fits) > 1 else ''}rated {format_quantity(max(needed_W.values()), 'W')}"
    return "".join(f", {part} rated {format_quantity(power_W, 'W')}" for part, power_W in needed_W.items())


def fitted(case: Case, fits: Iterable[Fit]) -> Case | None:
    """Return the case of the same limiter with parts of other values, solved; None where it cannot be solved.

    How to calm its loop is left out: that takes longer than all the rest, and nothing is told of a note.
    """
    sense, parts = case.parts("sense"), list(case.board.parts)
    changed = {case.part(fit.part).index: fit.value for fit in fits}
    for index, value in changed.items():
        parts[index] = _with_value(parts[index], value, parts[index].id in sense)

    def ohms(index: int) -> float:
        return parts[index].values.value or 0.0

    elements = [
        one if changed.keys().isdisjoint(one.parts) else replace(one, value=merged_resistance(one.tree, ohms))
        for one in case.board.elements
    ]
    board = replace(case.board, parts=tuple(parts), elements=tuple(elements))
    bench = build_bench(board, case.limiter, limits=case.limits, needs=case.needs)
    if bench.circuit is None:
        return None
    ambients_degC = case.limits.ambient_degC
    solution = solve(bench.circuit, ambients_degC, memo=case.solved)
    if solution.not_solved is not None:
        return None
    solution = with_dynamics(bench.circuit, solution, ambients_degC, advised=False, memo=case.solved)
    return replace(case, board=board, bench=bench, solution=solution, assumptions=[], advised=False)


def shaped(case: Case, fits: Iterable[Fit]) -> Case:
    """Return the case of the same limiter with other capacitors: its currents as they are, loop and step anew."""
    value = {name: fit.value for fit in fits if fit.part for name in case.devices_of(fit.part)}
    devices = [
        replace(one, model={"C": value[one.name]}) if one.name in value else one
        for one in case.circuit.devices
        if value.get(one.name) != 0.0
    ]
    devices += [
        Device(f"the capacitor from {' to '.join(fit.nodes)}", "capacitor", fit.nodes, {"C": fit.value})
        for fit in fits
        if fit.nodes
    ]
    circuit, ambients_degC = replace(case.circuit, devices=tuple(devices)), case.limits.ambient_degC
    solution = case.solved.recall(circuit, ambients_degC)
    if solution is None:
        currents = replace(case.solution, loop=None, loop_needs=(), step=None, step_needs=(), advice=None)
        solution = with_dynamics(circuit, currents, ambients_degC, advised=False, memo=case.solved)
    return replace(case.changed(circuit, solution), assumptions=[], advised=False)


def _advised(case: Case) -> Case:
    """Return a case with the advice that was left out."""
    solution = with_dynamics(case.circuit, case.solution, case.limits.ambient_degC, memo=case.solved)
    return replace(case, solution=solution, advised=True)


def _with_value(part: BoardPart, value: float, sense: bool) -> BoardPart:
    """Return a resistor with another value; one whose rating nobody knows with next to none, or that of a small one."""
    known = part.values.power_W is not None or (part.entry is not None and "power" in part.entry.ratings)
    power_W = part.values.power_W if known else UNRATED_W[sense]
    return replace(part, values=replace(part.values, value=value, power_W=power_W))


def _rank(finding: Finding) -> int:
    return LEVELS.index(finding.level) if finding.level is not None else len(LEVELS)
