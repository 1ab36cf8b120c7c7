"""DC solutions of a network: Newton's method on the nodal equations, many lanes at once.

Unknown node voltages V and inner junction voltages u are solved together; each device's u is eliminated by itself (a 2 by 2
block), so the nodal matrix stays as small as the schematic. With the port currents j(u) and port voltages P(u) of
``protlint.solve.devices`` and the incidence A, the equations are

    A^T j(u) + G V = 0 (Kirchhoff's current law at the unknown nodes), P(u) = A V.

Steps of junction voltages are limited (Nagel 1975). Lanes that do not converge are tried again from a cold start with
conductances across every port that shrink to nothing (gmin stepping), then with all supplies raised from zero (source
stepping). What still does not converge is marked, never guessed.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve import devices
from protlint.solve.devices import Array, Evaluation
from protlint.solve.lanes import Lanes, Parameters, parameters, take
from protlint.solve.network import Group, Network

CLOSE_V = 2e-6
"""Newton's error falls with the square: a last step this small leaves less than 1e-8 of a thermal voltage."""

ITERATIONS = 60
NODE_LEAK_S = 1e-13
"""From every unknown node to 0 V, so that what hangs on nothing but a capacitor has a voltage."""
DAMP_AFTER = 25
"""Lanes that swing to and fro take half steps from here on."""

GMIN_STEPS_S = (1e-2, 1e-3, 1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9, 1e-10, 1e-11, 1e-12)
LONGEST_GATE_STEP_V = 2.0

Charges = Callable[[Group, slice, Array, Evaluation], Evaluation]
"""Adds a group's charge currents: (group, its rows of inner, inner of the group, static evaluation) to evaluation."""


@dataclass(frozen=True, slots=True)
class Operating:
    """Solved lanes: inner junction voltages (ports, lanes), node voltages (nodes, lanes), currents into the circuit from
    what holds the known nodes (known nodes, lanes), and which lanes converged (lanes,)."""

    inner: Array
    node_V: Array
    known_A: Array
    converged: NDArray[np.bool_]

    @property
    def output_A(self) -> Array:
        """Current into the circuit at the output node (lanes,); NaN where not converged."""
        return np.where(self.converged, self.known_A[-2], np.nan)


def solve_lanes(network: Network, lanes: Lanes, start: Array | None = None) -> Operating:
    """Solve every lane, from ``start`` (ports, lanes or 1) or from cold; falls back on stepping where Newton fails."""
    with np.errstate(all="ignore"):
        p = parameters(network, lanes)
        begin = (
            cold_start(network, p, lanes.count) if start is None else np.broadcast_to(start, (network.ports, lanes.count))
        )
        inner, voltages, converged = newton(network, p, lanes.known_V, begin)
        if not converged.all():
            stuck = np.flatnonzero(~converged)
            inner[:, stuck], voltages[:, stuck], converged[stuck] = _fall_back(
                network, take(p, stuck), lanes.known_V[:, stuck]
            )
        node_V = np.concatenate((voltages, lanes.known_V))
        return Operating(inner, node_V, _known_currents(network, p, inner, node_V), converged)


def cold_start(network: Network, p: Parameters, count: int) -> Array:
    """Return inner voltages to begin with: junctions at the edge of conduction, MOSFETs at their threshold."""
    inner = np.zeros((network.ports, count))
    for group, record in zip(network.groups, p.records, strict=True):
        rows = inner[group.rows].reshape(group.ports, -1, count)
        if isinstance(record, devices.Bipolars):
            rows[0] = record.V_F * np.log(record.V_F / (np.sqrt(2.0) * record.I_S))
        elif isinstance(record, devices.Mosfets):
            rows[0] = record.V_TO + 0.5
            rows[1] = record.V_TO - 0.5
    return inner


def newton(
    network: Network,
    p: Parameters,
    known_V: Array,
    start: Array,
    *,
    bridge_S: float = 0.0,
    charges: Charges | None = None,
    injected_A: Array | None = None,
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Iterate from ``start``; return inner voltages (ports, lanes), unknown node voltages, and which lanes converged.

    ``bridge_S`` lies across every port (gmin stepping); ``charges`` adds charge currents to the devices; ``injected_A``
    (unknown nodes, lanes) flows into the nodes.
    """
    count, unknown = known_V.shape[1], network.unknown
    inner = np.array(start, dtype=np.float64)
    voltages = np.zeros((unknown, count))
    converged = np.zeros(count, dtype=bool)
    active = np.arange(count)
    matrix, right, outer_V = _linear_part(network, p, known_V, bridge_S)
    if injected_A is not None:
        right = right + injected_A
    work = inner
    to_unknown = np.ascontiguousarray(network.incidence[:, :unknown].T)
    for iteration in range(ITERATIONS):
        evaluations = evaluate(network, p, work, charges)
        conductance, port_V, port_A = _gather(network, evaluations, work.shape)
        companion = port_A - _through(network, conductance, port_V - outer_V, work.shape)
        system = matrix + (network.scatter @ conductance).reshape(unknown, unknown, -1)
        solved = eliminate(system, right - to_unknown @ companion)
        step = _inner_step(network, evaluations, to_unknown.T @ solved + outer_V - port_V)
        if iteration >= DAMP_AFTER:
            step *= 0.5
        new = _limited(network, p, work, work + step)
        moved = np.abs(new - work).max(axis=0) if len(new) else np.zeros(work.shape[1])
        finite = np.isfinite(moved) & np.isfinite(solved).all(axis=0)
        new = np.where(finite, new, 0.0)
        done = finite & (moved < CLOSE_V)
        inner[:, active] = new
        voltages[:, active] = np.where(finite, solved, 0.0)
        converged[active] = done
        left = np.flatnonzero(~done)
        if not len(left):
            break
        work = new
        if len(left) < 0.7 * len(active):
            active, work, p = active[left], new[:, left], take(p, left)
            matrix, right, outer_V = matrix[:, :, left], right[:, left], outer_V[:, left]
    return inner, voltages, converged


def evaluate(network: Network, p: Parameters, inner: Array, charges: Charges | None = None) -> list[Evaluation]:
    """Evaluate every group at its inner voltages (ports, lanes), in the sense of NPN and N-channel devices."""
    results = []
    for group, record, present in zip(network.groups, p.records, p.present, strict=True):
        rows = inner[group.rows].reshape(group.ports, -1, inner.shape[1])
        if isinstance(record, devices.Bipolars):
            result = devices.bipolar(rows, record, present)
        elif isinstance(record, devices.Mosfets):
            result = devices.mosfet(rows, record, present)
        elif isinstance(record, devices.Diodes):
            result = devices.diode(rows, record, present)
        else:
            result = devices.limited_source(rows, record)
        results.append(result if charges is None else charges(group, group.rows, rows, result))
    return results


def outside(evaluation: Evaluation) -> Array:
    """Return the conductances seen at the ports, outside the series resistances: current_slope inverse(voltage_slope)."""
    m, g = evaluation.voltage_slope, evaluation.current_slope
    if len(m) == 1:
        return g / m
    inverse = _inverse(m)
    result = np.empty_like(g)
    result[:, 0] = g[:, 0] * inverse[0, 0] + g[:, 1] * inverse[1, 0]
    result[:, 1] = g[:, 0] * inverse[0, 1] + g[:, 1] * inverse[1, 1]
    return result


def eliminate(matrix: Array, right: Array) -> Array:
    """Solve (n, n, lanes) systems for (n, lanes) right sides by Gaussian elimination along the diagonal.

    Nodal matrices bear elimination without exchanges; a lane that does not comes out as infinite or NaN and is caught.
    The inputs are overwritten.
    """
    size = len(right)
    for k in range(size - 1):
        factor = matrix[k + 1 :, k] / matrix[k, k]
        matrix[k + 1 :, k + 1 :] -= factor[:, None] * matrix[k, k + 1 :]
        right[k + 1 :] -= factor * right[k]
    for k in range(size - 1, -1, -1):
        if k + 1 < size:
            right[k] -= (matrix[k, k + 1 :] * right[k + 1 :]).sum(axis=0)
        right[k] /= matrix[k, k]
    return right


def _linear_part(network: Network, p: Parameters, known_V: Array, bridge_S: float) -> tuple[Array, Array, Array]:
    """Return the resistors' nodal matrix, their right side, and the known voltages' part of the port voltages."""
    unknown, count = network.unknown, known_V.shape[1]
    matrix = (network.resistor_scatter @ np.broadcast_to(p.conductance, (len(p.conductance), count))).reshape(
        unknown, unknown, count
    )
    diagonal = np.arange(unknown)
    matrix[diagonal, diagonal] += NODE_LEAK_S
    into = network.resistor_incidence
    right = -into[:, :unknown].T @ (p.conductance * (into[:, unknown:] @ known_V))
    outer_V = network.incidence[:, unknown:] @ known_V
    if bridge_S:
        ports = network.incidence[:, :unknown]
        matrix += bridge_S * (ports.T @ ports)[:, :, None]
        right -= bridge_S * (ports.T @ outer_V)
    return matrix, right, outer_V


def _gather(network: Network, evaluations: list[Evaluation], shape: tuple[int, ...]) -> tuple[Array, Array, Array]:
    """Stack the groups' outside conductances, port voltages and port currents, with their mirror signs."""
    count = shape[1]
    conductances, port_V, port_A = [], np.empty(shape), np.empty(shape)
    for group, evaluation in zip(network.groups, evaluations, strict=True):
        conductances.append(outside(evaluation).reshape(-1, count))
        port_V[group.rows] = (evaluation.port_V * group.sign).reshape(-1, count)
        port_A[group.rows] = (evaluation.port_A * group.sign).reshape(-1, count)
    return (np.concatenate(conductances) if conductances else np.zeros((0, count))), port_V, port_A


def _through(network: Network, conductance: Array, port_V: Array, shape: tuple[int, ...]) -> Array:
    """Return conductances times port voltages, group by group."""
    result = np.empty(shape)
    place = 0
    for group in network.groups:
        ports, rows = group.ports, group.rows
        members = (rows.stop - rows.start) // ports
        block = conductance[place : place + ports * ports * members].reshape(ports, ports, members, -1)
        place += ports * ports * members
        across = port_V[rows].reshape(ports, members, -1)
        result[rows] = (block * across).sum(axis=1).reshape(ports * members, -1)
    return result


def _inner_step(network: Network, evaluations: list[Evaluation], miss: Array) -> Array:
    """Return Newton's step of the inner voltages that takes up the port voltages' miss."""
    step = np.empty_like(miss)
    for group, evaluation in zip(network.groups, evaluations, strict=True):
        across = miss[group.rows].reshape(group.ports, -1, miss.shape[1]) * group.sign
        m = evaluation.voltage_slope
        change = across / m[0] if group.ports == 1 else (_inverse(m) * across).sum(axis=1)
        step[group.rows] = change.reshape(-1, miss.shape[1])
    return step


def _inverse(m: Array) -> Array:
    result = np.empty_like(m)
    determinant = m[0, 0] * m[1, 1] - m[0, 1] * m[1, 0]
    result[0, 0] = m[1, 1]
    result[1, 1] = m[0, 0]
    result[0, 1] = -m[0, 1]
    result[1, 0] = -m[1, 0]
    result /= determinant
    return result


def _limited(network: Network, p: Parameters, old: Array, new: Array) -> Array:
    """Shorten steps beyond what a device's equations can be trusted for; a device taken out rests at 0 V."""
    for group, record, present in zip(network.groups, p.records, p.present, strict=True):
        was = old[group.rows].reshape(group.ports, -1, old.shape[1])
        now = new[group.rows].reshape(group.ports, -1, old.shape[1])
        if isinstance(record, devices.Bipolars):
            now[0] = devices.junction_step(was[0], now[0], record.V_F, record.I_S)
            now[1] = devices.junction_step(was[1], now[1], record.V_R, record.I_S)
        elif isinstance(record, devices.Mosfets):
            now[0] = was[0] + np.clip(now[0] - was[0], -LONGEST_GATE_STEP_V, LONGEST_GATE_STEP_V)
            body = devices.junction_step(was[1] - was[0], now[1] - now[0], record.V_T, record.I_S)
            now[1] = now[0] + body
        elif isinstance(record, devices.Diodes):
            now[0] = devices.junction_step(was[0], now[0], record.V_N, record.I_S)
            if record.B_V is not None:
                broken = (
                    -devices.junction_step(-was[0] - record.B_V, -now[0] - record.B_V, record.V_B, record.I_BV) - record.B_V
                )
                now[0] = np.where(np.isfinite(broken), np.maximum(now[0], broken), now[0])
        if not isinstance(present, float):
            now *= present > 0.0
    return new


def _known_currents(network: Network, p: Parameters, inner: Array, node_V: Array) -> Array:
    """Return the current that each known node's holder feeds into the circuit (known nodes, lanes)."""
    _, _, port_A = _gather(network, evaluate(network, p, inner), inner.shape)
    through = p.conductance * (network.resistor_incidence @ node_V)
    known = slice(network.unknown, None)
    return network.incidence[:, known].T @ port_A + network.resistor_incidence[:, known].T @ through


def _fall_back(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Try gmin stepping, then source stepping, from a cold start."""
    inner = cold_start(network, p, known_V.shape[1])
    for bridge_S in GMIN_STEPS_S:
        inner, _, _ = newton(network, p, known_V, inner, bridge_S=bridge_S)
    inner, voltages, converged = newton(network, p, known_V, inner)
    if not converged.all():
        stuck = np.flatnonzero(~converged)
        inner[:, stuck], voltages[:, stuck], converged[stuck] = _source_stepping(network, take(p, stuck), known_V[:, stuck])
    return inner, voltages, converged


def _source_stepping(network: Network, p: Parameters, known_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Raise all known voltages from zero together, each step from the one before, halving steps that fail."""
    inner = np.zeros((network.ports, known_V.shape[1]))
    reached, step = 0.0, 0.1
    while True:
        aim = min(1.0, reached + step)
        tried, voltages, converged = newton(network, p, aim * known_V, inner)
        if not converged.all() and step > 1e-3:
            step *= 0.5
            continue
        inner, reached = tried, aim
        if reached == 1.0:
            return inner, voltages, converged
        step *= 1.5
