"""The limiting loop at the held short: natural frequencies, loop gain, and the worst of both spread and wiring.

The circuit is linearised at the held short with the drive at its on end. The verdict is the least damping among its natural
frequencies, which no break point can hide; the loop gain at the shunt's control terminal stands beside it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from protlint.solve.circuit import Circuit
from protlint.solve.devices import Array
from protlint.solve.expanded import Expanded, expand, split_node
from protlint.solve.gain import Gain, gain_function, read_gain
from protlint.solve.linear import Snapshot, conductance_matrix, store_matrix
from protlint.solve.modes import Complex, damping
from protlint.solve.network import Network, compile_network
from protlint.solve.parameters import CircuitError
from protlint.solve.solution import Loop, Worst
from protlint.solve.stage import Run, Stage, sweep_stage
from protlint.solve.wired import counting, linearise, look, wired_frequencies
from protlint.solve.worst import find_worst, make_scope, opening_scene

USUAL = 1
"""Place of the usual ambient among the three."""

MOST_A = 1e5
"""A drive that puts more into the circuit lies straight on a junction: no model says what happens then."""

WITH_CONTROL = ("npn", "pnp", "nmos", "pmos")


@dataclass(frozen=True, slots=True)
class Held:
    """A stage with its held short at every ambient."""

    stage: Stage
    short: Run


def solve_loop(
    circuit: Circuit, ambients_degC: tuple[float, float, float], *, short: str | None = None, corners: bool = True
) -> Loop | str:
    """Return the loop's answers, or the reason why there are none (missing part data as its keys, joined by ``; ``).

    All but the worst are nominal, at the usual (second) ambient, parts as drawn. ``short`` is the net the output is shorted
    to, by default the one of ``circuit.shorts`` with the greatest holds; without ``corners`` the worst is left out.
    """
    try:
        network = compile_network(circuit)
        expanded = expand(network, output="wired")
        held = hold(network, ambients_degC, short)
        shot = look(expanded, held.short, np.array([USUAL]))
        wired = linearise(expanded, shot)
        s = wired_frequencies(wired, 0.0)[0]
        own = damping(s[counting(wired, 0.0, s[None])[0]]).min(initial=1.0)
        gain = _gain(network, shot, s)
        by_wiring: tuple[Worst, ...] = ()
        if corners:
            scope = make_scope(held.stage, expanded, ambients_degC)
            by_wiring = find_worst(scope, opening_scene(scope, held.short.operating.inner))
    except CircuitError as reason:
        return str(reason)
    worst = min(by_wiring, key=lambda one: one.damping, default=None)
    natural = _natural(s)
    swinging = [one for one in natural if one[1] < 1.0]
    least = min(swinging, key=lambda one: one[1], default=(None, 1.0))
    return Loop(
        least_damping=least[1] if natural else None,
        at_Hz=least[0],
        worst_damping=None if worst is None else worst.damping,
        low_frequency_gain=None if gain is None else gain.low_frequency,
        crossover_Hz=None if gain is None else gain.crossover_Hz,
        phase_margin_deg=None if gain is None else gain.phase_margin_deg,
        own_damping=float(own) if natural else None,
        worst=worst,
        worst_without_wiring=by_wiring[0] if by_wiring else None,
        natural=natural,
        table=() if gain is None else gain.table,
    )


def hold(network: Network, ambients_degC: tuple[float, float, float], short: str | None = None) -> Held:
    """Return a network's stage with its held short.

    Raises
    ------
    CircuitError
        Where no held short is found at the usual ambient, or one with absurd currents.
    """
    reason: CircuitError | None = None
    best: tuple[float, Held] | None = None
    for node in network.circuit.shorts if short is None else (short,):
        try:
            stage, sweep = sweep_stage(network, node, ambients_degC, USUAL, drives=2)
        except CircuitError as error:
            reason = reason or error
            continue
        run = sweep.full_drive(0)
        holds_A = float(run.output_A[USUAL])
        if np.isfinite(holds_A) and (best is None or holds_A > best[0]):
            best = (holds_A, Held(stage, run))
    if best is None:
        raise reason or CircuitError("no operating point was found with the output shorted")
    greatest_A = float(np.abs(best[1].short.operating.known_A[:, USUAL]).max())
    if greatest_A > MOST_A:
        raise CircuitError(f"{network.circuit.drive.key} current")
    return best[1]


def _natural(s: Complex) -> tuple[tuple[float, float], ...]:
    """Return (Hz, damping) of natural frequencies in rad/s, slowest first, a pair once."""
    one_of_each = s[np.isfinite(s) & (s.imag >= 0.0)]
    ordered = one_of_each[np.argsort(np.abs(one_of_each), kind="stable")]
    sizes = np.abs(ordered) / (2.0 * np.pi)
    return tuple(zip(sizes.tolist(), damping(ordered).tolist(), strict=True))


def _gain(network: Network, shot: Snapshot, s: Complex) -> Gain | None:
    """Return the loop gain at the first shunt with a control terminal; None where there is none, or where it is held."""
    circuit = network.circuit
    shunt = next((one for one in circuit.devices if one.name in circuit.shunt and one.kind in WITH_CONTROL), None)
    if shunt is None:
        return None
    cut = expand(network, output="wired", split=shunt.name)
    net, terminal = cut.index(shunt.nodes[1]), cut.index(split_node(shunt.name))
    if net >= cut.unknown:
        return None
    G, c = conductance_matrix(cut, shot)[0], store_matrix(cut, shot)[0]
    return read_gain(gain_function(G, _stores(cut), c, net, terminal), np.abs(s) / (2.0 * np.pi))


def _stores(expanded: Expanded) -> Array:
    return expanded.stores[:, : expanded.unknown]
