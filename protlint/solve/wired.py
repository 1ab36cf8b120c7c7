"""A limiter's linear circuit with wiring to the short, and which of its natural frequencies are the limiter's own.

A mode is the limiter's where taking the shunt's transconductance out, at the same operating point, raises its damping by
more than a quarter of itself, or to where it does not swing at all. A board's output capacitance swings against wiring at
dampings of a thousandth, of which a quarter is nothing anybody could measure: a rise below 0.02, to which dampings agree
with an outside simulator, is none. Which mode has become which is followed while the transconductance shrinks.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from protlint.solve.devices import Array
from protlint.solve.expanded import OUTPUT_CAPACITOR, SHORT, Expanded
from protlint.solve.lanes import parameters, take
from protlint.solve.linear import (
    Snapshot,
    condition,
    conductance_matrix,
    control_rows,
    passive_values,
    snapshot,
    store_matrix,
    transconductance,
    unfold,
)
from protlint.solve.modes import Basis, Complex, Mask, damping, independent, natural_frequencies, partners, port_resistances
from protlint.solve.stage import Run

RAISED_BY = 0.25
LEAST_RISE = 0.02
STILL = 1.0 - 1e-6
"""A damping above is that of a real pole, by its rounding."""

_SHRINKING = (0.4, 0.16, 0.064, 0.025, 0.01, 0.004, 0.0)
"""What is left of the transconductance while modes are followed."""


@dataclass(frozen=True, slots=True)
class Wired:
    """Linearised lanes of a network with a wired output: G, R and c (lanes, ...) and A as in ``protlint.solve.modes``.

    ``source`` are the transconductances of the shunt's devices (sources, lanes), ``output`` and ``control`` the rows
    (sources, unknowns) where their currents flow and what controls them. ``wiring`` and ``capacitor`` are the stores of the
    wiring's inductance and of the board's capacitance behind it; ``bare`` and ``whole`` the bases without and with the two.
    """

    G: Array
    R: Array
    c: Array
    A: Array
    source: Array
    output: Array
    control: Array
    wiring: int
    capacitor: int
    bare: Basis
    whole: Basis

    def pick(self, lanes: NDArray[np.intp]) -> Wired:
        """Return some of the lanes."""
        return replace(self, G=self.G[lanes], R=self.R[lanes], c=self.c[lanes], source=self.source[:, lanes])


def look(expanded: Expanded, run: Run, lanes: NDArray[np.intp], passive: Array | None = None) -> Snapshot:
    """Evaluate a network, expanded with its output wired, at some solved lanes of a run.

    ``passive`` (passive stores, lanes) stands for the nominal values of capacitors and inductors.
    """
    p = take(parameters(expanded.network, run.lanes), lanes)
    voltages = unfold(expanded, run.operating.node_V[:, lanes], run.operating.inner[:, lanes], p)
    at = condition(expanded, p, run.lanes.ambient_K[lanes])
    return snapshot(expanded, at, voltages, passive_values(expanded) if passive is None else passive)


def linearise(expanded: Expanded, shot: Snapshot) -> Wired:
    """Linearise a network, expanded with its output wired."""
    sources = control_rows(expanded, expanded.network.circuit.shunt)
    rows = np.array([[output, control] for _, _, output, control in sources]).reshape(-1, 2, expanded.unknown)
    names = [device.name for device in expanded.passive]
    first = len(expanded.stores) - len(names)
    wiring, capacitor = first + names.index(SHORT), first + names.index(OUTPUT_CAPACITOR)
    G, c, A = conductance_matrix(expanded, shot), store_matrix(expanded, shot), expanded.stores[:, : expanded.unknown]
    holds = (c != 0.0).any(axis=(0, 2))
    holds[[wiring, capacitor]] = False
    bare = independent(A, holds)
    holds[wiring], holds[capacitor] = True, (c[:, capacitor] != 0.0).any()
    return Wired(
        G=G,
        R=port_resistances(G, A),
        c=c,
        A=A,
        source=np.array([transconductance(shot, group, row) for group, row, _, _ in sources]).reshape(-1, len(G)),
        output=rows[:, 0],
        control=rows[:, 1],
        wiring=wiring,
        capacitor=capacitor,
        bare=bare,
        whole=independent(A, holds),
    )


def wired_frequencies(wired: Wired, wiring_H: float) -> Complex:
    """Return the natural frequencies in rad/s (lanes, modes) with an inductance in the short; infinite where left out."""
    return _frequencies(wired, wired.R, wired.c, wiring_H)


def counting(wired: Wired, wiring_H: float, s: Complex) -> Mask:
    """Tell which of the natural frequencies ``s`` (lanes, modes) swing or grow and are the limiter's own."""
    now = damping(s)
    swings = np.isfinite(s) & ((np.abs(s.imag) > 0.0) | (s.real > 0.0))
    asked = np.minimum(now + np.maximum(RAISED_BY * np.abs(now), LEAST_RISE), STILL)
    bare = damping(_frequencies(wired, port_resistances(_left(wired, 0.0), wired.A), wired.c, wiring_H))
    # where nothing at all is damped that little without the shunt, there is nothing to follow
    counts: Mask = swings & (bare.min(axis=1, initial=1.0)[:, None] > asked)
    open_lanes = np.flatnonzero((swings & ~counts).any(axis=1))
    if len(open_lanes):
        became = _followed(wired.pick(open_lanes), wiring_H, s[open_lanes])
        counts[open_lanes] |= swings[open_lanes] & (damping(became) > asked[open_lanes])
    return counts


def _followed(wired: Wired, wiring_H: float, s: Complex) -> Complex:
    """Return what each mode (lanes, modes) has become when the transconductance is gone."""
    became = s
    for share in _SHRINKING:
        now = _frequencies(wired, port_resistances(_left(wired, share), wired.A), wired.c, wiring_H)
        became = np.take_along_axis(now, partners(became, now), axis=1)
    return became


def _left(wired: Wired, share: float) -> Array:
    """Return G (lanes, unknowns, unknowns) with a share of the transconductance left."""
    gone: Array = np.einsum("sl,si,sj->lij", (1.0 - share) * wired.source, wired.output, wired.control)
    return wired.G - gone


def _frequencies(wired: Wired, R: Array, c: Array, wiring_H: float) -> Complex:
    if wiring_H == 0.0:
        return natural_frequencies(R, c, wired.bare)
    c = c.copy()
    c[:, wired.wiring, wired.wiring] = -wiring_H
    return natural_frequencies(R, c, wired.whole)
