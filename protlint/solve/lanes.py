"""Operating conditions of a network, many at once: temperatures, voltages, tolerances; and device parameters under them.

The temperature laws are those of ``protlint.solve.parameters``.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any, cast

import numpy as np

from protlint.solve import devices, gummel_poon
from protlint.solve.constants import BOLTZMANN_V_PER_K, T0_K
from protlint.solve.devices import Array, IntArray
from protlint.solve.network import LEAST_SOURCE_OHM, Group, Network
from protlint.solve.parameters import LINK_OHM

Record = gummel_poon.Bipolars | devices.Mosfets | devices.Diodes | devices.Source


@dataclass(frozen=True, slots=True)
class Variation:
    """How lanes depart from the nominal devices; None where they do not.

    ``resistance`` are factors (resistors, lanes). By family: ``shift_V`` by how much V_BE (a diode's forward voltage, a
    MOSFET's threshold) is raised, and ``bf`` the bipolars' B_F itself, NaN where the nominal law holds.
    """

    resistance: Array | None = None
    shift_V: dict[str, Array] | None = None
    bf: Array | None = None

    def pick(self, which: IntArray) -> Variation:
        """Return some of the lanes."""
        return Variation(
            None if self.resistance is None else self.resistance[:, which],
            None if self.shift_V is None else {family: shift[:, which] for family, shift in self.shift_V.items()},
            None if self.bf is None else self.bf[:, which],
        )


@dataclass(frozen=True, slots=True)
class Lanes:
    """Operating conditions, one a lane: ambient in kelvin (lanes,), known voltages (known nodes, lanes), with the shunt in
    (1) or taken out (0) (lanes,), and the devices' variation."""

    ambient_K: Array
    known_V: Array
    present: Array | None = None
    variation: Variation = Variation()

    @property
    def count(self) -> int:
        """How many lanes."""
        return int(self.known_V.shape[1])

    def pick(self, which: IntArray) -> Lanes:
        """Return some of the lanes."""
        present = None if self.present is None else self.present[which]
        return Lanes(self.ambient_K[which], self.known_V[:, which], present, self.variation.pick(which))


@dataclass(frozen=True, slots=True)
class Parameters:
    """Device parameters at the lanes' temperatures: one record a group (or resistance and limit of the drive), and the
    resistors' conductances (resistors, lanes); ``present`` by group, 1.0 where no shunt is in it."""

    records: tuple[Record, ...]
    conductance: Array
    present: tuple[Array | float, ...]


def known_voltages(held_V: Array, output_V: Array, drive_V: Array) -> Array:
    """Stack held (held nodes, lanes), output and drive voltages (lanes,) as ``Lanes.known_V``."""
    return np.concatenate((held_V, output_V[None], drive_V[None]))


def parameters(network: Network, lanes: Lanes) -> Parameters:
    """Return every device's parameters at the lanes' temperatures and variations."""
    varied = lanes.variation
    base = network.resistor_base
    ohms = devices.resistance(base["R"], base["TC1"], base["TC2"], lanes.ambient_K + base["rise_K"])
    if varied.resistance is not None:
        ohms = ohms * varied.resistance
    records: list[Record] = []
    present: list[Array | float] = []
    for group in network.groups:
        shift = None if varied.shift_V is None else varied.shift_V.get(group.family)
        temperature = lanes.ambient_K + group.rise_K
        if group.family == "bipolar":
            records.append(_bipolars(group, temperature, shift, varied.bf))
        elif group.family == "mosfet":
            records.append(_mosfets(group, temperature, shift))
        elif group.family == "diode":
            records.append(_diodes(group, temperature, shift))
        else:
            drive = network.circuit.drive
            ones = np.ones((1, lanes.count))
            records.append(
                devices.Source(ones * max(drive.resistance_ohm, LEAST_SOURCE_OHM), ones * (drive.current_A or 0.0))
            )
        if lanes.present is None or not group.is_shunt.any():
            present.append(1.0)
        else:
            present.append(1.0 - group.is_shunt * (1.0 - lanes.present))
    return Parameters(tuple(records), 1.0 / np.maximum(ohms, LINK_OHM), tuple(present))


def take(p: Parameters, lanes: IntArray) -> Parameters:
    """Return the parameters of some lanes only."""
    records: list[Record] = []
    for record in p.records:
        values = {field.name: getattr(record, field.name) for field in fields(record)}
        chosen = {name: None if value is None else _pick(value, lanes) for name, value in values.items()}
        records.append(replace(cast(Any, record), **chosen))
    present = tuple(value if isinstance(value, float) else value[:, lanes] for value in p.present)
    return Parameters(tuple(records), _pick(p.conductance, lanes), present)


def _pick(values: Array, lanes: IntArray) -> Array:
    return values if values.shape[-1] == 1 else values[..., lanes]


def _bipolars(group: Group, temperature_K: Array, shift_V: Array | None, bf: Array | None) -> gummel_poon.Bipolars:
    p = group.base
    V_T = devices.thermal_voltage(temperature_K)
    growth = devices.junction_growth(temperature_K, p["EG"], p["XTI"])
    beta = (temperature_K / T0_K) ** p["XTB"]
    B_F = p["BF"] * beta
    if bf is not None:
        B_F = np.where(np.isnan(bf), B_F, bf)
    I_S = p["IS"] * np.exp(growth)
    if shift_V is not None:
        I_S = I_S * np.exp(-shift_V / (p["NF"] * V_T))
    varies = bool((p["RBM"] != p["RB"]).any())
    leaks = bool(p["ISC"].any())
    N_V = np.stack((p["NF"] * V_T, p["NR"] * V_T, p["NE"] * V_T))
    current = np.stack((I_S, I_S, p["ISE"] * np.exp(growth / p["NE"]) / beta))
    return gummel_poon.Bipolars(
        I=current,
        per_V=1.0 / N_V,
        V_crit=devices.critical_voltage(N_V[:2], current[:2]),
        per_B=np.stack((1.0 / B_F, 1.0 / (p["BR"] * beta))),
        early=np.stack((1.0 / p["VAR"], 1.0 / p["VAF"])),
        knee=np.stack((1.0 / p["IKF"], 1.0 / p["IKR"])),
        R_side=np.stack((p["RE"], p["RC"])),
        R_B=p["RB"],
        I_SC=p["ISC"] * np.exp(growth / p["NC"]) / beta if leaks else None,
        per_V_C=1.0 / (p["NC"] * V_T) if leaks else None,
        R_BM=p["RBM"] if varies else None,
        I_RB=p["IRB"] if varies and np.isfinite(p["IRB"]).any() else None,
    )


def _mosfets(group: Group, temperature_K: Array, shift_V: Array | None) -> devices.Mosfets:
    """Return the MOSFETs' parameters; V_TO in the sense of an N-channel type, moving as the module ``parameters`` says."""
    p = group.base
    V_T = devices.thermal_voltage(temperature_K)
    ratio = temperature_K / T0_K
    gap, gap_0 = _silicon_gap(temperature_K), _silicon_gap(np.asarray(T0_K))
    V_T0 = BOLTZMANN_V_PER_K * T0_K
    phi = junction_potential(p["PHI"], temperature_K)
    n_VTO = group.sign * p["VTO"]
    built_in = n_VTO - p["GAMMA"] * np.sqrt(p["PHI"]) + 0.5 * group.sign * (gap_0 - gap) + 0.5 * (phi - p["PHI"])
    phi = np.maximum(phi, 0.05)
    V_TO = built_in + p["GAMMA"] * np.sqrt(phi)
    I_S = p["IS"] * np.exp(gap_0 / V_T0 - gap / V_T)
    return devices.Mosfets(
        V_TO=V_TO if shift_V is None else V_TO + shift_V,
        K_P=p["KP"] * ratio**-1.5,
        LAMBDA=p["LAMBDA"],
        GAMMA=p["GAMMA"] if p["GAMMA"].any() else None,
        PHI=phi,
        R_S=p["RS"],
        R_D=p["RD"],
        I_S=I_S,
        V_T=V_T,
        V_crit=devices.critical_voltage(V_T, I_S),
    )


def _diodes(group: Group, temperature_K: Array, shift_V: Array | None) -> devices.Diodes:
    p = group.base
    V_T = devices.thermal_voltage(temperature_K)
    I_S = p["IS"] * np.exp(devices.junction_growth(temperature_K, p["EG"], p["XTI"]) / p["N"])
    if shift_V is not None:
        I_S = I_S * np.exp(-shift_V / (p["N"] * V_T))
    V_N, V_B = p["N"] * V_T, p["NBV"] * V_T
    return devices.Diodes(
        I_S=I_S,
        V_N=V_N,
        V_crit=devices.critical_voltage(V_N, I_S),
        R_S=p["RS"],
        B_V=p["BV"] if np.isfinite(p["BV"]).any() else None,
        I_BV=p["IBV"],
        V_B=V_B,
        V_B_crit=devices.critical_voltage(V_B, p["IBV"]),
    )


def junction_potential(V_J: Array, temperature_K: Array) -> Array:
    """Return a junction's built-in potential at a temperature, in volts, from that at 27 degC (Nagel 1975).

    V_J(T) = (T/T0) (V_J - c(T0)) + c(T) with c(T) = -2 V_T (1.5 ln(T/T0) + 0.5 (1.1150877 V/V_T0 - E_g(T)/V_T)).
    """
    ratio = temperature_K / T0_K
    V_T0 = BOLTZMANN_V_PER_K * T0_K
    V_T = devices.thermal_voltage(temperature_K)
    correction = -2.0 * V_T * (1.5 * np.log(ratio) + 0.5 * (1.1150877 / V_T0 - _silicon_gap(temperature_K) / V_T))
    # zero but for the rounding of the published gap
    correction_0 = _silicon_gap(np.asarray(T0_K)) - 1.1150877
    potential: Array = ratio * (V_J - correction_0) + correction
    return potential


def _silicon_gap(temperature_K: Array) -> Array:
    return 1.16 - 7.02e-4 * temperature_K * temperature_K / (temperature_K + 1108.0)
