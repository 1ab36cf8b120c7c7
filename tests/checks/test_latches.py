"""Limiters that trip and stay: where they trip and what they pass afterwards hold against a simulator."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from protlint.pipeline import Review
from protlint.report.behaviour import sentences
from protlint.report.document import document
from protlint.solve.answers import solve
from protlint.solve.bench import LATCH
from protlint.solve.circuit import Circuit
from protlint.solve.thyristor import two_transistors
from tests.support.desk import found, reviewed, the_one, unchecked
from tests.support.judged import SINK, sink
from tests.support.ngspice import needs_ngspice, swept

LATCHED = SINK.replace(
    "Q2 NPN QSN1 BASE STOP GND", "Q2 NPN QSN1 TAKE STOP GND\nQ3 PNP QSP1 STOP TAKE BASE\nR4 RES 1k BASE TAKE"
)
FIRED = SINK.replace("Q2 NPN QSN1 BASE STOP GND", "Q2 SCR MCR100-6 A=BASE G=STOP K=GND")
WEAK = FIRED.replace("R1 RES 390", "R1 RES 1k")
"""A drive too weak to keep the thyristor on past the 100 ohm at its gate."""


def latched(board: str = LATCHED, **needs: str) -> Review:
    job = replace(sink(), board=board)
    return (job.stated(**needs) if needs else job).review()


def circuit_of(review: Review) -> Circuit:
    circuit = the_one(review).circuit
    assert circuit is not None
    return circuit


def simulated(circuit: Circuit, ambient_degC: float) -> tuple[float, float]:
    """Return the most that passes into the load's supply as a simulator raises the drive, and what passes at its end."""
    rows = swept(circuit, ambient_degC, sweep="drive", start_V=0.0, stop_V=5.0, points=2001, output_V=12.0, drive_V=5.0)
    currents_A = [abs(current_A) for _, current_A in rows]
    return max(currents_A), currents_A[-1]


@pytest.mark.parametrize(("board", "latch"), [(LATCHED, "Q3"), (FIRED, "Q2 anode")], ids=["pair", "thyristor"])
def test_a_latch_is_found_and_solved(board: str, latch: str) -> None:
    one = the_one(latched(board))
    assert (one.solution.not_solved, circuit_of(latched(board)).latch) == (None, (latch,))
    assert one.limiter.topology == ("latched-pair" if one.limiter.elements.get(LATCH) else "latched-thyristor")
    assert not one.assumed


@needs_ngspice
@pytest.mark.parametrize("board", [LATCHED, FIRED], ids=["pair", "thyristor"])
def test_it_trips_and_passes_on_what_a_simulator_says(board: str) -> None:
    """The drive raised with the whole latch in place: the most it passes is where it trips."""
    one = the_one(latched(board))
    for row in one.solution.currents:
        trips_A, after_A = simulated(circuit_of(latched(board)), row.ambient_degC)
        assert row.begins_A == pytest.approx(trips_A, rel=1e-2)
        assert row.holds_A == pytest.approx(after_A, rel=2e-3)
        assert after_A < 0.5 * trips_A


@needs_ngspice
def test_a_drive_that_does_not_keep_it_on_is_told() -> None:
    one = the_one(latched(WEAK))
    row = one.solution.currents[1]
    most_A, after_A = simulated(circuit_of(latched(WEAK)), 27.0)
    assert (row.begins_A, row.holds_A) == (None, pytest.approx(after_A, rel=2e-3))
    assert after_A > 0.5 * most_A
    assert any(check == "begins" and "the latch trip" in needs for check, needs in unchecked(latched(WEAK)))


@pytest.mark.parametrize("board", [LATCHED, FIRED], ids=["pair", "thyristor"])
def test_its_figures_belong_together(board: str) -> None:
    """It carries what it passes before it trips, most is the same, and afterwards it holds less; every range holds
    a sample of corners."""
    review = latched(board)
    one, circuit = the_one(review), circuit_of(review)
    rng = np.random.default_rng(7)
    for row in one.solution.currents:
        assert row.begins_A is not None
        assert row.holds_A is not None
        assert row.carries_A == pytest.approx(row.begins_A, rel=0.02)
        assert row.holds_A < 0.5 * row.begins_A <= 0.5 * (row.most_A or 0.0) * (1.0 + 1e-9)
    low_A, high_A = one.solution.currents[1].begins_range_A or (math.nan, math.nan)
    for _ in range(3):
        sample = solve(moved(circuit, rng), (-10.0, 27.0, 70.0)).currents[1].begins_A
        assert sample is not None
        assert low_A <= sample <= high_A


def moved(circuit: Circuit, rng: np.random.Generator) -> Circuit:
    """Return the circuit with every resistance somewhere within its tolerance."""
    devices = tuple(
        replace(one, model={**one.model, "R": one.model["R"] * (1.0 + one.tolerance * rng.uniform(-1.0, 1.0))})
        if one.kind == "resistor"
        else one
        for one in circuit.devices
    )
    return replace(circuit, devices=devices)


def test_what_it_trips_at_is_held_against_what_the_board_needs() -> None:
    """It passes 0.28 A before it trips, 0.06 A afterwards."""
    assert not found(latched(carry="0.2 A"), "carry-not-met")
    assert found(latched(carry="0.27 A"), "carry-not-met")
    assert found(latched(cap="0.25 A"), "cap-exceeded")


def test_a_short_heats_with_what_passes_after_it_has_tripped() -> None:
    assert not found(latched(), "pass-overheated")
    assert not found(latched(), "sense-resistor-power")


def test_the_text_tells_that_it_trips() -> None:
    review = latched()
    (limiter,) = document(review)["limiters"]
    assert any("it trips at" in sentence and "then passes" in sentence for sentence in sentences(limiter))


def test_a_thyristor_without_its_figures_is_not_judged_and_they_are_named() -> None:
    review = latched(FIRED.replace("MCR100-6", "SCR-9"))
    one = the_one(review)
    assert one.limiter.topology == "latched-thyristor"
    assert one.solution.not_solved is not None
    assert any("SCR-9.ratings.igt, SCR-9.ratings.vgt, SCR-9.ratings.ih" in needs for _, needs in unchecked(review))


def test_the_pair_fires_at_the_data_sheet_s_gate_current() -> None:
    """What keeps the gate at v, v / R_G - (b_p - 1/b_n) I_S exp(v / V_T), is greatest at V_GT and I_GT there (25 degC): the
    condition of Ebers (1952) that the pair's gain reaches one, with the gate's resistance beside it."""
    pair = two_transistors({"igt": 2e-3, "vgt": 0.7, "ih": 1e-2})
    V_T = 8.617333262e-5 * 298.15
    at_25 = math.exp(-(0.7 / V_T)) * V_T / ((pair.pnp["BF"] - 1.0 / pair.npn["BF"]) * pair.gate_ohm)
    volts = np.linspace(0.4, 0.8, 4001)
    taken_A = volts / pair.gate_ohm - (pair.pnp["BF"] - 1.0 / pair.npn["BF"]) * at_25 * np.exp(volts / V_T)
    assert volts[np.argmax(taken_A)] == pytest.approx(0.7, abs=2e-4)
    assert taken_A.max() == pytest.approx(2e-3, rel=1e-4)
    assert pair.npn["IS"] == pytest.approx(at_25, rel=0.6)  # two kelvin further on at 27 degC
    alpha = pair.pnp["BF"] / (1.0 + pair.pnp["BF"])
    assert 0.7 / pair.gate_ohm / (alpha - (1.0 - alpha) / pair.npn["BF"]) == pytest.approx(1e-2, rel=1e-6)


@pytest.mark.parametrize("limits", [None, {}])
def test_a_bare_review_of_a_latch_stops_nowhere(limits: dict[str, str] | None) -> None:
    for board in (LATCHED, FIRED):
        assert reviewed(board, limits).limiters
