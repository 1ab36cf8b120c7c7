"""Circuits that move: the solved bench circuits with an added capacitor, random ones, and ngspice decks for both."""

from __future__ import annotations

import re
import subprocess
import tempfile
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from protlint.solve.charges import FAMILIES
from protlint.solve.circuit import Circuit, Device
from protlint.solve.parameters import KINDS
from tests.support import ngspice
from tests.support.circuits import bench_circuit, load_bench
from tests.support.shapes import drawn

ADDED = "C99"
UNITS = {"pF": 1e-12, "nF": 1e-9, "uF": 1e-6}
MOVING = ("sink", "follower", "source_pnp", "darlington_follower")
"""The bench circuits that come with dynamic data."""

_FAMILY = {"npn": "bipolar", "pnp": "bipolar", "nmos": "mosfet", "pmos": "mosfet", "diode": "diode", "zener": "diode"}


def shunt_of(circuit: Circuit) -> Device:
    """Return the circuit's (first) shunt."""
    return next(device for device in circuit.devices if device.name == circuit.shunt[0])


def with_capacitor(circuit: Circuit, nodes: tuple[str, str], farad: float, name: str = ADDED) -> Circuit:
    """Return the circuit with one capacitor more."""
    return replace(circuit, devices=(*circuit.devices, Device(name, "capacitor", nodes, {"C": farad})))


def bench_case(name: str, case: str) -> Circuit:
    """Return a bench circuit as one of its cases has it: ``as drawn``, ``100 nF base to emitter of the shunt`` ..."""
    circuit = bench_circuit(name)
    if case == "as drawn":
        return circuit
    value, unit, first, _, second, *_ = case.split()
    ends = dict(zip(("collector", "base", "emitter"), shunt_of(circuit).nodes, strict=True))
    return with_capacitor(circuit, (ends[first], ends[second]), float(value) * UNITS[unit])


def bench_cases(kind: str) -> list[tuple[str, str, dict[str, Any]]]:
    """Return (circuit, case, figures) of every case of a kind: ``loop`` or ``step_into_short``."""
    circuits = load_bench()["circuits"]
    return [(name, case, found) for name in circuits for case, found in circuits[name].get(f"{kind}_at_27_degC", {}).items()]


def random_circuit(seed: int) -> Circuit:
    """Return a bench circuit with resistors, models and capacitors moved at random, by a seed."""
    rng = np.random.default_rng(seed)
    circuit = bench_circuit(MOVING[int(rng.integers(len(MOVING)))])
    devices = []
    for device in circuit.devices:
        if device.kind == "resistor":
            spread = 0.3 if device.name in circuit.sense else 1.0
            model = {"R": float(device.model["R"] * np.exp(rng.uniform(-spread, spread)))}
        else:
            moved = {
                key: float(device.model[key] * np.exp(rng.uniform(-0.7, 0.7))) for key in ("CJE", "CJC", "TF", "BF", "IKF")
            }
            more = {
                "TR": float(rng.uniform(0.0, 1e-7)),
                "MJE": float(rng.uniform(0.25, 0.5)),
                "VJC": float(rng.uniform(0.5, 0.9)),
                "XCJC": float(rng.choice([1.0, 0.6])),
                "RBM": float(device.model["RB"] * rng.choice([1.0, 0.3])),
            }
            model = {**device.model, **moved, **more}
        devices.append(replace(device, model=model))
    circuit = replace(circuit, devices=tuple(devices))
    collector, base, emitter = shunt_of(circuit).nodes
    places = ((collector, base), (collector, emitter), (base, emitter))
    for number in range(int(rng.integers(0, 3))):
        nodes = places[int(rng.integers(3))]
        circuit = with_capacitor(circuit, nodes, float(10.0 ** rng.uniform(-11.0, -7.0)), f"C{90 + number}")
    return circuit


def on_end_V(circuit: Circuit) -> float:
    """Return the drive's end that turns the pass device on: high for an N-type first device, low for a P-type one."""
    first = next(device for device in circuit.devices if device.kind in ("npn", "pnp", "nmos", "pmos"))
    return (circuit.drive.high_V if first.kind in ("npn", "nmos") else circuit.drive.low_V).usual


def moving_shape(shape: str, seed: int) -> Circuit:
    """Return a drawn circuit of a shape with charges for every device, capacitors at the shunt or none, and, every other
    time, a capacitor at its output and an inductor from there to the short."""
    circuit, rng = drawn(shape, seed), np.random.default_rng([seed, *shape.encode()])

    def about(usual: float, spread: float = 2.0) -> float:
        return float(usual * spread ** rng.uniform(-1.0, 1.0))

    def charged(device: Device) -> dict[str, float]:
        if device.kind in ("npn", "pnp"):
            size = 30.0 if device.name in circuit.pass_devices else 1.0
            more = {"CJE": about(30e-12 * size), "CJC": about(10e-12 * size), "TF": about(0.5e-9 * size**0.8)}
            more |= {"TR": about(1e-8), "MJE": float(rng.uniform(0.25, 0.5)), "VJC": float(rng.uniform(0.5, 0.9))}
            return more | {"XCJC": float(rng.choice([1.0, 0.6]))}
        if device.kind in ("nmos", "pmos"):
            # published overlap capacitances are by metre of channel width, which is 1 um here
            return {"CGSO": about(1e-3), "CGDO": about(1e-4), "CBD": about(3e-10), "PB": float(rng.uniform(0.6, 0.9))}
        if device.kind in ("diode", "zener"):
            return {"CJO": about(10e-12, 4.0), "VJ": float(rng.uniform(0.5, 1.0)), "M": 0.4, "TT": about(5e-9)}
        return {}

    devices = [replace(device, model={**device.model, **charged(device)}) for device in circuit.devices]
    ends = [devices[[one.name for one in devices].index(circuit.shunt[0])].nodes[0]]
    last = next(one for one in devices if one.name == circuit.shunt[-1])
    ends += [*last.nodes[1:-1], last.nodes[-1]]
    for number in range(int(rng.integers(0, 3))):
        first, second = sorted(rng.choice(len(ends), 2, replace=False).tolist())
        value = {"C": float(10.0 ** rng.uniform(-11.0, -7.5))}
        devices.append(Device(f"C{90 + number}", "capacitor", (ends[first], ends[second]), value))
    if rng.random() < 0.5:
        devices = [replace(one, nodes=tuple("BOARD" if node == "OUT" else node for node in one.nodes)) for one in devices]
        devices.append(Device("L90", "inductor", ("BOARD", "OUT"), {"L": float(10.0 ** rng.uniform(-7.0, -5.0))}))
        devices.append(Device("C89", "capacitor", ("BOARD", "GND"), {"C": float(10.0 ** rng.uniform(-9.0, -6.0))}))
        devices.append(Device("R89", "resistor", ("BOARD", "GND"), {"R": about(300.0)}))
    return replace(circuit, devices=tuple(devices))


def moving_deck(
    circuit: Circuit, *, output_V: float, drive_V: float, cut: str | None = None, options: str = ngspice.OPTIONS
) -> list[str]:
    """Return a deck with capacitors, inductors and the devices' dynamic parameters.

    With ``cut`` the base of that device hangs on its net by the source ``vcut`` alone, from node ``ncut`` to the net.
    """
    static = replace(
        circuit, devices=tuple(device for device in circuit.devices if device.kind not in ("capacitor", "inductor"))
    )
    numbers = {device.name: number for number, device in enumerate(static.devices)}
    lines = ngspice.deck(static, output_V=output_V, drive_V=drive_V, options=options)
    for device in circuit.devices:
        nodes = [ngspice._node(node) for node in device.nodes]
        if device.kind in ("capacitor", "inductor"):
            symbol = "C" if device.kind == "capacitor" else "L"
            lines.append(f"{symbol}{device.name} {' '.join(nodes)} {device.model[symbol]!r}")
            continue
        bounds = FAMILIES.get(_FAMILY.get(device.kind, ""), {})
        number = numbers[device.name]
        static_names = set(KINDS[device.kind])
        more = " ".join(
            f"{key}={value!r}" for key, value in device.model.items() if key in bounds and key not in static_names
        )
        own = f".model model{number} "
        lines = [line[:-1] + f" {more})" if more and line.startswith(own) else line for line in lines]
        if device.name == cut:
            whole = f"Q{number} {' '.join(nodes)} "
            lines = [line.replace(whole, f"Q{number} {nodes[0]} ncut {nodes[2]} ") for line in lines]
            lines.append(f"vcut ncut {nodes[1]} 0 ac 1")
    return lines


def run_deck(lines: Sequence[str], commands: Sequence[str], *, timeout_s: float = 60.0) -> str:
    """Run a deck with commands and return what ngspice printed."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "deck.cir"
        path.write_text("\n".join([*lines, ".control", "set numdgt=9", *commands, "quit", ".endc", ".end", ""]))
        assert ngspice.PROGRAM is not None
        done = subprocess.run(
            [ngspice.PROGRAM, "-b", str(path)], capture_output=True, text=True, timeout=timeout_s, check=False, cwd=folder
        )
    return done.stdout + done.stderr


def simulated_poles(circuit: Circuit, *, output_V: float, drive_V: float) -> np.ndarray:
    """Return the poles (rad/s) that ngspice finds, empty where its analysis fails or stalls at its first guess, 1e8.

    It gets behavioural sources wrong, so a drive with a current limit cannot be asked about.
    """
    assert circuit.drive.current_A is None
    node = ngspice._node(shunt_of(circuit).nodes[1])
    text = run_deck(moving_deck(circuit, output_V=output_V, drive_V=drive_V), (f"pz {node} 0 {node} 0 cur pol", "print all"))
    found = re.findall(r"pole\(\d+\) = ([-+.\deE]+),([-+.\deE]+)", text)
    poles = np.array([complex(float(real), float(imaginary)) for real, imaginary in found])
    return poles[:0] if (np.abs(np.abs(poles) / 1e8 - 1.0) < 0.01).any() else poles


def simulated_gain(circuit: Circuit, frequency_Hz: Sequence[float], *, output_V: float, drive_V: float) -> np.ndarray:
    """Return the loop gain at the shunt's base by double injection, two small-signal runs of ngspice for each frequency."""
    shunt = shunt_of(circuit)
    lines = moving_deck(circuit, output_V=output_V, drive_V=drive_V, cut=shunt.name)
    net = ngspice._node(shunt.nodes[1])
    lines.append("iside 0 ncut 0 ac 0")
    commands = []
    for frequency in frequency_Hz:
        commands += [
            "alter vcut ac = 1",
            "alter iside ac = 0",
            f"ac lin 1 {frequency!r} {frequency!r}",
            f"print v({net})/v(ncut)",
            "alter vcut ac = 0",
            "alter iside ac = 1",
            f"ac lin 1 {frequency!r} {frequency!r}",
            "print i(vcut)",
        ]
    text = run_deck(lines, commands)
    values = [complex(float(a), float(b)) for a, b in re.findall(r"= *([-+.\deE]+), *([-+.\deE]+)", text)]
    values_V, values_A = np.array(values[0::2]), np.array(values[1::2])
    T_v, T_i = -values_V, values_A / (1.0 - values_A)
    gain: np.ndarray = (T_v * T_i - 1.0) / (T_v + T_i + 2.0)
    return gain


def simulated_step(
    circuit: Circuit,
    *,
    begin_V: float,
    short_V: float,
    drive_V: float,
    until_s: float,
    longest_s: float,
    rests_s: float = 0.0,
    first_s: float | None = None,
    control: bool = True,
    options: str = ngspice.OPTIONS,
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Run ngspice through the step into the short in 100 ns; return times from its start, output currents into the circuit,
    and the power into the (first) output device at its terminals, at the simulator's own time points.

    ``longest_s`` is the longest time step, a hundredth of ``first_s`` (by default the same) the first one; the circuit rests
    for ``rests_s`` before. All three place the time points. Without ``control`` the power is the one into the device's first
    terminal, against its common one, and nothing is in its control's lead: the source that reads the current there has to
    converge too, which moves time points.
    """
    passing = next(device for device in circuit.devices if device.name == circuit.pass_devices[0])
    output = ngspice._node(circuit.output)
    rest = f"0 {begin_V!r} " if rests_s else ""
    ramp = f"pwl({rest}{rests_s!r} {begin_V!r} {rests_s + 1e-7!r} {short_V!r})"
    first, base, common = (ngspice._node(node) for node in passing.nodes)
    lines = [
        f"voutput {output} 0 {ramp}"
        if line.startswith("voutput ")
        else line.replace(f" {first} {base} {common}", f" nfirst {'ncontrol' if control else base} {common}", 1)
        if line[0] in "QM"
        else line
        for line in moving_deck(circuit, output_V=begin_V, drive_V=drive_V, options=options)
    ]
    lines.append(f"vfirst {first} nfirst 0")
    power = f"(v({first})-v({common}))*i(vfirst)"
    if control:
        lines.append(f"vcontrol {base} ncontrol 0")
        power += f"+(v({base})-v({common}))*i(vcontrol)"
    with tempfile.TemporaryDirectory() as folder:
        data = Path(folder) / "out.data"
        commands = (
            f"tran {first_s or longest_s!r} {rests_s + until_s!r} 0 {longest_s!r}",
            f"let power = {power}",
            f"wrdata {data} i(voutput) power",
        )
        printed = run_deck(lines, commands)
        assert data.exists(), printed
        rows = np.loadtxt(data)
    moving = rows[:, 0] >= rests_s * (1.0 - 1e-9)
    return rows[moving, 0] - rests_s, -rows[moving, 1], rows[moving, 3]


def last_above(times: np.ndarray, currents: np.ndarray, level: float) -> float:
    """Return the last time a current falls through a level, 0 where it never was above."""
    above = np.flatnonzero(currents > level)
    if not len(above):
        return 0.0
    last = int(above[-1])
    assert last + 1 < len(currents), "the run ended above the level"
    share = (currents[last] - level) / (currents[last] - currents[last + 1])
    return float(times[last] + share * (times[last + 1] - times[last]))
