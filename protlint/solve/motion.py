"""Integration in time of an expanded network's nodal equations, conserving charge.

The equations are f(x, t) + A^T q'(A x) = 0 in the unknowns x of ``protlint.solve.expanded``: f are the static currents out
of the nodes, q the charges of the stores with rows A. Each step of length h is a trapezoidal one to a share g = 2 - sqrt(2)
of it and one of the second backward differentiation formula over all of it; both are solved by Newton's method on the
charges themselves, so that no charge is lost. The local error, of third order in h, is estimated from the three rates of
charge, filtered by the same matrix, and sets the length of the step.

References: R. E. Bank et al., "Transient simulation of silicon devices and circuits", IEEE Transactions on Electron Devices
ED-32, 1985; M. E. Hosea and L. F. Shampine, "Analysis and implementation of TR-BDF2", Applied Numerical Mathematics 20,
1996.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from protlint.solve.devices import Array
from protlint.solve.expanded import Expanded
from protlint.solve.linear import Condition, Snapshot, row_conductances, snapshot, store_matrix
from protlint.solve.parameters import CircuitError

SHARE = 2.0 - math.sqrt(2.0)
_BACK = SHARE / 2.0
"""Both stages work with the same rate 1 / (SHARE / 2 * h)."""
_FIRST = 1.0 / (SHARE * (2.0 - SHARE))
_ZEROTH = -((1.0 - SHARE) ** 2) * _FIRST
_ERROR = 2.0 * (-3.0 * SHARE**2 + 4.0 * SHARE - 2.0) / (12.0 * (2.0 - SHARE))

TOLERANCE_V, TOLERANCE_A, TOLERANCE_SHARE = 3e-5, 1e-5, 3e-5
"""Of a step: absolute for voltages and for inductors' currents, and a share of their size."""
NEWTON_SHARE = 0.3
"""Newton's last step by the tolerance."""
ITERATIONS = 12
FIRST_STEP_S, LEAST_STEP_S = 1e-11, 1e-17
_GROWTH, _SHRINKING, _SAFETY = 4.0, 0.2, 0.85


@dataclass(frozen=True, slots=True)
class Motion:
    """A network to integrate: its parameters, the values of capacitors and inductors, and what holds its known nodes (V, by
    time) and flows into its unknowns (A, by time)."""

    expanded: Expanded
    at: Condition
    passive: Array
    known_V: Callable[[float], Array]
    injected_A: Callable[[float], Array]


@dataclass(frozen=True, slots=True)
class _Frame:
    """What every step of a motion asks of its network: the rows of resistances and junctions over all nodes; these and the
    stores over the unknowns; the voltages (and inductors' currents) whose error is watched, and what is allowed of each."""

    rows: Array
    own: Array
    stores: Array
    watched: Array
    allowed: Array


@dataclass(frozen=True, slots=True)
class Instant:
    """A solved moment: all voltages (and inductors' currents), the currents through the rows of resistances and junctions,
    and the stores' charges and their rates."""

    time_s: float
    voltages: Array
    through_A: Array
    charge: Array
    charge_A: Array


@dataclass(frozen=True, slots=True)
class _Matrices:
    """A linearisation: rows of resistances and junctions, of stores, and what acts between them."""

    between: Array
    capacitance: Array
    system: Array


def at_rest(motion: Motion, voltages: Array, time_s: float = 0.0) -> Instant:
    """Return the moment at which nothing moves, from voltages (nodes,) near it.

    Raises
    ------
    CircuitError
        Where there is none near.
    """
    none = np.zeros(len(motion.expanded.stores))
    found = _solve(motion, _frame(motion.expanded), time_s, voltages, none, 0.0)
    if found is None:
        raise CircuitError("no operating point to begin the step from was found")
    return found[0]


def integrate(motion: Motion, start: Instant, breaks_s: tuple[float, ...]) -> Iterator[Instant]:
    """Yield one moment after the other, for as long as asked; a step ends at each of ``breaks_s``.

    Raises
    ------
    CircuitError
        Where no step is short enough.
    """
    now, step_s, frame = start, FIRST_STEP_S, _frame(motion.expanded)
    slope = np.zeros_like(start.voltages)
    while True:
        end_s = next((one for one in breaks_s if one > now.time_s), math.inf)
        last = now.time_s + step_s * 1.0001 >= end_s
        h = end_s - now.time_s if last else step_s
        if h < LEAST_STEP_S:
            raise CircuitError(f"the step into the short could not be followed beyond {now.time_s:.3g} s")
        made = _step(motion, frame, now, slope, h, end_s if last else now.time_s + h)
        if made is None:
            step_s = 0.25 * h
            continue
        after, error = made
        factor = min(_GROWTH, max(_SHRINKING, _SAFETY * max(error, 1e-6) ** (-1.0 / 3.0)))
        if error > 1.0:
            step_s = h * min(factor, 0.9)
            continue
        slope = (after.voltages - now.voltages) / h
        now, step_s = after, FIRST_STEP_S if last else h * factor
        yield now


def _frame(expanded: Expanded) -> _Frame:
    rows = np.concatenate((expanded.resistances, expanded.junctions))
    watched = np.concatenate((expanded.junctions, expanded.stores))
    allowed = np.full(len(watched), TOLERANCE_V)
    inductors = sum(device.kind == "inductor" for device in expanded.passive)
    if inductors:
        allowed[-inductors:] = TOLERANCE_A
    count = expanded.unknown
    return _Frame(rows, rows[:, :count], expanded.stores[:, :count], watched, allowed)


def _step(motion: Motion, frame: _Frame, now: Instant, slope: Array, h: float, end_s: float) -> tuple[Instant, float] | None:
    """Return the moment after a step of h and its error by the tolerance, or None where Newton's method fails."""
    rate = 1.0 / (_BACK * h)
    middle_s = now.time_s + SHARE * h
    first = _solve(motion, frame, middle_s, now.voltages + SHARE * h * slope, now.charge + now.charge_A / rate, rate)
    if first is None:
        return None
    middle = first[0]
    target = _FIRST * middle.charge + _ZEROTH * now.charge
    guess = now.voltages + (middle.voltages - now.voltages) / SHARE
    second = _solve(motion, frame, end_s, guess, target, rate)
    if second is None:
        return None
    after, matrices = second
    third = now.charge_A / SHARE - middle.charge_A / (SHARE * (1.0 - SHARE)) + after.charge_A / (1.0 - SHARE)
    error = np.linalg.solve(matrices.system, rate * _ERROR * h * (frame.stores.T @ third))
    return after, _size(frame, after.voltages, error) if np.isfinite(error).all() else 1e9


@np.errstate(all="ignore")
def _solve(
    motion: Motion, frame: _Frame, time_s: float, guess: Array, target: Array, rate: float
) -> tuple[Instant, _Matrices] | None:
    """Solve f(x) + A^T rate (q(x) - target) = injected; return the moment and the last linearisation, None where none is.

    A wild guess may overflow on its way; what is not finite is no solution.
    """
    expanded = motion.expanded
    count = expanded.unknown
    voltages = guess.copy()
    voltages[count:] = motion.known_V(time_s)
    injected = motion.injected_A(time_s)
    for _ in range(ITERATIONS):
        shot = snapshot(expanded, motion.at, voltages[:, None], motion.passive)
        through = np.concatenate((shot.conductance[:, 0] * (expanded.resistances @ voltages), shot.junction_A[:, 0]))
        charge_A = rate * (shot.charge[:, 0] - target)
        miss = frame.own.T @ through + expanded.constant @ voltages + frame.stores.T @ charge_A - injected
        matrices = _matrices(expanded, frame, shot, rate)
        try:
            change = np.linalg.solve(matrices.system, -miss)
        except np.linalg.LinAlgError:
            return None
        if not np.isfinite(change).all():
            return None
        size = _size(frame, voltages, change)
        voltages[:count] += change
        if size < NEWTON_SHARE:
            moved = matrices.capacitance @ (frame.stores @ change)
            return (
                Instant(
                    time_s,
                    voltages,
                    through + matrices.between @ (frame.own @ change),
                    shot.charge[:, 0] + moved,
                    charge_A + rate * moved,
                ),
                matrices,
            )
    return None


def _matrices(expanded: Expanded, frame: _Frame, shot: Snapshot, rate: float) -> _Matrices:
    between, capacitance = row_conductances(expanded, shot)[0], store_matrix(expanded, shot)[0]
    own, stores = frame.own, frame.stores
    system = own.T @ (between @ own) + expanded.constant[:, : expanded.unknown] + rate * (stores.T @ (capacitance @ stores))
    return _Matrices(between, capacitance, system)


def _size(frame: _Frame, voltages: Array, change: NDArray[np.floating[Any]]) -> float:
    """Return the greatest change of a junction's or store's voltage (or an inductor's current) by its tolerance."""
    moved = np.abs(frame.watched[:, : len(change)] @ change)
    return float((moved / (frame.allowed + TOLERANCE_SHARE * np.abs(frame.watched @ voltages))).max(initial=0.0))
