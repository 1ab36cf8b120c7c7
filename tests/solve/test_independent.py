"""The bench circuits' equations, written a second time and handed to scipy.optimize.root."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import root

from protlint.solve.dc import solve_lanes
from protlint.solve.lanes import Lanes, known_voltages
from protlint.solve.network import Network, compile_network
from tests.support.circuits import bench_circuit, load_bench
from tests.support.equations import node_equations, output_current, start_near

BENCH = load_bench()["circuits"]


def solved_here(network: Network, ambient_degC: float, output_V: float, drive_V: float) -> tuple[dict[str, float], float]:
    held = np.array([[network.circuit.held[node].usual] for node in network.held]).reshape(-1, 1)
    known = known_voltages(held, np.array([output_V]), np.array([drive_V]))
    operating = solve_lanes(network, Lanes(np.array([ambient_degC + 273.15]), known))
    assert operating.converged.all()
    return dict(zip(network.nodes, operating.node_V[:, 0], strict=True)), float(operating.output_A[0])


@pytest.mark.parametrize("name", sorted(BENCH))
@pytest.mark.parametrize("ambient_degC", [-40.0, 27.0, 110.0])
def test_scipy_finds_the_same_solution(name: str, ambient_degC: float) -> None:
    if name == "nmos_sink" and ambient_degC != 27.0:
        ambient_degC = 27.0
    circuit = bench_circuit(name)
    output_V = circuit.held[circuit.shorts[0]].usual
    drive_V = float(BENCH[name]["drive"]["to_V"])
    here, output_A = solved_here(compile_network(circuit), ambient_degC, output_V, drive_V)
    unknown, law = node_equations(circuit, ambient_degC, output_V, drive_V)
    near = root(law, start_near(circuit, unknown, here), method="lm", tol=1e-14, options={"maxiter": 20000})
    found = root(law, near.x, method="hybr", tol=1e-14, options={"maxfev": 20000})
    assert np.abs(law(found.x)).max() < 1e-8
    assert output_current(circuit, ambient_degC, output_V, drive_V, found.x) == pytest.approx(output_A, rel=1e-5)
    for node, voltage in zip(unknown, found.x, strict=True):
        if node in here:
            assert voltage == pytest.approx(here[node], abs=1e-5)
