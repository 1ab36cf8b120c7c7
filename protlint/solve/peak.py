"""How long a limiter bears a load peak that it would not carry for ever.

The drive is at its on end and the output free: a load draws first what it draws for ever, then rises to the peak in a
twentieth of its time (in 100 ns at least). The stage gives it until the shunt has taken so much of the drive that the output
is carried off, past the voltage that the load needs; that time is worked out by ``protlint.solve.motion``, at usual ambient,
parts as drawn.
"""

from __future__ import annotations

import math

import numpy as np

from protlint.solve.circuit import Circuit
from protlint.solve.delay import MOST_STEPS, RAMP_S, begin_voltage
from protlint.solve.devices import Array
from protlint.solve.expanded import expand
from protlint.solve.lanes import parameters
from protlint.solve.linear import condition, passive_values, unfold
from protlint.solve.loop import USUAL, Held, hold
from protlint.solve.motion import Motion, at_rest, integrate
from protlint.solve.network import compile_network
from protlint.solve.parameters import CircuitError
from protlint.solve.stage import run_stage

RISE_SHARE = 0.05
_POINTS = 129


def ride_through(
    circuit: Circuit,
    ambients_degC: tuple[float, float, float],
    *,
    peak_A: float,
    lasts_s: float,
    before_A: float = 0.0,
    output_V: float | None = None,
    short: str | None = None,
) -> float | str:
    """Return how long (s) a stage gives a peak before its output falls short, or the reason why that is not known.

    Infinite where it outlasts ``lasts_s``; 0 where the stage could not even give ``before_A``.

    Parameters
    ----------
    peak_A, lasts_s : the peak, and how long it is asked for
    before_A : what the load draws before, the limiter's way
    output_V : the output voltage the load needs; where None, what leaves pass device and sense resistance 2 V
    short : as for ``protlint.solve.loop.solve_loop``
    """
    try:
        network = compile_network(circuit)
        held = hold(network, ambients_degC, short)
        needed_V = begin_voltage(held) if output_V is None else output_V
        begun = _before(held, before_A, needed_V)
        if begun is None:
            return 0.0
        return _borne(held, begun, needed_V, before_A, peak_A, lasts_s)
    except CircuitError as reason:
        return str(reason)


def _before(held: Held, before_A: float, needed_V: float) -> float | None:
    """Return the output voltage at which the stage gives what the load draws before; None where it gives less.

    It lies beyond what the load needs, seen from the short, as far as the stage lets it.
    """
    stage, circuit = held.stage, held.stage.network.circuit
    short_V = float(held.short.output_V[USUAL])
    low_V, high_V = circuit.output_reach_V
    far_V = max(high_V, short_V, needed_V) if stage.way < 0.0 else min(low_V, short_V, needed_V)
    at_V = np.linspace(needed_V, far_V, _POINTS)
    inner = held.short.operating.inner[:, [USUAL]]
    start = np.broadcast_to(inner, (len(inner), _POINTS))
    run = run_stage(stage, np.full(_POINTS, held.short.lanes.ambient_K[USUAL]), output_V=at_V, start=start)
    gives = np.flatnonzero(run.output_A >= before_A)
    if not len(gives):
        return None
    last = int(gives[-1])
    if last + 1 == _POINTS:
        return float(at_V[last])
    share = (run.output_A[last] - before_A) / (run.output_A[last] - run.output_A[last + 1])
    return float(at_V[last] + share * (at_V[last + 1] - at_V[last]))


def _borne(held: Held, begun_V: float, needed_V: float, before_A: float, peak_A: float, lasts_s: float) -> float:
    """Follow the stage from its rest through the peak; return when the output passes ``needed_V``."""
    stage, network = held.stage, held.stage.network
    expanded = expand(network, output="free")
    usual = np.array([USUAL])
    run = run_stage(stage, held.short.lanes.ambient_K[usual], output_V=np.array([begun_V]))
    p = parameters(network, run.lanes)
    first = unfold(expanded, run.operating.node_V, run.operating.inner, p)[:, 0]
    known_V = first[expanded.unknown :].copy()
    output = expanded.index(network.circuit.output)
    rise_s = max(RAMP_S, RISE_SHARE * lasts_s)

    def drawn_A(time_s: float) -> Array:
        current = np.zeros(expanded.unknown)
        current[output] = stage.way * (before_A + (peak_A - before_A) * min(1.0, time_s / rise_s))
        return current

    at = condition(expanded, p, run.lanes.ambient_K)
    motion = Motion(expanded, at, passive_values(expanded), lambda time_s: known_V, drawn_A)
    begin = at_rest(motion, first)
    away = math.copysign(1.0, float(begin.voltages[output]) - needed_V)
    previous = begin
    for steps, instant in enumerate(integrate(motion, begin, (rise_s, lasts_s))):
        left_V = away * (instant.voltages[output] - needed_V)
        if left_V < 0.0:
            before_V = away * (previous.voltages[output] - needed_V)
            share = float(before_V / (before_V - left_V))
            return previous.time_s + share * (instant.time_s - previous.time_s)
        if instant.time_s >= lasts_s:
            return math.inf
        if steps > MOST_STEPS:
            raise CircuitError("the peak could not be followed to its end")
        previous = instant
    raise AssertionError("the integration goes on for as long as it is asked")
