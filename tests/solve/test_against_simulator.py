"""Limiters drawn by seed, solved here and by a general-purpose circuit simulator (ngspice).

Types, values, temperatures, polarity and drive are drawn over every shape in tests/support/shapes.py. By default one circuit
of each shape; ``PROTLINT_SIMULATED=20`` compares twenty of each.
"""

from __future__ import annotations

import os
import random

import numpy as np
import pytest

from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit
from protlint.solve.solution import Currents, Solution
from tests.support.ngspice import needs_ngspice, swept
from tests.support.shapes import SHAPES, drawn

EACH = int(os.environ.get("PROTLINT_SIMULATED", "1"))
CLOSE = 5e-4
"""Ten times closer than the 0.5 % that is promised."""


def ambients_of(seed: int) -> tuple[float, float, float]:
    """Three ambients between -55 and 150 degC."""
    dice = random.Random(seed)
    return dice.uniform(-55.0, 0.0), dice.uniform(10.0, 45.0), dice.uniform(60.0, 150.0)


def drive_ends(circuit: Circuit) -> tuple[float, float]:
    """Off end and on end: the on end of these shapes lies towards the supply, of the P pass device away from it."""
    low, high = circuit.drive.low_V.usual, circuit.drive.high_V.usual
    toward_high = circuit.devices[1].kind in ("npn", "nmos")
    return (low, high) if toward_high else (high, low)


def short_V(circuit: Circuit) -> float:
    return circuit.held[circuit.shorts[0]].usual


def simulated_begins(circuit: Circuit, currents: Currents) -> float | None:
    """The last crossing of nine tenths as the simulator sees it: on a coarse sweep, then on a fine one around it."""
    off, on = drive_ends(circuit)
    holds_A = currents.holds_A or 0.0
    low, high = off, on
    found = None
    for points in (201, 61, 61):
        both = [
            np.array(
                swept(
                    circuit,
                    currents.ambient_degC,
                    sweep="drive",
                    start_V=low,
                    stop_V=high,
                    points=points,
                    output_V=short_V(circuit),
                    drive_V=high,
                    shunt=shunt,
                )
            )
            for shunt in (True, False)
        ]
        drive_V, limited_A, unlimited_A = both[0][:, 0], np.abs(both[0][:, 1]), np.abs(both[1][:, 1])
        over = limited_A - 0.9 * unlimited_A
        enough = np.maximum(limited_A[:-1], limited_A[1:]) > 0.05 * holds_A
        rows = np.flatnonzero(((over[:-1] > 0.0) != (over[1:] > 0.0)) & enough)
        if not len(rows):
            return None
        row = rows[-1]
        part = over[row] / (over[row] - over[row + 1])
        found = float(limited_A[row] + part * (limited_A[row + 1] - limited_A[row]))
        low, high = float(drive_V[row]), float(drive_V[row + 1])
    return found if found is not None and found > 0.05 * holds_A else None


def simulated_at(circuit: Circuit, ambient_degC: float, output_V: float, *, shunt: bool = True) -> float:
    """The simulator's output current with the drive swept up to its on end."""
    off, on = drive_ends(circuit)
    rows = swept(
        circuit,
        ambient_degC,
        sweep="drive",
        start_V=off,
        stop_V=on,
        points=41,
        output_V=output_V,
        drive_V=on,
        shunt=shunt,
    )
    return abs(rows[-1][1])


def locus_current(solution: Solution, output_V: float) -> float:
    points = sorted(solution.locus, key=lambda point: point.output_V)
    return float(np.interp(output_V, [point.output_V for point in points], [point.output_A for point in points]))


@needs_ngspice
@pytest.mark.parametrize("shape", sorted(SHAPES))
def test_limiters_drawn_by_seed_agree_with_the_simulator(shape: str) -> None:
    for seed in range(EACH):
        circuit = drawn(shape, seed + 2 * len(shape))
        solution = solve(circuit, ambients_of(seed))
        assert solution.not_solved is None
        for currents in solution.currents if EACH > 1 else solution.currents[1 + seed % 2 :: 2]:
            where = f"{shape} {seed} at {currents.ambient_degC:.1f} degC"
            holds_A = simulated_at(circuit, currents.ambient_degC, short_V(circuit))
            assert currents.holds_A == pytest.approx(holds_A, rel=CLOSE), where
            unlimited_A = simulated_at(circuit, currents.ambient_degC, short_V(circuit), shunt=False)
            assert currents.unlimited_A == pytest.approx(unlimited_A, rel=CLOSE), where
            begins_A = simulated_begins(circuit, currents)
            if begins_A is None or currents.begins_A is None:
                assert begins_A is None and currents.begins_A is None, where
            else:
                assert currents.begins_A == pytest.approx(begins_A, rel=CLOSE), where


@needs_ngspice
@pytest.mark.parametrize("shape", sorted(SHAPES))
def test_loci_drawn_by_seed_agree_with_the_simulator(shape: str) -> None:
    for seed in range(EACH):
        circuit = drawn(shape, seed + len(shape))
        usual = ambients_of(seed)[1]
        solution = solve(circuit, ambients_of(seed))
        low, high = sorted((solution.locus[0].output_V, solution.locus[-1].output_V))
        most_A = solution.currents[1].most_A or 0.0
        start_V, stop_V = solution.locus[0].output_V, solution.locus[-1].output_V
        _, on = drive_ends(circuit)
        rows = swept(circuit, usual, sweep="output", start_V=start_V, stop_V=stop_V, points=41, output_V=start_V, drive_V=on)
        simulated_A = np.array([current for _, current in rows]) * np.sign(rows[0][1])
        for (output_V, _), current in zip(rows, simulated_A, strict=True):
            if low <= output_V <= high:
                assert locus_current(solution, output_V) == pytest.approx(current, abs=3e-3 * most_A), (
                    shape,
                    seed,
                    output_V,
                )
        assert most_A >= simulated_A.max() * (1.0 - 1e-3)
