"""The base current of the shunt in the instant before the loop acts: a hard short, the drive on, the shunt still off.

The whole unlimited current then runs through the sense resistance, and what that drops stands on the shunt's base through
whatever resistance there is: I_B = (V - V_junction) / (R_th + RB), V and R_th by Thevenin's theorem.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from protlint.checks.case import Case
from protlint.checks.ends import drive_V, ends_of
from protlint.findings import WorkingLine
from protlint.quantities import format_quantity
from protlint.solve.circuit import Device
from protlint.solve.conditions import Condition
from protlint.solve.parameters import CircuitError
from protlint.solve.range_ends import Ends
from protlint.solve.resistive import behind, thevenin
from protlint.solve.solution import Point

KIRCHHOFF = "Kirchhoff's voltage law"


@dataclass(frozen=True, slots=True)
class Surge:
    """The instant at the ambient and the ends of the stated ranges where it is worst: the unlimited current through each
    sense resistance and how it was found, the drop across the sense resistance, and what the base sees: voltage,
    resistance, RB."""

    ambient_degC: float
    sense_A: float
    how: str
    sense_ohm: float
    drop_V: float
    seen_V: float
    seen_ohm: float
    base_ohm: float
    junction_V: float

    @property
    def excess_V(self) -> float:
        """Return what is left of the voltage for the resistances."""
        return max(0.0, self.seen_V - self.junction_V)

    @property
    def base_A(self) -> float:
        """Return the base current."""
        return self.excess_V / (self.seen_ohm + self.base_ohm) if self.excess_V else 0.0

    def lines(self) -> tuple[WorkingLine, ...]:
        """Return the working."""
        seen, junction = format_quantity(self.seen_V, "V"), format_quantity(self.junction_V, "V")
        ohms = f"{format_quantity(self.seen_ohm, 'ohm')} + {format_quantity(self.base_ohm, 'ohm')}"
        drop = f"{format_quantity(self.sense_A, 'A')} * {format_quantity(self.sense_ohm, 'ohm')}"
        return (
            WorkingLine("unlimited current", f"{self.how}, {self.ambient_degC:g} degC", self.sense_A, "A"),
            WorkingLine("drop across the sense resistance", drop, self.drop_V, "V", "Ohm's law"),
            WorkingLine("what the base sees of it", "no current into the base", self.seen_V, "V", "Thevenin's theorem"),
            WorkingLine("through", "the resistance to the base", self.seen_ohm, "ohm", "Thevenin's theorem"),
            WorkingLine("base current", f"({seen} - {junction}) / ({ohms})", self.base_A, "A", KIRCHHOFF),
        )


def shunt_of(case: Case) -> Device | None:
    """Return the shunt where it is a bipolar transistor: a diode string has no base."""
    circuit = case.circuit
    return next((one for one in circuit.devices if one.name in circuit.shunt and one.kind in ("npn", "pnp")), None)


def surge(case: Case, shunt: Device, junction_V: float) -> Surge | None:
    """Return the instant at its worst ambient, or None where the circuit without its shunt could not be solved."""
    found = [_at(case, shunt, junction_V, *place) for place in _unlimited(case)]
    solved = [one for one in found if one is not None]
    return max(solved, key=lambda one: (one.base_A, one.drop_V), default=None)


def _unlimited(case: Case) -> list[tuple[float, Ends, Point]]:
    """Return the short with the shunt taken out, parts as drawn, at every ambient and every end of the stated ranges; empty
    where one was not solved."""
    short = case.solution.short
    if short is None:
        return []
    try:
        ends = ends_of(case)
        usual = case.at_ambients(case.solution.unlimited)
        if not usual or not ends[0].words:
            return [(row.ambient_degC, ends[0], point) for row, point in usual]
        places = [(ambient_degC, one) for ambient_degC in case.limits.ambient_degC for one in ends]
        points = case.under(
            [
                Condition(ambient_degC, drive_V(case, one, on=True), one.held_V[short], shunt_in=False, corner=one.corner)
                for ambient_degC, one in places
            ]
        )
    except CircuitError:
        return []
    solved = [(*place, point) for place, point in zip(places, points, strict=True) if point is not None]
    return solved if len(solved) == len(places) else []


def _at(case: Case, shunt: Device, junction_V: float, ambient_degC: float, ends: Ends, point: Point) -> Surge | None:
    circuit, short = case.circuit, case.solution.short
    senses = [device for device in circuit.devices if device.name in circuit.sense]
    if short is None or not senses:
        return None
    known_V = {**ends.held_V, circuit.output: ends.held_V[short]}
    _, base, emitter = shunt.nodes
    sign = 1.0 if shunt.kind == "npn" else -1.0
    currents = {}
    how = "solved, output shorted, shunt taken out"
    for sense in senses:
        near = sense.nodes[1] if sense.nodes[0] == emitter else sense.nodes[0]
        current_A = abs(point.states[sense.name].current_A)
        by_supply = _by_supply_A(case, sense, near, known_V)
        if by_supply is not None:
            current_A, how = by_supply
        currents[near] = sign * current_A
    greatest = max(abs(current) for current in currents.values())
    seen_V, seen_ohm = thevenin(circuit, base, emitter, known_V=known_V, injected_A=currents)
    sense_ohm = senses[0].model["R"]
    return Surge(
        ambient_degC=ambient_degC,
        sense_A=greatest,
        how=f"{how}{ends.words}",
        sense_ohm=sense_ohm,
        drop_V=greatest * sense_ohm,
        seen_V=sign * seen_V,
        seen_ohm=seen_ohm,
        base_ohm=shunt.model.get("RB", 0.0),
        junction_V=junction_V,
    )


def _by_supply_A(case: Case, sense: Device, near: str, known_V: Mapping[str, float]) -> tuple[float, str] | None:
    """Return what a MOSFET's loop passes: the supply over the loop's resistance, for its gate may rise with its drain."""
    circuit = case.circuit
    for device in circuit.devices:
        if device.name not in circuit.pass_devices or device.kind not in ("nmos", "pmos") or device.nodes[2] != near:
            continue
        supply = behind(circuit, device.nodes[0], known_V)
        far = sense.nodes[1] if sense.nodes[0] == near else sense.nodes[0]
        end = behind(circuit, far, known_V)
        if supply is None or end is None:
            return None
        rating = case.rating(device.name, "rds_on")
        on_ohm = rating.value if rating is not None else device.model.get("RD", 0.0) + device.model.get("RS", 0.0)
        loop_ohm = sense.model["R"] + on_ohm + supply[1] + end[1]
        volts = abs(supply[0] - end[0])
        formula = (
            f"{format_quantity(volts, 'V')} / {format_quantity(loop_ohm, 'ohm')}, the supply over the loop's resistance"
        )
        return volts / loop_ohm, formula
    return None
