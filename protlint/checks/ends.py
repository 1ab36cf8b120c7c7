"""What a limiter comes to at the ends of the stated ranges of its supplies and drive.

The held short is solved with every spread where it gives the most current. What a supply's range does to a part's heat or
voltage need not go that way, so the checks ask these points too, as far as ranges are stated, and judge by the worst.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from protlint.checks.case import Case
from protlint.solve.conditions import Condition
from protlint.solve.corners import DRIVE_ENDS
from protlint.solve.parameters import CircuitError
from protlint.solve.range_ends import Ends, loci_at, range_ends
from protlint.solve.solution import Currents, Point

HELD_MOST = "solved in the held short, every tolerance set for the most"
ON_THE_LOCUS = "solved with the limiter holding at that output voltage, every tolerance set for the most"
"""How the figures of the held short come about; the ends of stated ranges that count follow."""

NOT_SOLVED = "the held short at every ambient, which could not be solved"

WORSE = 1.001
"""A point counts as worse than another where it is by this much."""


@dataclass(frozen=True, slots=True)
class Held:
    """The held short and the locus from there on, at one ambient; at which ends of the stated ranges, None where every
    spread is set for the most current."""

    row: Currents
    locus: tuple[Point, ...]
    ends: Ends | None = None

    @property
    def words(self) -> str:
        """The ends of the stated ranges in words; empty where there are none."""
        return "" if self.ends is None else self.ends.words

    @property
    def short(self) -> Point:
        """The held short."""
        return self.locus[0]


def ends_of(case: Case, *, at: Mapping[str, float] | None = None, on_end: bool = True, off_end: bool = False) -> list[Ends]:
    """Return the combinations of the ends of the stated ranges, the drive's on end and off end among them where asked for;
    a single one, nominal but for ``at``, where none is stated.

    Raises
    ------
    CircuitError : the circuit cannot be solved at all.
    """
    low_is_on = case.solution.on_end != "high"
    drive = [
        name for name, is_on in zip(DRIVE_ENDS, (low_is_on, not low_is_on), strict=True) if (on_end if is_on else off_end)
    ]
    ends, kept = range_ends(case.circuit, at, drive=drive)
    if kept:
        case.assumptions.append(
            f"in the checks, the stated ranges of {', '.join(kept)}, the narrowest, at their usual voltage"
        )
    return list(ends)


def drive_V(case: Case, ends: Ends, *, on: bool) -> float:
    """Return the drive's voltage at its on end or its off end."""
    return ends.high_V if (case.solution.on_end == "high") == on else ends.low_V


def held_shorts(case: Case) -> list[Held]:
    """Return the held short and its locus at every ambient, every spread set for the most current, and with the same spreads
    at every end of the stated ranges; empty where not every ambient could be solved."""
    return case.once("held shorts", lambda: _held_shorts(case))


def _held_shorts(case: Case) -> list[Held]:
    solution = case.solution
    loci = solution.high_locus or tuple((point,) for point in solution.high_short)
    pairs = zip(solution.high_short, loci, strict=False)
    found = [Held(row, (short, *locus[1:])) for row, (short, locus) in case.at_ambients(list(pairs))]
    if not found or solution.short is None:
        return found
    try:
        return found + _at_other_ends(case, solution.short, found)
    except CircuitError as reason:
        case.assumptions.append(f"stated ranges count only as they give the most current: {reason}")
        return found


def _at_other_ends(case: Case, short: str, most: list[Held]) -> list[Held]:
    """Return the held short at every end of the stated ranges; with its locus where the pass devices are put to more voltage
    or power there than in ``most``, the held short of the most current at each ambient."""
    ends = ends_of(case, at=case.solution.corners.get("high", {}))
    if not ends[0].words:
        return []
    places = [(one, held) for one in ends for held in most]
    points = case.under(
        [
            Condition(held.row.ambient_degC, drive_V(case, one, on=True), one.held_V[short], corner=one.corner)
            for one, held in places
        ]
    )
    found: dict[tuple[float, ...], list[Held]] = {}
    worse = []
    for (one, held), point in zip(places, points, strict=True):
        if point is None:
            case.assumptions.append(
                f"no operating point was found in the short at {held.row.ambient_degC:g} degC{one.words}"
            )
            continue
        found.setdefault(one.corner, []).append(Held(held.row, (point,), one))
        if one not in worse and _is_worse(case, point, held.short):
            worse.append(one)
    if worse:
        corners = [one.corner for one in worse]
        for one, loci in zip(
            worse, loci_at(case.circuit, short, case.limits.ambient_degC, corners, case.known), strict=True
        ):
            of_row = dict(zip((held.row for held in most), loci, strict=True))
            found[one.corner] = [replace(held, locus=(held.short, *of_row[held.row][1:])) for held in found[one.corner]]
    return [held for these in found.values() for held in these]


def _is_worse(case: Case, point: Point, than: Point) -> bool:
    """Tell whether any pass device has more across it, or turns more to heat, than at another point."""
    return any(
        abs(value) > WORSE * abs(known)
        for name in case.circuit.pass_devices
        for value, known in (
            (point.states[name].voltage_V, than.states[name].voltage_V),
            (point.states[name].power_W, than.states[name].power_W),
        )
    )


def at_carry(case: Case) -> list[tuple[Point, str]]:
    """Return the working output's points as drawn, at usual ambient: with everything usual, and at every end of the stated
    ranges, said in words; empty where there is none."""
    return case.once("at carry", lambda: _at_carry(case))


def _at_carry(case: Case) -> list[tuple[Point, str]]:
    usual = case.solution.at_carry
    if usual is None:
        return []
    try:
        ends = ends_of(case)
        if not ends[0].words:
            return [(usual, "")]
        ambient_degC = case.limits.ambient_degC[1]
        asked = [Condition(ambient_degC, drive_V(case, one, on=True), usual.output_V, corner=one.corner) for one in ends]
        points = case.under(asked)
    except CircuitError:
        return [(usual, "")]
    way = -1.0 if case.solution.sources else 1.0
    there = [
        (replace(point, output_A=way * point.output_A), one.words)
        for one, point in zip(ends, points, strict=True)
        if point is not None
    ]
    return [(usual, ""), *there]
