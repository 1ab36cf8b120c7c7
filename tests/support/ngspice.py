"""The general-purpose circuit simulator ngspice as an outside oracle: decks from circuits, and its answers.

Settings are those of the solved bench circuits: TNOM 27 degC, GMIN 1e-13, RELTOL 1e-6, level-1 MOSFETs of 1 um by 1 um.
"""

from __future__ import annotations

import re
import shutil
import subprocess
import tempfile
from collections.abc import Sequence
from functools import cache
from pathlib import Path

import pytest

from protlint.solve.circuit import Circuit, Device
from protlint.solve.parameters import KINDS

PROGRAM = shutil.which("ngspice")
needs_ngspice = pytest.mark.skipif(PROGRAM is None, reason="ngspice is not installed: nothing was compared with a simulator")
OPTIONS = "tnom=27 gmin=1e-13 reltol=1e-6 abstol=1e-13 vntol=1e-9 itl1=500 itl2=500"

_LETTER = {"npn": "Q", "pnp": "Q", "nmos": "M", "pmos": "M", "diode": "D", "zener": "D", "resistor": "R"}
_MODEL = {"npn": "NPN", "pnp": "PNP", "nmos": "NMOS", "pmos": "PMOS", "diode": "D", "zener": "D"}


@cache
def version() -> str:
    """Return the program's version, ``39`` say."""
    assert PROGRAM is not None
    printed = subprocess.run([PROGRAM, "--version"], capture_output=True, text=True, timeout=60, check=True).stdout
    found = re.search(r"ngspice-(\S+)", printed)
    assert found, printed
    return found[1]


def swept(
    circuit: Circuit,
    ambient_degC: float,
    *,
    sweep: str,
    start_V: float,
    stop_V: float,
    points: int,
    output_V: float,
    drive_V: float,
    shunt: bool = True,
) -> list[tuple[float, float]]:
    """Sweep the ``drive`` or the ``output`` voltage; return (voltage, current into the circuit at the output) pairs."""
    source = {"drive": "vdrive", "output": "voutput"}[sweep]
    step = (stop_V - start_V) / (points - 1)
    text = deck(circuit, output_V=output_V, drive_V=drive_V, shunt=shunt)
    with tempfile.TemporaryDirectory() as folder:
        data = Path(folder) / "out.data"
        control = (
            ".control",
            "set numdgt=12",
            f"option temp={ambient_degC!r}",
            f"dc {source} {start_V!r} {stop_V + 0.01 * step!r} {step!r}",
            f"wrdata {data} i(voutput)",
            "quit",
            ".endc",
        )
        path = Path(folder) / "deck.cir"
        path.write_text("\n".join([*text, *control, ".end", ""]))
        assert PROGRAM is not None
        done = subprocess.run([PROGRAM, "-b", str(path)], capture_output=True, text=True, timeout=60, check=False)
        if not data.exists():
            raise AssertionError(f"ngspice found nothing:\n{done.stdout}\n{done.stderr}")
        rows = [tuple(float(word) for word in line.split()) for line in data.read_text().splitlines() if line.strip()]
    return [(voltage, -current) for voltage, current in rows]


def deck(circuit: Circuit, *, output_V: float, drive_V: float, shunt: bool = True, options: str = OPTIONS) -> list[str]:
    """Return the lines of a deck with the output and the drive at given voltages."""
    lines = ["limiter", f".options {options}"]
    for number, device in enumerate(circuit.devices):
        if device.kind in _LETTER and (shunt or device.name not in circuit.shunt):
            lines += _device(device, number)
    for number, (node, limits) in enumerate(circuit.held.items()):
        if node not in (circuit.output, circuit.drive.node):
            lines.append(f"vheld{number} {_node(node)} 0 {limits.usual!r}")
    lines.append(f"voutput {_node(circuit.output)} 0 {output_V!r}")
    drive = circuit.drive
    if drive.resistance_ohm == 0.0 and drive.current_A is None:
        return [*lines, f"vdrive {_node(drive.node)} 0 {drive_V!r}"]
    lines.append(f"vdrive ndrivesource 0 {drive_V!r}")
    if drive.current_A is None:
        return [*lines, f"rdrive ndrivesource {_node(drive.node)} {drive.resistance_ohm!r}"]
    wanted = f"(v(ndrivesource)-v({_node(drive.node)}))/{max(drive.resistance_ohm, 1e-3)!r}"
    limited = f"max(min({wanted},{drive.current_A!r}),{-drive.current_A!r})"
    return [*lines, f"bdrive ndrivesource {_node(drive.node)} i={limited}"]


def _node(name: str) -> str:
    return "n" + "".join(letter if letter.isalnum() else "_" for letter in name).lower()


def _device(device: Device, number: int) -> Sequence[str]:
    name = f"{_LETTER[device.kind]}{number}"
    nodes = " ".join(_node(node) for node in device.nodes)
    rise = f" dtemp={device.rise_K!r}" if device.rise_K else ""
    if device.kind == "resistor":
        ohm, tc = max(device.model["R"], 1e-6), device.model
        return [f"{name} {nodes} {ohm!r} tc1={tc.get('TC1', 0.0)!r} tc2={tc.get('TC2', 0.0)!r}{rise}"]
    wanted = KINDS[device.kind]
    parameters = " ".join(f"{key}={value!r}" for key, value in device.model.items() if key in wanted)
    if device.kind in ("nmos", "pmos"):
        nodes, rise, parameters = f"{nodes} {_node(device.nodes[2])}", f" w=1u l=1u{rise}", f"level=1 {parameters}"
    return [f"{name} {nodes} model{number}{rise}", f".model model{number} {_MODEL[device.kind]}({parameters})"]
