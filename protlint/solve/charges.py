"""Charges of devices: what their junctions store at given voltages and temperature, and the capacitances that follow.

Published models, with the parameter names, defaults and temperature laws of the Berkeley implementation (references in
``protlint.solve.devices``):

- depletion charge of a junction: the integral of C_J (1 - v/V_J)^-M up to v = FC V_J, of its tangent beyond;
- base-emitter diffusion, for v_BE > 0: TF (1 + XTF w^2 exp(v_BC / 1.44 VTF)) i_F / q_B with w = i_F / (i_F + ITF);
- base-collector diffusion TR i_R; the depletion charge of that junction splits by XCJC between the inner base and the base
  terminal, both against the inner collector;
- diode: TT times its current, and its depletion charge;
- MOSFET: constant CGS and CGD, and the depletion charge CBD of the body diode.

With temperature the built-in potential follows ``protlint.solve.lanes.junction_potential`` and
C_J(T) = C_J (1 + M (4e-4 (T - T0) - (V_J(T) - V_J) / V_J)); transit times stay. Left out: the substrate of integrated
transistors, and the excess phase PTF.

Arrays have shape (devices, lanes), in the sense of NPN and N-channel devices.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np

from protlint.solve.circuit import Circuit, Device
from protlint.solve.constants import T0_K
from protlint.solve.devices import Array
from protlint.solve.gummel_poon import Transport
from protlint.solve.lanes import junction_potential
from protlint.solve.network import Group
from protlint.solve.parameters import Bounds, within_bounds
from protlint.toml.text import toml_key

BIPOLAR: Final[Bounds] = {
    "CJE": (0.0, 0.0, 1e-3),
    "VJE": (0.75, 0.1, 5.0),
    "MJE": (0.33, 0.0, 0.95),
    "CJC": (0.0, 0.0, 1e-3),
    "VJC": (0.75, 0.1, 5.0),
    "MJC": (0.33, 0.0, 0.95),
    "XCJC": (1.0, 0.0, 1.0),
    "FC": (0.5, 0.0, 0.95),
    "TF": (0.0, 0.0, 1e-2),
    "TR": (0.0, 0.0, 1.0),
    "XTF": (0.0, 0.0, 1e6),
    "VTF": (math.inf, 1e-3, math.inf),
    "ITF": (0.0, 0.0, math.inf),
}
DIODE: Final[Bounds] = {
    "CJO": (0.0, 0.0, 1e-3),
    "VJ": (1.0, 0.1, 5.0),
    "M": (0.5, 0.0, 0.95),
    "FC": (0.5, 0.0, 0.95),
    "TT": (0.0, 0.0, 1.0),
}
MOSFET: Final[Bounds] = {
    "CGS": (0.0, 0.0, 1e-3),
    "CGD": (0.0, 0.0, 1e-3),
    "CGSO": (0.0, 0.0, 1e3),
    "CGDO": (0.0, 0.0, 1e3),
    "CBD": (0.0, 0.0, 1e-3),
    "PB": (0.8, 0.1, 5.0),
    "MJ": (0.5, 0.0, 0.95),
    "FC": (0.5, 0.0, 0.95),
}
MODEL_WIDTH_M: Final = 1e-6
"""Published overlap capacitances are by metre of channel width; the models here stand for a square channel of 1 um."""

FAMILIES: Final[Mapping[str, Bounds]] = {"bipolar": BIPOLAR, "mosfet": MOSFET, "diode": DIODE}

_BIPOLAR_NEEDS = ((("TF",), "ft"), (("CJC",), "cob"), (("CJE",), "cib"))
_MOSFET_NEEDS = ((("CGS", "CGSO"), "ciss"), (("CGD", "CGDO"), "crss"))
_DIODE_NEEDS = ((("CJO",), "cj"),)
NEEDS: Final[Mapping[str, tuple[tuple[tuple[str, ...], str], ...]]] = {
    "npn": _BIPOLAR_NEEDS,
    "pnp": _BIPOLAR_NEEDS,
    "nmos": _MOSFET_NEEDS,
    "pmos": _MOSFET_NEEDS,
    "diode": _DIODE_NEEDS,
    "zener": _DIODE_NEEDS,
}
"""By kind: model parameters of which one has to be given, and the rating it could be derived from."""


@dataclass(frozen=True, slots=True)
class Junction:
    """Depletion charges at their own temperature: capacitance at no bias (F), built-in potential (V), grading, FC."""

    C_J: Array
    V_J: Array
    M: Array
    FC: Array


@dataclass(frozen=True, slots=True)
class Stored:
    """Charges (C) and the capacitances (F) that are their slopes.

    ``charge`` and ``capacitance`` are (stores, devices, lanes), a capacitance by its store's own voltage. ``cross`` is the
    slope of the first store's charge by the second one's voltage (bipolars), None elsewhere.
    """

    charge: Array
    capacitance: Array
    cross: Array | None = None


@dataclass(frozen=True, slots=True)
class BipolarCharges:
    """Charge parameters of bipolar transistors.

    ``junctions`` are base-emitter and base-collector (2, devices, lanes), ``outer`` that part of the latter which lies
    outside the base resistance, None where no transistor has one; ``inverse_VTF`` is 1 / (1.44 VTF).
    """

    junctions: Junction
    outer: Junction | None
    T_F: Array
    T_R: Array
    X_TF: Array
    inverse_VTF: Array
    I_TF: Array


@dataclass(frozen=True, slots=True)
class MosfetCharges:
    """Charge parameters of MOSFETs: gate-source and gate-drain capacitance (F), and the body diode."""

    C_GS: Array
    C_GD: Array
    body: Junction


@dataclass(frozen=True, slots=True)
class DiodeCharges:
    """Charge parameters of diodes: depletion and transit time (s)."""

    junction: Junction
    T_T: Array


Charges = BipolarCharges | MosfetCharges | DiodeCharges


def missing_charges(circuit: Circuit) -> tuple[str, ...]:
    """Return the part-data keys without which the circuit's loop and delay cannot be computed, in the circuit's order.

    ``QPN1.model.TF or QPN1.ratings.ft``; capacitors and inductors without a value are named with their value's symbol.
    """
    found: dict[str, None] = {}
    for device in circuit.devices:
        part = toml_key(device.part_number or device.name)
        for names, rating in NEEDS.get(device.kind, ()):
            if not any(name in device.model for name in names):
                found[f"{part}.model.{names[0]} or {part}.ratings.{rating}"] = None
        symbol = {"capacitor": "C", "inductor": "L"}.get(device.kind)
        if symbol is not None and not device.model.get(symbol, math.nan) >= 0.0:
            found[f"the value of {device.name}"] = None
    return tuple(found)


def charges_of(group: Group, ambient_K: Array) -> Charges | None:
    """Return a group's charge parameters at its devices' temperatures; None for the drive.

    Raises
    ------
    CircuitError
        Where a parameter is absurd.
    """
    bounds = FAMILIES.get(group.family)
    if bounds is None:
        return None
    full = [within_bounds(device, bounds) for device in group.devices]
    p = {name: np.array([one[name] for one in full]).reshape(-1, 1) for name in bounds}
    temperature = ambient_K + group.rise_K
    if group.family == "bipolar":
        outside = 1.0 - p["XCJC"]
        return BipolarCharges(
            junctions=_at(
                temperature,
                np.stack((p["CJE"], p["CJC"] * p["XCJC"])),
                np.stack((p["VJE"], p["VJC"])),
                np.stack((p["MJE"], p["MJC"])),
                p["FC"],
            ),
            outer=_at(temperature, p["CJC"] * outside, p["VJC"], p["MJC"], p["FC"]) if outside.any() else None,
            T_F=p["TF"],
            T_R=p["TR"],
            X_TF=p["XTF"],
            inverse_VTF=1.0 / (1.44 * p["VTF"]),
            I_TF=p["ITF"],
        )
    if group.family == "mosfet":
        C_GS, C_GD = _overlap(group.devices, p)
        return MosfetCharges(C_GS, C_GD, _at(temperature, p["CBD"], p["PB"], p["MJ"], p["FC"]))
    return DiodeCharges(_at(temperature, p["CJO"], p["VJ"], p["M"], p["FC"]), p["TT"])


def bipolar_charges(inner: Array, outer_BC: Array, t: Transport, p: BipolarCharges) -> Stored:
    """Return base-emitter, inner base-collector and outer base-collector charges.

    ``inner`` are inner junction voltages (2, devices, lanes), ``t`` what crosses the base there, ``outer_BC`` the base
    terminal's voltage against the inner collector.
    """
    charge, capacitance = np.zeros((3, *outer_BC.shape)), np.zeros((3, *outer_BC.shape))
    charge[:2], capacitance[:2] = depletion(inner, p.junctions)
    if p.outer is not None:
        charge[2], capacitance[2] = depletion(outer_BC, p.outer)
    on = inner[0] > 0.0
    i_F, g_F = t.i[0] * on, t.g[0] * on  # forward: of the ideal base-emitter junction
    i_R, g_R = t.i[1], t.g[1]  # reverse: of the ideal base-collector junction
    q_B_by_BE, q_B_by_BC = t.q_B_slope
    lent, lent_slope, by_BC = i_F, g_F, 0.0
    if p.X_TF.any():
        w = i_F / np.maximum(i_F + p.I_TF, 1e-300)
        grows = p.I_TF > 0.0
        excess = p.X_TF * np.exp(np.minimum(inner[1] * p.inverse_VTF, 50.0)) * np.where(grows, w * w, 1.0)
        lent = i_F * (1.0 + excess)
        lent_slope = g_F * (1.0 + excess * np.where(grows, 3.0 - 2.0 * w, 1.0))
        by_BC = i_F * excess * p.inverse_VTF
    carried = lent / t.q_B
    charge[0] += p.T_F * carried
    charge[1] += p.T_R * i_R
    capacitance[0] += p.T_F * (lent_slope - carried * q_B_by_BE) / t.q_B
    capacitance[1] += p.T_R * g_R
    return Stored(charge, capacitance, p.T_F * (by_BC - carried * q_B_by_BC) / t.q_B)


def mosfet_charges(inner: Array, body_V: Array, p: MosfetCharges) -> Stored:
    """Return gate-source, gate-drain and body charges; ``body_V`` is the source terminal against the inner drain."""
    q_b, c_b = depletion(body_V, p.body)
    fixed = np.stack(np.broadcast_arrays(p.C_GS, p.C_GD, body_V))[:2]
    return Stored(np.concatenate((fixed * inner, q_b[None])), np.concatenate((fixed, c_b[None])))


def diode_charges(inner: Array, current_A: Array, slope_S: Array, p: DiodeCharges) -> Stored:
    """Return diode charges at inner voltages (devices, lanes), their static currents and slopes."""
    q, c = depletion(inner, p.junction)
    return Stored((q + p.T_T * current_A)[None], (c + p.T_T * slope_S)[None])


def depletion(v: Array, p: Junction) -> tuple[Array, Array]:
    """Return the depletion charge (C) and capacitance (F) of junctions at their voltages (devices, lanes).

    C_J (1 - v/V_J)^-M and its integral up to v = FC V_J, the tangent and its integral beyond.
    """
    edge = p.FC * p.V_J
    below = np.minimum(v, edge)
    beyond = v - below
    left = 1.0 - below / p.V_J
    grown = left**-p.M
    c = p.C_J * grown
    steepness = c * p.M / (p.V_J * left)
    q = p.C_J * p.V_J * (1.0 - left * grown) / (1.0 - p.M) + beyond * (c + 0.5 * beyond * steepness)
    return q, c + beyond * steepness


def _at(temperature_K: Array, C_J: Array, V_J: Array, M: Array, FC: Array) -> Junction:
    V_T = np.maximum(junction_potential(V_J, temperature_K), 0.05)
    growth = 1.0 + M * (4e-4 * (temperature_K - T0_K) - (V_T - V_J) / V_J)
    return Junction(C_J * growth, V_T, M, FC)


def _overlap(members: tuple[Device, ...], p: Mapping[str, Array]) -> tuple[Array, Array]:
    """Return C_GS and C_GD: as given for the whole device, else the overlap capacitances over the model's width."""
    given = {name: np.array([[name in device.model] for device in members]) for name in ("CGS", "CGD")}
    return (
        np.where(given["CGS"], p["CGS"], p["CGSO"] * MODEL_WIDTH_M),
        np.where(given["CGD"], p["CGD"], p["CGDO"] * MODEL_WIDTH_M),
    )
