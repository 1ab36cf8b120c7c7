"""The step into the short: how long the limiter lets more through than it holds, how much, and whether it settles.

With the drive at its on end, the output goes from its working voltage, or from where pass device and sense resistance
together have 2 V, to the short in 100 ns; the circuit follows by ``protlint.solve.motion``. The delay ends the last time the
output current falls below 1.1 times holds.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from protlint.quantities import format_quantity
from protlint.solve.circuit import Circuit
from protlint.solve.devices import Array
from protlint.solve.expanded import Expanded, expand
from protlint.solve.lanes import parameters
from protlint.solve.linear import condition, passive_values, unfold
from protlint.solve.loop import USUAL, Held, hold
from protlint.solve.modes import damping
from protlint.solve.motion import Instant, Motion, at_rest, integrate
from protlint.solve.network import compile_network
from protlint.solve.parameters import CircuitError
from protlint.solve.solution import Step
from protlint.solve.stage import run_stage
from protlint.solve.wired import linearise, look, wired_frequencies

RAMP_S = 100e-9
OVER = 1.1
"""Times holds; the delay lasts until the output current is below for good."""
BEGIN_V = 2.0
"""What pass device and sense together have where no working output voltage is stated."""

CLOSE_V, CLOSE_SHARE = 5e-3, 0.03
"""At rest for good: for a whole period every junction and store this near its final voltage, the current this near holds."""
DYING_PERIODS, DYING_WINDOWS, DYING_SHARE = 2.0, 10, 0.9
"""A ringing dies out where, window after window of so many periods, all swings to both sides of its final value and the
current stays more than half way below the level, and the swings are down to this share of what they were so many windows
ago."""
RINGS_BELOW = 0.6
"""A mode damped more overshoots by less than a tenth, so that its period need not be waited for."""
SUSTAINED_OVER, SUSTAINED_SHARE = 6, 1e-3
"""A current whose swings past the level have not fallen by this share of their height over so many swings on; where a mode
grows, one whose swings have not risen by it gets no higher."""
MOST_STEPS, MOST_S = 5000, 1e3
"""A step is followed so far and no further: no limiter is as slow, and one that rings longer is hardly damped."""
MOST_GROWING_STEPS = 1500
"""The same where a mode grows: only the peak is still asked for."""
SWINGS = 10.0
"""Periods of a growing mode that are followed at most."""


@dataclass(frozen=True, slots=True)
class Course:
    """What is read off a moment: time, output current the limiter's way, and the power into each pass device."""

    time_s: float
    output_A: float
    pass_W: Array


@dataclass(frozen=True, slots=True)
class Trial:
    """A step to follow: the motion, the rows of junctions and stores, where it begins and ends, holds, what reads a moment,
    the longest period of a mode that rings there, and the slowest mode that grows there (None: all decay)."""

    expanded: Expanded
    motion: Motion
    watched: Array
    start: Instant
    final: Array
    holds_A: float
    read: Callable[[Instant], Course]
    period_s: float
    grows_Hz: float | None


def solve_step(circuit: Circuit, ambients_degC: tuple[float, float, float], *, short: str | None = None) -> Step | str:
    """Return the answers of the step into the short at usual ambient, parts as drawn, or the reason why there are none.

    ``short`` is the net the output is shorted to, by default the one of ``circuit.shorts`` with the greatest holds. The
    energy is what goes into the pass device that takes the most until the delay is over. Where the current swings on, delay
    and energy are None. One that still rings when it has been followed as far as is worth while, and falls all the time,
    has no answer: the reason says how long it was followed.
    """
    try:
        return follow(prepare_step(circuit, ambients_degC, short))
    except CircuitError as reason:
        return str(reason)


def rc_delay(R: float, C: float, before: float, fault: float) -> float:
    """Return the time (s) in which an RC at the shunt's base reaches its turn-on voltage: R C ln((m - p) / (m - 1)).

    The first-order answer of any textbook on circuits to a step, for working by hand.

    Parameters
    ----------
    R : resistance into the base, ohm
    C : capacitance from base to emitter, F
    before, fault : p and m, the drop across the sense resistance before and in the fault, by the turn-on voltage

    Returns
    -------
    The delay; infinite for a fault that does not reach the turn-on voltage, 0 where it was reached before.

    Examples
    --------
    >>> round(rc_delay(1e3, 1e-6, 0.0, 2.0) * 1e3, 2)
    0.69
    """
    if fault <= 1.0:
        return math.inf
    return R * C * math.log(max(fault - before, fault - 1.0) / (fault - 1.0))


def prepare_step(circuit: Circuit, ambients_degC: tuple[float, float, float], short: str | None = None) -> Trial:
    """Return the step into the short at usual ambient, ready to be followed.

    Raises
    ------
    CircuitError
        Where there is none: missing part data, no operating point, no output voltage to begin from.
    """
    network = compile_network(circuit)
    expanded = expand(network)
    held = hold(network, ambients_degC, short)
    usual = np.array([USUAL])
    final_run = held.short
    begin_V = circuit.output_V if circuit.output_V is not None else begin_voltage(held)
    begin = run_stage(held.stage, final_run.lanes.ambient_K[usual], output_V=np.array([begin_V]))
    if not begin.operating.converged[0]:
        raise CircuitError(f"no operating point was found with the output at {begin_V:.3g} V to begin the step from")
    p = parameters(network, begin.lanes)
    at = condition(expanded, p, begin.lanes.ambient_K)
    final = unfold(expanded, final_run.operating.node_V[:, usual], final_run.operating.inner[:, usual], p)[:, 0]
    first = unfold(expanded, begin.operating.node_V, begin.operating.inner, p)[:, 0]
    output, count = expanded.index(circuit.output), expanded.unknown
    short_V = float(final[output])

    def known_V(time_s: float) -> Array:
        voltages = final[count:].copy()
        voltages[output - count] = begin_V + (short_V - begin_V) * min(1.0, time_s / RAMP_S)
        return voltages

    none = np.zeros(count)
    motion = Motion(expanded, at, passive_values(expanded), known_V, lambda time_s: none)
    wired = expand(network, output="wired")
    s = wired_frequencies(linearise(wired, look(wired, final_run, usual)), 0.0)[0]
    growing = np.abs(s[np.isfinite(s) & (s.real > 0.0)])
    ringing = np.abs(s[np.isfinite(s) & (damping(s) < RINGS_BELOW)])
    inductors = sum(device.kind == "inductor" for device in expanded.passive)
    stores = expanded.stores[: len(expanded.stores) - inductors]
    return Trial(
        expanded=expanded,
        motion=motion,
        watched=np.concatenate((expanded.junctions, stores)),
        start=at_rest(motion, first),
        final=final,
        holds_A=float(final_run.output_A[USUAL]),
        read=_reader(expanded, held.stage.way),
        period_s=float(2.0 * np.pi / ringing.min(initial=np.inf)),
        grows_Hz=float(growing.min() / (2.0 * np.pi)) if len(growing) else None,
    )


def begin_voltage(held: Held) -> float:
    """Return the output voltage that leaves pass device and sense resistance together 2 V.

    Raises
    ------
    CircuitError
        Where there is none.
    """
    stage, circuit = held.stage, held.stage.network.circuit
    place = {node: index for index, node in enumerate(stage.network.nodes)}
    paths = _paths(circuit)
    short_V = float(held.short.output_V[USUAL])
    low_V, high_V = circuit.output_reach_V
    low_V, high_V = min(low_V, short_V), max(high_V, short_V)
    far_V = high_V if stage.way < 0.0 else low_V
    inner = held.short.operating.inner[:, [USUAL]]
    left_V, right_V = short_V, far_V
    for _ in range(2):
        at_V = np.linspace(left_V, right_V, 17)
        ambient_K = np.full(len(at_V), held.short.lanes.ambient_K[USUAL])
        run = run_stage(stage, ambient_K, output_V=at_V, start=np.broadcast_to(inner, (len(inner), len(at_V))))
        node_V = run.operating.node_V
        across = np.min([np.ptp(node_V[[place[node] for node in nodes]], axis=0) for nodes in paths], axis=0)
        under = np.flatnonzero((across < BEGIN_V) & run.operating.converged)
        if not len(under) or under[0] == 0:
            raise CircuitError(f"no output voltage leaves pass device and sense resistance {BEGIN_V:g} V: output")
        right = int(under[0])
        left_V, right_V = float(at_V[right - 1]), float(at_V[right])
        inner = run.operating.inner[:, [right - 1]]
        share = (across[right - 1] - BEGIN_V) / (across[right - 1] - across[right])
    return left_V + float(share) * (right_V - left_V)


def _paths(circuit: Circuit) -> list[tuple[str, ...]]:
    """Return, for each pass device, the nodes that it and the sense resistance lie between: its ends and that one's.

    Of several sense resistances the one at its common terminal counts, where one is there.
    """
    nodes = {device.name: device.nodes for device in circuit.devices}
    paths = []
    for name in circuit.pass_devices:
        ends = (nodes[name][0], nodes[name][-1])
        at_it = [sense for sense in circuit.sense if ends[1] in nodes[sense]]
        paths.append((*ends, *(node for sense in at_it or circuit.sense[:1] for node in nodes[sense])))
    if not paths:
        raise CircuitError("a pass device with a sense resistance")
    return paths


def follow(trial: Trial) -> Step:
    """Follow a step until it rests, or swings on, and read its figures.

    Raises
    ------
    CircuitError
        Where it still rings when it has been followed as far as is worth while.
    """
    level_A = OVER * trial.holds_A
    course = [trial.read(trial.start)]
    tops: list[float] = []
    grows = trial.grows_Hz is not None
    until_s = min(MOST_S, RAMP_S + SWINGS / trial.grows_Hz if trial.grows_Hz else math.inf)
    most_steps = MOST_GROWING_STEPS if grows else MOST_STEPS
    close_s, rests, swings = math.inf, False, _Swings(trial)
    for instant in integrate(trial.motion, trial.start, (RAMP_S,)):
        course.append(trial.read(instant))
        now_A = course[-1].output_A
        if course[-2].output_A <= level_A < now_A:
            change = _change(tops, trial.holds_A)
            if change is not None and (change < SUSTAINED_SHARE if grows else change > -SUSTAINED_SHARE):
                grows = True
                break
            tops.append(now_A)
        elif tops:
            tops[-1] = max(tops[-1], now_A)
        close = instant.time_s > RAMP_S and not grows and _is_close(trial, instant, course[-1])
        close_s = min(close_s, instant.time_s) if close else math.inf
        rests = instant.time_s - close_s >= trial.period_s or (not grows and swings.die_out(instant, now_A))
        if rests or instant.time_s > until_s or len(course) > most_steps:
            break
    peak_A = max(trial.holds_A, *(one.output_A for one in course))
    last = max((place for place, one in enumerate(course) if one.output_A > level_A), default=None)
    quiet = last is None or course[last].time_s < 0.5 * course[-1].time_s
    if grows:
        return Step(settles=False, delay_s=None, peak_A=peak_A, pass_energy_J=None)
    if not (rests or quiet):
        lasts = format_quantity(course[-1].time_s, "s")
        raise CircuitError(f"an end of the step into the short, which still rings after {lasts}, {len(tops)} swings")
    if last is None or last + 1 == len(course):
        return Step(settles=True, delay_s=0.0, peak_A=peak_A, pass_energy_J=0.0)
    before, after = course[last], course[last + 1]
    share = (before.output_A - level_A) / (before.output_A - after.output_A)
    delay_s = before.time_s + share * (after.time_s - before.time_s)
    times = np.array([one.time_s for one in course[: last + 1]] + [delay_s])
    powers = np.array([one.pass_W for one in course[: last + 1]] + [before.pass_W + share * (after.pass_W - before.pass_W)])
    energy = 0.5 * (np.diff(times)[:, None] * (powers[:-1] + powers[1:])).sum(axis=0)
    return Step(settles=True, delay_s=delay_s, peak_A=peak_A, pass_energy_J=float(energy.max(initial=0.0)))


@dataclass(slots=True)
class _Swings:
    """How far the voltages of junctions and stores lay from their final values, window by window: the least and the greatest
    of each and the greatest current in the present one, and the heights of those before in which all swung to both sides."""

    trial: Trial
    until_s: float = RAMP_S
    least_V: Array | None = None
    greatest_V: Array | None = None
    top_A: float = 0.0
    heights_V: list[float] = field(default_factory=list)

    def die_out(self, instant: Instant, now_A: float) -> bool:
        """Take a moment in; tell whether the swings up to it die out, so that the current does not reach the level again.

        A window is long enough for the slowest mode that rings. What creeps instead is not on both sides of its final value.
        """
        away_V = _away(self.trial, instant)
        self.least_V = away_V if self.least_V is None else np.minimum(self.least_V, away_V)
        self.greatest_V = away_V if self.greatest_V is None else np.maximum(self.greatest_V, away_V)
        self.top_A = max(self.top_A, now_A)
        if instant.time_s < self.until_s:
            return False
        least_V, greatest_V = self.least_V, self.greatest_V
        both_sides = (least_V < 0.0) & (greatest_V > 0.0) | (np.maximum(-least_V, greatest_V) < CLOSE_V)
        if both_sides.all() and self.top_A < 0.5 * (1.0 + OVER) * self.trial.holds_A:
            self.heights_V.append(float((greatest_V - least_V).max(initial=0.0)))
        else:
            self.heights_V.clear()
        self.until_s = instant.time_s + DYING_PERIODS * self.trial.period_s
        self.least_V = self.greatest_V = None
        self.top_A = 0.0
        heights = self.heights_V
        return len(heights) > DYING_WINDOWS and heights[-1] < DYING_SHARE * heights[-1 - DYING_WINDOWS]


def _change(tops: Sequence[float], holds_A: float) -> float | None:
    """Return by what share of itself the height of the swings past the level has changed over the last few, from the
    greatest current of each; None where there are not enough yet."""
    if len(tops) <= SUSTAINED_OVER:
        return None
    return (tops[-1] - holds_A) / (tops[-1 - SUSTAINED_OVER] - holds_A) - 1.0


def _reader(expanded: Expanded, way: float) -> Callable[[Instant], Course]:
    """Return what reads the output current and the power into each pass device's terminals off a moment."""
    rows = np.concatenate((expanded.resistances, expanded.junctions))
    output = expanded.index(expanded.network.circuit.output)
    into, stored = rows[:, output], expanded.stores[:, output]
    led = _led(expanded, output)
    of_rows, of_stores = _rows_of_passing(expanded)

    def read(instant: Instant) -> Course:
        output_A = float(into @ instant.through_A + stored @ instant.charge_A + led @ instant.voltages)
        power = of_rows @ (instant.through_A * (rows @ instant.voltages))
        power += of_stores @ (instant.charge_A * (expanded.stores @ instant.voltages))
        return Course(instant.time_s, way * output_A, power)

    return read


def _led(expanded: Expanded, output: int) -> Array:
    """Return which inductors' currents flow out of the output's node (1) or into it (-1), as a row over all nodes."""
    inductors = [device for device in expanded.passive if device.kind == "inductor"]
    first = expanded.unknown - len(inductors)
    led = np.zeros(len(expanded.nodes))
    for place, device in enumerate(inductors, start=first):
        led[place] = sum(
            sign for node, sign in zip(device.nodes, (1.0, -1.0), strict=True) if node == expanded.nodes[output]
        )
    return led


def _rows_of_passing(expanded: Expanded) -> tuple[Array, Array]:
    """Return which rows of resistances and junctions, and which stores, lie inside each pass device (devices, rows), as 0
    and 1."""
    network, first = expanded.network, len(expanded.resistances)
    owners = [network.groups[series.group].devices[series.row].name for series in expanded.series]
    rows, stores = [], []
    for group in network.groups:
        for row, device in enumerate(group.devices):
            if device.name not in network.circuit.pass_devices:
                continue
            inside = np.zeros(first + len(expanded.junctions))
            inside[[first + group.rows.start + port * len(group.devices) + row for port in range(group.ports)]] = 1.0
            for index, owner in enumerate(owners):
                inside[len(network.resistors) + index] = float(owner == device.name)
            rows.append(inside)
            stores.append([float(owner == device.name) for owner in expanded.store_owner])
    return np.array(rows).reshape(len(rows), -1), np.array(stores).reshape(len(rows), -1)


def _is_close(trial: Trial, instant: Instant, at: Course) -> bool:
    """Tell whether a moment is so near the held short that only its own modes, which all decay, are left."""
    near = np.abs(_away(trial, instant)).max(initial=0.0) < CLOSE_V
    return bool(near) and abs(at.output_A / trial.holds_A - 1.0) < CLOSE_SHARE


def _away(trial: Trial, instant: Instant) -> Array:
    """Return how far the voltages of junctions and stores lie from their final ones."""
    away_V: Array = trial.watched @ (instant.voltages - trial.final)
    return away_V
