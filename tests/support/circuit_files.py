"""A circuit built by hand, as the files a user would give: a netlist in EDIF, a limits file and part data."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path

from protlint.limits import Range
from protlint.solve.circuit import Circuit, Device
from protlint.toml.text import toml_key

PORTS = {
    "npn": "C B E", "pnp": "C B E", "nmos": "D G S", "pmos": "D G S", "diode": "A K", "zener": "A K",
    "resistor": "1 2", "capacitor": "1 2",
}  # fmt: skip
CELLS = {
    "npn": "NPN", "pnp": "PNP", "nmos": "NMOS", "pmos": "PMOS", "diode": "DIODE", "zener": "ZENER",
    "resistor": "RES", "capacitor": "CAP",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Files:
    """The files of one circuit."""

    netlist: Path
    limits: Path
    parts: Path


def plain(circuit: Circuit) -> Circuit:
    """Return the circuit without what no netlist states: the temperature coefficients of resistors."""
    devices = tuple(replace(one, model={"R": one.model["R"]}) if one.kind == "resistor" else one for one in circuit.devices)
    return replace(circuit, devices=devices)


def write_files(circuit: Circuit, folder: Path) -> Files:
    """Write a circuit's files into a folder."""
    files = Files(folder / "board.edf", folder / "limits.toml", folder / "parts.toml")
    files.netlist.write_text("\n".join(_edif(circuit)) + "\n")
    files.limits.write_text("\n".join(_limits(circuit)) + "\n")
    files.parts.write_text("\n".join(_parts(circuit)) + "\n")
    return files


def _name(text: str) -> str:
    identifier = re.sub("[^A-Za-z0-9_]", "_", text)
    identifier = identifier if identifier[0].isalpha() else f"&{identifier}"
    return identifier if identifier == text else f'(rename {identifier} "{text}")'


def _identifier(text: str) -> str:
    return _name(text).removeprefix("(rename ").split()[0]


def _edif(circuit: Circuit) -> Iterator[str]:
    yield "(edif BOARD (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))"
    yield " (library PARTS (edifLevel 0) (technology (numberDefinition))"
    for kind in sorted({device.kind for device in circuit.devices}):
        ports = " ".join(f"(port {_name(port)})" for port in PORTS[kind].split())
        yield f"  (cell {CELLS[kind]} (cellType GENERIC) (view V (viewType NETLIST) (interface {ports})))"
    yield " )"
    yield " (library TOP (edifLevel 0) (technology (numberDefinition))"
    yield "  (cell BOARD (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents"
    nets: dict[str, list[str]] = {}
    for device in circuit.devices:
        cell = CELLS[device.kind]
        yield f"   (instance {device.name} (viewRef V (cellRef {cell} (libraryRef PARTS)))"
        yield "".join(f'    (property {key} (string "{text}"))' for key, text in _properties(device)) + ")"
        for port, net in zip(PORTS[device.kind].split(), device.nodes, strict=True):
            nets.setdefault(net, []).append(f"(portRef {_identifier(port)} (instanceRef {device.name}))")
    for net, pins in nets.items():
        yield f"   (net {_name(net)} (joined {' '.join(pins)}))"
    yield "  ))))"
    yield " (design BOARD (cellRef BOARD (libraryRef TOP))))"


def _properties(device: Device) -> Iterator[tuple[str, str]]:
    if device.kind in ("resistor", "capacitor"):
        yield "VALUE", f"{device.model['R']:.9g}" if device.kind == "resistor" else f"{device.model['C'] * 1e12:.9g}p"
        if device.tolerance:
            yield "TOLERANCE", f"{device.tolerance * 100:.9g}%37%"
    else:
        yield "PART_NUMBER", f"TYPE_{device.name}"


def _limits(circuit: Circuit) -> Iterator[str]:
    spreads = {device.vbe_spread_V for device in circuit.devices if device.kind in ("npn", "pnp")}
    low, high = max(spreads, default=(0.0, 0.0))
    yield "[board]"
    yield 'ambient = ["-10 degC", "27 degC", "85 degC"]'
    yield 'resistor_tolerance = "1 %"'
    yield f'vbe_spread = {{ low = "{low} V", high = "{high} V" }}'
    yield "[supply]"
    for node, voltage in circuit.held.items():
        yield f"{toml_key(node)} = {_range(voltage)}"
    drive = circuit.drive
    yield f"[drive.{toml_key(drive.node)}]"
    yield f"low = {_range(drive.low_V)}"
    yield f"high = {_range(drive.high_V)}"
    yield f'resistance = "{drive.resistance_ohm!r} ohm"'
    if drive.current_A is not None:
        yield f'current = "{drive.current_A!r} A"'
    yield '[limiter."*"]'
    yield f"shorted_to = [{', '.join(chr(34) + node + chr(34) for node in circuit.shorts)}]"
    if circuit.output_V is not None:
        yield f'output = "{circuit.output_V} V"'


def _range(voltage: Range) -> str:
    return f'{{ low = "{voltage.low!r} V", usual = "{voltage.usual!r} V", high = "{voltage.high!r} V" }}'


def _parts(circuit: Circuit) -> Iterator[str]:
    for device in circuit.devices:
        if device.kind in ("resistor", "capacitor"):
            continue
        yield f"[TYPE_{device.name}]"
        yield f'kind = "{device.kind}"'
        yield 'source = "made for a test"'
        if device.hfe is not None:
            yield f"[TYPE_{device.name}.ratings]"
            yield f"hfe_min = {device.hfe[0]!r}"
            yield f"hfe_max = {device.hfe[1]!r}"
        yield f"[TYPE_{device.name}.model]"
        for key, value in device.model.items():
            yield f"{key} = {float(value)!r}"
