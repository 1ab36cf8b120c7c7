"""Printed ranges: ten thousand seeded samples lie within, and the listed corner reaches the ends."""

from __future__ import annotations

import os
from dataclasses import replace

import numpy as np
import pytest

from protlint.limits import Range
from protlint.solve.answers import solve
from protlint.solve.begins import drive_ends
from protlint.solve.circuit import Circuit
from protlint.solve.locus import Conditions, greatest, least_working, trace, working_edges
from protlint.solve.network import compile_network
from protlint.solve.solution import Solution
from protlint.solve.stage import KELVIN, Stage, run_stage, sweep_stage
from tests.support.circuits import bench_circuit, load_bench
from tests.support.shapes import SHAPES, drawn

AMBIENTS = (-40.0, 27.0, 110.0)
SAMPLES = 10_000
EACH = int(os.environ.get("PROTLINT_SAMPLED", "1"))


def with_moving_supplies(circuit: Circuit) -> Circuit:
    """The circuit with supplies within 10 % and a drive within half a volt."""

    def within(limits: Range, share: float, volts: float) -> Range:
        spread = share * abs(limits.usual) + volts
        return Range(limits.usual - spread, limits.usual, limits.usual + spread)

    low, high = circuit.output_reach_V
    drive = circuit.drive
    return replace(
        circuit,
        held={node: within(limits, 0.1, 0.0) for node, limits in circuit.held.items()},
        drive=replace(drive, low_V=within(drive.low_V, 0.0, 0.5), high_V=within(drive.high_V, 0.0, 0.5)),
        output_reach_V=(1.1 * low, 1.1 * high),
    )


def stage_of(circuit: Circuit, solution: Solution) -> Stage:
    assert solution.short is not None
    return sweep_stage(compile_network(circuit), solution.short, AMBIENTS, 1)[0]


def sampled(stage: Stage, ambient_degC: float, corner: np.ndarray) -> np.ndarray:
    return run_stage(stage, np.full(corner.shape[1], ambient_degC + KELVIN), corner=corner).output_A


@pytest.mark.parametrize("name", sorted(load_bench()["circuits"]))
def test_ten_thousand_samples_of_a_bench_circuit_lie_within_the_range_of_holds(name: str) -> None:
    circuit = bench_circuit(name)
    solution = solve(circuit, AMBIENTS)
    stage = stage_of(circuit, solution)
    corner = np.random.default_rng(7).uniform(-1.0, 1.0, (len(stage.axes), SAMPLES))
    # half of them at the edges of what is allowed, where extremes lie
    corner[:, ::2] = np.sign(corner[:, ::2])
    currents = solution.currents[1]
    assert currents.holds_range_A is not None
    low, high = currents.holds_range_A
    found = sampled(stage, currents.ambient_degC, corner)
    assert low <= found.min() and found.max() <= high
    assert low <= (currents.holds_A or 0.0) <= high


@pytest.mark.parametrize("name", sorted(load_bench()["circuits"]))
def test_the_listed_corner_reaches_the_ends_of_the_range(name: str) -> None:
    circuit = bench_circuit(name)
    solution = solve(circuit, AMBIENTS)
    stage = stage_of(circuit, solution)
    ends = solution.currents[1].holds_range_A
    assert ends is not None
    for end, expected in zip(("low", "high"), ends, strict=True):
        listed = solution.corners[end]
        corner = np.array([[listed.get(f"{axis.device}.{axis.parameter}", 0.0)] for axis in stage.axes])
        assert sampled(stage, 27.0, corner)[0] == pytest.approx(expected, rel=1e-5)


@pytest.mark.parametrize("shape", sorted(SHAPES))
def test_samples_of_limiters_drawn_by_seed_lie_within_every_range(shape: str) -> None:
    """Holds, carries and most, supplies moving in every second circuit, hot and cold."""
    for seed in range(EACH):
        circuit = drawn(shape, 100 + seed)
        if seed % 2 == 0:
            circuit = with_moving_supplies(circuit)
        solution = solve(circuit, AMBIENTS)
        stage = stage_of(circuit, solution)
        dice = np.random.default_rng(seed)
        for currents in (solution.currents[0], solution.currents[2]):
            corner = dice.uniform(-1.0, 1.0, (len(stage.axes), 1000))
            corner[:, ::2] = np.sign(corner[:, ::2])
            found = sampled(stage, currents.ambient_degC, corner)
            assert currents.holds_range_A is not None
            assert currents.holds_range_A[0] <= found.min()
            assert found.max() <= currents.holds_range_A[1]
            few = np.arange(24)
            conditions = Conditions(np.full(len(few), currents.ambient_degC + KELVIN), corner[:, few])
            start = run_stage(stage, conditions.ambient_K, corner=conditions.corner).operating.inner[:, None]
            loci, _ = trace(stage, conditions, start)
            most = [loci.output_A[index] for lane in few if (index := greatest(loci, int(lane))) is not None]
            assert currents.most_range_A is not None
            slack = 2e-3 * (currents.most_A or 0.0)
            assert currents.most_range_A[0] - slack <= min(most)
            assert max(most) <= currents.most_range_A[1] + slack
            if currents.carries_range_A is not None:
                edged = working_edges(stage, conditions, loci)
                least = [edged.output_A[index] for lane in few if (index := least_working(edged, int(lane))) is not None]
                assert currents.carries_range_A[0] - slack <= min(least)
                assert max(least) <= currents.carries_range_A[1] + slack


def brute_begins(stage: Stage, ambient_degC: float, corner: np.ndarray) -> np.ndarray:
    """Where each corner begins on a fine sweep of the drive's usual range; NaN where it does not."""
    points, count = 400, corner.shape[1]
    off, on = drive_ends(stage)
    run = run_stage(
        stage,
        np.full(2 * points * count, ambient_degC + KELVIN),
        corner=np.tile(corner, 2 * points),
        drive_V=np.tile(np.repeat(np.linspace(off, on, points), count), 2),
        shunt_in=np.repeat([1.0, 0.0], points * count),
    )
    limited, unlimited = run.output_A.reshape(2, points, count)
    found = np.full(count, np.nan)
    for lane in range(count):
        over = limited[:, lane] - 0.9 * unlimited[:, lane]
        rows = np.flatnonzero((over[:-1] > 0.0) & (over[1:] <= 0.0) & (limited[1:, lane] > 0.05 * limited[-1, lane]))
        if len(rows):
            row = rows[-1]
            part = over[row] / (over[row] - over[row + 1])
            found[lane] = limited[row, lane] + part * (limited[row + 1, lane] - limited[row, lane])
    return found


@pytest.mark.parametrize("shape", sorted(SHAPES))
def test_samples_of_begins_lie_within_its_range(shape: str) -> None:
    for seed in range(EACH):
        circuit = drawn(shape, 200 + seed)
        solution = solve(circuit, AMBIENTS)
        stage = stage_of(circuit, solution)
        for currents in solution.currents[1:]:
            if currents.begins_A is None:
                continue
            assert currents.begins_range_A is not None
            low, high = currents.begins_range_A
            assert low <= currents.begins_A <= high
            corner = np.sign(np.random.default_rng(seed).uniform(-1.0, 1.0, (len(stage.axes), 12)))
            found = brute_begins(stage, currents.ambient_degC, corner)
            found = found[np.isfinite(found)]
            # a sweep's straight lines between its points miss the crossing by some thousandths
            assert (found >= low * 0.99).all()
            assert (found <= high * 1.01).all()


def test_a_corner_of_current_gain_is_the_bound_itself_at_every_temperature() -> None:
    """With the gain alone in question, holds at the low end equals holds with B_F at its bound and no temperature law."""
    circuit = bench_circuit("follower", tolerance=0.0, vbe_spread_V=0.0)
    devices = tuple(device if device.name == "Q10" else replace(device, hfe=None) for device in circuit.devices)
    ranged = solve(replace(circuit, devices=devices), AMBIENTS)
    for currents in ranged.currents:
        assert currents.holds_range_A is not None
        found = []
        for bound in (60.0, 180.0):
            # B_F is the bound at this ambient if the law is divided out beforehand
            law = ((currents.ambient_degC + KELVIN) / 300.15) ** 1.5
            changed = tuple(
                replace(device, hfe=None, model={**device.model, "BF": bound / law}) if device.name == "Q10" else device
                for device in devices
            )
            alone = solve(replace(circuit, devices=changed), (currents.ambient_degC,) * 3)
            found.append(alone.currents[1].holds_A)
        assert currents.holds_range_A[0] == pytest.approx(min(found), rel=1e-5)
        assert currents.holds_range_A[1] == pytest.approx(max(*found, currents.holds_A or 0.0), rel=1e-5)


def test_sensitivities_are_derivatives() -> None:
    circuit = bench_circuit("sink")
    solution = solve(circuit, AMBIENTS)
    table = {(one.device, one.parameter): one.relative for one in solution.sensitivities}
    for name in ("R1", "R2", "R3"):
        moved = []
        for share in (0.999, 1.001):
            devices = tuple(
                replace(device, model={"R": device.model["R"] * share}) if device.name == name else device
                for device in circuit.devices
            )
            moved.append(solve(replace(circuit, devices=devices), AMBIENTS).currents[1].holds_A or 0.0)
        slope = (moved[1] - moved[0]) / (solution.currents[1].holds_A or 1.0) / 0.002
        assert table[name, "R"] == pytest.approx(slope, abs=2e-4)
    assert table["R2", "R"] == pytest.approx(-0.9, abs=0.1)
