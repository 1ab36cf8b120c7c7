"""What loop, advice and step cost beside the currents, and what solving all corners at once is worth; only printed."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from protlint.solve.advice import advise
from protlint.solve.answers import solve
from protlint.solve.delay import solve_step
from protlint.solve.expanded import expand
from protlint.solve.loop import hold, solve_loop
from protlint.solve.modes import damping
from protlint.solve.network import compile_network
from protlint.solve.solution import Loop, Step
from protlint.solve.wired import linearise, look, wired_frequencies
from protlint.solve.worst import make_scope, opening_scene
from tests.support.circuits import bench_circuit
from tests.support.dynamics import MOVING

AMBIENTS = (-10.0, 27.0, 85.0)


def timed(work: Callable[[], Any], times: int = 1) -> tuple[float, Any]:
    """Processor time of the quickest of some runs, in seconds, and the result."""
    spent, result = [], None
    for _ in range(times):
        began = time.process_time()
        result = work()
        spent.append(time.process_time() - began)
    return min(spent), result


@pytest.mark.parametrize("name", MOVING)
def test_cost_of_loop_step_and_advice_by_that_of_the_currents(name: str) -> None:
    circuit = bench_circuit(name)
    currents_s, _ = timed(lambda: solve(circuit, AMBIENTS), 3)
    loop_s, loop = timed(lambda: solve_loop(circuit, AMBIENTS), 3)
    step_s, step = timed(lambda: solve_step(circuit, AMBIENTS))
    advice_s, _ = timed(lambda: advise(circuit, AMBIENTS, loop=loop, step=step))
    assert isinstance(loop, Loop)
    assert isinstance(step, Step)
    print(
        f"\n{name}: currents {currents_s * 1e3:.0f} ms; loop with corners and wiring {loop_s * 1e3:.0f} ms, "
        f"{loop_s / currents_s:.2f} of them; step {step_s / currents_s:.1f}, advice {advice_s / currents_s:.1f} times them"
    )


def test_all_corners_at_once_against_one_after_the_other() -> None:
    network = compile_network(bench_circuit("darlington_follower"))
    expanded = expand(network, output="wired")
    held = hold(network, AMBIENTS)
    scope = make_scope(held.stage, expanded, AMBIENTS)
    scene = opening_scene(scope, held.short.operating.inner)
    lanes = np.arange(len(scene.ambient))

    def together() -> np.ndarray:
        return damping(wired_frequencies(linearise(expanded, look(expanded, scene.run, lanes)), 0.0)).min(axis=1)

    def apart() -> np.ndarray:
        return np.array(
            [
                damping(wired_frequencies(linearise(expanded, look(expanded, scene.run, lanes[[lane]])), 0.0)).min()
                for lane in lanes
            ]
        )

    together_s, at_once = timed(together, 3)
    apart_s, in_turn = timed(apart)
    assert at_once == pytest.approx(in_turn, abs=1e-9)
    print(f"\n{len(lanes)} corners linearised at once: {apart_s / together_s:.0f} times as quick as one after the other")
