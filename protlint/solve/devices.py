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
_JUNCTIONS = np.array([0, 1, 0])
"""Base-emitter, base-collector, and base-emitter again for its leakage."""

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

    @property
    def i_F(self) -> Array:
        """Forward current of the ideal base-emitter junction."""
        return _row(self.i, 0)

    @property
    def i_R(self) -> Array:
        """Reverse current of the ideal base-collector junction."""
        return _row(self.i, 1)

    @property
    def g_F(self) -> Array:
        """Slope of ``i_F`` by the base-emitter voltage."""
        return _row(self.g, 0)

    @property
    def g_R(self) -> Array:
        """Slope of ``i_R`` by the base-collector voltage."""
        return _row(self.g, 1)

    @property
    def q_B_by_BE(self) -> Array:
        """Slope of the base charge by the base-emitter voltage."""
        return _row(self.q_B_slope, 0)

    @property
    def q_B_by_BC(self) -> Array:
        """Slope of the base charge by the base-collector voltage."""
        return _row(self.q_B_slope, 1)


@dataclass(frozen=True, slots=True)
class Mosfets:
    """Parameters of MOSFETs at their own temperatures, each (devices, lanes); ``I_S``, ``V_T`` and ``V_crit`` are the body
    diode's."""

    V_TO: Array
    K_P: Array
    LAMBDA: Array
    GAMMA: Array | None
    PHI: Array
    R_S: Array
    R_D: Array
    I_S: Array
    V_T: Array
    V_crit: Array


@dataclass(frozen=True, slots=True)
class Diodes:
    """Parameters of diodes at their own temperatures, each (devices, lanes); ``B_V`` None where none breaks down."""

    I_S: Array
    V_N: Array
    V_crit: Array
    R_S: Array
    B_V: Array | None
    I_BV: Array
    V_B: Array
    V_B_crit: Array


@dataclass(frozen=True, slots=True)
class Source:
    """A drive with a current limit: its resistance and greatest current, each (1, lanes)."""

    resistance_ohm: Array
    limit_A: Array


def _row(values: Array, index: int) -> Array:
    row: Array = values[index]
    return row


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
    return _with_series(inner, current, slope, p.R_side, r_b)


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
    any_turned = bool(turned.any())
    control = np.where(turned, v_gd, v_gs) if any_turned else v_gs
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
    if p.GAMMA is not None:
        # a rising current raises the threshold that it flows against
        rising = np.where(turned, 0.0, 0.5 * p.GAMMA * p.R_S / np.sqrt(p.PHI + p.R_S * i_d))
        g_m, g_ds = g_m / (1.0 + rising * g_m), g_ds / (1.0 + rising * g_m)
    by_gs, by_gd = g_m + g_ds, -g_ds
    if any_turned:
        # with the ends changed over, the gate works against the drain: I_D = -f(v_GD, -v_DS)
        i_d = np.where(turned, -i_d, i_d)
        by_gs, by_gd = np.where(turned, g_ds, by_gs), np.where(turned, -by_gs, by_gd)

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


def critical_voltage(V_N: Array, I_S: Array) -> Array:
    """Return the voltage at which a junction's characteristic bends most: V_N ln(V_N / (sqrt(2) I_S)), V_N = N V_T
    (Nagel 1975)."""
    voltage: Array = V_N * np.log(V_N / (np.sqrt(2.0) * I_S))
    return voltage


def junction_step(old: Array, new: Array, per_V: Array, V_crit: Array) -> Array:
    """Shorten a step of a junction voltage to where its exponential can still be trusted.

    A step of more than 2 N V_T that ends beyond the critical voltage counts by its logarithm only, from the old voltage or
    from 0 V (Nagel 1975, section on junction limiting). ``per_V`` is 1/(N V_T).
    """
    start = np.maximum(old, 0.0)
    rise = (new - start) * per_V
    far = (new > V_crit) & (rise > 2.0)
    shortened: Array = np.where(far, start + np.log1p(np.maximum(rise, 0.0)) / per_V, new)
    return shortened


def _with_series(inner: Array, current: Array, slope: Array, side: Array, control: Array) -> Evaluation:
    """Put resistances outside the junctions: ``side`` (2, ...) at the common and the other terminal, and ``control``."""
    port = inner + control * (current[0] + current[1])
    port += side * current
    voltage_slope = side[:, None] * slope
    voltage_slope += control * (slope[0] + slope[1])
    voltage_slope[0, 0] += 1.0
    voltage_slope[1, 1] += 1.0
    return Evaluation(port, current, voltage_slope, slope)


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
