"""Steps into the short against a general-purpose simulator with short steps, where it is installed."""

from __future__ import annotations

import os

import numpy as np
import pytest

from protlint.solve.circuit import Circuit
from protlint.solve.delay import OVER, prepare_step, solve_step
from protlint.solve.solution import Step
from tests.support.dynamics import bench_case, last_above, random_circuit, simulated_step
from tests.support.ngspice import needs_ngspice

AMBIENTS = (-10.0, 27.0, 85.0)
SEEDS = range(200, 200 + int(os.environ.get("PROTLINT_SIMULATED_STEPS", "8")))


def compare(circuit: Circuit) -> None:
    """Compare delay, energy and peak, each within 1 % (and 1 ns)."""
    step = solve_step(circuit, AMBIENTS)
    assert isinstance(step, Step), step
    trial = prepare_step(circuit, AMBIENTS)
    mirror = any(device.kind == "pnp" for device in circuit.devices)
    short_V = circuit.held[circuit.shorts[0]].usual
    until_s = 2e-5 if step.delay_s is None else max(1e-6, 3.0 * step.delay_s)
    times, currents, power = simulated_step(
        circuit,
        begin_V=float(trial.start.voltages[trial.expanded.index(circuit.output)]),
        short_V=short_V,
        drive_V=(circuit.drive.low_V if mirror else circuit.drive.high_V).usual,
        until_s=until_s,
    )
    currents = currents * np.sign(currents[-1])
    assert step.peak_A == pytest.approx(max(float(currents.max()), trial.holds_A), rel=0.01)
    if not step.settles:
        # it swings on in the simulator too
        last = currents[times > 0.5 * until_s]
        assert np.ptp(last) > 0.1 * trial.holds_A
        return
    delay_s = last_above(times, currents, OVER * trial.holds_A)
    assert step.delay_s == pytest.approx(delay_s, rel=0.01, abs=1e-9)
    inside = times <= delay_s
    energy_J = float(np.trapezoid(power[inside], times[inside]))
    assert step.pass_energy_J == pytest.approx(energy_J, rel=0.02, abs=1e-9)


@needs_ngspice
@pytest.mark.parametrize("seed", SEEDS)
def test_random_steps_agree_with_transient_runs(seed: int) -> None:
    compare(random_circuit(seed))


@needs_ngspice
@pytest.mark.parametrize("name", ["sink", "source_pnp", "darlington_follower"])
def test_bench_steps_agree_with_transient_runs_of_short_steps(name: str) -> None:
    compare(bench_case(name, "100 nF base to emitter of the shunt"))
