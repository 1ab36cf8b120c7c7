"""Advice holds: the advised part reaches the aim, the next smaller value does not, at any of the usual places."""

from __future__ import annotations

from dataclasses import replace

import pytest

from protlint.quantities import preferred
from protlint.solve import advice as advice_module
from protlint.solve.advice import (
    AIM,
    BASE_EMITTER,
    COLLECTOR_BASE,
    COSTS,
    DRIVE_FAR,
    Advice,
    advise,
    base_stop,
    fitted,
    places,
)
from protlint.solve.circuit import Circuit, Device
from protlint.solve.loop import solve_loop
from protlint.solve.solution import Loop
from tests.support.circuits import bench_circuit
from tests.support.dynamics import bench_case, shunt_of

AMBIENTS = (-10.0, 27.0, 85.0)
RINGING = [
    ("sink", "as drawn"),
    ("follower", "100 nF base to emitter of the shunt"),
    ("source_pnp", "1 nF collector to base of the shunt"),
    ("darlington_follower", "as drawn"),
    ("darlington_follower", "100 nF base to emitter of the shunt"),
]


def advised(circuit: Circuit, *, delay: bool = False) -> Advice:
    advice = advise(circuit, AMBIENTS, delay=delay)
    assert isinstance(advice, Advice), advice
    return advice


def judged(circuit: Circuit) -> float:
    loop = solve_loop(circuit, AMBIENTS)
    assert isinstance(loop, Loop), loop
    assert loop.worst_damping is not None
    return loop.worst_damping


@pytest.mark.parametrize(("name", "case"), RINGING)
def test_the_advised_capacitor_does_and_the_next_smaller_does_not(name: str, case: str) -> None:
    circuit = bench_case(name, case)
    advice = advised(circuit)
    assert not advice.enough
    fit = advice.fits[0]
    assert fit.farad is not None
    mended = judged(fitted(circuit, fit))
    assert mended >= AIM
    assert mended == pytest.approx(fit.worst_damping, abs=1e-6)
    smaller = preferred(0.99 * fit.farad, "E6", "down")
    assert smaller < fit.farad
    for nodes in places(circuit).values():
        assert judged(fitted(circuit, replace(fit, nodes=nodes, farad=smaller))) < AIM


def test_what_each_part_does_is_what_taking_it_out_does() -> None:
    circuit = bench_case("darlington_follower", "100 nF base to emitter of the shunt")
    advice = advised(circuit)
    by_part = {effect.part: effect for effect in advice.effects}
    assert set(by_part) == {"C99", "R33"}
    assert by_part["R33"].base_stop
    # source: fixtures/bench-circuits.json, the same stage as drawn
    assert by_part["C99"].own_damping == pytest.approx(0.2248, abs=1e-3)
    assert advice.costs == "C99"


def test_a_divider_s_leg_is_not_blamed_for_the_damping() -> None:
    """Bridging it calms the loop and gives another limit: it is no part to do without."""
    circuit = bench_circuit("darlington_follower")
    _, base, emitter = shunt_of(circuit).nodes
    (stop,) = [one for one in circuit.devices if one is base_stop(circuit)]
    high = replace(stop, model={**stop.model, "R": 1e3})
    ringing = replace(circuit, devices=tuple(high if one is stop else one for one in circuit.devices))
    alone = advised(ringing)
    assert alone.costs == stop.name
    divided = replace(ringing, devices=(*ringing.devices, Device("LEG", "resistor", (base, emitter), {"R": 1e6})))
    found = advised(divided)
    assert found.costs is None
    assert [one.part for one in found.effects] == [stop.name]
    assert found.effects[0].worst_damping > found.worst_damping + COSTS


def test_the_second_way_does_without_the_capacitor_that_costs_the_most() -> None:
    circuit = bench_case("darlington_follower", "100 nF base to emitter of the shunt")
    beside, instead = advised(circuit).fits
    assert beside.instead_of is None
    assert instead.instead_of == "C99"
    assert instead.farad is not None
    assert judged(fitted(circuit, instead)) >= AIM
    # where nothing else has to be fitted, nothing is
    follower = bench_case("follower", "100 nF base to emitter of the shunt")
    _, bare = advised(follower).fits
    assert (bare.farad, bare.instead_of) == (None, "C99")
    assert judged(fitted(follower, bare)) >= AIM


def test_a_well_damped_loop_needs_nothing() -> None:
    advice = advised(bench_circuit("follower"))
    assert advice.enough
    assert not advice.fits
    assert advice.costs is None


def test_the_delay_before_and_after_is_told() -> None:
    advice = advised(bench_case("follower", "100 nF base to emitter of the shunt"), delay=True)
    assert advice.step is not None
    assert advice.step.delay_s == pytest.approx(3.828e-5, rel=0.01)
    assert [fit.step is not None and fit.step.settles for fit in advice.fits] == [True, True]


def test_none_of_the_usual_places_does_where_the_values_run_out(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(advice_module, "GREATEST_F", 22e-12)
    advice = advised(bench_circuit("darlington_follower"))
    assert not advice.enough
    assert not advice.fits


def test_a_resonance_that_is_not_the_limiter_s_asks_for_nothing() -> None:
    """1 uH and 100 pF at a held output ring without any damping, and nothing at the shunt could change that."""
    circuit = bench_circuit("follower")
    tank = (
        Device("L1", "inductor", ("OUT", "TANK"), {"L": 1e-6}),
        Device("C1", "capacitor", ("TANK", "GND"), {"C": 1e-10}),
    )
    rings = replace(circuit, devices=(*circuit.devices, *tank))
    loop = solve_loop(rings, AMBIENTS)
    assert isinstance(loop, Loop)
    assert loop.least_damping == pytest.approx(0.0, abs=1e-6)
    assert loop.own_damping == 1.0
    assert advised(rings).enough


def test_the_usual_places_follow_the_shunt_and_the_steering_diode() -> None:
    circuit = bench_circuit("follower")
    collector, base, emitter = shunt_of(circuit).nodes
    assert places(circuit) == {
        COLLECTOR_BASE: (collector, base),
        DRIVE_FAR: (collector, emitter),
        BASE_EMITTER: (base, emitter),
    }
    shunt = shunt_of(circuit)
    steered = tuple(replace(one, nodes=("STEER", *one.nodes[1:])) if one is shunt else one for one in circuit.devices)
    diode = Device("D1", "diode", (collector, "STEER"), {"IS": 1e-14, "CJO": 4e-12})
    found = places(replace(circuit, devices=(*steered, diode)))
    assert found[COLLECTOR_BASE] == ("STEER", base)
    assert found[DRIVE_FAR] == (collector, emitter)
    stop = base_stop(circuit)
    assert stop is not None
    assert stop.name == "R12"


def test_a_diode_string_has_one_place_only() -> None:
    circuit = bench_circuit("follower")
    shunt = shunt_of(circuit)
    string = tuple(one for one in circuit.devices if one is not shunt)
    diodes = (
        Device("D1", "diode", ("BASE", "MID"), {"IS": 1e-14, "CJO": 4e-12}),
        Device("D2", "diode", ("MID", "OUT"), {"IS": 1e-14, "CJO": 4e-12}),
    )
    found = replace(circuit, devices=(*string, *diodes), shunt=("D1", "D2"))
    assert set(places(found)) == {DRIVE_FAR}
    assert base_stop(found) is None
    assert isinstance(advise(found, AMBIENTS, delay=False), Advice)


def test_missing_dynamic_data_is_the_reason() -> None:
    reason = advise(bench_circuit("nmos_sink"), AMBIENTS)
    assert isinstance(reason, str)
    assert "Q40.model.CGS or Q40.ratings.ciss" in reason


def test_a_tolerance_of_a_capacitor_on_the_board_counts() -> None:
    circuit = bench_case("follower", "100 nF base to emitter of the shunt")
    loose = replace(
        circuit,
        devices=tuple(replace(one, tolerance=0.2) if one.kind == "capacitor" else one for one in circuit.devices),
    )
    assert judged(loose) < judged(circuit)
