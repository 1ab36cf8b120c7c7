"""Device equations: what flows in a transistor, diode or resistor at given junction voltages and temperature.

Bipolar transistors are in ``protlint.solve.gummel_poon``; what all devices share, MOSFETs, diodes and the rest are here.

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


def with_series(inner: Array, current: Array, slope: Array, side: Array, control: Array) -> Evaluation:
    """Put resistances outside the junctions: ``side`` (2, ...) at the common and the other terminal, and ``control``."""
    port = inner + control * (current[0] + current[1])
    port += side * current
    voltage_slope = side[:, None] * slope
    voltage_slope += control * (slope[0] + slope[1])
    voltage_slope[0, 0] += 1.0
    voltage_slope[1, 1] += 1.0
    return Evaluation(port, current, voltage_slope, slope)


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
