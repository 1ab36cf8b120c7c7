"""Limiters that trip and stay: what is solved of them holds against a simulator, and what is not is said."""

from __future__ import annotations

from dataclasses import replace

import pytest

from protlint.pipeline import Review
from protlint.solve.bench import LATCH
from tests.support.desk import found, reviewed, the_one, unchecked
from tests.support.judged import SINK, sink
from tests.support.ngspice import needs_ngspice, swept

LATCHED = SINK.replace(
    "Q2 NPN QSN1 BASE STOP GND", "Q2 NPN QSN1 TAKE STOP GND\nQ3 PNP QSP1 STOP TAKE BASE\nR4 RES 1k BASE TAKE"
)
FIRED = SINK.replace("Q2 NPN QSN1 BASE STOP GND", "Q2 SCR - A=BASE G=STOP K=GND")


def latched(board: str = LATCHED, **needs: str) -> Review:
    job = replace(sink(), board=board)
    return (job.stated(**needs) if needs else job).review()


def test_a_latch_of_two_transistors_is_found_and_solved() -> None:
    one = the_one(latched())
    assert one.limiter.topology == "latched-pair"
    assert one.limiter.elements[LATCH]
    assert one.solution.not_solved is None
    assert any("Q3" in sentence and "latches" in sentence for sentence in one.assumed)


@needs_ngspice
def test_it_trips_below_what_is_held_without_the_latch() -> None:
    """A simulator raises the drive with the whole latch in place: the most it passes is the current at which it trips."""
    one = the_one(latched())
    circuit, row = one.circuit, one.solution.currents[1]
    assert circuit is not None
    assert row.holds_A is not None
    whole = replace(
        circuit,
        devices=tuple(
            replace(device, nodes=("STOP", "TAKE", "BASE")) if device.name == "Q3" else device for device in circuit.devices
        ),
    )
    currents_A = [
        abs(current_A)
        for _, current_A in swept(
            whole, 27.0, sweep="drive", start_V=0.0, stop_V=5.0, points=501, output_V=12.0, drive_V=5.0
        )
    ]
    trips_A = max(currents_A)
    assert currents_A[-1] < 0.25 * trips_A
    assert 0.7 * row.holds_A < trips_A < row.holds_A


def test_what_a_latch_carries_before_it_trips_is_not_called_met() -> None:
    review = latched()
    assert not found(review, "carry-not-met")
    assert any(check == "carry-not-met" and "Q3 trips" in needs for check, needs in unchecked(review))
    assert found(latched(carry="0.4 A"), "carry-not-met")  # even without the latch it would carry less


def test_a_latch_ends_a_short_before_it_heats_anything() -> None:
    assert not found(latched(), "pass-overheated")
    assert not found(latched(), "sense-resistor-power")


def test_a_thyristor_is_found_and_said_not_to_be_modelled() -> None:
    review = latched(FIRED)
    one = the_one(review)
    assert (one.limiter.topology, one.verdict) == ("latched-thyristor", "not judged")
    assert any("Q2" in needs and "not modelled" in needs for _, needs in unchecked(review))


@pytest.mark.parametrize("limits", [None, {}])
def test_a_bare_review_of_a_latch_stops_nowhere(limits: dict[str, str] | None) -> None:
    for board in (LATCHED, FIRED):
        assert reviewed(board, limits).limiters
