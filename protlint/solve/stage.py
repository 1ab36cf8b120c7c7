"""One limiter's stage, ready to be run at any ambient, drive, output voltage and corner.

A ``Stage`` knows which short it is solved for, which end of the drive turns the pass device on, and which way the output
current then flows; the figures taken from it are positive that way.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from protlint.solve.circuit import FEED, Drive
from protlint.solve.constants import KELVIN
from protlint.solve.corners import Axis, axes_of, held_voltages, variation
from protlint.solve.dc import Operating, evaluate, solve_lanes
from protlint.solve.devices import Array, IntArray
from protlint.solve.elimination import product
from protlint.solve.lanes import Lanes, Variation, known_voltages, parameters
from protlint.solve.network import Network
from protlint.solve.parameters import CircuitError
from protlint.solve.solution import Point, State

SWEEP_POINTS = 33
LEAST_OUTPUT_A = 1e-6
"""A stage whose drive moves less than this drives nothing."""
LEAST_CONTROL_SHARE = 1e-3
"""Nor does a drive control a stage that moves its unlimited current by less than this share of it."""


@dataclass(frozen=True, slots=True)
class Stage:
    """A network with the short, the drive's on end (1 high, 0 low) and the way of its output current (+1 into the circuit).

    ``passing`` are the pass devices' nodes across which the voltage stands, the positive one first when the device works.
    """

    network: Network
    axes: tuple[Axis, ...]
    short: str
    on_end: int
    way: float
    passing: tuple[tuple[int, int], ...]


@dataclass(frozen=True, slots=True)
class Run:
    """Solved lanes of a stage: the conditions, the operating points, and the output current the limiter's way (lanes,),
    NaN where not solved."""

    lanes: Lanes
    operating: Operating
    output_V: Array
    output_A: Array

    def pick(self, lanes: IntArray) -> Run:
        """Return some lanes."""
        solved = self.operating
        return Run(
            self.lanes.pick(lanes),
            Operating(solved.inner[:, lanes], solved.node_V[:, lanes], solved.known_A[:, lanes], solved.converged[lanes]),
            self.output_V[lanes],
            self.output_A[lanes],
        )


@dataclass(frozen=True, slots=True)
class Sweep:
    """The drive swept from its off end to its on end into the short: the run of all lanes, ordered with and without the
    shunt, then by drive voltage, then by ambient; drive voltages (points,); the number of ambients."""

    run: Run
    drive_V: Array
    ambients: int

    def current(self, without: int) -> Array:
        """Return the output currents with (0) or without (1) the shunt (points, ambients)."""
        current: Array = self.run.output_A.reshape(2, len(self.drive_V), self.ambients)[without]
        return current

    def inner(self) -> Array:
        """Return the inner voltages (ports, 2, points, ambients)."""
        return self.run.operating.inner.reshape(-1, 2, len(self.drive_V), self.ambients)

    def full_drive(self, without: int) -> Run:
        """Return the run at the on end, one lane an ambient, with (0) or without (1) the shunt."""
        first = (without * len(self.drive_V) + len(self.drive_V) - 1) * self.ambients
        return self.run.pick(np.arange(first, first + self.ambients))


def sweep_stage(
    network: Network, short: str, ambients_degC: Sequence[float], usual: int, *, drives: int = SWEEP_POINTS
) -> tuple[Stage, Sweep]:
    """Sweep the drive into a short at every ambient; return the stage, and the sweep from its off end to its on end.

    The on end is the one at which the pass devices carry more without the shunt at the usual ambient (an index): of a stage
    of two halves the other one may give the output more at the other end. ``drives`` is how many drive voltages are
    solved; 2 are enough where only the stage is wanted.

    Raises
    ------
    CircuitError
        Where neither end is solved or neither turns the pass device on.
    """
    place = {node: index for index, node in enumerate(network.nodes)}
    passing: list[tuple[int, int]] = []
    for device in network.circuit.devices:
        if device.name in network.circuit.pass_devices:
            first, last = place[device.nodes[0]], place[device.nodes[-1]]
            passing.append((last, first) if device.kind in ("pnp", "pmos") else (first, last))
    stage = Stage(network, axes_of(network), short, 1, 1.0, tuple(passing))
    drive = network.circuit.drive
    count = len(ambients_degC)
    drive_V = np.linspace(drive.low_V.usual, drive.high_V.usual, drives)
    run = run_stage(
        stage,
        np.tile(np.array(ambients_degC) + KELVIN, 2 * drives),
        drive_V=np.tile(np.repeat(drive_V, count), 2),
        shunt_in=np.repeat([1.0, 0.0], drives * count),
    )
    ends = Sweep(run, drive_V, count).current(1)[[0, -1], usual]
    if np.isnan(ends).all():
        raise CircuitError("no operating point was found with the output shorted")
    most_A = float(np.nanmax(np.abs(ends)))
    if most_A < LEAST_OUTPUT_A:
        raise CircuitError(_turns_nothing_on(drive, f"{most_A:.2g} A flows into the short at most"))
    last = drives * count
    carried = _forward_current(stage, run.pick(np.array([last + usual, 2 * last - count + usual])))
    weights = carried if np.isfinite(carried).any() else np.abs(ends)
    on_end = int(np.nanargmax(weights))
    greatest = float(ends[on_end])
    if weights[on_end] < LEAST_OUTPUT_A:
        raise CircuitError(_turns_nothing_on(drive, "nothing passes in its forward sense"))
    if abs(float(weights[1] - weights[0])) < LEAST_CONTROL_SHARE * abs(float(weights[on_end])):
        raise CircuitError(_uncontrolled(drive, abs(greatest)))
    way = 1.0 if greatest > 0.0 else -1.0
    run = replace(run, output_A=way * run.output_A)
    if on_end == 0:
        rows = np.arange(2 * drives * count).reshape(2, drives, count)[:, ::-1].ravel()
        run, drive_V = run.pick(rows), drive_V[::-1]
    return replace(stage, on_end=on_end, way=way), Sweep(run, drive_V, count)


def _turns_nothing_on(drive: Drive, what: str) -> str:
    """Say that a drive does not turn the stage on, what passes all the same, and which key states the drive."""
    low_V, high_V, node = drive.low_V.usual, drive.high_V.usual, drive.node.removesuffix(FEED)
    return (
        f"the drive at {node}, from {low_V:g} V to {high_V:g} V, cannot turn the pass device on: {what}; "
        f"{drive.key} low and high state it otherwise"
    )


def _uncontrolled(drive: Drive, unlimited_A: float) -> str:
    """Say that both ends of a drive give the same, and what would help."""
    low_V, high_V, node = drive.low_V.usual, drive.high_V.usual, drive.node.removesuffix(FEED)
    return (
        f"the drive at {node} does not control the stage: at {low_V:g} V as at {high_V:g} V it passes {unlimited_A:.3g} A "
        f"without the shunt; fit what pulls the pass device off, or state {drive.key} low and high"
    )


def _forward_current(stage: Stage, run: Run) -> Array:
    """Return the pass devices' greatest current in the forward sense (lanes,); infinite where none is named."""
    table, circuit = states(stage.network, run), stage.network.circuit
    signs = {device.name: -1.0 if device.kind in ("pnp", "pmos") else 1.0 for device in circuit.devices}
    currents = [signs[name] * table[name][0] for name in circuit.pass_devices]
    return np.max(currents, axis=0) if currents else np.full(run.lanes.count, np.inf)


def run_stage(
    stage: Stage,
    ambient_K: Array,
    *,
    axes: Sequence[Axis] | None = None,
    corner: Array | None = None,
    output_V: Array | None = None,
    drive_V: Array | None = None,
    shunt_in: Array | None = None,
    known_V: Array | None = None,
    start: Array | None = None,
    insist: bool = True,
) -> Run:
    """Solve lanes, all arrays (lanes,) but ``corner`` (axes, lanes) and ``start`` (ports, lanes).

    ``axes`` stand for the stage's own; ``output_V`` None or NaN holds the output in the short, ``drive_V`` None holds the
    drive at its on end, both as the corner has them. ``known_V`` (known nodes, lanes) overrides all three. ``insist`` is
    as for ``protlint.solve.dc.solve_lanes``.
    """
    lanes = stage_lanes(
        stage,
        ambient_K,
        axes=axes,
        corner=corner,
        output_V=output_V,
        drive_V=drive_V,
        shunt_in=shunt_in,
        known_V=known_V,
    )
    operating = solve_lanes(stage.network, lanes, start, insist=insist)
    return Run(lanes, operating, lanes.known_V[-2], stage.way * operating.output_A)


def stage_lanes(
    stage: Stage,
    ambient_K: Array,
    *,
    axes: Sequence[Axis] | None = None,
    corner: Array | None = None,
    output_V: Array | None = None,
    drive_V: Array | None = None,
    shunt_in: Array | None = None,
    known_V: Array | None = None,
) -> Lanes:
    """Return the lanes that :func:`run_stage` solves; arguments as there."""
    network, count = stage.network, len(ambient_K)
    chosen = stage.axes if axes is None else axes
    if corner is None:
        chosen, corner = (), np.zeros((0, count))
    varied = variation(network, chosen, corner, ambient_K) if len(chosen) else Variation()
    if known_V is None:
        held_V, ends_V = held_voltages(network, chosen, corner)
        short_V = _short_voltage(stage, held_V, count)
        output_V = short_V if output_V is None else np.where(np.isnan(output_V), short_V, output_V)
        known_V = known_voltages(held_V, output_V, ends_V[stage.on_end] if drive_V is None else drive_V)
    return Lanes(ambient_K, known_V, shunt_in, varied)


def pass_voltage(stage: Stage, run: Run) -> Array:
    """Return the least voltage across any pass device (lanes,), in its forward sense."""
    node_V = run.operating.node_V
    across = [node_V[positive] - node_V[negative] for positive, negative in stage.passing]
    return np.min(across, axis=0) if across else np.full(node_V.shape[1], np.inf)


def states(network: Network, run: Run) -> dict[str, tuple[Array, Array, Array, Array, Array]]:
    """Return every device's current, voltage, power, control current and control voltage, each (lanes,)."""
    with np.errstate(all="ignore"):
        p = parameters(network, run.lanes)
        evaluations = evaluate(network, p, run.operating.inner)
    node_V = run.operating.node_V
    across = product(network.incidence, node_V)
    table: dict[str, tuple[Array, Array, Array, Array, Array]] = {}
    for group, evaluation in zip(network.groups, evaluations, strict=True):
        port_A = evaluation.port_A * group.sign
        port_V = across[group.rows].reshape(group.ports, -1, node_V.shape[1]) * group.sign
        for index, device in enumerate(group.devices):
            if group.ports == 1:
                current, voltage = port_A[0, index], port_V[0, index]
                table[device.name] = (current, voltage, current * voltage, np.zeros_like(current), voltage)
                continue
            current, control = -port_A[1, index], port_A[0, index] + port_A[1, index]
            control_V = port_V[0, index]
            voltage = control_V - port_V[1, index]
            table[device.name] = (current, voltage, current * voltage + control * control_V, control, control_V)
    drops = product(network.resistor_incidence, node_V)
    conductance = np.broadcast_to(p.conductance, drops.shape)
    for index, device in enumerate(network.resistors):
        current = drops[index] * conductance[index]
        table[device.name] = (current, drops[index], current * drops[index], np.zeros_like(current), drops[index])
    return table


def points(stage: Stage, run: Run, lanes: Sequence[int]) -> tuple[Point, ...]:
    """Return chosen lanes as points with every device's state; lanes that were not solved are left out."""
    solved = [lane for lane in lanes if np.isfinite(run.output_A[lane])]
    table = {name: np.array(rows)[:, solved].T.tolist() for name, rows in states(stage.network, run).items()}
    node = stage.network.nodes.index(stage.network.circuit.drive.node)
    output_V, output_A = run.output_V[solved].tolist(), run.output_A[solved].tolist()
    drive_A, drive_V = run.operating.known_A[-1, solved].tolist(), run.operating.node_V[node, solved].tolist()
    return tuple(
        Point(
            output_V=output_V[place],
            output_A=output_A[place],
            states={name: State(*of_lanes[place]) for name, of_lanes in table.items()},
            drive_A=drive_A[place],
            drive_V=drive_V[place],
        )
        for place in range(len(solved))
    )


def shunt_and_pass_current(stage: Stage, run: Run) -> tuple[Array, Array]:
    """Return the greatest current through a shunt device, and the pass devices' current together, each (lanes,)."""
    table, circuit = states(stage.network, run), stage.network.circuit
    nothing = np.zeros(run.lanes.count)
    shunt = [np.abs(table[name][0]) for name in circuit.shunt] or [nothing]
    passing = [np.abs(table[name][0]) for name in circuit.pass_devices] or [nothing]
    return np.max(shunt, axis=0), np.sum(passing, axis=0)


def short_voltage(stage: Stage, corner: Array | None, count: int) -> Array:
    """Return the voltage of the short at a corner (axes, lanes) or nominal (lanes,)."""
    axes = () if corner is None else stage.axes
    held_V, _ = held_voltages(stage.network, axes, np.zeros((0, count)) if corner is None else corner)
    return _short_voltage(stage, held_V, count)


def _short_voltage(stage: Stage, held_V: Array, count: int) -> Array:
    network = stage.network
    if stage.short in network.held:
        held: Array = held_V[network.held.index(stage.short)]
        return held
    return np.full(count, network.circuit.held[stage.short].usual)
