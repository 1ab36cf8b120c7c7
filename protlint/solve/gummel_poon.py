"""Bipolar transistors: the static model of Gummel and Poon; shapes, ports and references in ``protlint.solve.devices``."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from protlint.solve.devices import GMIN_S, GREATEST_EXPONENT, Array, Evaluation, with_series

_JUNCTIONS = np.array([0, 1, 0])
"""Base-emitter, base-collector, and base-emitter again for its leakage."""


@dataclass(frozen=True, slots=True)
class Bipolars:
    """Parameters of bipolar transistors at their own temperatures.

    ``I`` (3, devices, lanes) are the saturation currents I_S, I_S and I_SE of the base-emitter, base-collector and
    base-emitter leakage junctions, ``per_V`` (3, ...) one over N V_T of each. By junction (2, devices, lanes or 1):
    ``V_crit`` the voltage of greatest curvature, ``per_B`` 1/B_F and 1/B_R, ``early`` 1/VAR and 1/VAF (1/V), ``knee`` 1/IKF
    and 1/IKR (1/A), ``R_side`` R_E and R_C. ``I_SC`` with ``per_V_C`` 1/(N_C V_T) is None where no collector junction leaks;
    ``R_BM`` None means a constant base resistance R_B.
    """

    I: Array  # noqa: E741
    per_V: Array
    V_crit: Array
    per_B: Array
    early: Array
    knee: Array
    R_side: Array
    R_B: Array
    I_SC: Array | None
    per_V_C: Array | None
    R_BM: Array | None
    I_RB: Array | None


@dataclass(frozen=True, slots=True)
class Transport:
    """What crosses the base of bipolar transistors.

    Junction currents and conductances (3, devices, lanes) in the order of ``Bipolars.I``, the relative base charge (devices,
    lanes) and its slopes by both junction voltages (2, devices, lanes).
    """

    i: Array
    g: Array
    q_B: Array
    q_B_slope: Array


@dataclass(frozen=True, slots=True)
class Evaluated(Evaluation):
    """Bipolar transistors at given inner voltages, with what crosses their bases there."""

    transport: Transport


def bipolar(inner: Array, p: Bipolars, present: Array | float = 1.0) -> Evaluated:
    """Gummel-Poon bipolar transistors at inner base-emitter and base-collector voltages (2, devices, lanes).

    With i_F = I_S (exp(v_BE / NF V_T) - 1), i_R = I_S (exp(v_BC / NR V_T) - 1), the base charge
    q_B = q_1 (1 + sqrt(1 + 4 q_2)) / 2, q_1 = 1 / (1 - v_BC/VAF - v_BE/VAR), q_2 = i_F/IKF + i_R/IKR:

    I_C = (i_F - i_R) / q_B - i_R/B_R - i_LC
    I_B = i_F/B_F + i_LE + i_R/B_R + i_LC

    with the leakages i_LE = I_SE (exp(v_BE / NE V_T) - 1), i_LC = I_SC (exp(v_BC / NC V_T) - 1). The base resistance is
    RB, or RBM + (RB - RBM)/q_B, or Hauser's form of it where IRB is given. ``present`` 0 takes a device out.
    """
    t = transport(inner, p)
    i_t = (t.i[0] - t.i[1]) / t.q_B
    transfer = t.q_B_slope * i_t
    np.negative(transfer[0], out=transfer[0])
    transfer += t.g[:2]
    transfer /= t.q_B
    i_base, g_base = t.i[:2] * p.per_B, t.g[:2] * p.per_B
    i_base[0] += t.i[2]
    g_base[0] += t.g[2]
    if p.I_SC is not None and p.per_V_C is not None:
        leak = np.exp(np.minimum(inner[1] * p.per_V_C, GREATEST_EXPONENT)) * p.I_SC
        i_base[1] += leak - p.I_SC
        g_base[1] += leak * p.per_V_C
    slope = np.empty((2, 2, *i_t.shape))
    slope[0, 0] = g_base[0] + transfer[0]
    slope[0, 1] = -transfer[1]
    slope[1, 0] = -transfer[0]
    slope[1, 1] = g_base[1] + transfer[1]
    current = i_base.copy()
    current[0] += i_t
    current[1] -= i_t
    if not isinstance(present, float):
        slope *= present
        current *= present
    r_b = p.R_B if p.R_BM is None else base_resistance(p, t.q_B, i_base[0] + i_base[1])
    outside = with_series(inner, current, slope, p.R_side, r_b)
    return Evaluated(outside.port_V, outside.port_A, outside.voltage_slope, outside.current_slope, t)


def transport(inner: Array, p: Bipolars) -> Transport:
    """Return junction currents and base charge of :func:`bipolar`, with slopes, at inner voltages (2, devices, lanes)."""
    i = inner[_JUNCTIONS] * p.per_V
    np.minimum(i, GREATEST_EXPONENT, out=i)
    np.exp(i, out=i)
    i *= p.I
    g = i * p.per_V
    i -= p.I
    i[:2] += GMIN_S * inner
    g[:2] += GMIN_S
    narrowing = inner * p.early
    q_1 = 1.0 / np.maximum(1.0 - narrowing[0] - narrowing[1], 0.02)
    injection = i[:2] * p.knee
    root = np.sqrt(np.maximum(1.0 + 4.0 * (injection[0] + injection[1]), 1e-12))
    q_b = 0.5 * q_1 * (1.0 + root)
    return Transport(i, g, q_b, (p.early * q_b + g[:2] * (p.knee / root)) * q_1)


def base_resistance(p: Bipolars, q_b: Array, i_b: Array) -> Array:
    """Return the base resistance in ohms at high injection, at base charges and base currents (devices, lanes).

    Its own slope is left out of the Jacobian, which slows the iteration and shifts no solution. From the charge,
    RBM + (RB - RBM) / q_B; where IRB is given, J. R. Hauser's crowding (IEEE Transactions on Electron Devices ED-11, 1964):

    RBM + 3 (RB - RBM) (tan z - z) / (z tan^2 z), z = (-1 + sqrt(1 + 144 I_B / (pi^2 IRB))) / ((24/pi^2) sqrt(I_B/IRB)).
    """
    assert p.R_BM is not None
    by_charge = p.R_BM + (p.R_B - p.R_BM) / q_b
    if p.I_RB is None:
        return by_charge
    given = np.isfinite(p.I_RB)
    share = np.maximum(i_b / np.where(given, p.I_RB, 1.0), 1e-9)
    z = (np.sqrt(1.0 + 14.59025 * share) - 1.0) / (2.4317 * np.sqrt(share))
    tangent = np.tan(z)
    by_current = p.R_BM + 3.0 * (p.R_B - p.R_BM) * (tangent - z) / (z * tangent * tangent)
    return np.where(given, by_current, by_charge)
