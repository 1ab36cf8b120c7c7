"""What the designer knows and the netlist does not say: the limits file as data.

Every quantity is an SI float (temperatures in degC). ``protlint.limits_file`` reads the file.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from fnmatch import fnmatchcase
from typing import Any

from protlint.findings import Level

ATTRIBUTES = ("value", "part_number", "power", "tolerance", "footprint", "voltage")
"""What a property can tell of a part."""

UNSTATED = {
    "ambient_degC": "the ambient is -10 to 85 degC, usually 27 degC",
    "resistor_tolerance": "a resistor that states no tolerance has 1 %",
    "vbe_spread_V": "a bipolar transistor's V_BE lies within 40 mV of its usual value",
}
"""What is assumed where a limits file leaves a field of :class:`Limits` out."""


@dataclass(frozen=True, slots=True)
class Range:
    """A quantity with its stated spread; ``low <= usual <= high``."""

    low: float
    usual: float
    high: float


@dataclass(frozen=True, slots=True)
class DriveLimits:
    """What drives a net or a pin: its two ends in volts, its resistance, and the most current it gives (None: stiff)."""

    low_V: Range | None = None
    high_V: Range | None = None
    resistance_ohm: float = 0.0
    current_A: float | None = None
    power_W: float | None = None
    from_rails_V: float | None = None


@dataclass(frozen=True, slots=True)
class Peak:
    """A load peak that must pass."""

    current_A: float
    lasts_s: float
    output_V: float | None = None


@dataclass(frozen=True, slots=True)
class CheckSetting:
    """A check's level (``off`` silences it) and thresholds, as a limits file sets them."""

    level: Level | str | None = None
    thresholds: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class LimiterLimits:
    """What the board needs of one limiter; None where the file does not say."""

    carry_A: float | None = None
    cap_A: float | None = None
    output_V: float | None = None
    short_s: float | None = None
    """How long a short lasts; ``math.inf`` for a continuous one (the default), None where not stated."""
    shorted_to: tuple[str, ...] = ()
    sink_K_per_W: float | None = None
    shunt_rise_K: float | None = None
    pass_rise_K: float | None = None
    regulate_A: float | None = None
    load_ohm: float | None = None
    load_current_A: float | None = None
    load_cold_ohm: float | None = None
    load_capacitance_F: float | None = None
    peak: Peak | None = None
    checks: Mapping[str, CheckSetting] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Limits:
    """A limits file, or the defaults where there is none (``file`` is then None)."""

    file: str | None = None
    ambient_degC: tuple[float, float, float] = (-10.0, 27.0, 85.0)
    resistor_tolerance: float = 0.01
    vbe_spread_V: tuple[float, float] = (0.04, 0.04)
    """How far a bipolar's V_BE may lie below and above usual."""
    derating: str = "none"
    supplies_V: Mapping[str, Range] = field(default_factory=dict)
    drives: Mapping[str, DriveLimits] = field(default_factory=dict)
    """By net name, or by pin as ``U1.6``; globs; ``*`` is for drives of which nothing else is stated. One table counts: an
    exact name before a glob, else the later one in the file."""
    drivers: Mapping[str, DriveLimits] = field(default_factory=dict)
    """By part number; globs, of which one counts as for drives."""
    limiters: Mapping[str, LimiterLimits] = field(default_factory=dict)
    """By pass device, output net or sense resistor; globs; in the order of the file; ``*`` gives defaults."""
    attributes: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """Property names this file uses: ``value``, ``part_number``, ``power``, ``tolerance``, ``footprint``, ``voltage``."""
    checks: Mapping[str, CheckSetting] = field(default_factory=dict)
    pins: Mapping[str, Mapping[str, str]] = field(default_factory=dict)
    """Pin roles: cell or part number to pin name or number to role."""
    assumed: tuple[str, ...] = ()
    """Which fields stand at their defaults, in the words of :data:`UNSTATED`."""

    def assumes(self, name: str) -> bool:
        """Tell whether a field named in :data:`UNSTATED` was left to its default."""
        return UNSTATED[name] in self.assumed


def needs_of(limits: Limits, *names: str) -> LimiterLimits:
    """Return what the board needs of the limiter that goes by these names: its pass devices, output net, sense resistors.

    Every table whose key fits one of the names counts, later ones in the file over earlier ones, and ``*`` below them all.
    """
    fitting = [needs for pattern, needs in limits.limiters.items() if pattern == "*"]
    fitting += [
        needs for pattern, needs in limits.limiters.items() if pattern != "*" and any(fits(pattern, name) for name in names)
    ]
    stated: dict[str, Any] = {}
    for needs in fitting:
        for item in fields(LimiterLimits):
            value = getattr(needs, item.name)
            if item.name == "checks":
                stated["checks"] = {**stated.get("checks", {}), **value}
            elif value is not None and value != ():
                stated[item.name] = value
    return LimiterLimits(**stated)


def driver_of(limits: Limits, *part_numbers: str | None) -> DriveLimits | None:
    """Return the ``[driver]`` table of the first of some part numbers that has one, else what is stated of any drive.

    An exact number counts before a glob, and ``*`` last; of several globs the later one in the file.
    """
    for number in filter(None, part_numbers):
        fitting = [key for key in limits.drivers if fits(key, number)]
        if fitting:
            rank = {key: (key != "*", key.casefold() == number.casefold(), at) for at, key in enumerate(fitting)}
            return limits.drivers[max(fitting, key=rank.__getitem__)]
    return limits.drives.get("*")


def fits(pattern: str, name: str) -> bool:
    """Whether a name is the pattern or fits it as a glob, without regard to case."""
    pattern, name = pattern.casefold(), name.casefold()
    return pattern == name or fnmatchcase(name, pattern)


def is_glob(pattern: str) -> bool:
    """Whether a name may fit a pattern without being it."""
    return any(letter in pattern for letter in "*?[")
