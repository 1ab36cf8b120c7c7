"""Circuits that cannot be solved, or only in part: a reason, no exception, no warning, no NaN."""

from __future__ import annotations

import dataclasses
import math
import random
from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any

import pytest

from protlint.limits import Range
from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.parameters import KINDS
from tests.support.circuits import bench_circuit, fixed
from tests.support.shapes import SHAPES, drawn

AMBIENTS = (-40.0, 27.0, 110.0)


def numbers(value: Any, path: str = "") -> Iterator[tuple[str, Any]]:
    """Every leaf of a solution with its path."""
    if dataclasses.is_dataclass(value):
        for one in dataclasses.fields(value):
            yield from numbers(getattr(value, one.name), f"{path}.{one.name}")
    elif isinstance(value, Mapping):
        for key, one in value.items():
            yield from numbers(one, f"{path}[{key}]")
    elif isinstance(value, tuple):
        for place, one in enumerate(value):
            yield from numbers(one, f"{path}[{place}]")
    else:
        yield path, value


def assert_plain(solution: object) -> None:
    """Every number is a finite float of Python's own."""
    for path, value in numbers(solution):
        assert value is None or type(value) in (str, int, bool, float), (path, type(value))
        assert not isinstance(value, float) or math.isfinite(value), (path, value)


def changed(circuit: Circuit, name: str, **changes: Any) -> Circuit:
    """The circuit with one device changed."""
    devices = tuple(replace(device, **changes) if device.name == name else device for device in circuit.devices)
    return replace(circuit, devices=devices)


def with_parameter(name: str, parameter: str, value: float) -> Circuit:
    circuit = bench_circuit("sink")
    model = next(device.model for device in circuit.devices if device.name == name)
    return changed(circuit, name, model={**model, parameter: value})


def with_drive(**changes: Any) -> Circuit:
    circuit = bench_circuit("sink")
    return replace(circuit, drive=replace(circuit.drive, **changes))


def with_device(device: Device) -> Circuit:
    circuit = bench_circuit("sink")
    return replace(circuit, devices=(*circuit.devices, device))


SINK = bench_circuit("sink")

REASONS = {
    "saturation current of zero": (with_parameter("Q2", "IS", 0.0), "IS"),
    "negative current gain": (with_parameter("Q1", "BF", -100.0), "BF"),
    "emission coefficient of 40": (with_parameter("Q2", "NF", 40.0), "NF"),
    "parameter that is no number": (with_parameter("Q2", "VAF", math.nan), "VAF"),
    "negative resistance": (with_parameter("R2", "R", -1.0), "R2"),
    "resistor without a value": (changed(SINK, "R2", model={}), "R2"),
    "tolerance of twice the value": (changed(SINK, "R2", tolerance=2.0), "tolerance"),
    "hFE the wrong way round": (changed(SINK, "Q1", hfe=(300.0, 100.0)), "hFE"),
    "kind that is none": (changed(SINK, "Q2", kind="thyristor"), "thyristor"),
    "transistor with two legs": (changed(SINK, "Q2", nodes=("BASE", "BS")), "Q2"),
    "zener without a voltage": (with_device(Device("D1", "zener", ("GND", "BASE"), {"IS": 1e-14})), "BV"),
    "gate that hangs on nothing": (with_device(Device("M1", "nmos", ("BASE", "GATE", "GND"), {"KP": 1.0})), "GATE"),
    "supplies joined by a link": (with_device(Device("R9", "resistor", ("+12V", "GND"), {"R": 0.0})), "link"),
    "output joined to a supply": (with_device(Device("L1", "inductor", ("OUT", "+12V"), {"L": 1e-3})), "link"),
    "drive joined to a supply through two links": (
        replace(
            SINK,
            devices=(
                *SINK.devices,
                Device("R8", "resistor", ("DRV", "MID"), {"R": 0.0}),
                Device("R9", "resistor", ("MID", "GND"), {"R": 0.0}),
            ),
        ),
        "link",
    ),
    "supply of 0 V": (replace(SINK, held={"GND": fixed(0.0), "+12V": fixed(0.0)}), "turn the pass device on"),
    "supply that is no number": (replace(SINK, held={"GND": fixed(0.0), "+12V": fixed(math.nan)}), "+12V"),
    "drive that never rises": (with_drive(high_V=fixed(0.0)), "turn the pass device on"),
    "drive of the wrong polarity": (with_drive(low_V=fixed(-12.0), high_V=fixed(0.0)), "turn the pass device on"),
    "drive that gives no current": (with_drive(current_A=0.0), "drives nothing"),
    "drive behind a negative resistance": (with_drive(resistance_ohm=-5.0), "resistance"),
    "drive range the wrong way round": (with_drive(high_V=Range(12.0, 11.0, 10.0)), "range"),
    "drive on the output": (with_drive(node="OUT"), "one net"),
    "no short": (replace(SINK, shorts=()), "short"),
    "short to nowhere": (replace(SINK, shorts=("AIR",)), "short"),
    "shunt that is not there": (replace(SINK, shunt=("Q9",)), "Q9"),
    "two parts of one name": (with_device(Device("R1", "resistor", ("DRV", "GND"), {"R": 1.0})), "one name"),
    "output at a billion volts": (replace(SINK, output_V=1e9), "working output voltage"),
}


@pytest.mark.parametrize("case", sorted(REASONS))
def test_a_circuit_that_cannot_be_solved_says_why(case: str) -> None:
    circuit, word = REASONS[case]
    solution = solve(circuit, AMBIENTS)
    assert solution.not_solved is not None
    assert word in solution.not_solved
    assert_plain(solution)


@pytest.mark.parametrize("ambients", [(-300.0, 27.0, 85.0), (math.nan, 27.0, 85.0), (-10.0, 27.0, 1e4)])
def test_ambients_that_make_no_sense_are_refused(ambients: tuple[float, float, float]) -> None:
    assert solve(SINK, ambients).not_solved is not None


def test_missing_parts_of_no_importance_do_not_stop_the_solver() -> None:
    """No shunt, a dangling capacitor chain, a resistor to nowhere, two grounds joined by a link."""
    extra = (
        Device("C1", "capacitor", ("BASE", "X1"), {"C": 1e-9}),
        Device("R7", "resistor", ("X1", "X2"), {"R": 100.0}),
        Device("C2", "capacitor", ("X2", "OUT"), {"C": 1e-9}),
        Device("R8", "resistor", ("SNS", "X3"), {"R": 100.0}),
        Device("R9", "resistor", ("GND", "AGND"), {"R": 0.0}),
    )
    circuit = replace(SINK, devices=(*SINK.devices, *extra), held={**SINK.held, "AGND": fixed(0.0)})
    solution = solve(circuit, AMBIENTS)
    assert solution.not_solved is None
    assert solution.currents[1].holds_A == pytest.approx(solve(SINK, AMBIENTS).currents[1].holds_A, rel=1e-6)
    bare = solve(replace(circuit, shunt=(), pass_devices=(), sense=()), AMBIENTS)
    assert bare.not_solved is None
    assert_plain(bare)


def test_an_output_that_leaves_the_pass_device_nothing_is_not_checked() -> None:
    solution = solve(bench_circuit("foldback"), AMBIENTS)
    assert ("carries", "output") in solution.not_checked
    assert solution.currents[1].carries_A is None


def spoiled(seed: int) -> Circuit:
    """A limiter with a few parameters, connections and voltages turned to nonsense."""
    dice = random.Random(seed)
    circuit = drawn(dice.choice(sorted(SHAPES)), dice.randrange(1000))
    devices = list(circuit.devices)
    for _ in range(dice.randrange(1, 4)):
        place = dice.randrange(len(devices))
        device = devices[place]
        choice = dice.randrange(4)
        if choice == 0 and KINDS[device.kind]:
            name = dice.choice(sorted(KINDS[device.kind]))
            _, least, most = KINDS[device.kind][name]
            value = dice.choice([least, most, 0.0, -1.0, math.nan, math.inf, 10.0 ** dice.uniform(-12.0, 5.0)])
            devices[place] = replace(device, model={**device.model, name: value})
        elif choice == 1:
            nodes = list(device.nodes)
            nodes[dice.randrange(len(nodes))] = dice.choice([*circuit.devices[0].nodes, "LOOSE", "GND"])
            devices[place] = replace(device, nodes=tuple(nodes))
        elif choice == 2:
            devices[place] = replace(device, nodes=device.nodes[::-1])
        else:
            devices[place] = replace(device, rise_K=dice.choice([50.0, 500.0, -100.0, 1e6, math.nan]))
    drive = replace(circuit.drive, current_A=dice.choice([None, 1e-9, 1e3]))
    volts = dice.choice([0.0, 1.0, 400.0, -24.0])
    held = {**circuit.held, "SUP": Range(volts - 1.0, volts, volts + 1.0)}
    return replace(circuit, devices=tuple(devices), drive=drive, held=held, regulates=dice.random() < 0.3)


@pytest.mark.parametrize("seed", range(40))
def test_nonsense_gives_a_reason_or_plain_numbers(seed: int) -> None:
    assert_plain(solve(spoiled(seed), AMBIENTS))


def test_a_drive_of_a_current_source_is_a_drive() -> None:
    drive = Drive("BASE", fixed(0.0), fixed(12.0), current_A=5e-3)
    devices = tuple(device for device in SINK.devices if device.name != "R1")
    solution = solve(replace(SINK, devices=devices, drive=drive), AMBIENTS)
    assert solution.not_solved is None
    assert solution.held_short is not None
    assert solution.held_short.drive_A == pytest.approx(5e-3, rel=1e-6)
