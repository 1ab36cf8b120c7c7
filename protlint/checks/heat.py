"""Does anything burn while the limiter holds: the resistors' own heat and voltage against their derated ratings."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from protlint.board.graph import BoardPart, Element
from protlint.board.shares import part_shares
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.checks.derating import derated, share_of
from protlint.checks.ends import HELD_MOST, NOT_SOLVED, ON_THE_LOCUS, WORSE, Held, at_carry, held_shorts
from protlint.findings import Fit, Level, NotChecked, WorkingLine
from protlint.partdata.book import Figure
from protlint.quantities import format_quantity, preferred
from protlint.solve.solution import Point

KNEE_DEGC, ZERO_DEGC = 70.0, 155.0
"""Chip resistors: full dissipation to 70 degC (IEC 60115-1), none left at 155 degC (makers' thick-film chip data sheets)."""

OVERLOAD_TIMES, OVERLOAD_S = 6.25, 5.0
"""Short-time overload of IEC 60115-1, 2.5 times rated voltage for 5 s; from memory."""

COMMON_RATINGS_W = (0.0625, 0.1, 0.125, 0.25, 0.5, 0.75, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 25.0, 50.0, 100.0)
"""Ratings that resistors are sold with; common practice of the trade."""

ANY_BEARS_V = 15.0
"""The least element voltage of any chip resistor size (0201; Yageo chip resistor catalogue): below it none need be known."""


@dataclass(frozen=True, slots=True)
class Rating:
    """A resistor's rated dissipation, its derating line, and the share of it that a derating standard leaves."""

    power: Figure
    knee_degC: float
    zero_degC: float
    share: float = 1.0

    def at_W(self, ambient_degC: float) -> float:
        """Return the dissipation allowed at an ambient: full to the knee, then straight down to the zero point."""
        span = self.zero_degC - self.knee_degC
        left = (self.zero_degC - ambient_degC) / span if span > 0.0 else float(ambient_degC <= self.knee_degC)
        return self.share * self.power.value * min(1.0, max(0.0, left))


@dataclass(frozen=True, slots=True)
class Load:
    """What one resistor bears in one condition at one ambient: its current, and how often its rating that may be there.

    ``how`` is how the current was found; ``times`` is how many times its rating the part bears for as long as the condition
    lasts.
    """

    condition: str
    ambient_degC: float
    current_A: float
    resistance_ohm: float
    times: float = 1.0
    how: str = ""

    @property
    def power_W(self) -> float:
        """Return the dissipation (Joule's law)."""
        return self.current_A**2 * self.resistance_ohm

    @property
    def voltage_V(self) -> float:
        """Return the voltage across the part (Ohm's law)."""
        return abs(self.current_A) * self.resistance_ohm


def sense_resistor_power(case: Case) -> Iterator[Answer]:
    """Yield findings for each part of the sense resistance that takes too much power or voltage."""
    yield from _resistors(case, "sense-resistor-power", case.limiter.elements.get("sense", ()))


def resistor_power(case: Case) -> Iterator[Answer]:
    """Yield findings for each other resistor on the bench that takes too much power or voltage."""
    sense = case.limiter.elements.get("sense", ())
    others = [index for index in dict.fromkeys(case.bench.element_of.values()) if index not in sense]
    yield from _resistors(case, "resistor-power", others)


def _resistors(case: Case, check: str, indices: Iterable[int]) -> Iterator[Answer]:
    for index in sorted(indices):
        element = case.board.elements[index]
        if element.kind != "resistor":
            continue
        for part_index in element.parts:
            part = case.board.parts[part_index]
            loads = list(_loads(case, element, part))
            if not case.at_ambients(case.solution.high_short):
                yield NotChecked(check, NOT_SOLVED)
            elif loads:
                yield from _power(case, check, part, loads)
                yield from _voltage(case, check, part, max(loads, key=lambda load: load.voltage_V))


def _power(case: Case, check: str, part: BoardPart, loads: list[Load]) -> Iterator[Answer]:
    rating = resistor_rating(case, part)
    if rating is None:
        yield NotChecked(check, _rating_key(case, part))
        return
    worst = max(loads, key=lambda load: _ratio(load.power_W, rating.at_W(load.ambient_degC) * load.times))
    allowed_W = rating.at_W(worst.ambient_degC) * worst.times
    level = _level(case, check, _ratio(worst.power_W, allowed_W))
    if level is None and _level(case, check, max(_ratio(one.power_W, rating.at_W(one.ambient_degC)) for one in loads)):
        case.assumptions.append(
            f"{part.id}: {OVERLOAD_TIMES:g} times its rating for {OVERLOAD_S:g} s, from memory of IEC 60115-1"
        )
    if level is not None:
        yield _burns(case, check, part, worst, rating, level)


def resistor_rating(case: Case, part: BoardPart) -> Rating | None:
    """Return a resistor's rating: its own power property, else that of its part data (by part number or footprint)."""
    ratings = part.entry.ratings if part.entry is not None else {}
    knee = ratings["power_at"].value if "power_at" in ratings else KNEE_DEGC
    zero = ratings["zero_at"].value if "zero_at" in ratings else ZERO_DEGC
    share = share_of(case.limits.derating, "resistor", "power")
    if part.values.power_W is not None:
        return Rating(Figure(part.values.power_W, "stated in the netlist"), knee, zero, share)
    power = case.rating(part.id, "power")
    return None if power is None else Rating(power, knee, zero, share)


def _rating_key(case: Case, part: BoardPart) -> str:
    if part.entry is not None:
        return case.rating_key(part.id, "power")
    return f"a POWER property of {part.id}, a FOOTPRINT that names its size, or part data with its ratings.power"


def _loads(case: Case, element: Element, part: BoardPart) -> Iterator[Load]:
    """Yield what a resistor bears in the held short, on the way there where that is more (at the knee of a foldback), and at
    carry; at every ambient and every end of the stated ranges."""
    values_ohm = {index: case.board.parts[index].values.value or 0.0 for index in element.parts}
    names = [name for name, index in case.bench.element_of.items() if index == element.index]
    value_ohm = values_ohm[part.index]
    if not names or value_ohm <= 0.0:
        return
    share = part_shares(element.tree, values_ohm)[part.index].current if len(values_ohm) > 1 else 1.0
    times = overload_times(case)
    for held in held_shorts(case):
        current_A = _current_A(held.short, names) * share
        yield Load("in the held short", held.row.ambient_degC, current_A, value_ohm, times, f"{HELD_MOST}{held.words}")
        most = max(_overloads(case, held), key=lambda point: _current_A(point, names))
        most_A = _current_A(most, names) * share
        if most_A > WORSE * current_A:
            where = f"with the output at {format_quantity(most.output_V, 'V')}"
            yield Load(where, held.row.ambient_degC, most_A, value_ohm, times, f"{ON_THE_LOCUS}{held.words}")
    for carried, ends in at_carry(case):
        current_A = _current_A(carried, names) * share
        carry_A = case.needs.carry_A
        if carry_A is not None and element.index in case.limiter.elements.get("sense", ()) and carried.output_A > carry_A:
            current_A *= carry_A / carried.output_A
        for row in case.solution.currents:
            yield Load("at carry", row.ambient_degC, current_A, value_ohm, how=f"solved at carry, as drawn{ends}")


def _overloads(case: Case, held: Held) -> list[Point]:
    """Return the held short and the points of its locus no farther from it than the stated working output: an overload, be
    it as hard as a short or not, leaves the output between the two."""
    short_V, output_V = held.short.output_V, case.needs.output_V
    far_V = math.inf if output_V is None else abs(output_V - short_V)
    return [held.short, *(point for point in held.locus[1:] if abs(point.output_V - short_V) <= far_V)]


def overload_times(case: Case) -> float:
    """Return how many times its rating a resistor bears for as long as the short lasts."""
    return OVERLOAD_TIMES if case.lasts_s <= OVERLOAD_S else 1.0


def _current_A(point: Point, names: list[str]) -> float:
    return max((abs(point.states[name].current_A) for name in names if name in point.states), default=0.0)


def _ratio(value: float, allowed: float) -> float:
    if allowed > 0.0:
        return value / allowed
    return math.inf if value > 0.0 else 0.0


def _level(case: Case, check: str, ratio: float) -> Level | None:
    if ratio > case.threshold(check, "error"):
        return "error"
    return "warning" if ratio > case.threshold(check, "warning") else None


def _burns(case: Case, check: str, part: BoardPart, load: Load, rating: Rating, level: Level) -> Answer:
    ambient = format_quantity(load.ambient_degC, "degC")
    allowed_W = rating.at_W(load.ambient_degC) * load.times
    how = f"full to {rating.knee_degC:g} degC, none at {rating.zero_degC:g} degC"
    source = "IEC 60115-1"
    if load.times != 1.0:
        source += ", its overload test from memory"
        how += f", {load.times:g} times that for no more than {OVERLOAD_S:g} s"
    share = f", {format_quantity(_ratio(load.power_W, allowed_W), '%')} of the" if allowed_W > 0.0 else "; the rating leaves"
    remedy, fits = _bigger(case, check, part, load, rating)
    return case.finding(
        check,
        f"{part.id} takes {format_quantity(load.power_W, 'W')} {load.condition} at {ambient}{share} "
        f"{format_quantity(allowed_W, 'W')} it may take there",
        parts=(part.id,),
        working=(
            WorkingLine("current", load.how, load.current_A, "A"),
            WorkingLine(
                "power",
                f"({format_quantity(load.current_A, 'A')})^2 * {format_quantity(load.resistance_ohm, 'ohm')}",
                load.power_W,
                "W",
                "Joule's law",
            ),
            WorkingLine("rating", "at its knee or below", rating.power.value, "W", _source(case, rating.power.source)),
            WorkingLine(f"allowed at {ambient}", how, allowed_W, "W", source),
        ),
        remedy=remedy,
        fits=fits,
        level=level,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
        subject=part.id,
    )


def _source(case: Case, source: str, quantity: str = "power") -> str:
    return derated(case.limits.derating, "resistor", quantity, source)


def rating_to_fit_W(power_W: float, rating: Rating, ambient_degC: float, share: float, times: float = 1.0) -> float | None:
    """Return the next rating sold whose part stays below a share of what it may take; None where none may take anything."""
    left = rating.at_W(ambient_degC) * times / rating.power.value
    if left <= 0.0:
        return None
    needed_W = power_W / (left * share)
    return next((sold for sold in COMMON_RATINGS_W if sold >= needed_W), preferred(needed_W, "E6", "up"))


def _bigger(case: Case, check: str, part: BoardPart, load: Load, rating: Rating) -> tuple[str, tuple[Fit, ...]]:
    """Return the rating to fit: the next one sold that stays below the warning threshold at that ambient."""
    sold_W = rating_to_fit_W(load.power_W, rating, load.ambient_degC, case.threshold(check, "warning"), load.times)
    if sold_W is None:
        return f"fit a resistor that may dissipate at {format_quantity(load.ambient_degC, 'degC')} as {part.id}", ()
    fit = f"fit {format_quantity(load.resistance_ohm, 'ohm')} rated {format_quantity(sold_W, 'W')} as {part.id}"
    return fit, (Fit(part.id, load.resistance_ohm, sold_W),)


def _voltage(case: Case, check: str, part: BoardPart, load: Load) -> Iterator[Answer]:
    """Yield a finding where the voltage across a resistor passes what its element bears."""
    share = share_of(case.limits.derating, "resistor", "voltage")
    lowest = case.threshold(check, "warning") * share * ANY_BEARS_V
    stated = part.values.voltage_V
    rating = Figure(stated, "stated in the netlist") if stated is not None else case.rating(part.id, "voltage_max")
    if rating is None:
        if load.voltage_V > lowest:
            yield NotChecked(check, _voltage_key(case, part))
        return
    ratio = load.voltage_V / (share * rating.value)
    level = _level(case, check, ratio)
    if level is None:
        return
    needed_V = preferred(load.voltage_V / (share * case.threshold(check, "warning")), "E24", "up")
    yield case.finding(
        check,
        f"{part.id} has {format_quantity(load.voltage_V, 'V')} across it {load.condition} at "
        f"{format_quantity(load.ambient_degC, 'degC')}, {format_quantity(ratio, '%')} of what its element may bear",
        parts=(part.id,),
        working=(
            WorkingLine("current", load.how, load.current_A, "A"),
            WorkingLine(
                "voltage",
                f"{format_quantity(load.current_A, 'A')} * {format_quantity(load.resistance_ohm, 'ohm')}",
                load.voltage_V,
                "V",
                "Ohm's law",
            ),
            WorkingLine(
                "it may bear", "element voltage", share * rating.value, "V", _source(case, rating.source, "voltage")
            ),
        ),
        remedy=f"fit a resistor rated {format_quantity(needed_V, 'V')} or more as {part.id}, or two in series",
        level=level,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
        subject=f"{part.id} voltage",
    )


def _voltage_key(case: Case, part: BoardPart) -> str:
    if part.entry is not None:
        return case.rating_key(part.id, "voltage_max")
    return f"a VOLTAGE property of {part.id}, a FOOTPRINT that names its size, or part data with its ratings.voltage_max"
