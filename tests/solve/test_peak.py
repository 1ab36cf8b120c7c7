"""How long a limiter bears a peak: what it carries for ever, what capacitors buy, and what the drive cannot give."""

from __future__ import annotations

import math

import numpy as np
import pytest

from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit
from protlint.solve.delay import rc_delay
from protlint.solve.peak import RISE_SHARE, ride_through
from tests.support.circuits import bench_circuit
from tests.support.dynamics import bench_case, shunt_of, with_capacitor

AMBIENTS = (-10.0, 27.0, 85.0)


def borne(circuit: Circuit, peak_A: float, lasts_s: float, *, before_A: float = 0.2, output_V: float | None = None) -> float:
    found = ride_through(circuit, AMBIENTS, peak_A=peak_A, lasts_s=lasts_s, before_A=before_A, output_V=output_V)
    assert isinstance(found, float), found
    return found


def test_what_is_carried_for_ever_is_borne_to_the_end() -> None:
    circuit = bench_circuit("sink")
    carries_A = solve(circuit, AMBIENTS).currents[1].carries_A
    assert carries_A is not None
    assert borne(circuit, 0.98 * carries_A, 1e-3) == math.inf
    assert borne(circuit, 1.1 * carries_A, 1e-3) < 1e-3


def test_the_output_gives_way_when_the_load_has_risen_to_what_the_locus_has_at_that_voltage() -> None:
    """A rise slow against the loop: it goes along the locus."""
    circuit = bench_circuit("sink")
    solution = solve(circuit, AMBIENTS)
    at_2_V = float(
        np.interp(2.0, [one.output_V for one in solution.locus[::-1]], [one.output_A for one in solution.locus[::-1]])
    )
    peak_A, lasts_s = 0.6, 0.1
    expected_s = RISE_SHARE * lasts_s * (at_2_V - 0.2) / (peak_A - 0.2)
    assert borne(circuit, peak_A, lasts_s, output_V=2.0) == pytest.approx(expected_s, rel=5e-3)


def test_a_capacitor_at_the_base_buys_time_about_as_the_rc_formula_says() -> None:
    """1 kohm and 2.2 uF at the base; V_BE 0.70 V at holds (0.74 V less the drop in the stop); a plausibility."""
    circuit = bench_circuit("sink")
    _, base, emitter = shunt_of(circuit).nodes
    slow = with_capacitor(circuit, (base, emitter), 2.2e-6)
    peak_A = 0.45
    by_hand_s = rc_delay(1e3, 2.2e-6, 0.2 * 2.0 / 0.70, peak_A * 2.0 / 0.70)
    found_s = borne(slow, peak_A, 20e-3, output_V=2.0) - RISE_SHARE * 20e-3
    assert found_s == pytest.approx(by_hand_s, rel=0.6)
    assert borne(circuit, peak_A, 20e-3, output_V=2.0) < RISE_SHARE * 20e-3
    longer = borne(with_capacitor(circuit, (base, emitter), 10e-6), peak_A, 20e-3, output_V=2.0)
    assert longer > borne(slow, peak_A, 20e-3, output_V=2.0)


def test_more_than_the_stage_can_give_before_the_peak_is_not_borne_at_all() -> None:
    assert borne(bench_circuit("follower"), 1.0, 1e-3, before_A=0.9, output_V=20.0) == 0.0


def test_a_mirror_stage_bears_a_peak_as_well() -> None:
    circuit = bench_case("source_pnp", "1 uF base to emitter of the shunt")
    plain = bench_circuit("source_pnp")
    assert borne(circuit, 0.52, 1e-3) > borne(plain, 0.52, 1e-3)
    assert borne(plain, 0.3, 1e-3) == math.inf


def test_missing_dynamic_data_is_the_reason() -> None:
    found = ride_through(bench_circuit("nmos_sink"), AMBIENTS, peak_A=1.0, lasts_s=1e-3)
    assert isinstance(found, str)
    assert "Q40.model.CGS" in found
