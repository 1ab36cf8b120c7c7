"""What answers mean: regulation, several shorts, temperature rises, energy, mirrors, loci, who limits."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit, Drive
from tests.support.circuits import bench_circuit, fixed
from tests.support.shapes import SHAPES, drawn, mirrored

AMBIENTS = (-10.0, 27.0, 85.0)


def usual_holds(circuit: Circuit, ambients: tuple[float, float, float] = AMBIENTS) -> float:
    holds = solve(circuit, ambients).currents[1].holds_A
    assert holds is not None
    return holds


def on_one_supply(volts: float) -> Circuit:
    """The bench sink with its drive from the supply of its load."""
    circuit = bench_circuit("sink")
    return replace(
        circuit,
        held={"GND": fixed(0.0), "+12V": fixed(volts)},
        drive=Drive("DRV", fixed(0.0), fixed(volts)),
        output_reach_V=(0.0, volts),
        regulates=True,
    )


def test_regulation_is_what_moving_the_supply_and_the_temperature_shows() -> None:
    solution = solve(on_one_supply(12.0), AMBIENTS)
    regulates = solution.regulates
    assert regulates is not None
    assert regulates.current_A == solution.currents[1].holds_A
    by_supply = (usual_holds(on_one_supply(12.5)) - usual_holds(on_one_supply(11.5))) / regulates.current_A
    assert regulates.per_supply_volt == pytest.approx(by_supply, rel=2e-3)
    hot, cold = (usual_holds(on_one_supply(12.0), (0.0, 27.0 + step, 85.0)) for step in (1.0, -1.0))
    assert regulates.per_kelvin == pytest.approx((hot - cold) / 2.0 / regulates.current_A, rel=2e-3)


def test_least_compliance_voltage_leaves_95_percent_of_the_current() -> None:
    circuit = on_one_supply(12.0)
    regulates = solve(circuit, AMBIENTS).regulates
    assert regulates is not None
    carried = solve(replace(circuit, output_V=regulates.compliance_V), AMBIENTS).currents[1].carries_A
    assert carried == pytest.approx(0.95 * regulates.current_A, rel=5e-3)


def test_a_stage_that_protects_regulates_nothing() -> None:
    assert solve(bench_circuit("sink"), AMBIENTS).regulates is None


def test_of_several_shorts_the_worst_is_reported_and_each_is_kept() -> None:
    circuit = bench_circuit("follower")
    below = replace(
        circuit, held={**circuit.held, "-10V": fixed(-10.0)}, shorts=("GND", "-10V"), output_reach_V=(-10.0, 24.0)
    )
    solution = solve(below, AMBIENTS)
    alone = {node: usual_holds(replace(below, shorts=(node,))) for node in below.shorts}
    assert [short.node for short in solution.shorts] == ["GND", "-10V"]
    for short in solution.shorts:
        assert short.holds_A[1] == pytest.approx(alone[short.node], rel=1e-6)
        assert short.point is not None
    assert solution.short == max(alone, key=lambda node: alone[node])
    assert solution.currents[1].holds_A == pytest.approx(max(alone.values()), rel=1e-6)
    assert solution.locus[0].output_V == -10.0


def test_a_warm_shunt_limits_as_its_own_temperature_says() -> None:
    """The shunt alone 58 K above ambient: holds falls by about 2 mV/K over the sense resistance (V_BE of 0.7 V at 4 mA)."""
    circuit = bench_circuit("nmos_sink")
    warm = replace(
        circuit,
        devices=tuple(replace(device, rise_K=58.0) if device.name == "Q41" else device for device in circuit.devices),
    )
    fall = (usual_holds(circuit) - usual_holds(warm)) / usual_holds(circuit)
    assert fall == pytest.approx(58.0 * 0.0017 / 0.66, rel=0.1)
    everything = replace(circuit, devices=tuple(replace(device, rise_K=58.0) for device in circuit.devices))
    assert usual_holds(everything) == pytest.approx(solve(circuit, AMBIENTS).currents[2].holds_A, rel=1e-6)


@pytest.mark.parametrize("name", ["sink", "follower", "source_pnp", "darlington_follower", "nmos_sink", "foldback"])
def test_dissipation_adds_up_to_what_is_fed_in(name: str) -> None:
    circuit = bench_circuit(name)
    point = solve(circuit, AMBIENTS).held_short
    assert point is not None
    dissipated = sum(state.power_W for state in point.states.values())
    leaving: dict[str, float] = {}
    for device in circuit.devices:
        state = point.states[device.name]
        ends = (device.nodes[0], device.nodes[-1])
        leaving[ends[0]] = leaving.get(ends[0], 0.0) + state.current_A
        leaving[ends[1]] = leaving.get(ends[1], 0.0) - state.current_A
        if len(device.nodes) == 3:
            leaving[device.nodes[1]] = leaving.get(device.nodes[1], 0.0) + state.control_A
            leaving[ends[1]] -= state.control_A
    volts = {node: limits.usual for node, limits in circuit.held.items()}
    volts |= {circuit.output: point.output_V, circuit.drive.node: point.drive_V}
    fed = sum(volts[node] * current for node, current in leaving.items() if node in volts)
    assert dissipated == pytest.approx(fed, rel=1e-6)
    inner = [current for node, current in leaving.items() if node not in volts]
    assert np.abs(inner).max() < 1e-9


@pytest.mark.parametrize("shape", sorted(SHAPES))
def test_the_mirror_of_a_limiter_does_the_same(shape: str) -> None:
    """But for MOSFETs, whose level-1 temperature law treats the types differently off 27 degC."""
    circuit = drawn(shape, 40)
    ambients = (27.0, 27.0, 27.0) if "nmos" in shape else AMBIENTS
    ours, twin = solve(circuit, ambients), solve(mirrored(circuit), ambients)
    for one, other in zip(ours.currents, twin.currents, strict=True):
        assert one.holds_A == pytest.approx(other.holds_A, rel=1e-7)
        assert one.begins_A == pytest.approx(other.begins_A, rel=1e-6)
        assert one.most_A == pytest.approx(other.most_A, rel=1e-6)
        assert one.holds_range_A == pytest.approx(other.holds_range_A, rel=1e-6)


def test_the_same_circuit_gives_the_same_solution_to_the_last_bit() -> None:
    circuit = drawn("slope", 3)
    assert solve(circuit, AMBIENTS) == solve(circuit, AMBIENTS)


def test_the_locus_runs_from_the_short_to_where_the_pass_device_runs_out() -> None:
    for name in ("sink", "follower", "foldback"):
        solution = solve(bench_circuit(name), AMBIENTS)
        most = max(point.output_A for point in solution.locus)
        assert solution.held_short is not None
        assert solution.locus[0].output_V == solution.held_short.output_V
        assert solution.locus[-1].output_A < 0.02 * most
        voltages = [point.output_V for point in solution.locus]
        assert voltages == sorted(voltages, reverse=name == "sink")
        assert solution.worst_point in solution.locus


def test_who_limits_is_found_by_taking_the_shunt_out() -> None:
    follower = solve(bench_circuit("follower"), AMBIENTS)
    assert [currents.limited_by_short for currents in follower.currents] == ["drive", "limiter", "limiter"]
    at_6_V = solve(replace(bench_circuit("follower"), output_V=6.0), AMBIENTS).currents[2]
    assert at_6_V.limited_by_output == ("drive" if (at_6_V.carries_A or 0.0) < 0.8 else "limiter")


def test_carries_without_a_working_voltage_is_the_least_that_leaves_the_pass_device_two_volts() -> None:
    circuit = bench_circuit("sink")
    solution = solve(circuit, AMBIENTS)
    working = [point for point in solution.locus if point.states["Q1"].voltage_V >= 1.99]
    assert solution.currents[1].carries_A == pytest.approx(min(point.output_A for point in working), rel=1e-4)
    assert solution.at_carry is not None
    assert solution.at_carry.states["Q1"].voltage_V == pytest.approx(2.0, abs=0.01)


def test_a_diode_string_reports_the_current_it_takes() -> None:
    solution = solve(drawn("diode string", 4), AMBIENTS)
    assert solution.held_short is not None
    taken = abs(solution.held_short.states["D1"].current_A)
    assert solution.currents[1].shunt_A == pytest.approx(taken)


def test_parallel_pass_devices_are_counted_together() -> None:
    solution = solve(drawn("parallel", 4), AMBIENTS)
    assert solution.held_short is not None
    both = sum(abs(solution.held_short.states[name].current_A) for name in ("Q1", "Q4"))
    assert solution.currents[1].pass_A == pytest.approx(both)
