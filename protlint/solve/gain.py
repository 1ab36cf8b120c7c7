"""Loop gain by double injection at a device's control terminal.

R. D. Middlebrook, "Measurement of loop gain in feedback systems", International Journal of Electronics 38, 1975: the wire
between net and terminal is driven by a voltage in series, then by a current from the side; the two ratios T_v and T_i of
what returns to what goes in give T = (T_v T_i - 1) / (T_v + T_i + 2). With the wire cut, and Z the impedances of the two
ends against each other (1 the net's, 2 the terminal's), that is

    T = (Z_21 - Z_12) / (Z_11 + Z_22 - 2 Z_21).

T is positive at low frequency where the feedback is negative; the phase margin is 180 degrees plus the phase of T at its
last downward crossing of 1, unwrapped from low frequency.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from protlint.solve.devices import Array
from protlint.solve.modes import GREATEST_HZ, Complex

PER_DECADE = 30
_REFINEMENTS = 4
_BETWEEN = 17


@dataclass(frozen=True, slots=True)
class Gain:
    """Loop gain: magnitude at low frequency, last downward crossing of 1 and the phase margin there, None where it never
    crosses; and a table of (frequency in Hz, magnitude, phase in degrees) in steps of 1, 2, 5."""

    low_frequency: float
    crossover_Hz: float | None
    phase_margin_deg: float | None
    table: tuple[tuple[float, float, float], ...]


def gain_function(G: Array, A: Array, c: Array, net: int, terminal: int) -> Callable[[Array], Complex]:
    """Return T as a function of frequency in Hz (frequencies,), for one circuit with the wire cut.

    G (unknowns, unknowns), A (stores, unknowns), c (stores, stores); ``net`` and ``terminal`` are the unknowns of the ends.
    """
    stores = len(A)
    ends = np.zeros((2, len(G)))
    ends[0, net] = ends[1, terminal] = 1.0
    rows = np.concatenate((A, ends))
    Z = rows @ np.linalg.solve(G, rows.T)
    R, into, out, direct = Z[:stores, :stores], Z[:stores, stores:], Z[stores:, :stores], Z[stores:, stores:]
    loaded, one = R @ c, np.eye(stores)

    def gain(frequency_Hz: Array) -> Complex:
        s = 2j * np.pi * frequency_Hz[:, None, None]
        stored = np.linalg.solve(one + s * loaded, np.broadcast_to(into, (len(s), *into.shape)))
        impedance = direct - s * (out @ c @ stored)
        difference = impedance[:, 1, 0] - impedance[:, 0, 1]
        result: Complex = difference / (impedance[:, 0, 0] + impedance[:, 1, 1] - 2.0 * impedance[:, 1, 0])
        return result

    return gain


def read_gain(gain: Callable[[Array], Complex], near_Hz: Array) -> Gain:
    """Read low-frequency gain, crossover and phase margin off a loop gain; ``near_Hz`` are frequencies where it may bend."""
    bends = near_Hz[np.isfinite(near_Hz) & (near_Hz > 0.0) & (near_Hz <= GREATEST_HZ)]
    lowest = 1e-3 * float(bends.min(initial=1e3))
    count = int(PER_DECADE * np.log10(GREATEST_HZ / lowest)) + 1
    around = np.outer(bends, np.geomspace(0.8, 1.25, 15)).ravel()
    frequency = np.unique(np.concatenate((np.geomspace(lowest, GREATEST_HZ, count), around)))
    T = gain(frequency)
    at_rest = float(gain(np.zeros(1))[0].real)
    phase = np.unwrap(np.concatenate(([0.0 if at_rest >= 0.0 else -np.pi], np.angle(T))))[1:]
    size = np.abs(T)
    table = _table(frequency, size, phase)
    falls = np.flatnonzero((size[:-1] > 1.0) & (size[1:] <= 1.0))
    if not len(falls):
        return Gain(abs(at_rest), None, None, table)
    left = int(falls[-1])
    low, high = frequency[left], frequency[left + 1]
    for _ in range(_REFINEMENTS):
        between = np.geomspace(low, high, _BETWEEN)
        above = np.flatnonzero(np.abs(gain(between)) > 1.0)
        place = min(int(above[-1]) if len(above) else 0, _BETWEEN - 2)
        low, high = between[place], between[place + 1]
    crossover = float(np.sqrt(low * high))
    at = np.unwrap([phase[left], np.angle(gain(np.array([crossover]))[0])])[1]
    return Gain(abs(at_rest), crossover, float(180.0 + np.degrees(at)), table)


def _table(frequency: Array, size: Array, phase: Array) -> tuple[tuple[float, float, float], ...]:
    """Return the rows at 1, 2 and 5 times powers of ten within the swept range, from a curve that has all its bends."""
    decades = range(math.floor(math.log10(frequency[0])), math.ceil(math.log10(frequency[-1])) + 1)
    wanted = [step * 10.0**decade for decade in decades for step in (1.0, 2.0, 5.0)]
    rows = np.array([one for one in wanted if frequency[0] <= one <= frequency[-1]])
    at = np.log(rows), np.log(frequency)
    sizes = np.exp(np.interp(*at, np.log(np.maximum(size, 1e-300))))
    return tuple(zip(rows.tolist(), sizes.tolist(), np.degrees(np.interp(*at, phase)).tolist(), strict=True))
