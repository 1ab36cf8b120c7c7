"""Natural frequencies and loop gain of random circuits against a general-purpose simulator, where it is installed."""

from __future__ import annotations

import os

import numpy as np
import pytest

from protlint.solve.circuit import Circuit
from protlint.solve.loop import solve_loop
from protlint.solve.solution import Loop
from tests.support.dynamics import moving_shape, on_end_V, random_circuit, simulated_gain, simulated_poles
from tests.support.ngspice import needs_ngspice
from tests.support.shapes import SHAPES

SEEDS = range(100, 100 + int(os.environ.get("PROTLINT_SIMULATED_LOOPS", "8")))
EACH = int(os.environ.get("PROTLINT_SIMULATED_SHAPES", "2"))
AMBIENTS = (-10.0, 27.0, 85.0)


def compare(circuit: Circuit) -> None:
    """Compare every natural frequency that the simulator finds below 1 GHz, and the loop gain: at rest, at its crossover."""
    loop = solve_loop(circuit, AMBIENTS, corners=False)
    assert isinstance(loop, Loop), loop
    ends = {"output_V": circuit.held[circuit.shorts[0]].usual, "drive_V": on_end_V(circuit)}
    poles = simulated_poles(circuit, **ends) if circuit.drive.current_A is None else np.array([])
    expected = [(abs(s) / (2.0 * np.pi), -s.real / abs(s)) for s in poles if s.imag >= 0.0 and abs(s) < 2e9 * np.pi]
    assert len(expected) <= sum(f < 1e9 for f, _ in loop.natural)
    for frequency_Hz, damping in expected:
        # its search gives up before the last ones now and then, but what it finds is there
        near = [d for f, d in loop.natural if f == pytest.approx(frequency_Hz, rel=1e-3)]
        assert any(d == pytest.approx(damping, abs=2e-3) for d in near), (frequency_Hz, damping, loop.natural)
    if loop.low_frequency_gain is None:
        if not expected:
            pytest.skip("the simulator's pole-zero analysis did not converge, and there is no loop gain to compare")
        return
    asked_Hz = [1.0, 1e5] if loop.crossover_Hz is None else [1.0, loop.crossover_Hz]
    gain = simulated_gain(circuit, asked_Hz, **ends)
    assert abs(gain[0]) == pytest.approx(loop.low_frequency_gain, rel=4e-3)
    if loop.crossover_Hz is not None:
        assert loop.phase_margin_deg is not None
        assert abs(gain[1]) == pytest.approx(1.0, rel=2e-3)
        turned = (180.0 + np.degrees(np.angle(gain[1])) - loop.phase_margin_deg + 180.0) % 360.0 - 180.0
        assert turned == pytest.approx(0.0, abs=0.1)


@needs_ngspice
@pytest.mark.parametrize("seed", SEEDS)
def test_random_loops_agree_with_pole_zero_and_small_signal_runs(seed: int) -> None:
    compare(random_circuit(seed))


@needs_ngspice
@pytest.mark.parametrize("seed", range(EACH))
@pytest.mark.parametrize("shape", SHAPES)
def test_loops_of_every_shape_agree_with_pole_zero_and_small_signal_runs(shape: str, seed: int) -> None:
    compare(moving_shape(shape, seed))
