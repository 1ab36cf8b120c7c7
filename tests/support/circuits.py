"""Circuits built from the solved bench circuits, and by hand from short descriptions."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from typing import Any

from protlint.limits import Range
from protlint.solve.circuit import Circuit, Device, Drive
from tests.support.paths import FIXTURES

PIN_ORDER = {
    "npn": "CBE",
    "pnp": "CBE",
    "nmos": "DGS",
    "pmos": "DGS",
    "diode": "AK",
    "zener": "AK",
    "resistor": "12",
    "capacitor": "12",
}

Data = Mapping[str, Any]


def load_bench() -> Data:
    """Return the solved bench circuits."""
    data: Data = json.loads((FIXTURES / "bench-circuits.json").read_text())
    return data


def ohms(text: str) -> float:
    """Read ``2k2``, ``0.68``, ``1k``."""
    return float(text.replace("k", ".") + "") * 1e3 if "k" in text else float(text)


def fixed(volts: float) -> Range:
    """A voltage without a spread."""
    return Range(volts, volts, volts)


def around(device: Device) -> Circuit:
    """A circuit that holds a device's terminals: first at OUT, second at DRV (or ground), third at ground."""
    return Circuit(
        devices=(device,),
        held={"GND": fixed(0.0), "SUP": fixed(5.0)},
        drive=Drive("DRV", fixed(0.0), fixed(5.0)),
        output="OUT",
        shorts=("SUP",),
        shunt=(),
        pass_devices=(),
        sense=(),
    )


def bench_circuit(name: str, *, tolerance: float = 0.01, vbe_spread_V: float = 0.03, hfe: bool = True) -> Circuit:
    """Build one of the solved bench circuits."""
    data = load_bench()
    entry = data["circuits"][name]
    devices = []
    for part in entry["parts"]:
        kind = part["kind"]
        nodes = tuple(part["pins"][pin] for pin in PIN_ORDER[kind])
        if kind == "resistor":
            devices.append(Device(part["designator"], kind, nodes, {"R": ohms(part["value"])}, tolerance=tolerance))
            continue
        number = part["part_number"]
        model = {key: value for key, value in data["models_at_27_degC"][number].items() if key != "kind"}
        bounds = data["hfe_min_max"].get(number)
        bipolar = kind in ("npn", "pnp")
        devices.append(
            Device(
                part["designator"],
                kind,
                nodes,
                model,
                hfe=tuple(bounds) if bounds and hfe and bipolar else None,
                vbe_spread_V=(vbe_spread_V, vbe_spread_V) if bipolar else (0.0, 0.0),
            )
        )
    held = {"GND": fixed(0.0)} | {net: fixed(float(volts)) for net, volts in entry["supply_V"].items()}
    ends = sorted((float(entry["drive"]["from_V"]), float(entry["drive"]["to_V"])))
    output, shunt = entry["short"]["net"], entry["shunt"]
    emitter_side = {"sink": ("R2",), "follower": ("R11",), "source_pnp": ("R21",), "darlington_follower": ("R32",)}
    sense = emitter_side.get(name, ("R41",) if name == "nmos_sink" else ("R61",))
    passing = _passing(devices, shunt, sense)
    return Circuit(
        devices=tuple(devices),
        held=held,
        drive=Drive(entry["drive"]["net"], fixed(ends[0]), fixed(ends[1])),
        output=output,
        shorts=(entry["short"]["held_at"],),
        shunt=(shunt,),
        pass_devices=passing,
        sense=sense,
        output_reach_V=(min(r.low for r in held.values()), max(r.high for r in held.values())),
        ground_leg=name == "foldback",
    )


def _passing(devices: Sequence[Device], shunt: str, sense: Sequence[str]) -> tuple[str, ...]:
    watched = {node for device in devices if device.name in sense for node in device.nodes}
    return tuple(
        device.name
        for device in devices
        if device.kind in ("npn", "pnp", "nmos", "pmos") and device.name != shunt and device.nodes[2] in watched
    )
