"""Limiter circuits of many shapes with values, types and temperatures drawn by seed.

Every builder makes the circuit that sources current upwards from its output or sinks it with N-type devices; ``mirrored``
turns it into its P-type twin. Part types are invented and vary around the solved bench circuits' types.
"""

from __future__ import annotations

import random
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

from protlint.limits import Range
from protlint.solve.circuit import Circuit, Device, Drive
from tests.support.circuits import load_bench

SMALL, POWER, MEDIUM, SMALL_P, POWER_P = "QSN1", "QPN1", "QDN1", "QSP1", "QPP1"
TYPES = load_bench()["models_at_27_degC"]
TWIN = {"npn": "pnp", "pnp": "npn", "nmos": "pmos", "pmos": "nmos"}


def fixed(volts: float) -> Range:
    """A voltage without a spread."""
    return Range(volts, volts, volts)


@dataclass(slots=True)
class Sketch:
    """A circuit being drawn: devices so far and the dice."""

    dice: random.Random
    devices: list[Device] = field(default_factory=list)

    def value(self, usual: float, spread: float = 2.0) -> float:
        """Draw a value within a factor of the usual one, evenly in its logarithm."""
        return usual * spread ** self.dice.uniform(-1.0, 1.0)

    def resistor(self, name: str, a: str, b: str, ohm: float, spread: float = 2.0) -> str:
        """Add a resistor of about the usual value."""
        model = {"R": self.value(ohm, spread)}
        if self.dice.random() < 0.3:
            model |= {"TC1": self.dice.uniform(-2e-4, 4e-4), "TC2": self.dice.uniform(-1e-7, 1e-7)}
        self.devices.append(Device(name, "resistor", (a, b), model, tolerance=0.01))
        return name

    def bipolar(self, name: str, number: str, collector: str, base: str, emitter: str) -> str:
        """Add a bipolar transistor of a varied type."""
        model = {key: value for key, value in TYPES[number].items() if key not in ("kind", "CJE", "CJC", "TF")}
        for key in ("IS", "BF", "VAF", "IKF", "ISE", "BR", "RB", "RE", "RC"):
            model[key] *= 1.5 ** self.dice.uniform(-1.0, 1.0)
        if self.dice.random() < 0.3:
            model |= {"VAR": 20.0, "IKR": model["IKF"] / 5.0, "ISC": model["ISE"], "NC": 1.9}
        if self.dice.random() < 0.3:
            model |= {"RBM": 0.3 * model["RB"]}
            if self.dice.random() < 0.5:
                model |= {"IRB": 1e-3}
        bounds = (0.6 * model["BF"], 1.6 * model["BF"])
        self.devices.append(
            Device(name, TYPES[number]["kind"], (collector, base, emitter), model, hfe=bounds, vbe_spread_V=(0.03, 0.03))
        )
        return name

    def mosfet(self, name: str, drain: str, gate: str, source: str) -> str:
        """Add an N-channel MOSFET of a varied type."""
        model = {"VTO": self.dice.uniform(1.5, 4.0), "KP": self.value(4.0, 3.0), "LAMBDA": self.dice.uniform(0.0, 0.02)}
        model |= {"RS": self.value(0.01), "RD": self.value(0.03), "IS": self.value(1e-12, 100.0)}
        if self.dice.random() < 0.3:
            model |= {"GAMMA": self.dice.uniform(0.1, 0.6), "PHI": self.dice.uniform(0.55, 0.8)}
        self.devices.append(Device(name, "nmos", (drain, gate, source), model))
        return name

    def diode(self, name: str, anode: str, cathode: str) -> str:
        """Add a junction diode of a varied type."""
        model = {"IS": self.value(2e-9, 10.0), "N": self.dice.uniform(1.5, 2.0), "RS": self.value(0.5)}
        self.devices.append(Device(name, "diode", (anode, cathode), model))
        return name

    def zener(self, name: str, anode: str, cathode: str, volts: float) -> str:
        """Add a zener of about the usual voltage."""
        model = {"IS": 1e-14, "N": 1.0, "RS": self.value(3.0), "BV": volts, "IBV": 5e-3}
        self.devices.append(Device(name, "zener", (anode, cathode), model))
        return name

    def base_stop(self, name: str, sense: str, ohm: float) -> str:
        """Add a base stop, or none; return the net of the shunt's base."""
        if self.dice.random() < 0.15:
            return sense
        self.resistor(name, sense, "BS", ohm)
        return "BS"

    def drive(self, high_V: float) -> Drive:
        """Return a stiff drive, one with a resistance, or a current-limited one."""
        kind = self.dice.randrange(3)
        if kind == 0:
            return Drive("DRV", fixed(0.0), fixed(high_V))
        if kind == 1:
            return Drive("DRV", fixed(0.0), fixed(high_V), resistance_ohm=self.value(100.0))
        return Drive("DRV", fixed(0.0), fixed(high_V), resistance_ohm=self.value(10.0), current_A=self.value(15e-3))

    def circuit(
        self,
        drive: Drive,
        supply_V: float,
        *,
        sinks: bool,
        passing: Sequence[str],
        shunt: Sequence[str],
        sense: str = "R2",
        ground_leg: bool = False,
    ) -> Circuit:
        """Finish the circuit: shorted to the supply where it sinks, else to ground."""
        return Circuit(
            devices=tuple(self.devices),
            held={"GND": fixed(0.0), "SUP": fixed(supply_V)},
            drive=drive,
            output="OUT",
            shorts=("SUP" if sinks else "GND",),
            shunt=tuple(shunt),
            pass_devices=tuple(passing),
            sense=(sense,),
            output_reach_V=(0.0, supply_V),
            ground_leg=ground_leg,
        )


def sink(s: Sketch) -> Circuit:
    """A common-emitter sink."""
    drive = s.drive(12.0)
    s.resistor("R1", drive.node, "BASE", 1e3)
    s.bipolar("Q1", POWER, "OUT", "BASE", "SNS")
    s.resistor("R2", "SNS", "GND", 2.0)
    s.bipolar("Q2", SMALL, "BASE", s.base_stop("R3", "SNS", 470.0), "GND")
    return s.circuit(drive, 12.0, sinks=True, passing=["Q1"], shunt=["Q2"])


def follower(s: Sketch) -> Circuit:
    """An emitter follower; sometimes with a steering diode in the shunt's collector."""
    drive = s.drive(24.0)
    s.resistor("R1", drive.node, "BASE", 1e3)
    s.bipolar("Q1", POWER, "SUP", "BASE", "SNS")
    s.resistor("R2", "SNS", "OUT", 0.8)
    collector = "BASE"
    if s.dice.random() < 0.4:
        s.diode("D1", "BASE", "COL")
        collector = "COL"
    s.bipolar("Q2", SMALL, collector, s.base_stop("R3", "SNS", 220.0), "OUT")
    return s.circuit(drive, 24.0, sinks=False, passing=["Q1"], shunt=["Q2"])


def darlington(s: Sketch) -> Circuit:
    """A Darlington follower."""
    drive = s.drive(30.0)
    s.resistor("R1", drive.node, "B1", 4.7e3)
    s.bipolar("Q3", MEDIUM, "SUP", "B1", "B2")
    s.bipolar("Q1", POWER, "SUP", "B2", "SNS")
    s.resistor("R4", "B2", "SNS", 100.0)
    s.resistor("R2", "SNS", "OUT", 0.33)
    s.bipolar("Q2", SMALL, "B1", s.base_stop("R3", "SNS", 150.0), "OUT")
    return s.circuit(drive, 30.0, sinks=False, passing=["Q1"], shunt=["Q2"])


def compound(s: Sketch) -> Circuit:
    """A complementary pair: an N-type driver with a P-type output device."""
    drive = s.drive(24.0)
    s.resistor("R1", drive.node, "B1", 2.2e3)
    s.bipolar("Q3", MEDIUM, "B2", "B1", "SNS")
    s.bipolar("Q1", POWER_P, "SNS", "B2", "SUP")
    s.resistor("R4", "SUP", "B2", 150.0)
    s.resistor("R2", "SNS", "OUT", 0.5)
    s.bipolar("Q2", SMALL, "B1", s.base_stop("R3", "SNS", 150.0), "OUT")
    return s.circuit(drive, 24.0, sinks=False, passing=["Q1"], shunt=["Q2"])


def high_side_p(s: Sketch) -> Circuit:
    """A P-type pass device whose drive pulls to ground through an N-type transistor's collector or a resistor."""
    s.resistor("R1", "DRV", "BASE", 1e3)
    s.bipolar("Q1", POWER_P, "OUT", "BASE", "SNS")
    s.resistor("R2", "SUP", "SNS", 1.2)
    s.resistor("R4", "SUP", "BASE", 4.7e3)
    s.bipolar("Q2", SMALL_P, "BASE", s.base_stop("R3", "SNS", 330.0), "SUP")
    drive = replace(s.drive(15.0), resistance_ohm=0.0, current_A=None)
    return s.circuit(drive, 15.0, sinks=False, passing=["Q1"], shunt=["Q2"])


def nmos_sink(s: Sketch) -> Circuit:
    """A MOSFET sink; sometimes with a gate zener."""
    drive = s.drive(12.0)
    s.resistor("R1", drive.node, "GATE", 4.7e3)
    s.mosfet("Q1", "OUT", "GATE", "SNS")
    s.resistor("R2", "SNS", "GND", 0.47)
    if s.dice.random() < 0.5:
        s.zener("D1", "SNS", "GATE", 10.0)
    s.bipolar("Q2", SMALL, "GATE", s.base_stop("R3", "SNS", 330.0), "GND")
    return s.circuit(drive, 24.0, sinks=True, passing=["Q1"], shunt=["Q2"])


def nmos_follower(s: Sketch) -> Circuit:
    """A MOSFET source follower with a gate zener."""
    drive = s.drive(30.0)
    s.resistor("R1", drive.node, "GATE", 4.7e3)
    s.mosfet("Q1", "SUP", "GATE", "SNS")
    s.resistor("R2", "SNS", "OUT", 0.47)
    s.zener("D1", "OUT", "GATE", 12.0)
    s.bipolar("Q2", SMALL, "GATE", s.base_stop("R3", "SNS", 330.0), "OUT")
    return s.circuit(drive, 24.0, sinks=False, passing=["Q1"], shunt=["Q2"])


def preset(s: Sketch) -> Circuit:
    """A follower with a divider that raises the limit."""
    drive = s.drive(20.0)
    s.resistor("R1", drive.node, "BASE", 680.0)
    s.bipolar("Q1", POWER, "SUP", "BASE", "SNS")
    s.resistor("R2", "SNS", "OUT", 1.0)
    s.resistor("R3", "SNS", "BS", 220.0)
    s.resistor("R4", "BS", "OUT", 470.0)
    s.bipolar("Q2", SMALL, "BASE", "BS", "OUT")
    return s.circuit(drive, 20.0, sinks=False, passing=["Q1"], shunt=["Q2"])


def foldback(s: Sketch) -> Circuit:
    """A follower whose divider has a leg to ground."""
    drive = s.drive(20.0)
    s.resistor("R1", drive.node, "BASE", 680.0)
    s.bipolar("Q1", POWER, "SUP", "BASE", "SNS")
    s.resistor("R2", "SNS", "OUT", 1.2)
    s.resistor("R3", "SNS", "BS", 180.0, 1.3)
    s.resistor("R4", "BS", "GND", 2.2e3, 1.3)
    s.bipolar("Q2", SMALL, "BASE", "BS", "OUT")
    return s.circuit(drive, 20.0, sinks=False, passing=["Q1"], shunt=["Q2"], ground_leg=True)


def slope(s: Sketch) -> Circuit:
    """A Darlington follower whose divider has a leg to the far supply."""
    drive = s.drive(30.0)
    s.resistor("R1", drive.node, "B1", 3.3e3)
    s.bipolar("Q3", MEDIUM, "SUP", "B1", "B2")
    s.bipolar("Q1", POWER, "SUP", "B2", "SNS")
    s.resistor("R6", "B2", "SNS", 100.0)
    s.resistor("R2", "SNS", "OUT", 0.33)
    s.resistor("R3", "SNS", "BS", 220.0, 1.3)
    s.resistor("R4", "SUP", "BS", 22e3, 1.3)
    s.resistor("R5", "BS", "OUT", 330.0, 1.3)
    s.bipolar("Q2", SMALL, "B1", "BS", "OUT")
    return s.circuit(drive, 30.0, sinks=False, passing=["Q1"], shunt=["Q2"], ground_leg=True)


def diode_string(s: Sketch) -> Circuit:
    """A follower limited by two or three diodes from its base past the sense resistor."""
    drive = s.drive(20.0)
    s.resistor("R1", drive.node, "BASE", 1e3)
    s.bipolar("Q1", POWER, "SUP", "BASE", "SNS")
    s.resistor("R2", "SNS", "OUT", 1.0)
    count = s.dice.choice((2, 3))
    nets = ["BASE", *(f"N{k}" for k in range(1, count)), "OUT"]
    names = [s.diode(f"D{k + 1}", nets[k], nets[k + 1]) for k in range(count)]
    return s.circuit(drive, 20.0, sinks=False, passing=["Q1"], shunt=names)


def parallel(s: Sketch) -> Circuit:
    """Two pass devices in parallel with emitter resistors, one of them sensed; a Darlington driver before them."""
    drive = s.drive(24.0)
    s.resistor("R1", drive.node, "B1", 2.2e3)
    s.bipolar("Q3", MEDIUM, "SUP", "B1", "B2")
    s.bipolar("Q1", POWER, "SUP", "B2", "SNS")
    s.bipolar("Q4", POWER, "SUP", "B2", "E4")
    s.resistor("R2", "SNS", "OUT", 0.47, 1.2)
    s.resistor("R7", "E4", "OUT", 0.47, 1.2)
    s.resistor("R6", "B2", "OUT", 220.0)
    s.bipolar("Q2", SMALL, "B1", s.base_stop("R3", "SNS", 150.0), "OUT")
    return s.circuit(drive, 24.0, sinks=False, passing=["Q1", "Q4"], shunt=["Q2"])


SHAPES: dict[str, Callable[[Sketch], Circuit]] = {
    "sink": sink,
    "follower": follower,
    "darlington": darlington,
    "compound": compound,
    "high side p": high_side_p,
    "nmos sink": nmos_sink,
    "nmos follower": nmos_follower,
    "preset": preset,
    "foldback": foldback,
    "slope": slope,
    "diode string": diode_string,
    "parallel": parallel,
}


def drawn(shape: str, seed: int) -> Circuit:
    """Return a circuit of a shape drawn by seed, every other time mirrored."""
    sketch = Sketch(random.Random(f"{shape} {seed}"))
    circuit = SHAPES[shape](sketch)
    return mirrored(circuit) if seed % 2 else circuit


def mirrored(circuit: Circuit) -> Circuit:
    """Return the P-type twin: types exchanged, diodes turned, all voltages negated."""

    def turned(limits: Range) -> Range:
        return Range(-limits.high, -limits.usual, -limits.low)

    devices = []
    for device in circuit.devices:
        nodes = device.nodes[::-1] if device.kind in ("diode", "zener") else device.nodes
        model = dict(device.model)
        if "VTO" in model:
            model["VTO"] = -model["VTO"]
        devices.append(replace(device, kind=TWIN.get(device.kind, device.kind), nodes=nodes, model=model))
    drive, (low, high) = circuit.drive, circuit.output_reach_V
    return replace(
        circuit,
        devices=tuple(devices),
        held={node: turned(limits) for node, limits in circuit.held.items()},
        drive=replace(drive, low_V=turned(drive.high_V), high_V=turned(drive.low_V)),
        output_reach_V=(-high, -low),
        output_V=None if circuit.output_V is None else -circuit.output_V,
    )
