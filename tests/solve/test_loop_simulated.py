"""Natural frequencies and loop gain of random circuits against a general-purpose simulator, where it is installed."""

from __future__ import annotations

import os

import numpy as np
import pytest

from protlint.solve.circuit import Circuit
from protlint.solve.loop import solve_loop
from protlint.solve.solution import Loop
from tests.support.dynamics import random_circuit, simulated_gain, simulated_poles
from tests.support.ngspice import needs_ngspice

SEEDS = range(100, 100 + int(os.environ.get("PROTLINT_SIMULATED_LOOPS", "8")))
AMBIENTS = (-10.0, 27.0, 85.0)


def ends(circuit: Circuit) -> dict[str, float]:
    """The short's voltage and the drive's on end."""
    drive, mirror = circuit.drive, any(device.kind == "pnp" for device in circuit.devices)
    return {
        "output_V": circuit.held[circuit.shorts[0]].usual,
        "drive_V": (drive.low_V if mirror else drive.high_V).usual,
    }


@needs_ngspice
@pytest.mark.parametrize("seed", SEEDS)
def test_random_loops_agree_with_pole_zero_and_small_signal_runs(seed: int) -> None:
    circuit = random_circuit(seed)
    loop = solve_loop(circuit, AMBIENTS, corners=False)
    assert isinstance(loop, Loop), loop
    poles = simulated_poles(circuit, **ends(circuit))
    if not len(poles):
        pytest.skip("the simulator's pole-zero analysis did not converge on this circuit")
    found = [(f, d) for f, d in loop.natural if f < 1e9]
    expected = sorted((abs(s) / (2.0 * np.pi), -s.real / abs(s)) for s in poles if s.imag >= 0.0 and abs(s) < 2e9 * np.pi)
    # the simulator prints nearly equal real poles as a pair now and then
    assert [one[0] for one in found] == pytest.approx([one[0] for one in expected], rel=1e-3)
    assert [one[1] for one in found] == pytest.approx([one[1] for one in expected], abs=2e-3)
    asked_Hz = [1.0, 1e5] if loop.crossover_Hz is None else [1.0, loop.crossover_Hz]
    gain = simulated_gain(circuit, asked_Hz, **ends(circuit))
    assert abs(gain[0]) == pytest.approx(loop.low_frequency_gain, rel=1e-3)
    if loop.crossover_Hz is not None:
        assert loop.phase_margin_deg is not None
        assert abs(gain[1]) == pytest.approx(1.0, rel=1e-3)
        turned = (180.0 + np.degrees(np.angle(gain[1])) - loop.phase_margin_deg + 180.0) % 360.0 - 180.0
        assert turned == pytest.approx(0.0, abs=0.1)
