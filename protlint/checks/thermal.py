"""How hot a junction gets: by sink or in free air, for ever or for a time.

T_J = T_A + P (R_JC + R_CA) with a sink, T_A + P R_JA without one. For a time t the junction rises by P Z(t) above the case,
which keeps its temperature for so short a time. Z(t) is the maker's transient thermal impedance where part data gives it,
or what a pulsed safe area says of it ((T_J,max - 25 degC) over the greatest V I of its curve); past the longest of these the
square root of time bounds it, up to R_JC: heat spreading into a solid raises its surface with the square root of time
(H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 1959), and a package only falls behind that.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

from protlint.checks.case import Case
from protlint.checks.derating import derated, junction_limit_degC, share_of
from protlint.checks.safe_area import SAFE_AREA_DEGC
from protlint.findings import WorkingLine
from protlint.partdata.book import Figure, PartEntry
from protlint.quantities import format_quantity

SINKABLE = 5.0
"""A package whose resistance to free air is this many times that to its case is made for a sink."""


@dataclass(frozen=True, slots=True)
class Heating:
    """What heats a part: its own power, that of all on its sink, the ambient, how long it lasts, the sink (None: not
    stated), and the power that the part and all on the sink take before."""

    own_W: float
    shared_W: float
    ambient_degC: float
    lasts_s: float = math.inf
    sink_K_per_W: float | None = None
    before_W: float = 0.0
    before_shared_W: float = 0.0


@dataclass(frozen=True, slots=True)
class Junction:
    """How hot a junction gets, what it may reach, what its part may take there, and the lines behind it.

    ``from_degC`` is what the junction rises above, by ``per_W`` for each watt of its own: the case, or the ambient in free
    air. ``allowed_how`` is how ``allowed_W`` comes about. ``assumed`` tells that the transient impedance was taken, not
    given; ``on_sink`` that the case is on a sink (of 0 K/W where none is stated and none would do).
    """

    degC: float
    limit_degC: float
    from_degC: float
    per_W: float
    own_W: float
    allowed_W: float
    lines: tuple[WorkingLine, ...]
    allowed_how: str = ""
    assumed: bool = False
    on_sink: bool = False

    @property
    def ratio(self) -> float:
        """Return the power over what may be taken, infinite where nothing may."""
        return self.own_W / self.allowed_W if self.allowed_W > 0.0 else math.inf

    @property
    def too_hot(self) -> bool:
        """Tell whether the part takes more than it may."""
        return self.own_W > self.allowed_W


@dataclass(frozen=True, slots=True)
class Transient:
    """A transient thermal impedance, where it comes from, and whether it was assumed."""

    K_per_W: float
    source: str
    assumed: bool = False


def junction(case: Case, part_id: str, heat: Heating, *, settles_s: float, case_holds_s: float) -> Junction | str:
    """Return how hot a junction gets, or the key of what is missing for it.

    Where no sink is stated, a package made for one is judged in free air if it stands that, and else, if it would be too
    hot on the best of sinks, on that; between the two only the sink's own figure can tell.
    """
    limit = case.rating(part_id, "tj_max")
    if limit is None:
        return case.rating_key(part_id, "tj_max")
    part = _Part(case, part_id, limit.value)
    if heat.lasts_s <= case_holds_s:
        return _for_a_time(part, heat, settles_s)
    to_case, to_air = part.rating("rth_jc"), part.rating("rth_ja")
    if heat.sink_K_per_W is not None:
        return case.rating_key(part_id, "rth_jc") if to_case is None else _on_sink(part, heat, to_case, heat.sink_K_per_W)
    in_air = None if to_air is None else _in_air(part, heat, to_air)
    if not made_for_a_sink(to_case, to_air) or to_case is None:
        return in_air if in_air is not None else case.rating_key(part_id, "rth_ja")
    if in_air is not None and not in_air.too_hot:
        return in_air
    at_best = _on_sink(part, heat, to_case, 0.0)
    return at_best if at_best.too_hot else case.limits_key("sink")


def in_free_air(case: Case, part_id: str, heat: Heating) -> Junction | str:
    """Return how hot a junction gets in free air for ever, or the key of what is missing."""
    limit, to_air = case.rating(part_id, "tj_max"), case.rating(part_id, "rth_ja")
    if limit is None or to_air is None:
        return case.rating_key(part_id, "tj_max" if limit is None else "rth_ja")
    return _in_air(_Part(case, part_id, limit.value), heat, to_air)


def made_for_a_sink(to_case: Figure | None, to_air: Figure | None) -> bool:
    """Tell from its thermal resistances whether a package is made for a sink."""
    return to_case is not None and (to_air is None or to_air.value > SINKABLE * to_case.value)


def allowed_rise_K(derating: str, kind: str, tj_max_degC: float, from_degC: float) -> float:
    """Return how far a junction may rise above its case (or the ambient); not above zero where it may not at all."""
    share = share_of(derating, kind, "power")
    return min(share * (tj_max_degC - from_degC), junction_limit_degC(derating, tj_max_degC) - from_degC)


def hottest_case_degC(derating: str, kind: str, tj_max_degC: float, rise_K: float) -> float:
    """Return the case temperature from which a junction may just rise by so much: :func:`allowed_rise_K` turned round."""
    share = share_of(derating, kind, "power")
    return min(tj_max_degC - rise_K / share, junction_limit_degC(derating, tj_max_degC) - rise_K)


def transient(entry: PartEntry, lasts_s: float, settles_s: float) -> Transient | None:
    """Return a bound of the impedance from junction to case after a time, or None where R_JC is not known either.

    ``settles_s`` is the time in which a junction is taken to reach R_JC where nothing is published.
    """
    to_case = entry.ratings.get("rth_jc")
    known = published_transients(entry)
    if not known:
        if to_case is None:
            return None
        share = min(1.0, math.sqrt(lasts_s / settles_s))
        return Transient(to_case.value * share, f"{to_case.source}; square root of time", assumed=share < 1.0)
    longest_s, at_longest, source = known[-1]
    if lasts_s >= longest_s:
        bound = at_longest * math.sqrt(lasts_s / longest_s)
        return Transient(min(bound, to_case.value) if to_case is not None else bound, source)
    if lasts_s <= known[0][0]:
        return Transient(known[0][1], known[0][2])
    for (before_s, low, _), (after_s, high, _) in pairwise(known):
        if before_s <= lasts_s <= after_s:
            part = math.log(lasts_s / before_s) / math.log(after_s / before_s)
            return Transient(low * (high / low) ** part, source)
    raise AssertionError("the time lies between two of the known ones")


def published_transients(entry: PartEntry) -> list[tuple[float, float, str]]:
    """Return (time, K/W, source) of what part data says of the transient impedance, rising in time.

    A transient table counts; without one, what the pulsed safe areas imply.
    """
    if entry.transient:
        return [(one.lasts_s, one.K_per_W, one.source) for one in entry.transient]
    limit, to_case = entry.ratings.get("tj_max"), entry.ratings.get("rth_jc")
    if limit is None:
        return []
    found = []
    for curve in entry.safe_area:
        if math.isfinite(curve.lasts_s):
            implied = (limit.value - SAFE_AREA_DEGC) / max(volts * amperes for volts, amperes in curve.points)
            found.append((curve.lasts_s, min(implied, to_case.value) if to_case is not None else implied, curve.source))
    return sorted(found)


@dataclass(frozen=True, slots=True)
class _Part:
    """A part whose junction is looked at, with its greatest junction temperature."""

    case: Case
    part_id: str
    tj_max_degC: float

    def rating(self, name: str) -> Figure | None:
        return self.case.rating(self.part_id, name)

    def settled(
        self,
        heat: Heating,
        from_degC: float,
        per_W: float,
        rated: Figure | None,
        lines: tuple[WorkingLine, ...],
        **what: bool,
    ) -> Junction:
        """Return the junction that rises above ``from_degC``; ``rated`` is the power that may be taken at most."""
        derating, kind = self.case.limits.derating, self.case.part(self.part_id).kind
        limit_degC = junction_limit_degC(derating, self.tj_max_degC)
        share, resistance = share_of(derating, kind, "power"), format_quantity(per_W, "K/W")
        allowed_W = allowed_rise_K(derating, kind, self.tj_max_degC, from_degC) / per_W
        how = f"({limit_degC:g} degC - {from_degC:.4g} degC) / {resistance}"
        if share * (self.tj_max_degC - from_degC) < limit_degC - from_degC:
            how = f"{share:g} * ({self.tj_max_degC:g} degC - {from_degC:.4g} degC) / {resistance}"
        if rated is not None and share * rated.value < allowed_W:
            allowed_W, how = share * rated.value, "its rated power" if share == 1.0 else f"{share:g} times its rated power"
        degC = from_degC + per_W * heat.own_W
        last = WorkingLine(
            "junction",
            f"{from_degC:.4g} degC + {format_quantity(heat.own_W, 'W')} * {resistance}",
            degC,
            "degC",
            "T_J = T_C + P R_th",
        )
        may = WorkingLine(
            "it may reach", derated(derating, kind, "power", "tj_max of its part data"), limit_degC, "degC", None
        )
        return Junction(
            degC, limit_degC, from_degC, per_W, heat.own_W, max(0.0, allowed_W), (*lines, last, may), how, **what
        )


def _for_a_time(part: _Part, heat: Heating, settles_s: float) -> Junction | str:
    entry = part.case.part(part.part_id).entry
    assert entry is not None
    rise = transient(entry, heat.lasts_s, settles_s)
    to_case, to_air = part.rating("rth_jc"), part.rating("rth_ja")
    if rise is None:
        if to_air is None:
            return part.case.rating_key(part.part_id, "rth_jc")
        rise = Transient(to_air.value, f"{to_air.source}; no more than in free air for ever")
    case_degC = heat.ambient_degC
    if heat.sink_K_per_W is not None:
        case_degC += heat.sink_K_per_W * heat.before_shared_W
    elif to_air is not None:
        case_degC += (to_air.value - (to_case.value if to_case is not None else 0.0)) * heat.before_W
    start_degC = case_degC
    if to_case is not None:
        start_degC += max(0.0, to_case.value - rise.K_per_W) * heat.before_W
    lines = (
        WorkingLine("before", "ambient, and what it takes at the working output", start_degC, "degC"),
        WorkingLine(
            f"impedance after {format_quantity(heat.lasts_s, 's')}", "junction to case", rise.K_per_W, "K/W", rise.source
        ),
    )
    return part.settled(heat, start_degC, rise.K_per_W, None, lines, assumed=rise.assumed)


def _on_sink(part: _Part, heat: Heating, to_case: Figure, sink_K_per_W: float) -> Junction:
    case_degC = heat.ambient_degC + sink_K_per_W * heat.shared_W
    source = "limits file" if sink_K_per_W else "no sink keeps a case cooler than the ambient"
    lines = (
        WorkingLine("thermal resistance", "junction to case", to_case.value, "K/W", to_case.source),
        WorkingLine(
            "case",
            f"{heat.ambient_degC:g} degC + {format_quantity(heat.shared_W, 'W')} * {format_quantity(sink_K_per_W, 'K/W')}",
            case_degC,
            "degC",
            source,
        ),
    )
    return part.settled(heat, case_degC, to_case.value, part.rating("power_case"), lines, on_sink=True)


def _in_air(part: _Part, heat: Heating, to_air: Figure) -> Junction:
    line = WorkingLine("thermal resistance", "junction to free air", to_air.value, "K/W", to_air.source)
    return part.settled(heat, heat.ambient_degC, to_air.value, part.rating("power"), (line,))
