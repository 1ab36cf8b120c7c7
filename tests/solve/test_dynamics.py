"""Loop and step added to a solution; capacitances that come from data-sheet figures."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from protlint.solve.answers import solve
from protlint.solve.capacitances import DIODE_F, EMITTER_BY_COLLECTOR, capacitances_from, transit_time
from protlint.solve.charges import charges_of, depletion, missing_charges
from protlint.solve.circuit import Circuit
from protlint.solve.derive import derive
from protlint.solve.dynamics import with_dynamics
from protlint.solve.loop import solve_loop
from protlint.solve.memo import Memo
from protlint.solve.network import compile_network
from protlint.solve.solution import Loop
from tests.support.circuits import bench_circuit
from tests.support.dynamics import bench_case

AMBIENTS = (-10.0, 27.0, 85.0)


def renamed(circuit: Circuit) -> Circuit:
    """The same circuit with other names of devices and inner nets."""
    nodes = {node: f"N_{node}" for device in circuit.devices for node in device.nodes if node not in circuit.held}
    nodes |= {circuit.drive.node: circuit.drive.node, circuit.output: circuit.output}
    devices = tuple(
        replace(device, name=f"X{device.name}", nodes=tuple(nodes.get(node, node) for node in device.nodes))
        for device in circuit.devices
    )
    named = {field: tuple(f"X{name}" for name in getattr(circuit, field)) for field in ("shunt", "pass_devices", "sense")}
    return replace(circuit, devices=devices, **named)


def test_a_solution_gets_loop_and_step() -> None:
    circuit = bench_case("sink", "100 nF base to emitter of the shunt")
    solution = with_dynamics(circuit, solve(circuit, AMBIENTS), AMBIENTS)
    assert solution.loop is not None
    assert solution.step is not None
    assert solution.loop.least_damping == pytest.approx(0.5505, abs=1e-3)
    assert solution.step.settles
    assert not solution.loop_needs
    assert not solution.step_needs


def test_the_step_can_be_left_out_and_added_later() -> None:
    circuit = bench_circuit("sink")
    first = with_dynamics(circuit, solve(circuit, AMBIENTS), AMBIENTS, step=False)
    assert first.loop is not None
    assert first.step is None
    assert with_dynamics(circuit, first, AMBIENTS).step is not None


def test_equal_circuits_are_worked_out_once_under_their_own_names() -> None:
    memo = Memo()
    circuit = bench_circuit("darlington_follower")
    first = with_dynamics(circuit, solve(circuit, AMBIENTS, memo=memo), AMBIENTS, memo=memo)
    twin = renamed(circuit)
    known = solve(twin, AMBIENTS, memo=memo)
    assert known.step == first.step
    assert with_dynamics(twin, known, AMBIENTS, memo=memo) is known
    assert known.loop is not None
    assert known.loop.worst is not None
    assert first.loop is not None
    assert first.loop.worst is not None
    assert set(known.loop.worst.corner) == {f"X{key}" for key in first.loop.worst.corner}
    loaded = solve(replace(circuit, output_capacitance_F=1e-6), AMBIENTS, memo=memo)
    assert loaded.loop is None


def test_what_is_missing_is_said_by_key_for_both() -> None:
    circuit = bench_circuit("nmos_sink")
    solution = with_dynamics(circuit, solve(circuit, AMBIENTS), AMBIENTS)
    keys = ("Q40.model.CGS or Q40.ratings.ciss", "Q40.model.CGD or Q40.ratings.crss")
    assert solution.loop is None
    assert solution.loop_needs == keys
    assert solution.step_needs == keys


def test_a_mosfet_s_gate_capacitances_may_be_given_whole_or_by_width() -> None:
    circuit = bench_circuit("nmos_sink")

    def loop(**more: float) -> Loop:
        devices = tuple(
            replace(device, model={**device.model, **more}) if device.kind == "nmos" else device
            for device in circuit.devices
        )
        found = solve_loop(replace(circuit, devices=devices), AMBIENTS, corners=False)
        assert isinstance(found, Loop), found
        return found

    whole = loop(CGS=1e-9, CGD=1e-10)
    by_width = loop(CGSO=1e-3, CGDO=1e-4)
    assert np.array(whole.natural) == pytest.approx(np.array(by_width.natural))
    assert whole.natural != loop(CGS=2e-9, CGD=1e-10).natural
    assert whole.natural != loop(CGS=1e-9, CGD=1e-10, CBD=1e-9).natural


def test_figures_of_a_data_sheet_give_the_dynamic_data() -> None:
    """2N3904: f_T 300 MHz at 10 mA, C_ob 4 pF at 5 V, C_ib 8 pF at 0.5 V (maker's data sheet, from memory)."""
    ratings = {"ft": 300e6, "ft_at": 10e-3, "cob": 4e-12, "cob_at": 5.0, "cib": 8e-12, "cib_at": 0.5}
    charged = capacitances_from("npn", ratings, {})
    assert charged.model["CJC"] == pytest.approx(4e-12 * (1.0 + 5.0 / 0.75) ** 0.33)
    assert charged.model["CJE"] == pytest.approx(8e-12 * (1.0 + 0.5 / 0.75) ** 0.33)
    # f_T comes out again: g_m / (2 pi (C_pi + C_mu)) at 10 mA
    g_m = 10e-3 / 0.025865
    C_pi = charged.model["TF"] * g_m + 1.7 * charged.model["CJE"]
    assert g_m / (2.0 * math.pi * (C_pi + charged.model["CJC"])) == pytest.approx(300e6, rel=0.01)
    # a maker's library has 0.30 ns to 0.35 ns for this type
    assert 2e-10 < charged.model["TF"] < 5e-10
    assert len(charged.derived) == 3
    assert not charged.assumed


def test_what_a_model_states_stays_and_the_rest_is_derived() -> None:
    ratings = {"ft": 3e6, "cob": 300e-12}
    charged = capacitances_from("npn", ratings, {"TF": 2e-8, "IS": 1e-12})
    assert set(charged.model) == {"CJC", "CJE"}
    assert charged.model["CJE"] == pytest.approx(EMITTER_BY_COLLECTOR * 300e-12)
    assert charged.assumed
    derived = derive("npn", ratings, {"TF": 2e-8, "IS": 1e-12, "BF": 100.0})
    assert derived.model["TF"] == 2e-8
    assert derived.model["CJC"] == 300e-12
    assert derived.charges_assumed == charged.assumed
    # what only the loop rests on makes no current an assumed one
    assert not any("C_JE" in sentence for sentence in derived.assumed)


def test_transit_time_never_falls_to_nothing() -> None:
    assert transit_time(300e6, None, 1e-11) == pytest.approx(5.3e-10, rel=0.01)
    assert transit_time(300e6, 1e-5, 1e-11) == pytest.approx(0.3 * 5.305e-10, rel=0.01)


def test_a_mosfet_s_and_a_diode_s_figures_give_theirs() -> None:
    charged = capacitances_from("nmos", {"ciss": 1.9e-9, "crss": 1e-10, "coss": 5e-10}, {})
    assert charged.model == pytest.approx({"CGD": 1e-10, "CGS": 1.8e-9, "CBD": 4e-10})
    assert capacitances_from("diode", {"cj": 4e-12}, {}).model == {"CJO": 4e-12}
    usual = capacitances_from("diode", {}, {})
    assert usual.model == {"CJO": DIODE_F["diode"]}
    assert usual.assumed
    assert not capacitances_from("zener", {}, {"CJO": 1e-10}).model
    assert not capacitances_from("pmos", {"ciss": 1e-9}, {}).model


def test_a_circuit_with_everything_misses_nothing() -> None:
    assert missing_charges(bench_circuit("sink")) == ()


@pytest.mark.parametrize("ambient_degC", [-55.0, 27.0, 150.0])
def test_depletion_charge_is_the_integral_of_its_capacitance(ambient_degC: float) -> None:
    network = compile_network(bench_circuit("sink"))
    found = charges_of(network.groups[0], np.array([ambient_degC + 273.15]))
    assert found is not None
    junction = found.junctions  # type: ignore[union-attr]
    volts = np.linspace(-10.0, 1.2, 20001)
    both = np.broadcast_to(volts, (2, 2, len(volts)))
    charge, capacitance = (values[0, 0] for values in depletion(both, junction))
    middle = 0.5 * (capacitance[1:] + capacitance[:-1])
    assert charge[-1] - charge[0] == pytest.approx(float((middle * np.diff(volts)).sum()), rel=1e-6)
    at_zero = float(depletion(np.zeros((2, 2, 1)), junction)[1][0, 0, 0])
    # C_J rises by 4e-4 M a kelvin and a little more as V_J falls
    rise_K = ambient_degC - 27.0
    assert at_zero == pytest.approx(1e-9 * (1.0 + 0.33 * (4e-4 + 2.7e-3) * rise_K), rel=0.02)
