"""Loop, step and advice over the family of drawn circuits, every kind of stage among them, with dynamic data filled in."""

from __future__ import annotations

import os
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import scipy.linalg

from protlint.board.graph import build_board
from protlint.limits import needs_of
from protlint.netlist import read_netlist
from protlint.pipeline import Desk, set_up
from protlint.solve.advice import advise
from protlint.solve.bench import build_bench
from protlint.solve.circuit import Circuit
from protlint.solve.delay import solve_step
from protlint.solve.expanded import expand
from protlint.solve.linear import conductance_matrix, store_matrix
from protlint.solve.loop import hold, solve_loop
from protlint.solve.network import compile_network
from protlint.solve.solution import Advice, Loop, Step
from protlint.solve.wired import look
from protlint.topology.match import find_limiters
from tests.support.paths import FIXTURES

EVERY = 1 if os.environ.get("PROTLINT_WHOLE_FAMILY") else 4
FILES = sorted((FIXTURES / "circuits").glob("*.edf"))[::EVERY]
AMBIENTS = (-10.0, 27.0, 85.0)
BIPOLAR, MOSFET, DIODE = {"TF": 1e-8, "CJE": 3e-10, "CJC": 1e-10}, {"CGS": 1e-9, "CGD": 1e-10}, {"CJO": 1e-11}
USUAL = {"npn": BIPOLAR, "pnp": BIPOLAR, "nmos": MOSFET, "pmos": MOSFET, "diode": DIODE, "zener": DIODE}


@cache
def desk() -> Desk:
    return set_up()


def circuits(file: Path) -> list[Circuit]:
    """The solvable circuits of a file's limiters, every device with dynamic data."""
    board = build_board(read_netlist(file), limits=desk().limits, book=desk().book)
    found = []
    for limiter in find_limiters(board, desk().rules).limiters:
        bench = build_bench(board, limiter, limits=desk().limits, needs=needs_of(desk().limits, limiter.id))
        if bench.circuit is not None:
            devices = tuple(replace(one, model={**USUAL.get(one.kind, {}), **one.model}) for one in bench.circuit.devices)
            found.append(replace(bench.circuit, devices=devices))
    return found


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_every_stage_has_a_loop_a_step_and_advice_or_a_reason(file: Path) -> None:
    for circuit in circuits(file):
        loop, step = solve_loop(circuit, AMBIENTS), solve_step(circuit, AMBIENTS)
        if isinstance(loop, str):
            assert loop
            assert isinstance(step, str)
            continue
        assert isinstance(loop, Loop)
        assert loop.least_damping is None or -1.0 <= loop.least_damping <= 1.0
        assert loop.worst_damping is not None
        assert -1.0 <= loop.worst_damping <= 1.0
        if loop.own_damping is not None:
            assert loop.worst_damping <= loop.own_damping
        if isinstance(step, Step):
            assert step.peak_A is not None
            assert np.isfinite(step.peak_A)
        advice = advise(circuit, AMBIENTS, delay=False, loop=loop)
        assert isinstance(advice, Advice)
        assert all(fit.worst_damping >= 0.6 for fit in advice.fits)


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_natural_frequencies_of_every_stage_agree_with_scipy(file: Path) -> None:
    for circuit in circuits(file):
        loop = solve_loop(circuit, AMBIENTS, corners=False)
        if isinstance(loop, str):
            continue
        network = compile_network(circuit)
        expanded = expand(network, output="wired")
        shot = look(expanded, hold(network, AMBIENTS).short, np.array([1]))
        A = expanded.stores[:, : expanded.unknown]
        C = A.T @ store_matrix(expanded, shot)[0] @ A
        expected = scipy.linalg.eigvals(-conductance_matrix(expanded, shot)[0], C)
        size = np.abs(expected) / (2.0 * np.pi)
        # what hangs on leaks alone lies below, where the rounding of the fastest modes drowns it
        known = np.isfinite(expected) & (size < 1e9) & (size > 1e3)
        for s in expected[known & (expected.imag >= 0.0)]:
            frequency, ratio = abs(s) / (2.0 * np.pi), -s.real / abs(s)
            near = [d for f, d in loop.natural if f == pytest.approx(frequency, rel=1e-3)]
            assert any(d == pytest.approx(ratio, abs=1e-3) for d in near), (frequency, ratio, loop.natural)
