"""The formula beside the solved circuit: what a hand calculation gives, how far off it is, and which assumption fails.

``compare_formula`` reads from the circuit which closed form a working person would use, calculates it with V_BE = 0.6 V, and
where it misses the solved held short by more than 5 % calculates it again with each of its assumptions put right by the
solved values. An assumption fails where putting it right moves the figure by more than a tenth of what is missing.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from protlint.solve.circuit import Circuit, Device
from protlint.solve.parameters import LINK_OHM
from protlint.solve.solution import Currents, Point, Solution

V_BE_BY_HAND = 0.6
"""What a silicon transistor's base-emitter voltage is taken as by hand [V]; common practice of the trade."""

LARGEST_DIFFERENCE = 0.05
FAILING_SHARE = 0.1

FORMULAS: Mapping[str, str] = {
    "plain": "V_BE / R_S",
    "preset": "V_BE / R_S (1 + R_1 / R_2)",
    "foldback": "(V_BE + (1 - k) V_O) / (k R_S), k = R_2 / (R_1 + R_2)",
    "slope": "(V_BE (G_1 + G_2 + ...) - V G_2) / (R_S G_1), G = 1 / R, V from the output to the supply",
    "diode string": "(n - m) V_BE / R_S, n diodes beside m base-emitter junctions",
}
"""What is written down by hand, by name. Plain: US Army TC 9-62 (2005), para 4-131. Foldback: LM723 data sheet (ST), table
of formulas. Preset and slope: the node equation at the shunt's base. Diode string: the sum of voltages round its loop."""

BASE_EMITTER = "the shunt's V_BE is 0.6 V"
DIODE_DROP = "every junction drops 0.6 V"
BASE_CURRENT = "the shunt takes no base current"
SENSE_CURRENT = "all output current, and nothing else, passes the sense resistance"
DRIVE = "the drive can bring the stage to its limit"


@dataclass(frozen=True, slots=True)
class Failing:
    """An assumption that fails: the formula's figure with it alone put right, and with that the share of the difference
    that is explained."""

    assumption: str
    figure_A: float
    explains: float


@dataclass(frozen=True, slots=True)
class Comparison:
    """A formula's figure beside the solved holds in the short at usual ambient.

    ``fails`` comes with the one that explains most first, but the drive before all: where it gives out the rest follows.
    ``name`` is plain, preset, foldback, slope or diode string; ``formula`` its text; ``inputs`` what went into it, by
    symbol; ``difference`` solved over formula less 1; ``put_right_A`` the formula with all assumptions put right.
    """

    name: str
    formula: str
    inputs: Mapping[str, float]
    figure_A: float
    solved_A: float
    difference: float
    fails: tuple[Failing, ...]
    put_right_A: float


@dataclass(frozen=True, slots=True)
class _Case:
    """A formula's inputs. ``legs`` are (resistance, voltage of its far end above the shunt's emitter the shunt's way)."""

    R_S: float
    R_1: float
    V_BE: float
    I_B: float = 0.0
    beside_A: float = 0.0
    at_most_A: float | None = None
    legs: tuple[tuple[float, float], ...] = ()
    name: str = "plain"
    junctions: tuple[int, int] | None = None
    span_V: float | None = None

    def figure(self) -> float:
        """Return the output current: one law for all forms, the node equation at the shunt's base."""
        if self.junctions is not None:
            diodes, beside = self.junctions
            drop = (diodes - beside) * self.V_BE if self.span_V is None else self.span_V
        else:
            pulled = sum((self.V_BE - volts) / ohm for ohm, volts in self.legs)
            drop = self.V_BE + self.R_1 * (self.I_B + pulled)
        limit = drop / self.R_S + self.beside_A
        return limit if self.at_most_A is None else min(limit, self.at_most_A)


def compare_formula(circuit: Circuit, solution: Solution, *, usual: int = 1) -> Comparison | None:
    """Return the comparison at the usual ambient (an index), or None where no closed form fits (a latch has none) or
    nothing was solved."""
    held, currents = solution.held_short, solution.currents[usual] if solution.currents else None
    if held is None or currents is None or currents.holds_A is None or currents.holds_A <= 0.0 or circuit.latch:
        return None
    devices = {device.name: device for device in circuit.devices}
    shunts = [devices[name] for name in circuit.shunt]
    if shunts and all(device.kind in ("diode", "zener") for device in shunts):
        case = _string_case(circuit, shunts, devices)
    else:
        case = _shunt_case(circuit, shunts, devices, held)
    if case is None:
        return None
    return _compare(case, circuit, held, currents, shunts)


def _compare(by_hand: _Case, circuit: Circuit, held: Point, currents: Currents, shunts: Sequence[Device]) -> Comparison:
    holds_A = currents.holds_A or 0.0
    figure = by_hand.figure()
    missing = holds_A - figure
    steps = _corrections(by_hand, circuit, held, currents, shunts)
    put_right = by_hand
    fails: list[Failing] = []
    for assumption, changes in steps:
        put_right = replace(put_right, **changes)
        alone = replace(by_hand, **changes).figure()
        explains = (alone - figure) / missing if missing else 0.0
        if abs(missing) > LARGEST_DIFFERENCE * figure and abs(explains) > FAILING_SHARE:
            fails.append(Failing(assumption, alone, explains))
    inputs = {"V_BE": by_hand.V_BE, "R_S": by_hand.R_S}
    if by_hand.R_1 and by_hand.legs:
        inputs["R_1"] = by_hand.R_1
        inputs |= {f"R_{place}": ohm for place, (ohm, _) in enumerate(by_hand.legs, start=2)}
    return Comparison(
        name=by_hand.name,
        formula=FORMULAS[by_hand.name],
        inputs=inputs,
        figure_A=figure,
        solved_A=holds_A,
        difference=holds_A / figure - 1.0 if figure else 0.0,
        fails=tuple(sorted(fails, key=lambda one: (one.assumption != DRIVE, -abs(one.explains)))),
        put_right_A=put_right.figure(),
    )


def _corrections(
    by_hand: _Case, circuit: Circuit, held: Point, currents: Currents, shunts: Sequence[Device]
) -> list[tuple[str, dict[str, Any]]]:
    """Return every assumption with the changes that put it right from the solved held short."""
    sense_A = _sense_current(circuit, held)
    steps: list[tuple[str, dict[str, Any]]] = []
    if currents.limited_by_short == "drive" and currents.unlimited_A is not None:
        steps.append((DRIVE, {"at_most_A": currents.unlimited_A}))
    if by_hand.junctions is not None:
        steps.append((DIODE_DROP, {"span_V": sense_A * by_hand.R_S}))
    else:
        state, sign = held.states[shunts[0].name], _sign(shunts[0])
        steps.append((BASE_EMITTER, {"V_BE": sign * state.control_V}))
        steps.append((BASE_CURRENT, {"I_B": sign * state.control_A}))
    steps.append((SENSE_CURRENT, {"beside_A": (currents.holds_A or 0.0) - sense_A}))
    return steps


def _shunt_case(circuit: Circuit, shunts: Sequence[Device], devices: Mapping[str, Device], held: Point) -> _Case | None:
    """Return the inputs of a transistor shunt's formula, or None where its surroundings fit none."""
    if len(shunts) != 1 or shunts[0].kind not in ("npn", "pnp"):
        return None
    _, base, far = shunts[0].nodes
    sense = _sense(circuit, devices, far)
    known_V = {node: limits.usual for node, limits in circuit.held.items()}
    known_V |= {circuit.output: held.output_V, circuit.drive.node: held.drive_V}
    if sense is None or far not in known_V:
        return None
    near, R_S = sense
    sign = _sign(shunts[0])
    if base == near:
        return _Case(R_S=R_S, R_1=0.0, V_BE=V_BE_BY_HAND)
    R_1, name = None, "plain"
    legs: list[tuple[float, float]] = []
    for device in circuit.devices:
        if device.kind != "resistor" or base not in device.nodes:
            continue
        other = device.nodes[1] if device.nodes[0] == base else device.nodes[0]
        if other == near:
            R_1 = device.model["R"] if not R_1 else R_1 * device.model["R"] / (R_1 + device.model["R"])
        elif other in known_V:
            pull_V = sign * (known_V[other] - known_V[far])
            legs.append((device.model["R"], pull_V))
            if other != far:
                name = "slope" if pull_V > 0.0 else "foldback"
            elif name == "plain":
                name = "preset"
        else:
            return None
    if R_1 is None:
        return None
    return _Case(R_S=R_S, R_1=R_1, V_BE=V_BE_BY_HAND, legs=tuple(legs), name=name)


def _string_case(circuit: Circuit, diodes: Sequence[Device], devices: Mapping[str, Device]) -> _Case | None:
    """Return the inputs of a diode string's formula: the string, the junctions beside it, the sense resistance."""
    ends = [node for diode in diodes for node in diode.nodes]
    single = [node for node in ends if ends.count(node) == 1]
    if len(single) != 2:
        return None
    for top, far in (single, single[::-1]):
        sense = _sense(circuit, devices, far)
        beside = None if sense is None else _junctions_between(circuit, top, sense[0])
        if sense is not None and beside is not None:
            return _Case(R_S=sense[1], R_1=0.0, V_BE=V_BE_BY_HAND, junctions=(len(diodes), beside), name="diode string")
    return None


def _sense(circuit: Circuit, devices: Mapping[str, Device], far: str) -> tuple[str, float] | None:
    """Return the near end and the value of the sense resistance that starts at a node: a bank, a chain, or one resistor."""
    left = [devices[name] for name in circuit.sense]
    node, total = far, 0.0
    while left:
        bank = [device for device in left if device.kind == "resistor" and node in device.nodes]
        others = {end for device in bank for end in device.nodes if end != node}
        if len(others) != 1:
            return None
        total += 1.0 / sum(1.0 / max(device.model["R"], LINK_OHM) for device in bank)
        node = others.pop()
        left = [device for device in left if device not in bank]
    return (node, total) if total else None


def _sense_current(circuit: Circuit, held: Point) -> float:
    """Return the current through the sense resistance: through one of a chain, through all of a bank."""
    devices = {device.name: device for device in circuit.devices}
    first = devices[circuit.sense[0]]
    bank = [name for name in circuit.sense if set(devices[name].nodes) == set(first.nodes)]
    return sum(abs(held.states[name].current_A) for name in bank)


def _junctions_between(circuit: Circuit, top: str, near: str) -> int | None:
    """Return how many base-emitter junctions lead from one node to another, or None where they do not."""
    count, node = 0, top
    while node != near:
        following = [
            device.nodes[2] for device in circuit.devices if device.kind in ("npn", "pnp") and device.nodes[1] == node
        ]
        if len(following) != 1 or count > len(circuit.devices):
            return None
        node, count = following[0], count + 1
    return count


def _sign(device: Device) -> float:
    return 1.0 if device.kind == "npn" else -1.0
