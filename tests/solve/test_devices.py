"""Device equations: slopes against differences, temperature laws against published figures, a junction in closed form."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from scipy.special import wrightomega

from protlint.solve import devices, gummel_poon
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.constants import BOLTZMANN_V_PER_K, KELVIN, T0_K
from protlint.solve.dc import solve_lanes
from protlint.solve.lanes import Lanes, known_voltages, parameters
from protlint.solve.network import compile_network
from tests.support.by_hand import base_emitter_slope
from tests.support.circuits import around, fixed

FULL = {"VAF": 60.0, "VAR": 12.0, "IKF": 0.1, "IKR": 0.02, "ISE": 1e-13, "NE": 1.6, "ISC": 3e-13, "NC": 1.8, "BR": 3.0}


def lanes_for(circuit: Circuit, temperature_K: np.ndarray, output_V: np.ndarray, drive_V: np.ndarray) -> Lanes:
    network = compile_network(circuit)
    held = np.zeros((len(network.held), len(temperature_K)))
    return Lanes(temperature_K, known_voltages(held, output_V, drive_V))


@pytest.mark.parametrize(
    ("kind", "model", "lowest", "highest"),
    [
        ("npn", {"IS": 1e-14, **FULL, "RB": 5.0, "RE": 0.1, "RC": 0.5}, -2.0, 0.75),
        ("npn", {"IS": 1e-14}, -5.0, 0.8),
        ("nmos", {"VTO": 1.0, "KP": 2.0, "LAMBDA": 0.02, "RS": 0.05, "RD": 0.2}, -0.5, 4.0),
        ("diode", {"IS": 1e-9, "N": 1.7, "RS": 1.0}, -3.0, 0.8),
        ("zener", {"IS": 1e-14, "BV": 4.0, "RS": 1.0}, -4.1, 0.7),
    ],
)
def test_slopes_are_the_derivatives_of_voltages_and_currents(
    kind: str, model: dict[str, float], lowest: float, highest: float
) -> None:
    three = kind in ("npn", "nmos")
    device = Device("X", kind, ("OUT", "DRV", "GND") if three else ("OUT", "GND"), model)
    circuit = around(device)
    count = 500
    temperature = np.full(count, 330.0)
    network = compile_network(circuit)
    p = parameters(network, lanes_for(circuit, temperature, np.zeros(count), np.zeros(count)))
    evaluations: dict[type, Callable[..., devices.Evaluation]] = {
        gummel_poon.Bipolars: gummel_poon.bipolar,
        devices.Mosfets: devices.mosfet,
        devices.Diodes: devices.diode,
    }
    record = p.records[0]
    evaluate = evaluations[type(record)]
    inner = np.random.default_rng(3).uniform(lowest, highest, (2 if three else 1, 1, count))
    if kind == "nmos":
        inner[1] = np.minimum(inner[1], inner[0] + 0.7)
    at = evaluate(inner, record)
    step = 1e-6
    for column in range(len(inner)):
        moved = [inner.copy(), inner.copy()]
        moved[0][column] -= step
        moved[1][column] += step
        below, above = (evaluate(one, record) for one in moved)
        for exact, low, high in (
            (at.voltage_slope[:, column], below.port_V, above.port_V),
            (at.current_slope[:, column], below.port_A, above.port_A),
        ):
            assert np.allclose(exact, (high - low) / (2.0 * step), rtol=1e-5, atol=1e-6)


def test_one_junction_behind_a_resistor_is_wrights_omega() -> None:
    """v = V - R i, i = I_S (exp(v / V_T) - 1): i = V_T / R omega(...) - I_S, with the Wright omega function (Corless and
    Jeffrey, "The Wright omega function", 2002)."""
    R, I_S = 1e3, 1e-14
    circuit = around(Device("D", "diode", ("MID", "GND"), {"IS": I_S}))
    circuit = Circuit(**{**{f: getattr(circuit, f) for f in circuit.__slots__}, "devices": (
        *circuit.devices, Device("R", "resistor", ("OUT", "MID"), {"R": R}))})  # fmt: skip
    volts = np.linspace(-1.0, 12.0, 60)
    temperature = np.full(60, T0_K)
    solved = solve_lanes(compile_network(circuit), lanes_for(circuit, temperature, volts, np.zeros(60)))
    assert solved.converged.all()
    V_T = BOLTZMANN_V_PER_K * T0_K
    expected = V_T / R * wrightomega((volts + R * I_S) / V_T + math.log(R * I_S / V_T)).real - I_S
    # the solver lays 1e-13 S across the junction and from the node
    assert np.allclose(solved.output_A, expected, rtol=1e-9, atol=1e-12)


def test_saturation_current_grows_4_4_times_from_27_to_37_degC() -> None:
    """The published law with X_TI 3 and E_G 1.11 eV (SPICE2, Nagel 1975), not the doubling of leakage rules."""
    growth = devices.junction_growth(np.array([310.15]), np.array([1.11]), np.array([3.0]))
    assert math.exp(growth[0]) == pytest.approx(4.4, abs=0.05)


def base_emitter(model: dict[str, float], current_A: float, temperature_K: float) -> float:
    """V_BE of a diode-connected transistor at a current, by solving."""
    circuit = around(Device("Q", "npn", ("DRV", "DRV", "GND"), model))
    circuit = Circuit(**{**{f: getattr(circuit, f) for f in circuit.__slots__}, "devices": (
        *circuit.devices, Device("R", "resistor", ("OUT", "DRV"), {"R": 1e9})),
        "drive": Drive("DRV", fixed(5.0), fixed(5.0), current_A=current_A)})  # fmt: skip
    network = compile_network(circuit)
    held = np.zeros((len(network.held), 1))
    lanes = Lanes(np.array([temperature_K]), known_voltages(held, np.zeros(1), np.full(1, 5.0)))
    solved = solve_lanes(network, lanes)
    return float(solved.node_V[network.nodes.index("DRV"), 0])


def test_base_emitter_voltage_of_a_bc547() -> None:
    """BC547 data sheet: 0.58 V, 0.66 V, 0.70 V (least, typical, greatest) at 2 mA; model figures as published by a maker."""
    model = {"IS": 23.9e-15, "NF": 1.008, "BF": 294.0, "VAF": 63.0, "IKF": 0.136, "RB": 1.0, "RE": 0.468}
    assert base_emitter(model, 2e-3, 25.0 + KELVIN) == pytest.approx(0.66, abs=0.01)


@pytest.mark.parametrize(("V_BE", "slope"), [(0.50, -2.29), (0.60, -1.96), (0.65, -1.79), (0.70, -1.63)])
def test_base_emitter_voltage_falls_as_the_published_law_says(V_BE: float, slope: float) -> None:
    """(V_BE - E_G - X_TI V_T) / T at 27 degC in mV/K, and the solver by a step of one kelvin."""
    assert 1e3 * base_emitter_slope(V_BE, T0_K) == pytest.approx(slope, abs=0.01)
    I_C = 1e-3
    model = {"IS": I_C * math.exp(-V_BE / (BOLTZMANN_V_PER_K * T0_K)), "BF": 1e5}
    low, high = (base_emitter(model, I_C, T0_K + step) for step in (-0.5, 0.5))
    assert 1e3 * (high - low) == pytest.approx(slope, abs=0.02)


def test_a_decade_of_current_takes_59_millivolts() -> None:
    """N_F V_T ln 10 at 25 degC."""
    model = {"IS": 1e-14, "BF": 1e5}
    step = base_emitter(model, 1e-3, 298.15) - base_emitter(model, 1e-4, 298.15)
    assert step == pytest.approx(0.0592, abs=1e-4)


def test_a_resistor_follows_its_temperature_coefficients() -> None:
    circuit = around(Device("R", "resistor", ("OUT", "GND"), {"R": 100.0, "TC1": 1e-3, "TC2": 1e-5}))
    temperature = np.array([T0_K - 50.0, T0_K, T0_K + 100.0])
    solved = solve_lanes(compile_network(circuit), lanes_for(circuit, temperature, np.ones(3), np.zeros(3)))
    rise = temperature - T0_K
    assert 1.0 / solved.output_A == pytest.approx(100.0 * (1.0 + 1e-3 * rise + 1e-5 * rise * rise))


def test_a_zener_breaks_down_at_its_voltage_and_current() -> None:
    circuit = around(Device("D", "zener", ("GND", "OUT"), {"IS": 1e-14, "BV": 6.2, "IBV": 5e-3}))
    volts = np.array([6.2, 6.2 + BOLTZMANN_V_PER_K * T0_K * math.log(2.0), 3.0])
    solved = solve_lanes(compile_network(circuit), lanes_for(circuit, np.full(3, T0_K), volts, np.zeros(3)))
    assert solved.output_A == pytest.approx([5e-3, 10e-3, 0.0], rel=1e-6, abs=1e-11)


def test_a_body_diode_carries_a_reversed_output() -> None:
    circuit = around(Device("M", "nmos", ("OUT", "DRV", "GND"), {"VTO": 3.0, "KP": 4.0, "IS": 1e-11, "RD": 0.1}))
    solved = solve_lanes(compile_network(circuit), lanes_for(circuit, np.array([T0_K]), np.array([-1.0]), np.zeros(1)))
    assert solved.converged.all()
    current = -float(solved.output_A[0])
    drop = BOLTZMANN_V_PER_K * T0_K * math.log(current / 1e-11 + 1.0) + 0.1 * current
    assert drop == pytest.approx(1.0, abs=1e-6)
