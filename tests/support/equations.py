"""The circuit equations once more, written plainly: one lane, every inner node a node, for independent solvers.

Nothing here uses the solver's own equations: transistor and diode laws are spelled out again from the published model.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

import numpy as np

from protlint.solve.circuit import Circuit, Device

K_PER_Q = 8.617333262e-5
T0_K = 300.15

Function = Callable[[np.ndarray], np.ndarray]


def node_equations(circuit: Circuit, ambient_degC: float, output_V: float, drive_V: float) -> tuple[list[str], Function]:
    """Return the unknown nodes and Kirchhoff's current law at them as a function of their voltages."""
    known = {node: limits.usual for node, limits in circuit.held.items()}
    known |= {circuit.output: output_V, circuit.drive.node: drive_V}
    unknown: list[str] = []
    for device in circuit.devices:
        for node in (*device.nodes, *_inner_nodes(device)):
            if node not in known and node not in unknown:
                unknown.append(node)

    def law(voltages: np.ndarray) -> np.ndarray:
        return np.array([_leaving(circuit, ambient_degC, known, unknown, voltages).get(node, 0.0) for node in unknown])

    return unknown, law


def output_current(circuit: Circuit, ambient_degC: float, output_V: float, drive_V: float, voltages: np.ndarray) -> float:
    """Return the current into the circuit at its output for solved voltages."""
    known = {node: limits.usual for node, limits in circuit.held.items()}
    known |= {circuit.output: output_V, circuit.drive.node: drive_V}
    unknown, _ = node_equations(circuit, ambient_degC, output_V, drive_V)
    return _leaving(circuit, ambient_degC, known, unknown, voltages)[circuit.output]


def start_near(circuit: Circuit, unknown: list[str], solved: Mapping[str, float]) -> np.ndarray:
    """Return voltages near a solution: inner nodes at their terminals, and some millivolts of disorder."""
    terminal = {
        inner: outer
        for device in circuit.devices
        for inner, outer in zip(_inner_nodes(device), _outer_nodes(device), strict=True)
    }
    start = np.array([solved.get(node, solved.get(terminal.get(node, ""), 0.0)) for node in unknown])
    return start + np.random.default_rng(5).uniform(-0.003, 0.003, len(start))


def _outer_nodes(device: Device) -> tuple[str, ...]:
    """Return the terminals that the inner nodes belong to."""
    if device.kind in ("npn", "pnp"):
        return device.nodes
    return (device.nodes[0], device.nodes[2]) if device.kind in ("nmos", "pmos") else ()


def _inner_nodes(device: Device) -> tuple[str, ...]:
    if device.kind in ("npn", "pnp"):
        return tuple(f"{device.name}.{end}" for end in "cbe")
    if device.kind in ("nmos", "pmos"):
        return tuple(f"{device.name}.{end}" for end in "ds")
    return ()


def _leaving(
    circuit: Circuit, ambient_degC: float, known: dict[str, float], unknown: list[str], voltages: np.ndarray
) -> dict[str, float]:
    """Return the current leaving every node into devices."""
    V = known | dict(zip(unknown, voltages.tolist(), strict=True))
    leaving: dict[str, float] = {}

    def flow(start: str, end: str, amperes: float) -> None:
        leaving[start] = leaving.get(start, 0.0) + amperes
        leaving[end] = leaving.get(end, 0.0) - amperes

    for device in circuit.devices:
        temperature_K = ambient_degC + 273.15 + device.rise_K
        if device.kind == "resistor":
            a, b = device.nodes
            flow(a, b, (V[a] - V[b]) / device.model["R"])
        elif device.kind in ("npn", "pnp"):
            _bipolar(device, temperature_K, V, flow)
        elif device.kind in ("nmos", "pmos"):
            _mosfet(device, temperature_K, V, flow)
    return leaving


def _exponential(x: float) -> float:
    return math.exp(min(x, 200.0))


def _bipolar(device: Device, temperature_K: float, V: dict[str, float], flow: Callable[[str, str, float], None]) -> None:
    m, sign = device.model, 1.0 if device.kind == "npn" else -1.0
    collector, base, emitter = device.nodes
    c, b, e = _inner_nodes(device)
    for outer, inner, name in ((collector, c, "RC"), (base, b, "RB"), (emitter, e, "RE")):
        flow(outer, inner, (V[outer] - V[inner]) / max(m.get(name, 0.0), 1e-6))
    V_T = K_PER_Q * temperature_K
    ratio = temperature_K / T0_K
    growth = (ratio - 1.0) * m.get("EG", 1.11) / V_T + m.get("XTI", 3.0) * math.log(ratio)
    beta = ratio ** m.get("XTB", 0.0)
    I_S = m["IS"] * math.exp(growth)
    I_SE = m.get("ISE", 0.0) * math.exp(growth / m.get("NE", 1.5)) / beta
    v_be, v_bc = sign * (V[b] - V[e]), sign * (V[b] - V[c])
    i_f = I_S * (_exponential(v_be / V_T) - 1.0)
    i_r = I_S * (_exponential(v_bc / V_T) - 1.0)
    q_1 = 1.0 / (1.0 - v_bc / m.get("VAF", math.inf))
    q_b = 0.5 * q_1 * (1.0 + math.sqrt(max(1.0 + 4.0 * i_f / m.get("IKF", math.inf), 0.0)))
    i_c = (i_f - i_r) / q_b - i_r / (m.get("BR", 1.0) * beta)
    i_b = (
        i_f / (m["BF"] * beta)
        + I_SE * (_exponential(v_be / (m.get("NE", 1.5) * V_T)) - 1.0)
        + i_r / (m.get("BR", 1.0) * beta)
    )
    flow(c, e, sign * i_c)
    flow(b, e, sign * i_b)


def _mosfet(device: Device, temperature_K: float, V: dict[str, float], flow: Callable[[str, str, float], None]) -> None:
    """At 27 degC only: the temperature laws are tested elsewhere."""
    assert abs(temperature_K - T0_K) < 1e-9
    m, sign = device.model, 1.0 if device.kind == "nmos" else -1.0
    drain, gate, source = device.nodes
    d, s = _inner_nodes(device)
    flow(drain, d, (V[drain] - V[d]) / max(m.get("RD", 0.0), 1e-6))
    flow(source, s, (V[source] - V[s]) / max(m.get("RS", 0.0), 1e-6))
    over, across = sign * (V[gate] - V[s]) - sign * m["VTO"], sign * (V[d] - V[s])
    if over > 0.0:
        linear = min(across, over)
        flow(d, s, sign * m["KP"] * (1.0 + m.get("LAMBDA", 0.0) * across) * linear * (over - 0.5 * linear))
