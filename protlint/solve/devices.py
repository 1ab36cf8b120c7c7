"""Device equations: what flows in a transistor, diode or resistor at given junction voltages and temperature.

Published static models, evaluated for many devices and many operating conditions (lanes) at once. Every array has shape
(devices, lanes), or (2, devices, lanes) where a device has two junctions; voltages and currents are those of an NPN or
N-channel device (the network applies the polarity of the mirror types).

Ports. A device is described by its ports, so that series resistances cost no nodes of their own. A three-terminal device
has port 1 from control to common terminal (base to emitter, gate to source) and port 2 from control to the other one
(base to collector, gate to drain); a diode has one port. ``inner`` are the junction voltages inside the series
resistances, the unknowns of the device; the evaluation gives

- ``port_V``: the voltages seen from outside, inner voltages plus series drops;
- ``port_A``: the currents ``j`` of the ports, so that the control terminal takes j1 + j2, the common one -j1, the other -j2
  (collector current is -j2, base current j1 + j2);
- ``voltage_slope`` and ``current_slope``: their derivatives by the inner voltages, [row, column, device, lane].

The conductances seen from outside are then ``current_slope`` times the inverse of ``voltage_slope``, and the small-signal
conductances inside are ``current_slope`` itself.

Symbols (SI): V_T thermal voltage k T / q; T0 300.15 K, the temperature of all parameters; GMIN 1e-13 S across each junction.

References: H. K. Gummel and H. C. Poon, "An integral charge control model of bipolar transistors", Bell System Technical
Journal 49, 1970; H. Shichman and D. A. Hodges, "Modeling and simulation of insulated-gate field-effect transistor
switching circuits", IEEE Journal of Solid-State Circuits SC-3, 1968; temperature laws and parameter names of the Berkeley
implementation: L. W. Nagel, "SPICE2", Memorandum ERL-M520, University of California, 1975, and T. Quarles, Memorandum
ERL-M89/42, 1989.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve.constants import BOLTZMANN_V_PER_K, T0_K

Array = NDArray[np.float64]
IntArray = NDArray[np.intp]

GMIN_S = 1e-13
GREATEST_EXPONENT = 150.0
"""Keeps a wild step of an unfinished iteration finite: e^150 squared still fits a double."""


@dataclass(frozen=True, slots=True)
class Evaluation:
    """One group of devices at given inner voltages; shapes in the module's description."""

    port_V: Array
    port_A: Array
    voltage_slope: Array
    current_slope: Array


@dataclass(frozen=True, slots=True)
class Bipolars:
    """Parameters of bipolar transistors at their own temperatures, each (devices, lanes).

    ``V_F V_R V_E V_C`` are NF, NR, NE and NC times V_T; ``inverse_VAF`` and its like are 1/VAF 1/VAR 1/IKF 1/IKR in 1/V and
    1/A. ``R_BM`` None means a constant base resistance.
    """

    I_S: Array
    B_F: Array
    B_R: Array
    I_SE: Array
    I_SC: Array | None
    V_F: Array
    V_R: Array
    V_E: Array
    V_C: Array
    inverse_VAF: Array
    inverse_VAR: Array
    inverse_IKF: Array
    inverse_IKR: Array
    R_B: Array
    R_E: Array
    R_C: Array
    R_BM: Array | None
    I_RB: Array | None


@dataclass(frozen=True, slots=True)
class Transport:
    """Forward and reverse currents of bipolar transistors, their conductances, and the base charge with its slopes by the
    base-emitter and base-collector voltage; each (devices, lanes). The base charge is relative, without dimension."""

    i_F: Array
    i_R: Array
    g_F: Array
    g_R: Array
    q_B: Array
    q_B_by_BE: Array
    q_B_by_BC: Array


@dataclass(frozen=True, slots=True)
class Mosfets:
    """Parameters of MOSFETs at their own temperatures, each (devices, lanes); ``I_S`` and ``V_T`` are the body diode's."""

    V_TO: Array
    K_P: Array
    LAMBDA: Array
    GAMMA: Array | None
    PHI: Array
    R_S: Array
    R_D: Array
    I_S: Array
    V_T: Array


@dataclass(frozen=True, slots=True)
class Diodes:
    """Parameters of diodes at their own temperatures, each (devices, lanes); ``B_V`` None where none breaks down."""

    I_S: Array
    V_N: Array
    R_S: Array
    B_V: Array | None
    I_BV: Array
    V_B: Array


@dataclass(frozen=True, slots=True)
class Source:
    """A drive with a current limit: its resistance and greatest current, each (1, lanes)."""

    resistance_ohm: Array
    limit_A: Array


def thermal_voltage(temperature_K: Array) -> Array:
    """Return V_T = k T / q in volts."""
    return BOLTZMANN_V_PER_K * temperature_K


def junction_growth(temperature_K: Array, E_G: Array, X_TI: Array) -> Array:
    """Return the exponent by which a saturation current has grown from T0: ln(I_S(T) / I_S(T0)).

    (E_G q / k) (1/T0 - 1/T) + X_TI ln(T/T0), E_G in eV.
    """
    ratio = temperature_K / T0_K
    exponent: Array = (ratio - 1.0) * E_G / thermal_voltage(temperature_K) + X_TI * np.log(ratio)
    return exponent


def resistance(R: Array, TC1: Array, TC2: Array, temperature_K: Array) -> Array:
    """Return R (1 + TC1 dT + TC2 dT^2) in ohms, dT from T0."""
    rise_K = temperature_K - T0_K
    return R * (1.0 + rise_K * (TC1 + rise_K * TC2))


def bipolar(inner: Array, p: Bipolars, present: Array | float = 1.0) -> Evaluation:
    """Gummel-Poon bipolar transistors at inner base-emitter and base-collector voltages (2, devices, lanes).

    With i_F = I_S (exp(v_BE / NF V_T) - 1), i_R = I_S (exp(v_BC / NR V_T) - 1), the base charge
    q_B = q_1 (1 + sqrt(1 + 4 q_2)) / 2, q_1 = 1 / (1 - v_BC/VAF - v_BE/VAR), q_2 = i_F/IKF + i_R/IKR:

    I_C = (i_F - i_R) / q_B - i_R/B_R - i_LC
    I_B = i_F/B_F + i_LE + i_R/B_R + i_LC

    with the leakages i_LE = I_SE (exp(v_BE / NE V_T) - 1), i_LC = I_SC (exp(v_BC / NC V_T) - 1). The base resistance is
    RB, or RBM + (RB - RBM)/q_B, or Hauser's form of it where IRB is given. ``present`` 0 takes a device out.
    """
    v_be, v_bc = inner
    t = transport(inner, p)
    i_f, i_r, g_f, g_r, q_b = t.i_F, t.i_R, t.g_F, t.g_R, t.q_B
    e_l = np.exp(np.minimum(v_be / p.V_E, GREATEST_EXPONENT)) * p.I_SE
    base_r = i_r / p.B_R
    g_base_r = g_r / p.B_R
    if p.I_SC is not None:
        e_c = np.exp(np.minimum(v_bc / p.V_C, GREATEST_EXPONENT)) * p.I_SC
        base_r = base_r + e_c - p.I_SC
        g_base_r = g_base_r + e_c / p.V_C
    i_t = (i_f - i_r) / q_b
    i_c = i_t - base_r
    i_b = i_f / p.B_F + e_l - p.I_SE + base_r

    slope = np.empty((2, 2, *v_be.shape))
    slope[1, 0] = (i_t * t.q_B_by_BE - g_f) / q_b
    slope[1, 1] = (g_r + i_t * t.q_B_by_BC) / q_b + g_base_r
    slope[0, 0] = g_f / p.B_F + e_l / p.V_E - slope[1, 0]
    slope[0, 1] = g_base_r - slope[1, 1]
    current = np.stack((i_b + i_c, -i_c))
    if not isinstance(present, float):
        slope *= present
        current *= present
    r_b = p.R_B if p.R_BM is None else base_resistance(p, q_b, i_b)
    return _with_series(inner, current, slope, p.R_E, r_b, p.R_C)


def transport(inner: Array, p: Bipolars) -> Transport:
    """Return i_F, i_R and q_B of :func:`bipolar` with their slopes, at inner voltages (2, devices, lanes)."""
    v_be, v_bc = inner
    e_f = np.exp(np.minimum(v_be / p.V_F, GREATEST_EXPONENT)) * p.I_S
    e_r = np.exp(np.minimum(v_bc / p.V_R, GREATEST_EXPONENT)) * p.I_S
    i_f = e_f - p.I_S + GMIN_S * v_be
    i_r = e_r - p.I_S + GMIN_S * v_bc
    g_f = e_f / p.V_F + GMIN_S
    g_r = e_r / p.V_R + GMIN_S
    q_1 = 1.0 / np.maximum(1.0 - v_bc * p.inverse_VAF - v_be * p.inverse_VAR, 0.02)
    root = np.sqrt(np.maximum(1.0 + 4.0 * (i_f * p.inverse_IKF + i_r * p.inverse_IKR), 1e-12))
    q_b = 0.5 * q_1 * (1.0 + root)
    q_be = q_1 * (q_b * p.inverse_VAR + g_f * p.inverse_IKF / root)
    q_bc = q_1 * (q_b * p.inverse_VAF + g_r * p.inverse_IKR / root)
    return Transport(i_f, i_r, g_f, g_r, q_b, q_be, q_bc)


def mosfet(inner: Array, p: Mosfets, present: Array | float = 1.0) -> Evaluation:
    """Shichman-Hodges MOSFETs at inner gate-source and gate-drain voltages (2, devices, lanes); body tied to the source.

    For v_DS >= 0, with v_ov = v_GS - V_TO - GAMMA (sqrt(PHI + v_SB) - sqrt(PHI)):

    I_D = K_P (1 + LAMBDA v_DS) v_DS (v_ov - v_DS/2) for v_DS < v_ov, K_P/2 (1 + LAMBDA v_DS) v_ov^2 beyond, 0 for v_ov < 0;

    source and drain change places for v_DS < 0. The body diode lies from the source terminal to the inner drain. ``K_P``
    stands for the whole device (width equal to length). ``present`` 0 takes a device out.
    """
    v_gs, v_gd = inner
    v_ds = v_gs - v_gd
    turned = v_ds < 0.0
    control = np.where(turned, v_gd, v_gs)
    across = np.abs(v_ds)
    threshold = p.V_TO
    if p.GAMMA is not None:
        threshold = threshold + _body_effect(p, control - threshold, across, turned)
    over = np.maximum(control - threshold, 0.0)
    lengthening = p.K_P * (1.0 + p.LAMBDA * across)
    linear = np.minimum(across, over)
    core = linear * (over - 0.5 * linear)
    i_d = lengthening * core
    g_m = lengthening * linear
    g_ds = lengthening * (over - linear) + p.K_P * p.LAMBDA * core
    i_d = np.where(turned, -i_d, i_d)
    # with the ends changed over, the gate works against the drain: I_D = -f(v_GD, -v_DS)
    by_gs = np.where(turned, g_ds, g_m + g_ds)
    by_gd = np.where(turned, -(g_m + g_ds), -g_ds)

    v_body = -(v_ds + p.R_S * i_d)
    e_b = np.exp(np.minimum(v_body / p.V_T, GREATEST_EXPONENT)) * p.I_S
    i_body = e_b - p.I_S + GMIN_S * v_body
    g_body = e_b / p.V_T + GMIN_S
    body_gs = -g_body * (1.0 + p.R_S * by_gs)
    body_gd = g_body * (1.0 - p.R_S * by_gd)

    slope = np.empty((2, 2, *v_gs.shape))
    slope[0, 0] = by_gs - body_gs
    slope[0, 1] = by_gd - body_gd
    slope[1] = -slope[0]
    drain = i_d - i_body
    current = np.stack((drain, -drain))
    channel_V = p.R_S * i_d
    voltage_slope = np.empty_like(slope)
    voltage_slope[0, 0] = 1.0 + p.R_S * by_gs
    voltage_slope[0, 1] = p.R_S * by_gd
    voltage_slope[1, 0] = p.R_D * slope[1, 0]
    voltage_slope[1, 1] = 1.0 + p.R_D * slope[1, 1]
    port = np.stack((v_gs + channel_V, v_gd - p.R_D * drain))
    if not isinstance(present, float):
        slope *= present
        current *= present
    return Evaluation(port, current, voltage_slope, slope)


def diode(inner: Array, p: Diodes, present: Array | float = 1.0) -> Evaluation:
    """Junction diodes at inner voltages (1, devices, lanes).

    I = I_S (exp(v / N V_T) - 1) - I_BV exp(-(v + B_V) / N V_T), with R_S in series; a zener is a diode with B_V.
    ``present`` 0 takes a device out.
    """
    v = inner[0]
    e_f = np.exp(np.minimum(v / p.V_N, GREATEST_EXPONENT)) * p.I_S
    i = e_f - p.I_S + GMIN_S * v
    g = e_f / p.V_N + GMIN_S
    if p.B_V is not None:
        e_b = np.exp(np.minimum(-(v + p.B_V) / p.V_B, GREATEST_EXPONENT)) * p.I_BV
        i = i - e_b
        g = g + e_b / p.V_B
    i = i * present
    g = g * present
    return Evaluation((v + p.R_S * i)[None], i[None], (1.0 + p.R_S * g)[None, None], g[None, None])


def limited_source(inner: Array, p: Source) -> Evaluation:
    """A source resistance that gives way at a greatest current: j = v / R, held within +-limit (1, devices, lanes)."""
    v = inner[0]
    current = np.clip(v / p.resistance_ohm, -p.limit_A, p.limit_A)
    slope = np.where(np.abs(v) <= p.limit_A * p.resistance_ohm, 1.0 / p.resistance_ohm, 0.0)
    return Evaluation(inner, current[None], np.ones((1, 1, *v.shape)), slope[None, None])


def junction_step(old: Array, new: Array, V_T: Array, I_S: Array) -> Array:
    """Shorten a step of a junction voltage to where its exponential can still be trusted.

    A step of more than 2 V_T that ends beyond the voltage of greatest curvature, V_crit = V_T ln(V_T / (sqrt(2) I_S)),
    counts by its logarithm only, from the old voltage or from 0 V (Nagel 1975, section on junction limiting).
    """
    start = np.maximum(old, 0.0)
    rise = new - start
    far = (new > V_T * np.log(V_T / (np.sqrt(2.0) * I_S))) & (rise > 2.0 * V_T)
    shortened: Array = np.where(far, start + V_T * np.log1p(np.maximum(rise, 0.0) / V_T), new)
    return shortened


def _with_series(inner: Array, current: Array, slope: Array, r_1: Array, r_0: Array, r_2: Array) -> Evaluation:
    """Put r_1 at the common, r_0 at the control and r_2 at the other terminal outside the junctions."""
    j_1, j_2 = current
    control_V = r_0 * (j_1 + j_2)
    port = np.stack((inner[0] + control_V + r_1 * j_1, inner[1] + control_V + r_2 * j_2))
    control_slope = r_0 * (slope[0] + slope[1])
    voltage_slope = np.empty_like(slope)
    voltage_slope[0] = control_slope + r_1 * slope[0]
    voltage_slope[1] = control_slope + r_2 * slope[1]
    voltage_slope[0, 0] += 1.0
    voltage_slope[1, 1] += 1.0
    return Evaluation(port, current, voltage_slope, slope)


def base_resistance(p: Bipolars, q_b: Array, i_b: Array) -> Array:
    """Return the base resistance at high injection; its own slope is left out of the Jacobian (it only slows, never shifts).

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


def _body_effect(p: Mosfets, over: Array, across: Array, turned: Array) -> Array:
    """Return how far the drop in R_S raises the threshold, from two rounds of the saturated current (R_S is small)."""
    assert p.GAMMA is not None
    shift = np.zeros_like(over)
    for _ in range(3):
        height = np.maximum(over - shift, 0.0)
        linear = np.minimum(across, height)
        drop = p.R_S * p.K_P * (1.0 + p.LAMBDA * across) * linear * (height - 0.5 * linear)
        drop = np.where(turned, 0.0, drop)
        shift = p.GAMMA * (np.sqrt(p.PHI + drop) - np.sqrt(p.PHI))
    return shift
