"""The formula beside the solved circuit, and which of its assumptions fails."""

from __future__ import annotations

from dataclasses import replace

import pytest

from protlint.solve import comparison
from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit
from protlint.solve.comparison import Comparison, compare_formula
from tests.support.circuits import bench_circuit, load_bench
from tests.support.ideal import ideal_bipolar, ideal_follower, resistor
from tests.support.shapes import SHAPES, drawn

AMBIENTS = (-10.0, 27.0, 85.0)

FORMS = {
    "foldback": "foldback",
    "preset": "preset",
    "slope": "slope",
    "diode string": "diode string",
}


def compared(circuit: Circuit) -> Comparison:
    found = compare_formula(circuit, solve(circuit, AMBIENTS))
    assert found is not None
    return found


@pytest.mark.parametrize("name", sorted(load_bench()["circuits"]))
def test_a_formula_with_every_assumption_put_right_is_what_was_solved(name: str) -> None:
    found = compared(bench_circuit(name))
    assert found.name == ("foldback" if name == "foldback" else "plain")
    assert found.put_right_A == pytest.approx(found.solved_A, rel=1e-6)
    assert found.difference > 0.05
    assert found.fails


@pytest.mark.parametrize("shape", sorted(SHAPES))
def test_every_shape_has_its_formula_and_is_explained(shape: str) -> None:
    for seed in (60, 61):
        found = compared(drawn(shape, seed))
        assert found.name == FORMS.get(shape, "plain")
        assert found.put_right_A == pytest.approx(found.solved_A, rel=1e-6)
        if abs(found.difference) > comparison.LARGEST_DIFFERENCE:
            assert found.fails
            explained = [abs(one.explains) for one in found.fails if one.assumption != comparison.DRIVE]
            assert explained == sorted(explained, reverse=True)
        else:
            assert not found.fails


def test_a_circuit_that_meets_every_assumption_agrees_with_its_formula() -> None:
    found = compared(ideal_follower(ideal_bipolar(0.6, 1e-4), 2.0, 1e-4))
    assert found.figure_A == pytest.approx(0.3)
    assert found.difference == pytest.approx(0.0, abs=2e-3)
    assert not found.fails


def first_failing(circuit: Circuit) -> str:
    return compared(circuit).fails[0].assumption


def test_the_assumption_that_was_broken_is_the_one_that_fails() -> None:
    """Ideal circuits with one assumption broken each."""
    shunt = ideal_bipolar(0.6, 1e-4)
    assert first_failing(ideal_follower(ideal_bipolar(0.7, 1e-4), 2.0, 1e-4)) == comparison.BASE_EMITTER
    hungry = ideal_bipolar(0.6, 1e-4, B_F=20.0)
    stopped = (resistor("RB", "SNS", "B", 20e3),)
    assert first_failing(ideal_follower(hungry, 2.0, 1e-4, base="B", more=stopped)) == comparison.BASE_CURRENT
    beside = (resistor("RX", "SUP", "OUT", 100.0),)
    assert first_failing(ideal_follower(shunt, 2.0, 1e-4, more=beside)) == comparison.SENSE_CURRENT
    weak = ideal_follower(shunt, 2.0, 1e-4)
    weak = replace(
        weak,
        devices=tuple(
            replace(device, model={"IS": 1e-12, "BF": 500.0}) if device.name == "QP" else device for device in weak.devices
        ),
    )
    assert first_failing(weak) == comparison.DRIVE


def test_a_formula_goes_by_the_mirror_too() -> None:
    ours, twin = compared(drawn("foldback", 70)), compared(drawn("foldback", 71))
    assert ours.name == twin.name == "foldback"
    assert set(ours.inputs) == {"V_BE", "R_S", "R_1", "R_2"}


def test_nothing_is_compared_where_no_formula_fits_or_nothing_was_solved() -> None:
    circuit = bench_circuit("sink")
    solution = solve(circuit, AMBIENTS)
    assert compare_formula(replace(circuit, shunt=()), solution) is None
    assert compare_formula(replace(circuit, shorts=()), solve(replace(circuit, shorts=()), AMBIENTS)) is None
