"""Natural frequencies of linear circuits, their damping, and how they move when something is taken out.

The natural frequencies of (G + s C) x = 0 with C = A^T c A are s = -1/m for the eigenvalues m other than zero of R c, where
R = A G^-1 A^T are the resistances between the stores' ports: the generalised eigenvalue problem turned round, which needs no
inverse of C, singular in nearly every circuit. Stores that hold nothing, and stores whose voltages follow from others
(capacitors in a loop), are taken out first, so that no eigenvalue is zero for the structure's sake.

A mode's damping is -Re(s) / |s|: 1 where it does not swing, 0 where it swings on, below 0 where it grows.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve.devices import Array

Complex = NDArray[np.complex128]
Mask = NDArray[np.bool_]

GREATEST_HZ = 1e10
"""Natural frequencies above are left out: neither device models nor a netlist know anything of what happens there."""

_OTHER_HALF = 1e-6
"""Keeps the two modes of a pair apart, which lie in one place once the plane is folded."""


@dataclass(frozen=True, slots=True)
class Basis:
    """Independent stores, by their places among all, and how all stores' voltages follow from theirs (all, independent)."""

    chosen: tuple[int, ...]
    follow: Array


def port_resistances(G: Array, A: Array) -> Array:
    """Return R = A G^-1 A^T (lanes, stores, stores) from G (lanes, unknowns, unknowns) and A (stores, unknowns)."""
    through = np.linalg.solve(G, np.broadcast_to(A.T, (len(G), *A.T.shape)))
    resistances: Array = A @ through
    return resistances


def independent(A: Array, holds: Mask) -> Basis:
    """Find independent stores among those that hold anything at all (stores,); A is (stores, unknowns)."""
    chosen: list[int] = []
    for row in np.flatnonzero(holds).tolist():
        if np.linalg.matrix_rank(A[[*chosen, row]]) > len(chosen):
            chosen.append(row)
    follow = np.zeros((len(A), len(chosen)))
    if chosen:
        follow[holds] = np.linalg.lstsq(A[chosen].T, A[holds].T, rcond=None)[0].T.round(9)
    return Basis(tuple(chosen), follow)


def natural_frequencies(R: Array, c: Array, basis: Basis) -> Complex:
    """Return the natural frequencies in rad/s (lanes, independent stores); infinite for those left out.

    ``R`` and ``c`` are (lanes, stores, stores).
    """
    places = list(basis.chosen)
    m = np.linalg.eigvals(R[:, places][:, :, places] @ (basis.follow.T @ c @ basis.follow)).astype(np.complex128)
    known = np.abs(m) > 1.0 / (2.0 * np.pi * GREATEST_HZ)
    return np.where(known, -1.0 / np.where(known, m, 1.0), np.inf)


def damping(s: Complex) -> Array:
    """Return the damping -Re(s) / |s| of natural frequencies in rad/s, any shape; 1 for those left out."""
    size = np.abs(s)
    known = np.isfinite(size)
    ratio: Array = np.where(known, -s.real / np.where(known, size, 1.0), 1.0)
    return ratio


def margin(s: Complex) -> Array:
    """Return how far lanes (lanes, modes) are from swinging: the least damping, going on above 1 where nothing swings.

    A pair of real poles a, b next to each other counts as (a + b) / (2 sqrt(a b)), which is what its damping would be.
    """
    alone = np.isfinite(s) & (np.abs(s.imag) < 1e-9 * np.abs(s))
    rates = np.sort(np.where(alone & (s.real < 0.0), np.abs(s), np.inf), axis=1)
    paired = np.isfinite(rates[:, 1:])
    ratio = np.where(paired, rates[:, 1:], 1.0) / np.where(paired, rates[:, :-1], 1.0)
    pairs = np.where(paired, 0.5 * (1.0 + ratio) / np.sqrt(ratio), np.inf).min(axis=1, initial=np.inf)
    swinging = np.where(np.isfinite(s) & ~(alone & (s.real < 0.0)), damping(s), np.inf).min(axis=1, initial=np.inf)
    least: Array = np.minimum(pairs, swinging)
    return least


def partners(first: Complex, second: Complex) -> NDArray[np.intp]:
    """Return, for each mode of some circuits, which mode of slightly different ones it has become; all (lanes, modes).

    The nearest one; where two claim the same, nearest pairs first. Distances are taken between logarithms: relative in
    frequency, plain in angle.
    """
    distance = np.abs(_place(first)[:, :, None] - _place(second)[:, None, :])
    distance += _OTHER_HALF * ((first.imag < 0.0)[:, :, None] != (second.imag < 0.0)[:, None, :])
    found: NDArray[np.intp] = np.argmin(distance, axis=2)
    claimed = np.sort(found, axis=1) == np.arange(first.shape[1])
    for lane in np.flatnonzero(~claimed.all(axis=1)):
        found[lane] = _nearest_first(distance[lane])
    return found


def _nearest_first(distance: Array) -> NDArray[np.intp]:
    found = np.empty(len(distance), dtype=np.intp)
    for _ in range(len(distance)):
        row, column = divmod(int(np.argmin(distance)), len(distance))
        found[row] = column
        distance[row, :] = np.inf
        distance[:, column] = np.inf
    return found


def _place(s: Complex) -> Complex:
    """Return where a mode lies in the logarithmic plane, the two of a pair in one place; modes left out lie far out."""
    known = np.isfinite(s)
    folded = np.where(known, s.real + 1j * np.abs(s.imag), -2.0 * np.pi * GREATEST_HZ)
    place: Complex = np.log(folded)
    return place
