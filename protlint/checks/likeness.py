"""What belongs to what in limiters of one build: the values that stand in the same spot, and the circuit with others."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from protlint.checks.case import Case
from protlint.findings import Fit
from protlint.quantities import format_quantity
from protlint.solve.circuit import Circuit
from protlint.solve.solution import Currents

PARAMETERS = {"resistor": ("R", "ohm"), "capacitor": ("C", "F")}
"""The kinds of element that have a value here, with its name in a device's model and its unit."""

Spot = tuple[str, str]
"""A role in its full form and where in the limiter the element stands."""

Values = Mapping[Spot, tuple[tuple[float, int], ...]]
"""(value, board element) of everything in each spot, rising."""


@dataclass(frozen=True, slots=True)
class Change:
    """An element of a limiter and another value for it: its parts, its value now, the other value, their unit."""

    element: int
    parts: tuple[str, ...]
    now: float
    then: float
    unit: str

    @property
    def names(self) -> str:
        """The parts in words."""
        return ", ".join(self.parts)

    def fits(self, case: Case) -> tuple[Fit, ...]:
        """Return what is fitted: of a bank or chain every part changes by as much."""
        if len(self.parts) == 1:
            return (Fit(self.parts[0], self.then),)
        return tuple(Fit(part, (case.part(part).values.value or 0.0) * self.then / self.now) for part in self.parts)

    def says(self) -> str:
        """Return the two values in words: ``R12 is 22 ohm where most have 2.2 ohm``."""
        now, then = (format_quantity(value, self.unit) for value in (self.now, self.then))
        return f"{self.names} is {now} where most have {then}"


def change(case: Case, element: int, value: float) -> Change:
    """Return the change of a board element to a value."""
    one = case.board.elements[element]
    parts = tuple(case.board.parts[part].id for part in one.parts)
    return Change(element, parts, one.value or 0.0, value, PARAMETERS[one.kind][1])


def to_fit(changes: Iterable[Change]) -> str:
    """Return what to fit, as a remedy: ``fit 2.2 ohm as R12``."""
    said = []
    for one in changes:
        value = format_quantity(one.then, one.unit)
        said.append(f"fit {value} as {one.names}" if len(one.parts) == 1 else f"make {one.names} {value} together")
    return ", ".join(said)


def values_of(case: Case) -> Values:
    """Return the known values of a limiter's resistances and capacitors by where they stand."""
    board, limiter = case.board, case.limiter
    found: dict[Spot, list[tuple[float, int]]] = {}
    for role, elements in limiter.elements.items():
        for index in elements:
            element = board.elements[index]
            if element.kind in PARAMETERS and element.value is not None:
                place = limiter.places.get(board.parts[element.parts[0]].id, "")
                found.setdefault((role, place), []).append((element.value, index))
    return {spot: tuple(sorted(values)) for spot, values in sorted(found.items())}


def plain(values: Values, spot: Spot) -> tuple[float, ...]:
    """Return the values in a spot without what they belong to, to five digits, so that equal ones compare equal."""
    return tuple(float(f"{value:.5g}") for value, _ in values.get(spot, ()))


def differing(case: Case, others: Values, spots: Iterable[Spot]) -> tuple[Change, ...]:
    """Return the changes that make a limiter like ``others`` in the given spots, where as many elements stand in both."""
    values = values_of(case)
    found = []
    for spot in spots:
        if plain(values, spot) != plain(others, spot) and len(values.get(spot, ())) == len(others.get(spot, ())):
            pairs = zip(values[spot], others[spot], plain(values, spot), plain(others, spot), strict=True)
            found += [change(case, index, then) for (_, index), (then, _), mine, its in pairs if mine != its]
    return tuple(found)


def with_values(case: Case, changes: Sequence[Change]) -> Circuit:
    """Return a case's circuit with changes made."""
    wanted = {one.element: one.then for one in changes}
    devices = []
    for device in case.circuit.devices:
        element = case.bench.element_of.get(device.name)
        if element in wanted and device.kind in PARAMETERS:
            device = replace(device, model={**device.model, PARAMETERS[device.kind][0]: wanted[element]})
        devices.append(device)
    return replace(case.circuit, devices=tuple(devices))


def usual(rows: Sequence[Currents]) -> Currents | None:
    """Return the row of the usual ambient, the middle one, or None where nothing was solved."""
    return rows[len(rows) // 2] if rows else None


def usual_holds_A(case: Case) -> float | None:
    """Return what a limiter holds as drawn at the usual ambient, or None where it is not known or nothing."""
    return usual_A(case, "holds")


def usual_A(case: Case, figure: str) -> float | None:
    """Return a current of a limiter as drawn at the usual ambient, or None where it is not known or nothing.

    ``figure`` is ``holds``, ``carries`` or ``most``.
    """
    row = usual(case.solution.currents)
    value: float | None = getattr(row, f"{figure}_A") if row is not None else None
    return value or None
