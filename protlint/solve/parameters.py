"""Model parameters: which there are, what they default to, what is absurd, and what temperature does to them.

Names, defaults and temperature laws are the published ones of the Berkeley implementation (references in
``protlint.solve.devices``). Temperature laws, T in kelvin, T0 300.15 K:

- bipolar: I_S(T) = I_S (T/T0)^XTI exp((EG q/k)(1/T0 - 1/T)); B_F(T) = B_F (T/T0)^XTB, B_R alike; I_SE and I_SC grow as
  the NE-th and NC-th root of the same growth over (T/T0)^XTB;
- diode: I_S grows as the N-th root of that law; the breakdown voltage stays;
- MOSFET: K_P(T) = K_P (T/T0)^-1.5; V_TO moves with PHI and the energy gap of silicon 1.16 - 7.02e-4 T^2 / (T + 1108) eV.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Final

from protlint.solve.circuit import Device

LINK_OHM: Final = 1e-6
"""What a link of 0 ohm, or an inductor at rest, is taken as."""

Bounds = Mapping[str, tuple[float, float, float]]
"""Parameter name to default, least and greatest sensible value."""

BIPOLAR: Final[Bounds] = {
    "IS": (1e-16, 1e-30, 1e-2),
    "BF": (100.0, 1e-2, 1e5),
    "NF": (1.0, 0.5, 3.0),
    "VAF": (math.inf, 1.0, math.inf),
    "IKF": (math.inf, 1e-6, math.inf),
    "ISE": (0.0, 0.0, 1e-1),
    "NE": (1.5, 0.5, 10.0),
    "BR": (1.0, 1e-3, 1e5),
    "NR": (1.0, 0.5, 3.0),
    "VAR": (math.inf, 1.0, math.inf),
    "IKR": (math.inf, 1e-6, math.inf),
    "ISC": (0.0, 0.0, 1e-1),
    "NC": (2.0, 0.5, 10.0),
    "RB": (0.0, 0.0, 1e5),
    "IRB": (math.inf, 1e-9, math.inf),
    "RBM": (math.nan, 0.0, 1e5),
    "RE": (0.0, 0.0, 1e4),
    "RC": (0.0, 0.0, 1e4),
    "XTB": (0.0, -5.0, 10.0),
    "EG": (1.11, 0.1, 5.0),
    "XTI": (3.0, -10.0, 20.0),
}
DIODE: Final[Bounds] = {
    "IS": (1e-14, 1e-30, 1e-2),
    "N": (1.0, 0.3, 10.0),
    "RS": (0.0, 0.0, 1e5),
    "EG": (1.11, 0.1, 5.0),
    "XTI": (3.0, -10.0, 20.0),
    "BV": (math.inf, 0.5, math.inf),
    "IBV": (1e-3, 1e-12, 10.0),
    "NBV": (math.nan, 0.1, 50.0),
}
MOSFET: Final[Bounds] = {
    "VTO": (0.0, -50.0, 50.0),
    "KP": (2e-5, 1e-9, 1e5),
    "LAMBDA": (0.0, 0.0, 1.0),
    "GAMMA": (0.0, 0.0, 10.0),
    "PHI": (0.6, 0.1, 3.0),
    "RS": (0.0, 0.0, 1e4),
    "RD": (0.0, 0.0, 1e4),
    "IS": (1e-14, 1e-30, 1e-2),
}
RESISTOR: Final[Bounds] = {
    "R": (math.nan, 0.0, 1e15),
    "TC1": (0.0, -0.1, 0.1),
    "TC2": (0.0, -1e-2, 1e-2),
}
INDUCTOR: Final[Bounds] = {}

KINDS: Final[Mapping[str, Bounds]] = {
    "npn": BIPOLAR,
    "pnp": BIPOLAR,
    "nmos": MOSFET,
    "pmos": MOSFET,
    "diode": DIODE,
    "zener": DIODE,
    "resistor": RESISTOR,
    "inductor": INDUCTOR,
    "capacitor": INDUCTOR,
}
TERMINALS: Final = {"npn": 3, "pnp": 3, "nmos": 3, "pmos": 3}

_ZERO_MEANS_NONE = frozenset({"VAF", "VAR", "IKF", "IKR", "IRB", "BV", "VTF"})


class CircuitError(ValueError):
    """A circuit that cannot be solved as given; the message is the reason, fit for a report."""


def complete(device: Device) -> dict[str, float]:
    """Return the device's static parameters with the published defaults filled in.

    Raises
    ------
    CircuitError
        Where the kind is unknown, the nodes do not fit it, or a parameter is missing or absurd.
    """
    bounds = KINDS.get(device.kind)
    if bounds is None:
        raise CircuitError(f"{device.name}: a {device.kind or 'part of no kind'} cannot be solved")
    if len(device.nodes) != TERMINALS.get(device.kind, 2):
        raise CircuitError(f"{device.name}: {len(device.nodes)} connections do not make a {device.kind}")
    return _implied(device, within_bounds(device, bounds))


def within_bounds(device: Device, bounds: Bounds) -> dict[str, float]:
    """Return the parameters that ``bounds`` names, defaults filled in; NaN where a default of NaN was left.

    Raises
    ------
    CircuitError
        Where a parameter is absurd.
    """
    full: dict[str, float] = {}
    for name, (default, least, greatest) in bounds.items():
        value = device.model.get(name, default)
        if name in _ZERO_MEANS_NONE and value == 0.0:
            value = math.inf
        if math.isnan(default) and name not in device.model:
            full[name] = value
        elif not least <= value <= greatest:
            raise CircuitError(f"{device.name}: {name} = {value:g} lies outside {least:g} to {greatest:g}")
        else:
            full[name] = float(value)
    return full


def _implied(device: Device, full: dict[str, float]) -> dict[str, float]:
    """Fill in the parameters that default to others and check what belongs together."""
    if device.kind in ("npn", "pnp"):
        if math.isnan(full["RBM"]):
            full["RBM"] = full["RB"]
        if device.hfe is not None and not 0.5 <= device.hfe[0] <= device.hfe[1] <= 1e5:
            raise CircuitError(f"{device.name}: hFE from {device.hfe[0]:g} to {device.hfe[1]:g} makes no range")
    elif device.kind in ("diode", "zener"):
        if math.isnan(full["NBV"]):
            full["NBV"] = full["N"]
        if device.kind == "zener" and math.isinf(full["BV"]):
            raise CircuitError(f"{device.name}: a zener without a breakdown voltage BV")
    elif device.kind == "resistor":
        if math.isnan(full["R"]):
            raise CircuitError(f"{device.name}: no resistance R")
        if not 0.0 <= device.tolerance < 1.0:
            raise CircuitError(f"{device.name}: a tolerance of {device.tolerance:g} makes no range")
        full["R"] = max(full["R"], LINK_OHM)
    below, above = device.vbe_spread_V
    if not (0.0 <= below <= 1.0 and 0.0 <= above <= 1.0):
        raise CircuitError(f"{device.name}: a V_BE spread of -{below:g} V and +{above:g} V makes no range")
    if not -300.0 < device.rise_K < 1000.0:
        raise CircuitError(f"{device.name}: {device.rise_K:g} K above ambient makes no temperature")
    return full
