"""How fast limiters are solved, as ratios in one run: a batch of corners against a loop over them and against scipy.

Nothing is asserted on a clock. Small by default; ``PROTLINT_BENCH_CORNERS=1000`` measures the figures the project promises:
1,000 corners of one limiter at one point under 50 ms, a limiter complete in about 60 ms (process time, least of several).
"""

from __future__ import annotations

import os
from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import root

from protlint.solve.answers import solve
from protlint.solve.constants import KELVIN
from protlint.solve.memo import Memo
from protlint.solve.network import compile_network
from protlint.solve.stage import Stage, run_stage, sweep_stage
from tests.support.circuits import bench_circuit, load_bench
from tests.support.equations import node_equations, start_near
from tests.support.stopwatch import seconds

CORNERS = int(os.environ.get("PROTLINT_BENCH_CORNERS", "200"))
LOOPED, BY_SCIPY = 20, 3
AMBIENTS = (-10.0, 27.0, 85.0)
NAMES = sorted(load_bench()["circuits"])


def corners_of(stage: Stage, count: int) -> np.ndarray:
    return np.random.default_rng(1).uniform(-1.0, 1.0, (len(stage.axes), count))


@pytest.mark.parametrize("name", NAMES)
def test_a_batch_of_corners_against_a_loop_and_against_scipy(name: str) -> None:
    circuit = bench_circuit(name)
    stage, _ = sweep_stage(compile_network(circuit), circuit.shorts[0], AMBIENTS, 1)
    corner = corners_of(stage, CORNERS)
    ambient_K = np.full(CORNERS, 27.0 + KELVIN)

    def batch() -> np.ndarray:
        return run_stage(stage, ambient_K, corner=corner).output_A

    def loop() -> list[float]:
        return [float(run_stage(stage, ambient_K[:1], corner=corner[:, [lane]]).output_A[0]) for lane in range(LOOPED)]

    unknown, law = node_equations(circuit, 27.0, circuit.held[circuit.shorts[0]].usual, circuit.drive.high_V.usual)
    nominal = run_stage(stage, ambient_K[:1])
    nodes = dict(zip(stage.network.nodes, nominal.operating.node_V[:, 0].tolist(), strict=True))
    start = start_near(circuit, unknown, nodes)

    def scipy() -> None:
        for _ in range(BY_SCIPY):
            root(law, start, method="lm")

    assert loop() == pytest.approx(batch()[:LOOPED].tolist(), rel=1e-9)
    at_once = seconds(batch, 5) / CORNERS
    one_by_one = seconds(loop, 2) / LOOPED
    by_scipy = seconds(scipy, 1) / BY_SCIPY
    print(f"\n{name}: {CORNERS} corners in {1e3 * at_once * CORNERS:.1f} ms")
    print(f"  the same solver corner by corner takes {one_by_one / at_once:.0f} times as long")
    print(f"  scipy.optimize.root on plainly written equations takes {by_scipy / at_once:.0f} times as long")


def test_a_limiter_complete_against_its_corners() -> None:
    for name in NAMES:
        circuit = bench_circuit(name)
        complete = seconds(lambda circuit=circuit: solve(circuit, AMBIENTS), 3)  # type: ignore[misc]
        memo = Memo()
        solve(circuit, AMBIENTS, memo=memo)
        again = seconds(lambda circuit=circuit, memo=memo: solve(circuit, AMBIENTS, memo=memo), 3)  # type: ignore[misc]
        assert memo.recall(circuit, AMBIENTS) is not None
        print(f"\n{name}: complete in {1e3 * complete:.0f} ms; an equal one takes {complete / again:.0f} times less")


def test_a_board_of_equal_limiters_takes_hardly_longer_than_one() -> None:
    circuit = bench_circuit("follower")
    once = seconds(lambda: solve(circuit, AMBIENTS), 3)
    memo = Memo()
    channels = [replace(circuit, assumed=(f"channel {channel}",)) for channel in range(20)]
    together = seconds(lambda: [solve(channel, AMBIENTS, memo=memo) for channel in channels], 1)
    assert len(memo.kept) == 1
    print(f"\n20 equal limiters take {together / once:.1f} times as long as one")
