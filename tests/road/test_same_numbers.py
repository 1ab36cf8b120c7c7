"""A circuit solved by itself and the same circuit read from a netlist, found and put on the bench: the same numbers."""

from __future__ import annotations

from pathlib import Path

import pytest

from protlint.pipeline import review
from protlint.solve.answers import solve
from tests.support.circuit_files import plain, write_files
from tests.support.circuits import bench_circuit, load_bench
from tests.support.shapes import SHAPES, drawn

AMBIENTS_DEGC = (-10.0, 27.0, 85.0)
BENCH = load_bench()["circuits"]


@pytest.mark.parametrize("name", BENCH)
def test_bench_circuits_through_a_netlist_meet_the_simulator(name: str, tmp_path: Path) -> None:
    """Against fixtures/bench-circuits.json: 0.5 %, MOSFET pass devices off 27 degC 2 %, ranges 1 %."""
    files = write_files(bench_circuit(name), tmp_path)
    found = review(files.netlist, limits=files.limits, parts=[files.parts])
    assert len(found.limiters) == 1
    published = BENCH[name]
    for row in found.limiters[0].solution.currents:
        solved = published["solved"][f"{row.ambient_degC:g} degC"]
        loose = name == "nmos_sink" and row.ambient_degC != 27.0
        within = 0.02 if loose else 0.005
        assert row.holds_A == pytest.approx(solved["holds_A"], rel=within)
        assert row.unlimited_A == pytest.approx(solved["unlimited_A"], rel=within)
        if "begins_A" in solved:
            assert row.begins_A == pytest.approx(solved["begins_A"], rel=within)
        else:
            assert row.begins_A is None
        if row.ambient_degC == 27.0 and "holds_range_A_at_27_degC" in published:
            assert row.holds_range_A == pytest.approx(published["holds_range_A_at_27_degC"], rel=0.01)


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("shape", SHAPES)
def test_drawn_circuits_through_a_netlist_keep_their_numbers(shape: str, seed: int, tmp_path: Path) -> None:
    circuit = plain(drawn(shape, seed))
    files = write_files(circuit, tmp_path)
    found = review(files.netlist, limits=files.limits, parts=[files.parts])
    alone = solve(circuit, AMBIENTS_DEGC)
    assert alone.not_solved is None
    ours = [one for one in found.limiters if set(one.limiter.roles["shunt"]) == set(circuit.shunt)]
    assert len(ours) == 1, [(one.limiter.topology, one.limiter.roles) for one in found.limiters]
    assert ours[0].solution.not_solved is None
    for row, expected in zip(ours[0].solution.currents, alone.currents, strict=True):
        assert row.holds_A == pytest.approx(expected.holds_A, rel=1e-6)
        assert row.most_A == pytest.approx(expected.most_A, rel=1e-5)
        assert (row.begins_A is None) == (expected.begins_A is None)
        if expected.begins_A is not None:
            assert row.begins_A == pytest.approx(expected.begins_A, rel=1e-5)
        assert row.holds_range_A == pytest.approx(expected.holds_range_A, rel=1e-5)
        if expected.carries_A is not None:
            assert row.carries_A == pytest.approx(expected.carries_A, rel=1e-4)
