"""Does anything burn while the limiter holds: the resistors' own heat against their derated ratings."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from protlint.board.graph import BoardPart, Element
from protlint.board.shares import part_shares
from protlint.checks.case import ALL_ASSUMPTIONS, Answer, Case
from protlint.findings import Level, NotChecked, WorkingLine
from protlint.quantities import format_quantity, preferred
from protlint.solve.solution import Point

KNEE_DEGC, ZERO_DEGC = 70.0, 155.0
"""Chip resistors: full dissipation to 70 degC (IEC 60115-1), none left at 155 degC (makers' thick-film chip data sheets)."""

OVERLOAD_TIMES, OVERLOAD_S = 6.25, 5.0
"""Short-time overload of IEC 60115-1, 2.5 times rated voltage for 5 s; from memory."""

COMMON_RATINGS_W = (0.0625, 0.1, 0.125, 0.25, 0.5, 0.75, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 25.0, 50.0, 100.0)
"""Ratings that resistors are sold with; common practice of the trade."""


@dataclass(frozen=True, slots=True)
class Rating:
    """A resistor's rated dissipation, its derating line and where they come from."""

    power_W: float
    knee_degC: float
    zero_degC: float
    source: str

    def at_W(self, ambient_degC: float) -> float:
        """Return the dissipation allowed at an ambient: full to the knee, then straight down to the zero point."""
        span = self.zero_degC - self.knee_degC
        left = (self.zero_degC - ambient_degC) / span if span > 0.0 else float(ambient_degC <= self.knee_degC)
        return self.power_W * min(1.0, max(0.0, left))


@dataclass(frozen=True, slots=True)
class Load:
    """What one resistor dissipates in one condition at one ambient, and how often its rating that allows."""

    part: BoardPart
    condition: str
    ambient_degC: float
    power_W: float
    allowed_W: float
    rating: Rating
    current_A: float
    resistance_ohm: float

    @property
    def ratio(self) -> float:
        """Return the dissipation over what is allowed; infinite where nothing is."""
        return self.power_W / self.allowed_W if self.allowed_W > 0.0 else float("inf")


def sense_resistor_power(case: Case) -> Iterator[Answer]:
    """Yield a finding for each part of the sense resistance that takes too much power."""
    yield from _resistor_power(case, "sense-resistor-power", ("sense",))


def resistor_power(case: Case) -> Iterator[Answer]:
    """Yield a finding for each other resistor on the bench that takes too much power."""
    sense = set(case.limiter.elements.get("sense", ()))
    roles = tuple(role for role, indices in case.limiter.elements.items() if role != "sense" and not sense & set(indices))
    yield from _resistor_power(case, "resistor-power", roles)


def _resistor_power(case: Case, check: str, roles: tuple[str, ...]) -> Iterator[Answer]:
    indices = sorted({index for role in roles for index in case.limiter.elements.get(role, ())})
    for index in indices:
        element = case.board.elements[index]
        if element.kind != "resistor":
            continue
        for part_index in element.parts:
            part = case.board.parts[part_index]
            rating = resistor_rating(part)
            if rating is None:
                yield NotChecked(check, _rating_key(case, part))
                continue
            loads = list(_loads(case, element, part, rating))
            if loads:
                yield from _judged(case, check, max(loads, key=lambda load: load.ratio))


def resistor_rating(part: BoardPart) -> Rating | None:
    """Return a resistor's rating: its own power property, else that of its part data (by part number or footprint)."""
    ratings = part.entry.ratings if part.entry is not None else {}
    knee = ratings["power_at"].value if "power_at" in ratings else KNEE_DEGC
    zero = ratings["zero_at"].value if "zero_at" in ratings else ZERO_DEGC
    if part.values.power_W is not None:
        return Rating(part.values.power_W, knee, zero, "stated in the netlist")
    if "power" in ratings:
        return Rating(ratings["power"].value, knee, zero, ratings["power"].source)
    return None


def _rating_key(case: Case, part: BoardPart) -> str:
    if part.entry is not None:
        return case.rating_key(part.id, "power")
    return f"a POWER property of {part.id}, a FOOTPRINT that names its size, or part data with its ratings.power"


def _loads(case: Case, element: Element, part: BoardPart, rating: Rating) -> Iterator[Load]:
    """Yield what a resistor takes in the held short and at carry, at every ambient."""
    values_ohm = {index: case.board.parts[index].values.value or 0.0 for index in element.parts}
    share = part_shares(element.tree, values_ohm)[part.index]
    names = [name for name, index in case.bench.element_of.items() if index == element.index]
    value_ohm = values_ohm[part.index]
    short_s = case.needs.short_s
    times = OVERLOAD_TIMES if short_s is not None and short_s <= OVERLOAD_S else 1.0
    for point, row in zip(case.solution.high_short, case.solution.currents, strict=False):
        current_A = _current_A(point, names) * share.current
        yield Load(
            part,
            "in the held short",
            row.ambient_degC,
            current_A**2 * value_ohm,
            rating.at_W(row.ambient_degC) * times,
            rating,
            current_A,
            value_ohm,
        )
    carried = case.solution.at_carry
    if carried is not None:
        current_A = _current_A(carried, names) * share.current
        for row in case.solution.currents:
            allowed_W = rating.at_W(row.ambient_degC)
            yield Load(part, "at carry", row.ambient_degC, current_A**2 * value_ohm, allowed_W, rating, current_A, value_ohm)


def _current_A(point: Point, names: list[str]) -> float:
    return max((abs(point.states[name].current_A) for name in names if name in point.states), default=0.0)


def _judged(case: Case, check: str, load: Load) -> Iterator[Answer]:
    level: Level
    if load.ratio > case.threshold(check, "error"):
        level = "error"
    elif load.ratio > case.threshold(check, "warning"):
        level = "warning"
    else:
        return
    ambient = format_quantity(load.ambient_degC, "degC")
    yield case.finding(
        check,
        f"{load.part.id} takes {format_quantity(load.power_W, 'W')} {load.condition} at {ambient}, "
        f"{format_quantity(load.ratio, '%')} of the {format_quantity(load.allowed_W, 'W')} it may take there",
        parts=(load.part.id,),
        working=(
            WorkingLine("current", f"{load.condition}, every tolerance set for the most", load.current_A, "A"),
            WorkingLine(
                "power",
                f"({format_quantity(load.current_A, 'A')})^2 * {format_quantity(load.resistance_ohm, 'ohm')}",
                load.power_W,
                "W",
                "Joule's law",
            ),
            WorkingLine("rating", load.rating.source, load.rating.power_W, "W", load.rating.source),
            WorkingLine(
                f"allowed at {ambient}",
                f"full to {load.rating.knee_degC:g} degC, none at {load.rating.zero_degC:g} degC",
                load.allowed_W,
                "W",
                "IEC 60115-1",
            ),
        ),
        remedy=_bigger(case, check, load),
        level=level,
        assumption=case.assumes(*ALL_ASSUMPTIONS),
        subject=load.part.id,
    )


def _bigger(case: Case, check: str, load: Load) -> str:
    """Return the rating to fit: the next one sold that stays below the warning threshold at that ambient."""
    derating = load.allowed_W / load.rating.power_W if load.rating.power_W > 0.0 else 0.0
    if derating <= 0.0:
        return f"fit a resistor that may dissipate at {format_quantity(load.ambient_degC, 'degC')}"
    needed_W = load.power_W / (derating * case.threshold(check, "warning"))
    sold_W = next((rating for rating in COMMON_RATINGS_W if rating >= needed_W), preferred(needed_W, "E6", "up"))
    return f"fit {format_quantity(load.resistance_ohm, 'ohm')} rated {format_quantity(sold_W, 'W')} as {load.part.id}"
