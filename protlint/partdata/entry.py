"""What is known of one part type: its ratings, its published model, its safe operating area, its gains."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from itertools import pairwise

from protlint.partdata.identities import Contradiction
from protlint.partdata.ratings import Figure


@dataclass(frozen=True, slots=True)
class SafeArea:
    """One curve of a safe operating area: how long it may last (``inf`` for dc) and its (V, A) corners at 25 degC case."""

    lasts_s: float
    points: tuple[tuple[float, float], ...]
    source: str


@dataclass(frozen=True, slots=True)
class TransientPoint:
    """How much each watt has warmed a junction above its case after a time (transient thermal impedance)."""

    lasts_s: float
    K_per_W: float
    source: str


@dataclass(frozen=True, slots=True)
class HfePoint:
    """Current gain at one collector current; ``most`` None where the data sheet guarantees only the least."""

    ic_A: float
    least: float
    most: float | None = None


@dataclass(frozen=True, slots=True)
class PartEntry:
    """All that is known of one part type.

    ``ratings`` is keyed by the rating's name in the part-data file (``vceo``, ``power``, ``hfe_min`` ...); ``model`` holds
    published model parameters in SI units at 27 degC (empty where none are known) and ``model_source`` where they come
    from; ``pins`` maps a pin name or number to its role, on the word of ``pins_source``. ``hfe_points`` are gains at several
    currents, rising. ``footprints`` are the sizes a generic entry stands for (``0603``). ``contradictions`` are the thermal
    ratings that could not all be true, of which the careful ones were kept. ``file`` is None for protlint's own entries.
    """

    part_number: str
    kind: str
    pins: Mapping[str, str] = field(default_factory=dict)
    ratings: Mapping[str, Figure] = field(default_factory=dict)
    model: Mapping[str, float] = field(default_factory=dict)
    model_source: str | None = None
    safe_area: tuple[SafeArea, ...] = ()
    source: str = "memory"
    file: str | None = None
    pins_source: str = "memory"
    hfe_points: tuple[HfePoint, ...] = ()
    footprints: tuple[str, ...] = ()
    contradictions: tuple[Contradiction, ...] = ()
    transient: tuple[TransientPoint, ...] = ()
    """The transient thermal impedance to the case, rising in time."""

    def gains_at(self, ic_A: float) -> dict[str, float]:
        """Return ``hfe_min`` and, where a greatest gain is known, ``hfe_max`` at a collector current; empty without points.

        Between points the gain runs straight on logarithmic scales, as data sheets draw it; beyond the last it falls on as
        it did before, below the first it stays. Where the greatest gain is stated at one current only, it is taken to move
        as the least does.
        """
        if not self.hfe_points:
            return {}
        least = self._least_at(ic_A)
        known = [(point.ic_A, point.most) for point in self.hfe_points if point.most is not None]
        if not known and {"hfe_max", "hfe_at"} <= self.ratings.keys():
            known = [(self.ratings["hfe_at"].value, self.ratings["hfe_max"].value)]
        if not known:
            return {"hfe_min": least}
        at_A, most = min(known, key=lambda one: abs(math.log(one[0] / ic_A)))
        return {"hfe_min": least, "hfe_max": max(least, most * least / self._least_at(at_A))}

    def _least_at(self, ic_A: float) -> float:
        points = self.hfe_points
        if ic_A <= points[0].ic_A or len(points) == 1:
            return points[0].least
        low, high = next(((one, two) for one, two in pairwise(points) if ic_A <= two.ic_A), points[-2:])
        slope = math.log(high.least / low.least) / math.log(high.ic_A / low.ic_A)
        slope = min(slope, 0.0) if ic_A > high.ic_A else slope
        start = high if ic_A > high.ic_A else low
        return start.least * math.pow(ic_A / start.ic_A, slope)
