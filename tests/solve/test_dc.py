"""The DC solver against the solved bench circuits and against itself."""

from __future__ import annotations

import numpy as np
import pytest

from protlint.solve.dc import solve_lanes
from protlint.solve.lanes import Lanes, known_voltages
from protlint.solve.network import Network, compile_network
from tests.support.circuits import bench_circuit, load_bench

BENCH = load_bench()["circuits"]
NAMES = sorted(BENCH)


def lanes_at(network: Network, temperature_degC: np.ndarray, drive_V: np.ndarray) -> Lanes:
    """Lanes with the output in its first short."""
    circuit, count = network.circuit, len(drive_V)
    held = np.array([[circuit.held[node].usual] * count for node in network.held]).reshape(-1, count)
    short = np.full(count, circuit.held[circuit.shorts[0]].usual)
    return Lanes(temperature_degC + 273.15, known_voltages(held, short, drive_V))


@pytest.mark.parametrize("name", NAMES)
def test_holds_and_unlimited_agree_with_the_bench(name: str) -> None:
    """Source: fixtures/bench-circuits.json, solved by a general-purpose circuit simulator."""
    network = compile_network(bench_circuit(name))
    for ambient, figures in BENCH[name]["solved"].items():
        temperature = np.full(2, float(ambient.split()[0]))
        lanes = lanes_at(network, temperature, np.full(2, float(BENCH[name]["drive"]["to_V"])))
        lanes = Lanes(lanes.ambient_K, lanes.known_V, present=np.array([1.0, 0.0]))
        solved = np.abs(solve_lanes(network, lanes).output_A)
        assert solved[0] == pytest.approx(figures["holds_A"], rel=1e-4)
        assert solved[1] == pytest.approx(figures["unlimited_A"], rel=1e-4)


@pytest.mark.parametrize("name", NAMES)
def test_every_bench_circuit_converges_cold_from_55_below_to_150_degC(name: str) -> None:
    network = compile_network(bench_circuit(name))
    temperature, share = (axis.ravel() for axis in np.meshgrid(np.arange(-55.0, 151.0, 5.0), np.linspace(0.0, 1.0, 21)))
    entry = BENCH[name]["drive"]
    drive = entry["from_V"] + share * (entry["to_V"] - entry["from_V"])
    operating = solve_lanes(network, lanes_at(network, temperature, drive))
    assert operating.converged.all()
    assert np.isfinite(operating.output_A).all()
    again = solve_lanes(network, lanes_at(network, temperature, drive), operating.inner)
    assert np.allclose(again.output_A, operating.output_A, rtol=1e-7, atol=1e-12)
