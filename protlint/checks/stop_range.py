"""Which base stops will do: the least bounds the base current, the greatest keeps the shunt's gain out of the limit."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Callable
from dataclasses import dataclass, replace

from protlint.checks.case import Case
from protlint.checks.ends import drive_V, ends_of
from protlint.checks.sizing import with_resistance
from protlint.checks.surge import Surge
from protlint.quantities import preferred, within
from protlint.solve.circuit import Circuit, Device
from protlint.solve.conditions import Condition, solve_under
from protlint.solve.parameters import CircuitError

USUAL_LEAST_OHM = 47.0
"""The least base stop that is usual in limiters; common practice of the trade, from memory."""

GREATEST_OHM = 100e3
"""No base stop of a limiter is greater."""

SURELY_SMALL = 0.2
"""Where the base stop's drop, by hand, moves the limit by less than this share of the threshold, nothing is solved."""

BRIDGED_OHM = 1e-3


@dataclass(frozen=True, slots=True)
class Moves:
    """How holds moves from the least to the greatest gain of the shunt: with the base stop, without it, and the difference,
    relative to holds, at the ambient and the ends of the stated ranges (in words) where that is greatest."""

    share: float
    without: float
    with_A: tuple[float, float]
    hfe: tuple[float, float]
    ambient_degC: float
    words: str = ""


@dataclass(frozen=True, slots=True)
class StopRange:
    """The least base stop that will do, the greatest (None: not known), and the one to fit, all of E24."""

    least_ohm: float
    most_ohm: float | None
    to_fit_ohm: float


def moves_for_the_stop(case: Case, shunt: Device, stop_ohm: float | None = None) -> Moves | None:
    """Return how far holds moves with the shunt's gain for the base stop's sake; None where the gain's spread is not known.

    ``stop_ohm`` stands for the base stop as drawn. What is too small to matter by hand, I_C R (1/hFE_min - 1/hFE_max) over
    the sensed drop, is not solved.
    """
    if shunt.hfe is None or shunt.hfe[0] >= shunt.hfe[1]:
        return None
    names = _stop_names(case)
    circuit, now_ohm = case.circuit, _now_ohm(case)
    ohm = now_ohm if stop_ohm is None else stop_ohm
    if stop_ohm is None and _by_hand(case, shunt, ohm) < SURELY_SMALL * case.threshold("base-stop-high", "share"):
        return Moves(0.0, 0.0, (0.0, 0.0), shunt.hfe, case.limits.ambient_degC[1])
    with_it = _holds(case, with_resistance(circuit, names, ohm / now_ohm), shunt)
    without = _holds(case, with_resistance(circuit, names, BRIDGED_OHM / now_ohm), shunt)
    if with_it is None or without is None:
        return None
    found = []
    for (ambient_degC, words, low_A, high_A), (_, _, bare_low_A, bare_high_A) in zip(with_it, without, strict=True):
        bare = abs(bare_low_A - bare_high_A) / bare_high_A
        share = abs(low_A - high_A) / high_A - bare
        found.append(Moves(share, bare, (low_A, high_A), shunt.hfe, ambient_degC, words))
    return max(found, key=lambda one: one.share)


def stop_range(case: Case, shunt: Device, instant: Surge | None) -> StopRange:
    """Return the base stops of E24 that will do."""
    least_ohm = _least_ohm(case, instant)
    most_ohm = _most_ohm(case, shunt) if _stop_names(case) else None
    to_fit = max(least_ohm, preferred(USUAL_LEAST_OHM, "E24", "up"))
    if most_ohm is not None and to_fit > most_ohm:
        to_fit = max(least_ohm, most_ohm)
    if case.parts("base_stop") and least_ohm <= _now_ohm(case) and most_ohm is not None:
        to_fit = most_ohm
    return StopRange(least_ohm, most_ohm, to_fit)


def _least_ohm(case: Case, instant: Surge | None) -> float:
    """Return the least value that keeps the base current at the share of its rating that is allowed."""
    rating = case.rating(case.parts("shunt")[0], "ib")
    if instant is None or rating is None:
        return preferred(USUAL_LEAST_OHM, "E24", "up")
    needed_ohm = instant.excess_V / (case.threshold("base-stop-low", "share") * rating.value) - instant.base_ohm
    more_ohm = (needed_ohm - instant.seen_ohm) * max(1, len(case.circuit.sense) if _several_stops(case) else 1)
    return preferred(max(more_ohm + _now_ohm(case), 1.0), "E24", "up")


def _most_ohm(case: Case, shunt: Device) -> float | None:
    """Return the greatest value of E24 that moves the limit by no more than the threshold; None where one is not solved."""
    values = within(1.0, GREATEST_OHM, "E24")
    most = case.threshold("base-stop-high", "share")
    tried: dict[int, Moves | None] = {}

    def will_do(place: int) -> bool:
        moves = tried[place] = moves_for_the_stop(case, shunt, values[place])
        return moves is not None and moves.share <= most

    by_hand_ohm = most / max(_by_hand(case, shunt, 1.0), most / GREATEST_OHM)
    found = _last(will_do, len(values), near=bisect_right(values, by_hand_ohm) - 1)
    return None if None in tried.values() else values[found]


def _last(will_do: Callable[[int], bool], count: int, *, near: int) -> int:
    """Return the last of ``count`` places that will do, 0 where none does; they do up to some place, which lies near one."""
    low, high, step = -1, count, 1
    place = min(max(near, 0), count - 1)
    while low < place < high:
        low, high = (place, high) if will_do(place) else (low, place)
        place = place + step if low == place else place - step
        step *= 2
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (middle, high) if will_do(middle) else (low, middle)
    return max(low, 0)


def _by_hand(case: Case, shunt: Device, stop_ohm: float) -> float:
    assert shunt.hfe is not None
    held = [point for point in case.solution.high_short if shunt.name in point.states]
    drops = [abs(point.states[name].voltage_V) for point in held for name in case.circuit.sense if name in point.states]
    if not held or not drops or min(drops) <= 0.0:
        return float("inf")
    shunt_A = max(abs(point.states[shunt.name].current_A) for point in held)
    return shunt_A * stop_ohm * (1.0 / shunt.hfe[0] - 1.0 / shunt.hfe[1]) / min(drops)


def _holds(case: Case, circuit: Circuit, shunt: Device) -> list[tuple[float, str, float, float]] | None:
    """Return ambient, ends of the stated ranges in words, and holds at the least and the greatest gain of the shunt, for
    every ambient and every end; None where a point was not solved."""
    assert shunt.hfe is not None and case.solution.short is not None
    by_gain = []
    try:
        places = [(ambient_degC, one) for ambient_degC in case.limits.ambient_degC for one in ends_of(case)]
        conditions = [
            Condition(ambient_degC, drive_V(case, one, on=True), one.held_V[case.solution.short], corner=one.corner)
            for ambient_degC, one in places
        ]
        for gain in shunt.hfe:
            model = {**shunt.model, "BF": gain, "XTB": 0.0}
            devices = tuple(replace(one, model=model) if one.name == shunt.name else one for one in circuit.devices)
            by_gain.append(solve_under(replace(circuit, devices=devices), conditions, case.known))
    except CircuitError:
        return None
    rows = []
    for (ambient_degC, one), low, high in zip(places, *by_gain, strict=True):
        if low is None or high is None or high.output_A == 0.0:
            return None
        rows.append((ambient_degC, one.words, abs(low.output_A), abs(high.output_A)))
    return rows


def _stop_names(case: Case) -> tuple[str, ...]:
    indices = case.limiter.elements.get("base-stop", ())
    return tuple(name for name, index in case.bench.element_of.items() if index in indices)


def _several_stops(case: Case) -> bool:
    """Tell whether the base stops stand side by side, one for each sensed device."""
    return len(_stop_names(case)) > 1 and len(case.circuit.sense) > 1


def _now_ohm(case: Case) -> float:
    """Return the base stop as drawn: one in a row together, of several side by side the first; 0 where there is none."""
    values = [device.model["R"] for device in case.circuit.devices if device.name in _stop_names(case)]
    if not values:
        return 0.0
    return values[0] if _several_stops(case) else sum(values)
