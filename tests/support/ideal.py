"""Circuits of ideal parts, as textbooks draw them: transistors without resistance, Early effect or base current."""

from __future__ import annotations

import math
from collections.abc import Sequence

from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.constants import BOLTZMANN_V_PER_K, T0_K
from tests.support.circuits import fixed

AT_25_MV_DEGC = 0.025 / BOLTZMANN_V_PER_K - 273.15
"""The temperature at which kT/q is the 25 mV that books calculate with."""


def ideal_bipolar(V_BE: float, I_C: float, *, B_F: float = 1e5, ambient_degC: float = 27.0) -> dict[str, float]:
    """The model of a transistor that drops V_BE at I_C and an ambient."""
    temperature_K = ambient_degC + 273.15
    V_T = BOLTZMANN_V_PER_K * temperature_K
    growth = (temperature_K / T0_K - 1.0) * 1.11 / V_T + 3.0 * math.log(temperature_K / T0_K)
    return {"IS": I_C * math.exp(-V_BE / V_T - growth), "BF": B_F}


def with_saturation_current(I_S: float, *, ambient_degC: float, B_F: float = 1e5) -> dict[str, float]:
    """The model of a transistor of a stated saturation current at an ambient."""
    V_T = BOLTZMANN_V_PER_K * (ambient_degC + 273.15)
    return ideal_bipolar(V_T * math.log(1e-3 / I_S), 1e-3, B_F=B_F, ambient_degC=ambient_degC)


def ideal_follower(
    shunt: dict[str, float],
    sense_ohm: float,
    drive_A: float,
    *,
    supply_V: float = 30.0,
    base: str = "SNS",
    more: Sequence[Device] = (),
    output_V: float | None = None,
) -> Circuit:
    """A follower of ideal parts; a current-limited drive of ``drive_A`` feeds its base; ``more`` hangs around the shunt."""
    passing = {"IS": 1e-12, "BF": 1e5}
    devices = (
        Device("QP", "npn", ("SUP", "BASE", "SNS"), passing),
        Device("RS", "resistor", ("SNS", "OUT"), {"R": sense_ohm}),
        Device("QL", "npn", ("BASE", base, "OUT"), shunt),
        *more,
    )
    return Circuit(
        devices=devices,
        held={"GND": fixed(0.0), "SUP": fixed(supply_V)},
        drive=Drive("BASE", fixed(0.0), fixed(supply_V), current_A=drive_A),
        output="OUT",
        shorts=("GND",),
        shunt=("QL",),
        pass_devices=("QP",),
        sense=("RS",),
        output_V=output_V,
        output_reach_V=(0.0, supply_V),
        ground_leg=bool(more),
    )


def resistor(name: str, a: str, b: str, ohm: float) -> Device:
    """A resistor."""
    return Device(name, "resistor", (a, b), {"R": ohm})
