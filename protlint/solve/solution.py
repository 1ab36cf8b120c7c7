"""The answers of the solver, as plain numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import NamedTuple

Pair = tuple[float, float]
"""A low and a high end."""

WIRING_TAKES_UP = 1e-3
"""Damping that the resistance of any real wiring adds, which no netlist states."""


@dataclass(frozen=True, slots=True)
class Currents:
    """The currents of one limiter at one ambient; None where there is none or it could not be worked out."""

    ambient_degC: float
    begins_A: float | None
    holds_A: float | None
    carries_A: float | None
    most_A: float | None
    unlimited_A: float | None
    shunt_A: float | None
    pass_A: float | None
    """Shunt: the greatest current through a shunt device; pass: the pass devices' current together; both at holds."""
    limited_by_short: str | None
    """``limiter`` or ``drive``."""
    limited_by_output: str | None
    begins_range_A: Pair | None = None
    holds_range_A: Pair | None = None
    carries_range_A: Pair | None = None
    most_range_A: Pair | None = None


class State(NamedTuple):
    """One device at one solved point: current into its first terminal, voltage across it, dissipation.

    ``voltage_V`` is V_CE, V_DS or the voltage from first to last node; ``control_A`` a bipolar's base current;
    ``power_W`` the whole dissipation. A named tuple, since a review makes them by the ten thousand.
    """

    current_A: float
    voltage_V: float
    power_W: float
    control_A: float = 0.0
    control_V: float = 0.0


@dataclass(frozen=True, slots=True)
class Point:
    """One solved point: the output voltage, the output current (positive the limiter's way), every device's state, and what
    the drive gives: the current out of it and the voltage at its node."""

    output_V: float
    output_A: float
    states: Mapping[str, State]
    drive_A: float = 0.0
    drive_V: float = 0.0


@dataclass(frozen=True, slots=True)
class Sensitivity:
    """How one device's parameter moves holds: relative change of holds per relative change (or per volt for V_BE)."""

    device: str
    parameter: str
    relative: float


@dataclass(frozen=True, slots=True)
class Regulates:
    """For a stage whose drive nothing takes away: its current, what moves it, and the least voltage it needs.

    ``per_supply_volt`` (1/V) and ``per_kelvin`` (1/K) are relative changes of the current, at usual ambient;
    ``compliance_V`` is the least voltage between the output and the net its current goes to (or comes from) at which 95 %
    of the current is left.
    """

    current_A: float
    per_supply_volt: float
    per_kelvin: float
    compliance_V: float


@dataclass(frozen=True, slots=True)
class Shorted:
    """What the limiter holds into one of several shorts: the net, holds at each ambient, and the nominal held short."""

    node: str
    holds_A: tuple[float | None, ...]
    point: Point | None


@dataclass(frozen=True, slots=True)
class Worst:
    """The least damping over corners, ambients and fault wiring, and where it lies: frequency, ambient, inductance in the
    short, and the corner as device.parameter to the position taken (-1 the low, +1 the high end). A damping of 1 without a
    place means that no mode of the limiter's swings anywhere."""

    damping: float
    at_Hz: float | None = None
    ambient_degC: float | None = None
    wiring_H: float | None = None
    corner: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Loop:
    """The small-signal answers at the held short.

    ``own_damping`` is the least damping of the limiter's own modes, parts as drawn: of those whose damping rises by more
    than a quarter, and 0.02, with the shunt's transconductance taken out; 1 where none of them swings. ``worst`` is the
    least over every spread, ambient and fault wiring, ``worst_without_wiring`` with none in the short. ``natural`` are the
    natural frequencies as (Hz, damping), slowest first, a pair once; ``table`` the loop gain as (Hz, magnitude, phase in
    degrees, 0 where the feedback is negative).
    """

    least_damping: float | None
    at_Hz: float | None
    worst_damping: float | None
    low_frequency_gain: float | None
    crossover_Hz: float | None
    phase_margin_deg: float | None
    own_damping: float | None = None
    worst: Worst | None = None
    worst_without_wiring: Worst | None = None
    natural: tuple[tuple[float, float], ...] = ()
    table: tuple[tuple[float, float, float], ...] = ()

    @property
    def can_grow(self) -> bool:
        """Whether a mode of the limiter's grows within every spread, or with wiring by more than that takes up."""
        without, worst = self.worst_without_wiring, self.worst
        grows = without is not None and without.damping < 0.0
        return grows or (worst is not None and worst.damping < -WIRING_TAKES_UP)


@dataclass(frozen=True, slots=True)
class Step:
    """The answers of the step into the short."""

    settles: bool
    delay_s: float | None
    peak_A: float | None
    pass_energy_J: float | None


@dataclass(frozen=True, slots=True)
class Effect:
    """What a part does to the damping: its name, whether it is the base stop, and the damping without it, nominal and worst,
    of the limiter's own modes."""

    part: str
    base_stop: bool
    own_damping: float
    worst_damping: float


@dataclass(frozen=True, slots=True)
class Fit:
    """A way to calm a loop: a capacitor to fit (its place in words and as nodes, its value), a capacitor to take out, or
    both; None or empty where there is nothing to do of a kind. With the damping of the limiter's own modes then, nominal
    and worst, and the step then (None where it was not asked for or could not be worked out)."""

    place: str
    nodes: tuple[str, str]
    farad: float | None
    instead_of: str | None
    own_damping: float
    worst_damping: float
    step: Step | None = None


@dataclass(frozen=True, slots=True)
class Advice:
    """Advice on a loop.

    The damping of the limiter's own modes, parts as drawn and at worst, whether that is enough, what each part does to it,
    the part that costs the most (None: none does), and the ways to calm it: first the smallest capacitor beside all that is
    there, then without the capacitor that costs the most. Where the damping is not enough, no ``fits`` means that none of
    the usual places does. ``step`` is the step as drawn.
    """

    own_damping: float
    worst_damping: float
    enough: bool
    effects: tuple[Effect, ...]
    costs: str | None
    fits: tuple[Fit, ...]
    step: Step | None = None

    @property
    def fit(self) -> Fit | None:
        """The first way, None where there is none."""
        return self.fits[0] if self.fits else None


@dataclass(frozen=True, slots=True)
class Solution:
    """All that was worked out for one limiter.

    ``currents`` stand in the order of the three ambients. ``locus``, ``held_short`` and ``worst_point`` (the locus point of
    greatest pass dissipation) are nominal at usual ambient. ``not_solved`` says why where the circuit could not be solved;
    the rest is then empty or None.
    """

    currents: tuple[Currents, ...] = ()
    locus: tuple[Point, ...] = ()
    held_short: Point | None = None
    worst_point: Point | None = None
    at_carry: Point | None = None
    high_short: tuple[Point, ...] = ()
    """The held short at each ambient with every corner set for the most current."""
    high_locus: tuple[tuple[Point, ...], ...] = ()
    """The locus at each ambient, same corner, from the short outwards."""
    unlimited: tuple[Point, ...] = ()
    """The short at each ambient with the shunt taken out, as drawn."""
    on_end: str | None = None
    """Which end of the drive turns the pass device on: ``low`` or ``high``."""
    sources: bool = False
    """Whether the output current then flows out of the stage."""
    sensitivities: tuple[Sensitivity, ...] = ()
    """Of holds at usual ambient: relative per relative change of a resistor, B_F, supply or drive end; per volt of V_BE."""
    regulates: Regulates | None = None
    loop: Loop | None = None
    step: Step | None = None
    advice: Advice | None = None
    """Where the loop is badly damped."""
    loop_needs: tuple[str, ...] = ()
    """Why there is no loop: part-data keys, or what could not be found; the same of the step below."""
    step_needs: tuple[str, ...] = ()
    corners: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    """For the ``high`` and ``low`` end of holds at usual ambient: device.parameter to the position taken, -1 or +1."""
    short: str | None = None
    """The short all figures are for: of several, the one with the greatest holds."""
    shorts: tuple[Shorted, ...] = ()
    assumed: tuple[str, ...] = ()
    not_checked: tuple[tuple[str, str], ...] = ()
    not_solved: str | None = None
