"""DC solutions of a network: Newton's method on the nodal equations, many lanes at once.

Unknown node voltages V and inner junction voltages u are solved together; each device's u is eliminated by itself (a 2 by 2
block), so the nodal matrix stays as small as the schematic. With the port currents j(u) and port voltages P(u) of
``protlint.solve.devices`` and the incidence A, the equations are

    A^T j(u) + G V = 0 (Kirchhoff's current law at the unknown nodes), P(u) = A V.

Steps of junction voltages are limited (Nagel 1975). Lanes that do not converge are tried again: from cold, from where
the circuit settles when switched on, with conductances across every port that shrink to nothing (gmin stepping), with all
supplies raised from zero (source stepping). What still does not converge is marked, never guessed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve import devices, gummel_poon
from protlint.solve.devices import Array, Evaluation
from protlint.solve.elimination import eliminate, product
from protlint.solve.lanes import Lanes, Parameters, parameters, take
from protlint.solve.network import Network

CLOSE_V = 2e-6
"""Newton's error falls with the square: a last step this small leaves less than 1e-8 of a thermal voltage."""

ITERATIONS = 30
"""Of Newton's method before another way is tried; what converges does so in 5 to 15."""
NODE_LEAK_S = 1e-13
"""From every unknown node to 0 V, so that what hangs on nothing but a capacitor has a voltage."""

GMIN_STEPS_S = (1e-2, 1e-3, 1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9, 1e-10, 1e-11, 1e-12)
SOURCE_STEPS = 24
LONGEST_GATE_STEP_V = 20.0
FIRST_HOLD_S, LAST_HOLD_S = 10.0, 1e-9
SETTLING_STEPS = 160
LONGEST_SETTLING_STEP_V = 0.5


@dataclass(frozen=True, slots=True)
class Operating:
    """Solved lanes; all voltages inside are zero where a lane did not converge.

    Inner junction voltages (ports, lanes), node voltages (nodes, lanes), currents into the circuit from what holds the known
    nodes (known nodes, lanes), and which lanes converged (lanes,).
    """

    inner: Array
    node_V: Array
    known_A: Array
    converged: NDArray[np.bool_]

    @property
    def output_A(self) -> Array:
        """Current into the circuit at the output node (lanes,); NaN where not converged."""
        return np.where(self.converged, self.known_A[-2], np.nan)


@dataclass(frozen=True, slots=True)
class Folded:
    """A group from outside: its evaluation, the inverse of the voltage slopes, the conductances at its ports."""

    evaluation: Evaluation
    inverse: Array
    conductance: Array


def solve_lanes(network: Network, lanes: Lanes, start: Array | None = None, *, insist: bool = True) -> Operating:
    """Solve every lane, from ``start`` (ports, lanes or 1) or from cold.

    Where Newton's method fails other ways are tried, one after the other; not so where ``insist`` is false, which asks only
    for what lies near the start. Lanes that are not solved are marked, never raised.
    """
    with np.errstate(all="ignore"):
        p = parameters(network, lanes)
        begin = (
            cold_start(network, p, lanes.count) if start is None else np.broadcast_to(start, (network.ports, lanes.count))
        )
        inner, voltages, converged = newton(network, p, lanes.known_V, begin)
        if not converged.all():
            stuck = np.flatnonzero(~converged)
            if insist:
                inner[:, stuck], voltages[:, stuck], converged[stuck] = _fall_back(
                    network, take(p, stuck), lanes.known_V[:, stuck]
                )
            inner[:, ~converged] = 0.0
            voltages[:, ~converged] = 0.0
        node_V = np.concatenate((voltages, lanes.known_V))
        return Operating(inner, node_V, _known_currents(network, p, inner, node_V), converged)


def cold_start(network: Network, p: Parameters, count: int) -> Array:
    """Return inner voltages to begin with: junctions at the edge of conduction, MOSFETs at their threshold."""
    inner = np.zeros((network.ports, count))
    for group, record in zip(network.groups, p.records, strict=True):
        rows = inner[group.rows].reshape(group.ports, -1, count)
        if isinstance(record, gummel_poon.Bipolars):
            rows[0] = record.V_crit[0]
        elif isinstance(record, devices.Mosfets):
            rows[0] = record.V_TO + 0.5
            rows[1] = record.V_TO - 0.5
    return inner


def newton(
    network: Network, p: Parameters, known_V: Array, start: Array, *, bridge_S: float = 0.0
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Iterate from ``start``; return inner voltages (ports, lanes), unknown node voltages, and which lanes converged.

    ``bridge_S`` lies across every port (gmin stepping).
    """
    count, unknown = known_V.shape[1], network.unknown
    inner = np.empty((network.ports, count))
    voltages = np.zeros((unknown, count))
    converged = np.zeros(count, dtype=bool)
    active = np.arange(count)
    matrix, right, outer_V = linear_part(network, p, known_V, bridge_S)
    work = np.array(start, dtype=np.float64)
    to_ports, _ = network.port_parts
    done = converged
    for _ in range(ITERATIONS):
        folded = [fold(one) for one in evaluate(network, p, work)]
        port_V, companion, conductance = companions(network, folded, outer_V)
        system = matrix + product(network.scatter, conductance)
        solved = eliminate(network.pattern, system, right - product(to_ports.T, companion))
        new = limited(network, p, work, work + inner_step(network, folded, product(to_ports, solved) + outer_V - port_V))
        moved = np.abs(new - work).max(axis=0, initial=0.0)
        done = moved < CLOSE_V
        lost = np.isnan(moved)
        if lost.any():
            new[:, lost] = 0.0
            solved[:, lost] = 0.0
        work = new
        finished = int(done.sum())
        if finished == len(active):
            break
        if finished > 0.3 * len(active):
            inner[:, active[done]], voltages[:, active[done]] = new[:, done], solved[:, done]
            converged[active[done]] = True
            left = np.flatnonzero(~done)
            active, work, p, solved = active[left], new[:, left], take(p, left), solved[:, left]
            matrix, right, outer_V = matrix[:, left], right[:, left], outer_V[:, left]
            done = np.zeros(len(left), dtype=bool)
    inner[:, active], voltages[:, active], converged[active] = work, solved, done
    return inner, voltages, converged


def settle(network: Network, p: Parameters, known_V: Array) -> Array:
    """Return inner voltages (ports, lanes) near the solution, reached as the circuit itself would reach it from rest.

    Every node has a capacitor that holds it at its last voltage; steps in time that move a node too far are taken again
    shorter, others make the next one longer (pseudo-transient continuation, C. T. Kelley and D. E. Keyes, SIAM Journal on
    Numerical Analysis 35, 1998).
    """
    count, unknown = known_V.shape[1], network.unknown
    matrix, right, outer_V = linear_part(network, p, known_V, 0.0)
    to_ports, _ = network.port_parts
    voltages, hold_S = np.zeros((unknown, count)), np.full(count, FIRST_HOLD_S)
    work = np.zeros((network.ports, count))
    for _ in range(SETTLING_STEPS):
        folded = [fold(one) for one in evaluate(network, p, work)]
        port_V, companion, conductance = companions(network, folded, outer_V)
        system = matrix + product(network.scatter, conductance)
        system[network.pattern.diagonal] += hold_S
        solved = eliminate(network.pattern, system, right - product(to_ports.T, companion) + hold_S * voltages)
        new = limited(network, p, work, work + inner_step(network, folded, product(to_ports, solved) + outer_V - port_V))
        fair = np.abs(solved - voltages).max(axis=0, initial=0.0) < LONGEST_SETTLING_STEP_V
        work, voltages = np.where(fair, new, work), np.where(fair, solved, voltages)
        hold_S = np.where(fair, hold_S * 0.4, np.minimum(hold_S * 8.0, 1e3))
        if (hold_S < LAST_HOLD_S).all():
            break
    return work


def evaluate(network: Network, p: Parameters, inner: Array) -> list[Evaluation]:
    """Evaluate every group at its inner voltages (ports, lanes), in the sense of NPN and N-channel devices."""
    results = []
    for group, record, present in zip(network.groups, p.records, p.present, strict=True):
        rows = inner[group.rows].reshape(group.ports, -1, inner.shape[1])
        if isinstance(record, gummel_poon.Bipolars):
            result: Evaluation = gummel_poon.bipolar(rows, record, present)
        elif isinstance(record, devices.Mosfets):
            result = devices.mosfet(rows, record, present)
        elif isinstance(record, devices.Diodes):
            result = devices.diode(rows, record, present)
        else:
            result = devices.limited_source(rows, record)
        results.append(result)
    return results


def linear_part(network: Network, p: Parameters, known_V: Array, bridge_S: float) -> tuple[Array, Array, Array]:
    """Return the resistors' nodal matrix (entries, lanes), their right side, and the known voltages' part of the port
    voltages."""
    count = known_V.shape[1]
    matrix = product(network.resistor_scatter, np.broadcast_to(p.conductance, (len(p.conductance), count)))
    matrix[network.pattern.diagonal] += NODE_LEAK_S
    of_unknown, of_known = network.resistor_parts
    right = -product(of_unknown.T, p.conductance * product(of_known, known_V))
    to_unknown, to_known = network.port_parts
    outer_V = product(to_known, known_V)
    if bridge_S:
        matrix += bridge_S * network.bridge_scatter[:, None]
        right -= bridge_S * product(to_unknown.T, outer_V)
    return matrix, right, outer_V


def fold(evaluation: Evaluation) -> Folded:
    """Return what a group looks like from outside its series resistances: its conductances by port voltages, in siemens
    [row, column, device, lane], are ``current_slope`` times the inverse of ``voltage_slope``."""
    m, g = evaluation.voltage_slope, evaluation.current_slope
    if len(m) == 1:
        inverse = 1.0 / m
        return Folded(evaluation, inverse, g * inverse)
    inverse = np.empty_like(m)
    inverse[0, 0] = m[1, 1]
    inverse[1, 1] = m[0, 0]
    np.negative(m[0, 1], out=inverse[0, 1])
    np.negative(m[1, 0], out=inverse[1, 0])
    inverse /= m[0, 0] * m[1, 1] - m[0, 1] * m[1, 0]
    return Folded(evaluation, inverse, g[:, 0, None] * inverse[0] + g[:, 1, None] * inverse[1])


def companions(network: Network, folded: list[Folded], outer_V: Array) -> tuple[Array, Array, Array]:
    """Return, of all groups, the port voltages (ports, lanes) that the inner ones make, the currents (ports, lanes) of the
    straight lines through the present point at no port voltage, and their slopes (conductances, lanes)."""
    lanes = outer_V.shape[1]
    port_V, companion, conductance = [], [], []
    for group, one in zip(network.groups, folded, strict=True):
        voltage = one.evaluation.port_V
        across = voltage - outer_V[group.rows].reshape(voltage.shape)
        port_V.append(voltage.reshape(-1, lanes))
        companion.append((one.evaluation.port_A - _times(one.conductance, across)).reshape(-1, lanes))
        conductance.append(one.conductance.reshape(-1, lanes))
    return stack(port_V, lanes), stack(companion, lanes), stack(conductance, lanes)


def through(network: Network, folded: list[Folded], across_V: Array) -> Array:
    """Return the port currents (ports, lanes) that port voltages (ports, lanes) drive through the groups' conductances."""
    lanes = across_V.shape[1]
    parts = [
        _times(one.conductance, across_V[group.rows].reshape(one.evaluation.port_V.shape)).reshape(-1, lanes)
        for group, one in zip(network.groups, folded, strict=True)
    ]
    return stack(parts, lanes)


def _times(block: Array, across: Array) -> Array:
    """Return a (1, 1, ...) or (2, 2, ...) block times (1, ...) or (2, ...)."""
    product: Array = block[:, 0] * across[0]
    if len(across) == 2:
        product += block[:, 1] * across[1]
    return product


def inner_step(network: Network, folded: list[Folded], miss: Array) -> Array:
    """Return Newton's step of the inner voltages (ports, lanes) that takes up what the port voltages (ports, lanes) miss."""
    steps = []
    for group, one in zip(network.groups, folded, strict=True):
        across = miss[group.rows].reshape(one.evaluation.port_V.shape)
        steps.append(_times(one.inverse, across).reshape(-1, miss.shape[1]))
    return stack(steps, miss.shape[1])


def stack(parts: list[Array], lanes: int) -> Array:
    """Return the groups' rows, each (ports, lanes), one below the other; no copy where there is but one group."""
    if len(parts) == 1:
        return parts[0]
    return np.concatenate(parts) if parts else np.zeros((0, lanes))


def limited(network: Network, p: Parameters, old: Array, new: Array) -> Array:
    """Return the new inner voltages (ports, lanes), steps from the old ones shortened to where a device's equations can be
    trusted; a device that is taken out rests at 0 V. ``new`` is overwritten."""
    for group, record, present in zip(network.groups, p.records, p.present, strict=True):
        was = old[group.rows].reshape(group.ports, -1, old.shape[1])
        now = new[group.rows].reshape(group.ports, -1, old.shape[1])
        if isinstance(record, gummel_poon.Bipolars):
            now[...] = devices.junction_step(was, now, record.per_V[:2], record.V_crit)
        elif isinstance(record, devices.Mosfets):
            now[0] = was[0] + np.clip(now[0] - was[0], -LONGEST_GATE_STEP_V, LONGEST_GATE_STEP_V)
            now[1] = now[0] + devices.junction_step(was[1] - was[0], now[1] - now[0], 1.0 / record.V_T, record.V_crit)
        elif isinstance(record, devices.Diodes):
            now[...] = devices.junction_step(was, now, 1.0 / record.V_N, record.V_crit)
            if record.B_V is not None:
                was_over, now_over = -was - record.B_V, -now - record.B_V
                over = devices.junction_step(was_over, now_over, 1.0 / record.V_B, record.V_B_crit)
                now[...] = np.where(np.isfinite(record.B_V), np.maximum(now, -over - record.B_V), now)
        elif isinstance(record, devices.Source):
            # from beyond one limit no further than to the other: past both, the iteration would jump to and fro
            edge = record.limit_A * record.resistance_ohm
            now[...] = np.where(was > edge, np.maximum(now, -edge), np.where(was < -edge, np.minimum(now, edge), now))
        if not isinstance(present, float):
            now *= present > 0.0
    return new


def _known_currents(network: Network, p: Parameters, inner: Array, node_V: Array) -> Array:
    """Return the current that each known node's holder feeds into the circuit (known nodes, lanes)."""
    port_A = stack([one.port_A.reshape(-1, inner.shape[1]) for one in evaluate(network, p, inner)], inner.shape[1])
    through = p.conductance * product(network.resistor_incidence, node_V)
    return product(network.port_parts[1].T, port_A) + product(network.resistor_parts[1].T, through)


def _fall_back(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Try a cold start; then let the circuit settle from rest; then gmin stepping; then source stepping."""
    inner, voltages, converged = _from_cold(network, p, known_V)
    for attempt in (_settled, _gmin_stepping, _source_stepping):
        stuck = np.flatnonzero(~converged)
        if len(stuck):
            again = attempt(network, take(p, stuck), known_V[:, stuck])
            inner[:, stuck], voltages[:, stuck], converged[stuck] = again
    return inner, voltages, converged


def _from_cold(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    return newton(network, p, known_V, cold_start(network, p, known_V.shape[1]))


def _settled(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    return newton(network, p, known_V, settle(network, p, known_V))


def _gmin_stepping(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    inner = cold_start(network, p, known_V.shape[1])
    for bridge_S in GMIN_STEPS_S:
        inner, _, _ = newton(network, p, known_V, inner, bridge_S=bridge_S)
    return newton(network, p, known_V, inner)


def _source_stepping(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Raise all known voltages from zero together, each step from the one before, halving steps that fail."""
    inner = np.zeros((network.ports, known_V.shape[1]))
    reached, step = 0.0, 0.25
    for _ in range(SOURCE_STEPS):
        aim = min(1.0, reached + step)
        tried, voltages, converged = newton(network, p, aim * known_V, inner)
        if aim == 1.0 and converged.all():
            return tried, voltages, converged
        if converged.all():
            inner, reached, step = tried, aim, 1.5 * step
        else:
            step *= 0.5
    return newton(network, p, known_V, inner)
