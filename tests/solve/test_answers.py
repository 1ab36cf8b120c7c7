"""The answers against the solved bench circuits."""

from __future__ import annotations

import numpy as np
import pytest

from protlint.solve.answers import solve
from tests.support.circuits import bench_circuit, load_bench

BENCH = load_bench()["circuits"]
AMBIENTS = (-10.0, 27.0, 85.0)


@pytest.mark.parametrize("name", sorted(BENCH))
def test_currents_agree_with_the_bench(name: str) -> None:
    """Source: fixtures/bench-circuits.json, solved by a general-purpose circuit simulator."""
    solution = solve(bench_circuit(name), AMBIENTS)
    assert solution.not_solved is None
    for currents in solution.currents:
        figures = BENCH[name]["solved"][f"{currents.ambient_degC:g} degC"]
        assert currents.holds_A == pytest.approx(figures["holds_A"], rel=1e-4)
        assert currents.unlimited_A == pytest.approx(figures["unlimited_A"], rel=1e-4)
        assert currents.shunt_A == pytest.approx(figures["shunt_A"], rel=1e-3)
        if "begins_A" in figures:
            assert currents.begins_A == pytest.approx(figures["begins_A"], rel=1e-4)
        else:
            assert currents.begins_A is None
    usual = solution.currents[1]
    if "holds_range_A_at_27_degC" in BENCH[name]:
        assert usual.holds_range_A == pytest.approx(BENCH[name]["holds_range_A_at_27_degC"], rel=1e-3)
    assert len(solution.locus) >= 41


def test_foldback_locus_agrees_with_the_bench_at_every_listed_voltage() -> None:
    """Source: fixtures/bench-circuits.json."""
    solution = solve(bench_circuit("foldback"), AMBIENTS)
    voltage = [point.output_V for point in solution.locus]
    current = [point.output_A for point in solution.locus]
    for output_V, holds_A in BENCH["foldback"]["holds_A_against_output_V_at_27_degC"]:
        assert np.interp(output_V, voltage, current) == pytest.approx(holds_A, rel=2e-3)
