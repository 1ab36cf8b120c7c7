"""Natural frequencies and loop gain: against the solved bench circuits, closed forms, and independent eigenvalue solvers."""

from __future__ import annotations

import os
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
import scipy.linalg

from protlint.limits import Range
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.expanded import Expanded, expand
from protlint.solve.gain import gain_function, read_gain
from protlint.solve.linear import conductance_matrix, store_matrix
from protlint.solve.loop import hold, solve_loop
from protlint.solve.modes import damping, independent, natural_frequencies, port_resistances
from protlint.solve.network import compile_network
from protlint.solve.solution import Loop
from protlint.solve.wired import look
from tests.support.circuits import bench_circuit, fixed
from tests.support.dynamics import bench_case, bench_cases, random_circuit, shunt_of, with_capacitor

AMBIENTS = (-10.0, 27.0, 85.0)
SEEDS = range(int(os.environ.get("PROTLINT_RANDOM_LOOPS", "12")))


def solved(circuit: Circuit, *, corners: bool = False) -> Loop:
    loop = solve_loop(circuit, AMBIENTS, corners=corners)
    assert isinstance(loop, Loop), loop
    return loop


def matrices(circuit: Circuit) -> tuple[np.ndarray, np.ndarray, Expanded]:
    """G, C and the expanded network of a circuit's held short at usual ambient."""
    network = compile_network(circuit)
    expanded = expand(network, output="wired")
    shot = look(expanded, hold(network, AMBIENTS).short, np.array([1]))
    A = expanded.stores[:, : expanded.unknown]
    return conductance_matrix(expanded, shot)[0], A.T @ store_matrix(expanded, shot)[0] @ A, expanded


@pytest.mark.parametrize(("name", "case", "figures"), bench_cases("loop"))
def test_loop_agrees_with_the_bench(name: str, case: str, figures: dict[str, Any]) -> None:
    """Source: fixtures/bench-circuits.json (pole-zero analysis and double injection by a general-purpose simulator)."""
    loop = solved(bench_case(name, case))
    assert loop.least_damping == pytest.approx(figures["least_damping"], abs=2e-3)
    assert loop.low_frequency_gain == pytest.approx(figures["dc_loop_gain"], rel=1e-3)
    assert loop.crossover_Hz == pytest.approx(figures["crossover_Hz"], rel=1e-3)
    assert loop.phase_margin_deg == pytest.approx(figures["phase_margin_deg"], abs=0.05)
    if figures["at_Hz"] is not None:
        assert loop.at_Hz == pytest.approx(figures["at_Hz"], rel=1e-3)
    else:
        # the simulator's list calls a pair this close to real a real one
        assert loop.at_Hz is None or loop.least_damping > 0.99


@pytest.mark.parametrize("seed", SEEDS)
def test_natural_frequencies_agree_with_the_generalised_eigenvalues_of_scipy(seed: int) -> None:
    circuit = random_circuit(seed)
    G, C, _ = matrices(circuit)
    expected = scipy.linalg.eigvals(-G, C)
    size = np.abs(expected) / (2.0 * np.pi)
    expected = expected[np.isfinite(expected) & (size < 3e9) & (expected.imag >= 0.0)]
    found = solved(circuit).natural
    for s in expected:
        frequency, ratio = np.abs(s) / (2.0 * np.pi), -s.real / np.abs(s)
        assert any(f == pytest.approx(frequency, rel=1e-5) and d == pytest.approx(ratio, abs=1e-5) for f, d in found)
    assert sum(f < 3e9 for f, _ in found) == len(expected)


def test_a_series_resonant_circuit_has_its_textbook_damping() -> None:
    """zeta = (R / 2) sqrt(C / L) and omega_0 = 1 / sqrt(L C); any textbook on circuits."""
    R, L, C = 3.0, 2e-6, 5e-9
    # unknowns: the node between R and L, the node between L and C, the inductor's current
    G = np.array([[1.0 / R, 0.0, 1.0], [0.0, 1e-12, -1.0], [1.0, -1.0, 0.0]])
    A = np.array([[0.0, 1.0, 0.0], [0.0, 0.0, 1.0]])
    c = np.diag([C, -L])
    s = natural_frequencies(port_resistances(G[None], A), c[None], independent(A, np.ones(2, dtype=bool)))[0]
    assert damping(s) == pytest.approx([0.5 * R * np.sqrt(C / L)] * 2, rel=1e-6)
    assert np.abs(s) == pytest.approx([1.0 / np.sqrt(L * C)] * 2, rel=1e-6)


@pytest.mark.parametrize("T_0", [0.5, 3.0, 40.0, 275.0])
def test_a_loop_of_two_poles_has_the_closed_forms_of_the_second_order(T_0: float) -> None:
    """T = T0 / ((1 + s/p1)(1 + s/p2)): closed, zeta = (p1 + p2) / (2 sqrt(p1 p2 (1 + T0))); G. F. Franklin, J. D. Powell,
    A. Emami-Naeini, "Feedback Control of Dynamic Systems" (from memory)."""
    g_1, C_1, g_2, C_2 = 1e-3, 1e-9, 2e-4, 3e-10
    gm_2 = 0.05
    gm_1 = T_0 * g_1 * g_2 / gm_2
    # node 0: the net, 1: the terminal (cut from it), 2: the other stage
    G = np.array([[g_1 / 2, 0.0, gm_1], [0.0, g_1 / 2, 0.0], [0.0, -gm_2, g_2]])
    A = np.array([[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]])
    c = np.diag([C_1 / 2, C_1 / 2, C_2])
    p_1, p_2 = g_1 / C_1, g_2 / C_2
    gain = gain_function(G, A, c, 0, 1)
    omega = np.geomspace(1e3, 1e10, 50)
    expected = T_0 / ((1.0 + 1j * omega / p_1) * (1.0 + 1j * omega / p_2))
    assert gain(omega / (2.0 * np.pi)) == pytest.approx(expected, rel=1e-9, abs=1e-9)
    read = read_gain(gain, np.array([p_1, p_2]) / (2.0 * np.pi))
    assert read.low_frequency == pytest.approx(T_0, rel=1e-9)
    if T_0 < 1.0:
        assert read.crossover_Hz is None
        assert read.phase_margin_deg is None
    else:
        # |T| = 1 where u = omega^2 solves (1 + u/p1^2)(1 + u/p2^2) = T0^2
        a, b = p_1**2, p_2**2
        u = 0.5 * (-(a + b) + np.sqrt((a + b) ** 2 + 4.0 * a * b * (T_0**2 - 1.0)))
        crossover = np.sqrt(u)
        margin = 180.0 - np.degrees(np.arctan(crossover / p_1) + np.arctan(crossover / p_2))
        assert read.crossover_Hz == pytest.approx(crossover / (2.0 * np.pi), rel=1e-4)
        assert read.phase_margin_deg == pytest.approx(margin, abs=1e-2)
    joined = np.array([[1.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
    closed_G, closed_A = joined.T @ G @ joined, A @ joined
    s = natural_frequencies(
        port_resistances(closed_G[None], closed_A), c[None], independent(closed_A, np.ones(3, dtype=bool))
    )
    zeta = (p_1 + p_2) / (2.0 * np.sqrt(p_1 * p_2 * (1.0 + T_0)))
    assert float(damping(s).min()) == pytest.approx(min(zeta, 1.0), rel=1e-6)


def small_sink(base_stop_ohm: float) -> Circuit:
    """A sink of two 2N3904 for 50 mA with a drive resistor of 1 kohm; model from a maker's library, from memory."""
    model = {
        "IS": 6.734e-15,
        "BF": 416.4,
        "VAF": 74.0,
        "IKF": 0.0668,
        "RB": 10.0,
        "CJE": 4.49e-12,
        "CJC": 3.64e-12,
        "TF": 3.01e-10,
    }
    return Circuit(
        devices=(
            Device("Q1", "npn", ("OUT", "DRV", "SNS"), model),
            Device("Q2", "npn", ("DRV", "BASE", "GND"), model),
            Device("R1", "resistor", ("IN", "DRV"), {"R": 1e3}),
            Device("R2", "resistor", ("SNS", "GND"), {"R": 14.0}),
            Device("R3", "resistor", ("SNS", "BASE"), {"R": base_stop_ohm}),
        ),
        held={"GND": fixed(0.0), "+12V": fixed(12.0)},
        drive=Drive("IN", fixed(0.0), fixed(5.0)),
        output="OUT",
        shorts=("+12V",),
        shunt=("Q2",),
        pass_devices=("Q1",),
        sense=("R2",),
        output_reach_V=(0.0, 12.0),
    )


def test_a_small_sink_behaves_as_a_hand_calculation_of_its_poles_says() -> None:
    """Plausibility only. A hand calculation with three poles (derived for this program, no outside authority) gives a loop
    gain near 64, a crossover near 113 MHz with a margin of 49 degrees, less with 100 ohm in the base, and 15 MHz and 72
    degrees or 1.7 MHz and 89 degrees with 1 nF or 10 nF from the drive to the far end."""
    plain, stopped = solved(small_sink(0.0)), solved(small_sink(100.0))
    assert plain.phase_margin_deg is not None
    assert plain.low_frequency_gain == pytest.approx(64.0, rel=0.4)
    assert plain.crossover_Hz is not None
    assert 113e6 / 3.0 < plain.crossover_Hz < 113e6 * 3.0
    assert plain.phase_margin_deg == pytest.approx(49.0, abs=10.0)
    assert stopped.crossover_Hz is not None
    assert stopped.crossover_Hz < plain.crossover_Hz
    assert stopped.phase_margin_deg is not None
    assert stopped.phase_margin_deg < plain.phase_margin_deg
    for farad, crossover_Hz, margin_deg in ((1e-9, 15e6, 72.0), (1e-8, 1.7e6, 89.0)):
        circuit = small_sink(0.0)
        collector, _, emitter = shunt_of(circuit).nodes
        loop = solved(with_capacitor(circuit, (collector, emitter), farad))
        assert loop.crossover_Hz == pytest.approx(crossover_Hz, rel=0.25)
        assert loop.phase_margin_deg == pytest.approx(margin_deg, abs=15.0)


def test_missing_dynamic_data_is_named_by_key() -> None:
    circuit = bench_circuit("sink")
    bare = tuple(
        replace(device, model={key: value for key, value in device.model.items() if key != "TF"}, part_number="QPN1")
        if device.name == "Q1"
        else device
        for device in circuit.devices
    )
    assert solve_loop(replace(circuit, devices=bare), AMBIENTS) == "QPN1.model.TF or QPN1.ratings.ft"
    reason = solve_loop(bench_circuit("nmos_sink"), AMBIENTS)
    assert reason == "Q40.model.CGS or Q40.ratings.ciss; Q40.model.CGD or Q40.ratings.crss"


def test_a_circuit_without_a_held_short_gives_the_reason() -> None:
    circuit = bench_circuit("sink")
    dead = replace(circuit, drive=replace(circuit.drive, high_V=Range(0.0, 0.0, 0.0)))
    reason = solve_loop(dead, AMBIENTS)
    assert isinstance(reason, str)
    assert reason


def test_a_drive_straight_on_a_junction_is_asked_for_its_current() -> None:
    """12 V on the base of a model without series resistances, its emitter on ground."""
    circuit = bench_circuit("sink")
    devices = []
    for one in circuit.devices:
        if one.name == "Q1":
            ideal = {name: value for name, value in one.model.items() if name not in ("RB", "RE", "RC", "IKF")}
            devices.append(replace(one, nodes=(one.nodes[0], "DRV", one.nodes[2]), model=ideal))
        elif one.name == "Q2":
            devices.append(replace(one, nodes=("DRV", *one.nodes[1:])))
        elif one.name != "R1":
            devices.append(replace(one, model={"R": 0.0}) if one.name == "R2" else one)
    assert solve_loop(replace(circuit, devices=tuple(devices)), AMBIENTS) == "[drive.DRV] current"


def test_a_shunt_whose_base_is_held_has_natural_frequencies_and_no_loop_gain() -> None:
    circuit = bench_circuit("sink")
    held = tuple(
        replace(device, nodes=(device.nodes[0], "GND", device.nodes[2])) if device.name == "Q2" else device
        for device in circuit.devices
    )
    loop = solved(replace(circuit, devices=held))
    assert loop.low_frequency_gain is None
    assert loop.natural


def test_inductors_in_parallel_and_between_supplies_leave_the_loop_solvable() -> None:
    circuit = bench_circuit("follower")
    leads = tuple(replace(one, nodes=("LEAD", *one.nodes[1:])) if one.name == "Q10" else one for one in circuit.devices)

    def fed(*inductors: tuple[str, float]) -> Loop:
        coils = tuple(Device(name, "inductor", ("+24V", "LEAD"), {"L": henry}) for name, henry in inductors)
        return solved(replace(circuit, devices=(*leads, *coils)))

    whole, halves = fed(("L1", 1e-6)), fed(("L1", 2e-6), ("L2", 2e-6))
    # what flows round in the two has a mode of its own, which only the resistance of the links lets die
    assert np.array(halves.natural[1:]) == pytest.approx(np.array(whole.natural), rel=1e-3)
    assert halves.natural[0][0] < 1.0
    between = Device("L3", "inductor", ("+24V", "+24V B"), {"L": 1e-6})
    held = {**circuit.held, "+24V B": fixed(24.0)}
    assert solved(replace(circuit, held=held, devices=(*circuit.devices, between))).natural


def test_capacitors_in_a_loop_and_in_series_add_no_modes_of_their_own() -> None:
    circuit = bench_circuit("follower")
    collector, base, emitter = shunt_of(circuit).nodes
    one = solved(with_capacitor(circuit, (base, emitter), 1e-8))
    halves = with_capacitor(with_capacitor(circuit, (base, emitter), 4e-9, "C1"), (base, emitter), 6e-9, "C2")
    assert np.array(solved(halves).natural) == pytest.approx(np.array(one.natural), rel=1e-9)
    series = with_capacitor(with_capacitor(circuit, (base, "MID"), 2e-8, "C1"), ("MID", emitter), 2e-8, "C2")
    found = solved(series).natural
    assert found[0][0] < 10.0
    assert np.array(found[1:]) == pytest.approx(np.array(one.natural), rel=1e-3)
    triangle = with_capacitor(with_capacitor(circuit, (collector, base), 1e-9, "C1"), (collector, emitter), 1e-9, "C2")
    triangle = with_capacitor(triangle, (base, emitter), 1e-9, "C3")
    assert len(solved(triangle).natural) == len(solved(with_capacitor(triangle, (base, emitter), 1e-9, "C4")).natural)
