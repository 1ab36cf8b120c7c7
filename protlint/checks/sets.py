"""Do limiters that belong together agree: the two halves of an output stage, and like channels."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from statistics import median_low

from protlint.checks.board_case import BoardAnswer, BoardCase, Unanswered
from protlint.checks.case import ALL_ASSUMPTIONS, DRAWN, Case
from protlint.checks.likeness import (
    Change,
    Spot,
    Values,
    change,
    differing,
    plain,
    to_fit,
    usual,
    usual_A,
    usual_holds_A,
    values_of,
    with_values,
)
from protlint.checks.sizing import meets
from protlint.findings import Finding, NotChecked, WorkingLine
from protlint.quantities import format_quantity
from protlint.quantities.series import within
from protlint.solve.answers import solve
from protlint.solve.solution import Pair, Solution

LEAST_CHANNELS = 3
"""Two channels that differ do not tell which of them is odd."""

COMPARED = {
    "holds": ("holds", "hold"),
    "carries": ("carries", "carry"),
    "most": ("passes at most", "pass at most"),
}
"""The currents of halves and of like channels that are compared, in this order, with how one has it and several do; a
divider's leg to ground shows at the working output only."""

REACH = 1.1
"""How far around the sense resistance that goes as 1 / R preferred values are tried; the solved circuit decides."""


@dataclass(frozen=True, slots=True)
class Figure:
    """One of :data:`COMPARED` of a limiter at the usual ambient: as drawn, and from its low to its high end."""

    ambient_degC: float
    usual_A: float
    range_A: Pair


def halves_unequal(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield a finding where the two polarities of an output stage hold currents that no tolerance brings together."""
    check = "halves-unequal"
    for ids in whole.found.pairs:
        halves = [(has, case) for case in map(whole.cases.__getitem__, ids) if (has := _figure(case.solution, "holds"))]
        if len(halves) < len(ids):
            yield from (Unanswered(name, NotChecked(check, f"what {' and '.join(ids)} hold, solved")) for name in ids)
            continue
        (_, low), (_, high) = sorted(halves, key=lambda half: half[0].usual_A)
        apart = _first_apart(low, low.solution, high, low.threshold(check, "difference"))
        if apart is not None:
            yield _halves(apart, low, high)


def channels_unequal(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield a finding for each of three or more like limiters with a value other than most that carries another current."""
    for ids in whole.found.sets:
        if len(ids) >= LEAST_CHANNELS:
            cases = [whole.cases[name] for name in ids]
            values = [values_of(case) for case in cases]
            odd = _odd_spots(values)
            for place, spots in enumerate(odd):
                if spots:
                    yield from _channel(cases, values, odd, place)


def _figure(solution: Solution, figure: str) -> Figure | None:
    row = usual(solution.currents)
    usual_A, range_A = (None, None) if row is None else (getattr(row, f"{figure}_A"), getattr(row, f"{figure}_range_A"))
    return Figure(row.ambient_degC, usual_A, range_A) if row is not None and usual_A and range_A is not None else None


def _first_apart(one: Case, solved: Solution, other: Case, most: float) -> str | None:
    """Return the first of :data:`COMPARED` that lies apart in two halves, the one as ``solved``, the other as drawn.

    Halves whose outputs or supplies do not mirror each other's are compared by what they hold only.
    """
    for figure in COMPARED if _mirrored(one, other) else ("holds",):
        mine, its = _figure(solved, figure), _figure(other.solution, figure)
        if mine is not None and its is not None and _apart(mine, its, most):
            return figure
    return None


def _mirrored(one: Case, other: Case) -> bool:
    """Tell whether two halves work at opposite output voltages, or both at none that is stated, within opposite supplies."""
    mine_V, its_V = one.needs.output_V, other.needs.output_V
    low_V, high_V = other.circuit.output_reach_V
    at_opposite = mine_V == its_V if mine_V is None or its_V is None else mine_V == -its_V
    return at_opposite and one.circuit.output_reach_V == (-high_V, -low_V)


def _apart(one: Figure, other: Figure, most: float) -> bool:
    """Tell whether a current of two limiters lies more than a share of the smaller apart, with a gap between the ranges."""
    gap = max(one.range_A[0], other.range_A[0]) > min(one.range_A[1], other.range_A[1])
    return gap and max(one.usual_A, other.usual_A) > (1.0 + most) * min(one.usual_A, other.usual_A)


def _halves(figure: str, one: Case, other: Case) -> Finding:
    (low, low_has), (high, high_has) = sorted(
        ((case, has) for case in (one, other) if (has := _figure(case.solution, figure))), key=lambda half: half[1].usual_A
    )
    changed, changes = _what_mends(figure, high, low)
    verb, _ = COMPARED[figure]
    unlike = [one for case, beside in ((high, low), (low, high)) for one in _unlike(case, beside)]
    ratio = high_has.usual_A / low_has.usual_A - 1.0
    lines = []
    for case, its in ((high, high_has), (low, low_has)):
        lines.append(WorkingLine(f"{figure}, {case.limiter.id}", f"as drawn at {its.ambient_degC:g} degC", its.usual_A, "A"))
        for end, value_A in zip(("low", "high"), its.range_A, strict=True):
            lines.append(WorkingLine(f"its {end} end", "every tolerance at its worst", value_A, "A"))
    lines.append(WorkingLine("difference", "of the usual values, over the smaller", ratio, ""))
    parts = [part for one in unlike for part in one.parts]
    return changed.finding(
        "halves-unequal",
        f"{high.limiter.id} {verb} {format_quantity(high_has.usual_A, 'A')}, the other half, {low.limiter.id}, "
        f"{format_quantity(low_has.usual_A, 'A')}: {format_quantity(ratio, '%')} apart, more than tolerance makes up for",
        parts=tuple(dict.fromkeys((*parts, *(part for case in (high, low) for part in case.parts("sense", "shunt"))))),
        working=tuple(lines),
        remedy=to_fit(changes)
        if changes
        else "no sense resistance of one half brings the two together: compare drives, gains and presets",
        fits=tuple(fit for one in changes for fit in one.fits(changed)),
        assumption=high.assumes(*ALL_ASSUMPTIONS) or low.assumes(*ALL_ASSUMPTIONS),
    )


def _unlike(case: Case, beside: Case) -> tuple[Change, ...]:
    """Return the changes that make a half like the other."""
    return differing(case, values_of(beside), values_of(case))


def _what_mends(figure: str, high: Case, low: Case) -> tuple[Case, tuple[Change, ...]]:
    """Return the half to change and the values that bring it to the other, found by solving it again.

    The larger current comes down where what the board needs allows it: that is the careful side.
    """
    for case, beside in ((high, low), (low, high)):
        for changes in _candidates(figure, case, beside):
            solution = solve(with_values(case, changes), case.limits.ambient_degC)
            most = case.threshold("halves-unequal", "difference")
            solved = _figure(solution, "holds") and _figure(solution, figure)
            if solved and _first_apart(case, solution, beside, most) is None and _meets_needs(case, solution):
                return case, changes
    return high, ()


def _meets_needs(case: Case, solution: Solution) -> bool:
    needs = case.needs
    return (needs.carry_A is None and needs.cap_A is None) or meets(solution, needs.carry_A, needs.cap_A)


def _candidates(figure: str, case: Case, beside: Case) -> Iterator[tuple[Change, ...]]:
    """Yield changes to try: every value as in the other half, then other sense resistances alone."""
    unlike = _unlike(case, beside)
    if unlike:
        yield unlike
    sense = case.limiter.elements["sense"]
    now_ohm = case.board.elements[sense[0]].value
    mine_A, its_A = usual_A(case, figure), usual_A(beside, figure)
    if now_ohm and mine_A and its_A:
        aim_ohm = now_ohm * mine_A / its_A
        for series in ("E12", "E24"):
            for value in sorted(within(aim_ohm / REACH, aim_ohm * REACH, series), key=lambda one: abs(one - aim_ohm)):
                yield tuple(change(case, element, value) for element in sense)


def _odd_spots(values: Sequence[Values]) -> list[tuple[Spot, ...]]:
    """Return for every channel the spots where its values are not those of a strict majority."""
    odd: list[list[Spot]] = [[] for _ in values]
    for spot in sorted({spot for one in values for spot in one}):
        there = [plain(one, spot) for one in values]
        most, count = Counter(there).most_common(1)[0]
        if 2 * count > len(values):
            for place, its in enumerate(there):
                if its != most:
                    odd[place].append(spot)
    return [tuple(one) for one in odd]


def _channel(
    cases: Sequence[Case], values: Sequence[Values], odd: Sequence[tuple[Spot, ...]], place: int
) -> Iterator[BoardAnswer]:
    """Yield what is to be said of a channel with odd values, held against those that are like it in all else."""
    case, check = cases[place], "channels-unequal"
    others = [cases[one] for one in _held_against(values, odd, place)]
    changes = differing(case, values_of(others[0]), odd[place])
    if not changes or any(_asked(case) != _asked(one) for one in others):
        return
    if usual_holds_A(case) is None or all(usual_holds_A(one) is None for one in others):
        yield Unanswered(case.limiter.id, NotChecked(check, f"what {case.limiter.id} and the channels like it hold, solved"))
        return
    apart = _apart_from(case, others, case.threshold(check, "difference"))
    if apart is None:
        return
    figure, its_A, their_A = apart
    one_has, several_have = COMPARED[figure]
    alike = ", ".join(one.limiter.id for one in others)
    lines = []
    for one in changes:
        lines += [
            WorkingLine(f"value of {one.names}", "as drawn", one.now, one.unit),
            WorkingLine("in most channels", f"as in {alike}", one.then, one.unit),
        ]
    lines += [
        WorkingLine(f"{figure}, {case.limiter.id}", "solved as drawn", its_A, "A"),
        WorkingLine(f"{figure}, the others", f"the same, {alike}", their_A, "A"),
    ]
    yield case.finding(
        check,
        f"{'; '.join(one.says() for one in changes)} of {len(cases)} like channels: this one "
        f"{one_has} {format_quantity(its_A, 'A')}, they {several_have} {format_quantity(their_A, 'A')}",
        parts=tuple(part for one in changes for part in one.parts),
        working=tuple(lines),
        remedy=f"unless {case.limiter.id} alone is meant for another carry and cap (state them under [limiter]), "
        f"{to_fit(changes)}",
        fits=tuple(fit for one in changes for fit in one.fits(case)),
        assumption=case.assumes(*DRAWN),
    )


def _apart_from(case: Case, others: Sequence[Case], most: float) -> tuple[str, float, float] | None:
    """Return the first of :data:`COMPARED` that lies more than a share away from the others' median, with the two currents.

    Channels that work at other output voltages are compared by what they hold only.
    """
    alike = all(one.needs.output_V == case.needs.output_V for one in others)
    for figure in COMPARED if alike else ("holds",):
        its_A = usual_A(case, figure)
        solved = [current_A for one in others if (current_A := usual_A(one, figure)) is not None]
        if its_A is not None and solved:
            their_A = median_low(solved)
            if abs(its_A / their_A - 1.0) > most:
                return figure, its_A, their_A
    return None


def _held_against(values: Sequence[Values], odd: Sequence[tuple[Spot, ...]], place: int) -> list[int]:
    """Return the channels to hold an odd one against.

    They have the values of most wherever it has not, and are like it in all else; where there are none, those that have the
    values of most everywhere; else those that have them in the first spot where it has not.
    """
    mine = set(odd[place])
    as_most = [one for one in range(len(values)) if mine.isdisjoint(odd[one])]
    elsewhere = sorted({spot for one in values for spot in one} - mine)
    alike = [one for one in as_most if all(plain(values[one], spot) == plain(values[place], spot) for spot in elsewhere)]
    in_first = [one for one in range(len(values)) if odd[place][0] not in odd[one]]
    return alike or [one for one in as_most if not odd[one]] or in_first


def _asked(case: Case) -> tuple[float | None, ...]:
    """Return what the limits file asks of a limiter's current."""
    return case.needs.carry_A, case.needs.cap_A, case.needs.regulate_A
