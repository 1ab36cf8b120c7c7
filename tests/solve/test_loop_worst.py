"""The worst of corners, ambients and fault wiring: against samples, and whose modes count."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from protlint.solve.circuit import Circuit, Device
from protlint.solve.expanded import expand
from protlint.solve.loop import hold, solve_loop
from protlint.solve.modes import damping
from protlint.solve.network import compile_network
from protlint.solve.solution import Loop
from protlint.solve.wired import LEAST_RISE, counting, linearise, look, wired_frequencies
from protlint.solve.worst import WIRING_H
from tests.support.circuits import bench_circuit
from tests.support.dynamics import MOVING, bench_case, bench_cases

AMBIENTS = (-10.0, 27.0, 85.0)
SAMPLES = 12


def solved(circuit: Circuit) -> Loop:
    loop = solve_loop(circuit, AMBIENTS)
    assert isinstance(loop, Loop), loop
    return loop


def moved(circuit: Circuit, rng: np.random.Generator) -> Circuit:
    """The circuit with every part somewhere inside its spread, as nominal parts of their own."""
    devices = []
    for device in circuit.devices:
        model = dict(device.model)
        if device.kind == "resistor":
            model["R"] *= 1.0 + device.tolerance * rng.uniform(-1.0, 1.0)
        elif device.kind == "capacitor":
            model["C"] *= 1.0 + device.tolerance * rng.uniform(-1.0, 1.0)
        elif device.hfe is not None:
            model["BF"] = float(rng.uniform(*device.hfe))
            # V_BE at 27 degC: I_S exp(-dV / V_T)
            model["IS"] *= float(np.exp(-rng.uniform(-1.0, 1.0) * device.vbe_spread_V[0] / 0.025865))
        devices.append(replace(device, model=model, tolerance=0.0, hfe=None, vbe_spread_V=(0.0, 0.0)))
    return replace(circuit, devices=tuple(devices))


def test_an_inductor_of_the_board_s_behind_the_output_is_one_more_inductance_in_the_short() -> None:
    bare = bench_circuit("source_pnp")
    own = {1e-6: 0.0, 200e-6: 0.0}
    for inductance_H in own:
        with_own = solved(replace(bare, output_inductance_H=inductance_H))
        # the same inductance as a part of the circuit, with the short behind it and no wiring besides
        behind = replace(
            bare,
            devices=(*bare.devices, Device("L9", "inductor", (bare.output, "BEHIND"), {"L": inductance_H})),
            output="BEHIND",
        )
        alone = solved(behind).worst_without_wiring
        assert alone is not None
        assert with_own.worst_damping is not None
        usual = solved(bare).worst_damping
        assert usual is not None
        assert with_own.worst_damping == pytest.approx(min(usual, alone.damping), abs=5e-3)
        own[inductance_H] = usual - with_own.worst_damping
    assert max(own.values()) > 0.0


@pytest.mark.parametrize("name", MOVING)
def test_circuits_within_their_spread_are_no_worse_than_the_worst(name: str) -> None:
    """At 27 degC, where a moved I_S is exactly a moved V_BE, and B_F exactly its bound."""
    rng = np.random.default_rng(7)
    circuit = bench_case(name, "100 nF base to emitter of the shunt")
    circuit = replace(
        circuit,
        devices=tuple(
            replace(device, tolerance=0.1) if device.kind == "capacitor" else device for device in circuit.devices
        ),
    )
    here = (27.0, 27.0, 27.0)
    worst = solve_loop(circuit, here)
    assert isinstance(worst, Loop), worst
    assert worst.worst_damping is not None
    sampled = [solve_loop(moved(circuit, rng), here) for _ in range(SAMPLES)]
    dampings = [loop.worst_damping for loop in sampled if isinstance(loop, Loop) and loop.worst_damping is not None]
    assert len(dampings) == SAMPLES
    assert min(dampings) > worst.worst_damping - 2e-3


@pytest.mark.parametrize(("name", "case", "figures"), bench_cases("loop"))
def test_the_worst_lies_where_it_says_it_does(name: str, case: str, figures: dict[str, float]) -> None:
    """Built again as a nominal circuit of those very parts, at that ambient, with that wiring, it has that damping."""
    circuit = bench_case(name, case)
    loop = solved(circuit)
    worst = loop.worst
    assert worst is not None
    assert worst.damping == loop.worst_damping
    assert loop.least_damping is not None
    assert worst.damping <= loop.least_damping + 1e-9 or loop.least_damping > 0.75
    if worst.ambient_degC is None or worst.wiring_H is None:
        assert worst.damping == 1.0
        return
    V_T = 8.617333e-5 * (worst.ambient_degC + 273.15)
    devices = []
    for device in circuit.devices:
        model = dict(device.model)
        at = {key.rpartition(".")[2]: value for key, value in worst.corner.items() if key.startswith(f"{device.name}.")}
        if "R" in at:
            model["R"] *= 1.0 + device.tolerance * at["R"]
        if "V_BE" in at:
            model["IS"] *= float(np.exp(-at["V_BE"] * device.vbe_spread_V[1] / V_T))
        if "B_F" in at and device.hfe is not None:
            model |= {"BF": device.hfe[int(at["B_F"] > 0.0)], "XTB": 0.0}
            # with XTB at zero the leakages lose the factor they had from it
            factor = ((worst.ambient_degC + 273.15) / 300.15) ** device.model["XTB"]
            model["ISE"] /= factor
            model["BR"] *= factor
        devices.append(replace(device, model=model))
    network = compile_network(replace(circuit, devices=tuple(devices)))
    expanded = expand(network, output="wired")
    wired = linearise(expanded, look(expanded, hold(network, (worst.ambient_degC,) * 3).short, np.array([1])))
    s = wired_frequencies(wired, worst.wiring_H)[0]
    assert worst.at_Hz is not None
    nearest = int(np.argmin(np.abs(np.abs(s[np.isfinite(s)]) / (2.0 * np.pi) - worst.at_Hz)))
    assert damping(s)[np.isfinite(s)][nearest] == pytest.approx(worst.damping, abs=1e-3)


def at_wiring(circuit: Circuit, wiring_H: float) -> tuple[np.ndarray, np.ndarray]:
    """Dampings that count, and those that do not, of modes that swing."""
    network = compile_network(circuit)
    expanded = expand(network, output="wired")
    wired = linearise(expanded, look(expanded, hold(network, AMBIENTS).short, np.array([1])))
    s = wired_frequencies(wired, wiring_H)
    counts = counting(wired, wiring_H, s)[0]
    swings = np.isfinite(s[0]) & (s[0].imag > 0.0)
    return damping(s)[0][swings & counts], damping(s)[0][swings & ~counts]


def test_the_wiring_s_own_mode_does_not_count() -> None:
    """0.2 at 20 MHz with 0.5 uH, shunt or no shunt."""
    own, foreign = at_wiring(bench_circuit("sink"), 0.5e-6)
    assert own == pytest.approx([0.743], abs=0.01)
    assert foreign == pytest.approx([0.208], abs=0.01)


@pytest.mark.parametrize("wiring_H", WIRING_H[1:])
@pytest.mark.parametrize("farad", [1e-6, 1e-5, 1e-4])
def test_output_capacitors_ring_against_a_sink_s_wiring_with_or_without_its_shunt(farad: float, wiring_H: float) -> None:
    """A collector damps next to nothing, limited or not: dampings of a thousandth and less are not the limiter's."""
    circuit = replace(bench_circuit("sink"), output_capacitance_F=farad)
    own, foreign = at_wiring(circuit, wiring_H)
    assert own == pytest.approx([0.758], abs=0.01)
    assert (foreign < 1e-3).all()
    assert len(foreign) == 1
    loop = solved(circuit)
    assert loop.worst_damping is not None
    assert loop.worst_damping > 0.5


@pytest.mark.parametrize("wiring_H", WIRING_H[1:])
@pytest.mark.parametrize("farad", [1e-6, 1e-5, 1e-4])
def test_output_capacitors_ring_more_against_a_follower_s_wiring_when_it_limits(farad: float, wiring_H: float) -> None:
    """A tank beside a resistance R has the damping sqrt(L / C) / 2 R; the loop gain T makes R of a follower (1 + T) times
    as large. So taking the shunt out raises the damping by T times itself: the mode counts where that is more than 0.02.

    Source of T: fixtures/bench-circuits.json, 5.3371.
    """
    own, foreign = at_wiring(replace(bench_circuit("follower"), output_capacitance_F=farad), wiring_H)
    (ringing,) = (*own, *foreign)
    assert ringing / np.sqrt(wiring_H / farad) == pytest.approx(0.0044, rel=0.1)
    rises = 5.3371 * ringing
    assert (len(own) == 1) == (rises > LEAST_RISE), (rises, own, foreign)


def test_without_wiring_every_ringing_mode_of_the_bench_counts() -> None:
    own, foreign = at_wiring(bench_case("darlington_follower", "100 nF base to emitter of the shunt"), 0.0)
    assert own == pytest.approx([-0.2027], abs=1e-3)
    assert not len(foreign)
