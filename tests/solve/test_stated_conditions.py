"""Circuits under stated conditions: open outputs, supplies off, equal circuits once, loci at a corner, resistors alone."""

from __future__ import annotations

from dataclasses import replace

import pytest

from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.conditions import Condition, Known, solve_under
from protlint.solve.corners import axes_of
from protlint.solve.failures import failures
from protlint.solve.network import compile_network
from protlint.solve.range_ends import loci_at, positions
from protlint.solve.resistive import behind, thevenin
from tests.support.circuits import bench_circuit, fixed

AMBIENTS = (-10.0, 27.0, 85.0)
NAMES = ("sink", "follower", "source_pnp", "darlington_follower", "nmos_sink", "foldback")


@pytest.mark.parametrize("name", NAMES)
def test_the_held_short_is_one_of_the_conditions(name: str) -> None:
    circuit = bench_circuit(name)
    solution = solve(circuit, AMBIENTS)
    on_V = (circuit.drive.high_V if solution.on_end == "high" else circuit.drive.low_V).usual
    short_V = circuit.held[circuit.shorts[0]].usual
    held, unlimited = solve_under(circuit, [Condition(27.0, on_V, short_V), Condition(27.0, on_V, short_V, shunt_in=False)])
    assert held is not None
    assert unlimited is not None
    way = -1.0 if solution.sources else 1.0
    assert way * held.output_A == pytest.approx(solution.currents[1].holds_A, rel=1e-6)
    assert way * unlimited.output_A == pytest.approx(solution.currents[1].unlimited_A, rel=1e-6)


@pytest.mark.parametrize("name", NAMES)
def test_an_open_output_takes_no_current_and_lies_between_the_supplies(name: str) -> None:
    circuit = bench_circuit(name)
    low, high = circuit.output_reach_V
    for point in solve_under(
        circuit, [Condition(27.0, end.usual, None) for end in (circuit.drive.low_V, circuit.drive.high_V)]
    ):
        assert point is not None
        assert point.output_A == 0.0
        assert low - 0.1 <= point.output_V <= high + 0.1


def test_without_supplies_and_drive_nothing_flows() -> None:
    (point,) = solve_under(bench_circuit("sink"), [Condition(27.0, 0.0, 0.0, supplied=False)])
    assert point is not None
    assert all(abs(state.current_A) < 1e-9 for state in point.states.values())


def test_equal_circuits_are_solved_once_and_called_by_their_own_names() -> None:
    circuit, known = bench_circuit("follower"), Known()
    conditions = [Condition(27.0, 0.0, 12.0)]
    first = solve_under(circuit, conditions, known)[0]
    names = {device.name: f"CH2/{device.name}" for device in circuit.devices}
    twin = replace(
        circuit,
        devices=tuple(replace(device, name=names[device.name]) for device in circuit.devices),
        shunt=tuple(names[one] for one in circuit.shunt),
        pass_devices=tuple(names[one] for one in circuit.pass_devices),
        sense=tuple(names[one] for one in circuit.sense),
    )
    second = solve_under(twin, conditions, known)[0]
    assert len(known.kept) == 1
    assert first is not None
    assert second is not None
    assert set(second.states) == set(names.values())
    assert second.states["CH2/Q10"] == first.states["Q10"]


@pytest.mark.parametrize("name", ["sink", "foldback"])
def test_the_locus_at_a_corner_begins_at_that_corners_held_short(name: str) -> None:
    circuit = bench_circuit(name)
    solution = solve(circuit, AMBIENTS)
    ends = solution.currents[1].holds_range_A
    assert ends is not None
    for end, corner in zip(ends, ("low", "high"), strict=True):
        at = positions(axes_of(compile_network(circuit)), solution.corners[corner])
        points = loci_at(circuit, circuit.shorts[0], AMBIENTS, [at], Known())[0][1]
        assert len(points) > 40
        assert points[0].output_A == pytest.approx(end, rel=1e-3)


def test_a_failed_part_leaves_the_rest_of_the_circuit() -> None:
    circuit = bench_circuit("sink")
    table = failures(circuit, stops=["R3"], on_V=12.0, short_V=12.0, sources=False, ambient_degC=27.0)
    by = {(one.role, one.how): one.output_A for one in table}
    assert by["shunt", "open"] == pytest.approx(solve(circuit, AMBIENTS).currents[1].unlimited_A, rel=1e-6)
    assert by["shunt", "short"] == pytest.approx(0.0, abs=1e-6)


def divider() -> Circuit:
    devices = (
        Device("R1", "resistor", ("A", "B"), {"R": 3e3}),
        Device("R2", "resistor", ("B", "GND"), {"R": 1e3}),
        Device("R3", "resistor", ("B", "C"), {"R": 250.0}),
    )
    held = {"A": fixed(12.0), "GND": fixed(0.0)}
    return Circuit(devices, held, Drive("D", fixed(0.0), fixed(1.0)), "OUT", ("GND",), (), (), ())


def test_a_divider_seen_from_its_tap() -> None:
    # Thevenin's theorem: 12 V * 1 / 4 behind 3 kohm || 1 kohm, and 250 ohm more
    volts, ohms = thevenin(divider(), "C", "GND", known_V={"A": 12.0, "GND": 0.0}, injected_A={})
    assert volts == pytest.approx(3.0, rel=1e-6)
    assert ohms == pytest.approx(1e3, rel=1e-6)


def test_an_injected_current_adds_its_drop() -> None:
    volts, _ = thevenin(divider(), "C", "GND", known_V={"A": 12.0, "GND": 0.0}, injected_A={"B": 4e-3})
    assert volts == pytest.approx(3.0 + 4e-3 * 750.0, rel=1e-6)


def test_what_lies_behind_resistors() -> None:
    assert behind(divider(), "C", {"A": 12.0}) == (12.0, 3250.0)
    assert behind(divider(), "C", {"Z": 12.0}) is None
