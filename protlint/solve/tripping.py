"""Where a latch trips: the most that a stage passes before its shunt fires and takes the drive away for good.

A shunt that a second transistor holds on has two states at one drive. With its base held at v from its emitter the circuit
has one, and the current i that what holds the base has to give tells the rest. Where i is 0 the circuit stands by itself.
The drive x (from 0, off, to 1, on) at which it does so rises with v, and the output current with it, until the latch takes
over: there x(v) turns round, or goes on while the current falls. It trips where the current is greatest up to there. What
it stands at under the full drive afterwards is the first v at which i passes from below to above 0 there.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from protlint.limits import Range
from protlint.solve.circuit import Circuit
from protlint.solve.corners import held_voltages
from protlint.solve.devices import Array, IntArray
from protlint.solve.lanes import known_voltages
from protlint.solve.locus import PASS_V, Conditions
from protlint.solve.network import compile_network
from protlint.solve.parameters import CircuitError
from protlint.solve.stage import Run, Stage, pass_voltage, run_stage, short_voltage

_BASE_V = np.linspace(0.1, 1.5, 43)
"""Voltages from emitter to base that a shunt is looked at: from where it takes nothing to where it is full on."""
_DRIVES = np.linspace(0.0, 1.0, 17)

_ROUNDS, _PROBES, _NARROWER = 4, 5, 0.4
_SECANT_STEPS = 5
_FARTHEST_DRIVE = 3.0
"""A corner may trip a little beyond the drive's on end; what lies farther off is not looked at."""


@dataclass(frozen=True, slots=True)
class HeldBase:
    """A stage with its shunt's base held: the base's and the emitter's rows among the known nodes, +1 for an NPN shunt."""

    stage: Stage
    base: int
    emitter: int
    sign: float


@dataclass(frozen=True, slots=True)
class Tripping:
    """Where the latch trips, by condition: v, x, whether the drive turns round there, output current, inner voltages; NaN
    where it does not."""

    base_V: Array
    drive: Array
    turns: NDArray[np.bool_]
    output_A: Array
    inner: Array
    run: Run | None

    def pick(self, which: IntArray) -> Tripping:
        """Return some conditions' places, without their run."""
        return Tripping(
            self.base_V[which], self.drive[which], self.turns[which], self.output_A[which], self.inner[:, which], None
        )


@dataclass(frozen=True, slots=True)
class Scan:
    """The plane of v and x: i, output current and inner voltages (v, x, conditions)."""

    injected_A: Array
    output_A: Array
    inner: Array


def hold_base(stage: Stage) -> HeldBase:
    """Return a latch's stage with the base of its shunt held.

    Raises
    ------
    CircuitError
        Where the shunt's emitter is on no net whose voltage is known.
    """
    circuit = stage.network.circuit
    shunt = _shunt(circuit)
    _, base, emitter = next(device.nodes for device in circuit.devices if device.name == shunt)
    network = compile_network(replace(circuit, held={**circuit.held, base: Range(0.0, 0.0, 0.0)}))
    places = {node: place - network.unknown for place, node in enumerate(network.nodes)}
    if places[emitter] < 0:
        raise CircuitError(f"what holds {emitter}, the emitter of {shunt}, is not known: where it latches cannot be told")
    kind = next(device.kind for device in circuit.devices if device.name == shunt)
    held_stage = replace(stage, network=network, passing=_moved(stage, network.nodes))
    return HeldBase(held_stage, places[base], places[emitter], -1.0 if kind == "pnp" else 1.0)


def _shunt(circuit: Circuit) -> str:
    latch = set(circuit.latch)
    return next(
        device.name
        for device in circuit.devices
        if device.name in circuit.shunt and device.name not in latch and device.kind in ("npn", "pnp")
    )


def _moved(stage: Stage, nodes: Sequence[str]) -> tuple[tuple[int, int], ...]:
    place = {node: index for index, node in enumerate(nodes)}
    before = stage.network.nodes
    return tuple((place[before[positive]], place[before[negative]]) for positive, negative in stage.passing)


def _run(held: HeldBase, conditions: Conditions, output_V: Array, base_V: Array, drive: Array, start: Array | None) -> Run:
    """Run lanes with the shunt's base held ``base_V`` from its emitter and the drive at a share of its way."""
    stage, network = held.stage, held.stage.network
    count = len(base_V)
    corner = conditions.corner
    axes = () if corner is None else stage.axes
    held_V, ends_V = held_voltages(network, axes, np.zeros((0, count)) if corner is None else corner)
    output_V = np.where(np.isnan(output_V), short_voltage(stage, corner, count), output_V)
    off_V, on_V = ends_V[1 - stage.on_end], ends_V[stage.on_end]
    known_V = known_voltages(network, held_V, output_V, off_V + drive * (on_V - off_V))
    known_V[held.base] = known_V[held.emitter] + held.sign * base_V
    return run_stage(stage, conditions.ambient_K, corner=corner, known_V=known_V, start=start)


def _injected(held: HeldBase, run: Run) -> Array:
    """Return what holds the base gives it (lanes,), NaN where not solved."""
    current: Array = np.where(run.operating.converged, held.sign * run.operating.known_A[held.base], np.nan)
    return current


def scan(held: HeldBase, conditions: Conditions, output_V: Array) -> Scan:
    """Solve the whole plane of v and x under nominal conditions, the output held at voltages (conditions,), NaN in the
    short."""
    count = len(output_V)
    shape = (len(_BASE_V), len(_DRIVES), count)
    rows, columns, chosen = (one.ravel() for one in np.indices(shape))
    base, drive = _BASE_V[rows], _DRIVES[columns]
    run = _run(held, conditions.pick(chosen), output_V[chosen], base, drive, None)
    return Scan(_injected(held, run).reshape(shape), run.output_A.reshape(shape), run.operating.inner.reshape(-1, *shape))


def find(held: HeldBase, conditions: Conditions, output_V: Array) -> Tripping:
    """Find where nominal conditions trip; NaN where the drive does not reach one, or the pass device has less than 2 V."""
    plane = scan(held, conditions, output_V)
    count = len(output_V)
    base_V, drive, turns = np.full(count, np.nan), np.full(count, np.nan), np.zeros(count, dtype=bool)
    start = np.zeros((len(plane.inner), count))
    for place in range(count):
        found = _first_top(plane.injected_A[:, :, place], plane.output_A[:, :, place])
        if found is not None:
            row, column, drive[place], turns[place] = found
            base_V[place] = _BASE_V[row]
            start[:, place] = plane.inner[:, row, column, place]
    begin = Tripping(base_V, drive, turns, np.full(count, np.nan), start, None)
    fold = refine(held, conditions, output_V, begin)
    there = np.isfinite(fold.output_A) & (fold.drive <= 1.0) & (fold.output_A > 0.0)
    if held.stage.network.circuit.output_V is None and fold.run is not None:
        there &= np.isnan(output_V) | (pass_voltage(held.stage, fold.run) >= PASS_V)
    return replace(fold, output_A=np.where(there, fold.output_A, np.nan))


def _first_top(injected_A: Array, output_A: Array) -> tuple[int, int, float, bool] | None:
    """Return the row of v, the column of x and x itself where the most passes as the drive rises, and whether the drive
    turns round there; None where the drive gives out before.

    Both arrays are (v, x).
    """
    along: list[tuple[int, int, float]] = []
    passes_A: list[float] = []
    turns = False
    for row, line in enumerate(injected_A):
        falls = np.flatnonzero((line[:-1] > 0.0) & (line[1:] <= 0.0))
        if not len(falls):
            # where the latch gives more than is taken even with the drive off, the drive has turned round
            turns = bool(along) and not (line > 0.0).any()
            if along:
                break
            continue
        column = int(falls[0])
        part = float(line[column] / (line[column] - line[column + 1]))
        share = float(_DRIVES[column] + part * (_DRIVES[column + 1] - _DRIVES[column]))
        turns = bool(along) and share < along[-1][2]
        if turns:
            break
        along.append((row, column, share))
        passes_A.append(float(output_A[row, column] + part * (output_A[row, column + 1] - output_A[row, column])))
    top = int(np.argmax(passes_A)) if passes_A else 0
    at_end = top + 1 == len(along)
    if not along or (at_end and not turns):
        return None
    return (*along[top], at_end)


def refine(held: HeldBase, conditions: Conditions, output_V: Array, near: Tripping) -> Tripping:
    """Find where conditions trip near a place: the top of x(v), or of the current along it, by probes that close in."""
    count = len(near.base_V)
    centre, share, inner = near.base_V, near.drive, near.inner
    step = float(_BASE_V[1] - _BASE_V[0])
    offsets = np.linspace(-1.0, 1.0, _PROBES)
    lane = np.arange(count)
    for _ in range(_ROUNDS):
        which = np.tile(lane, _PROBES)
        at_V = (centre + step * offsets[:, None]).ravel()
        x, run = _balanced(held, conditions.pick(which), output_V[which], at_V, share[which], inner[:, which])
        drives = x.reshape(_PROBES, count)
        passes = np.where(np.isnan(drives), np.nan, run.output_A.reshape(_PROBES, count))
        across = np.where(near.turns, drives, passes)
        top = np.argmax(np.nan_to_num(across, nan=-np.inf), axis=0)
        chosen = top * count + lane
        shift = np.zeros(count)
        inside = (top > 0) & (top < _PROBES - 1)
        if inside.any():
            at = top[inside]
            below, here, above = (across[at + by, lane[inside]] for by in (-1, 0, 1))
            bend = below - 2.0 * here + above
            shift[inside] = np.where(bend < 0.0, 0.5 * (below - above) / np.where(bend < 0.0, bend, 1.0), 0.0)
            step_of = offsets[1] - offsets[0]
            shift[inside] *= step_of
        centre = centre + step * (offsets[top] + np.nan_to_num(shift))
        share, inner = drives[top, lane], run.operating.inner[:, chosen]
        step *= _NARROWER
    x, run = _balanced(held, conditions, output_V, centre, share, inner)
    passes_A = np.where(np.isfinite(x), run.output_A, np.nan)
    return Tripping(centre, x, near.turns, passes_A, run.operating.inner, run)


def _balanced(
    held: HeldBase, conditions: Conditions, output_V: Array, base_V: Array, drive: Array, start: Array
) -> tuple[Array, Run]:
    """Find the drive at which nothing has to hold the base, by the secant method; NaN where it is not found."""
    begin = np.nan_to_num(drive, nan=0.5)
    before, x = begin, np.clip(begin + 1e-3, 0.0, _FARTHEST_DRIVE)
    run = _run(held, conditions, output_V, base_V, before, start)
    miss_before = _injected(held, run)
    for _ in range(_SECANT_STEPS):
        run = _run(held, conditions, output_V, base_V, x, run.operating.inner)
        miss = _injected(held, run)
        slope = (miss - miss_before) / np.where(x == before, 1.0, x - before)
        onward = np.where(slope < 0.0, x - miss / np.where(slope < 0.0, slope, -1.0), np.nan)
        before, miss_before = x, miss
        x = np.clip(np.where(np.isnan(onward), before, onward), -1.0, _FARTHEST_DRIVE)
    run = _run(held, conditions, output_V, base_V, x, run.operating.inner)
    miss = _injected(held, run)
    scale = np.abs(run.output_A) * 1e-4 + 1e-9
    return np.where((np.abs(miss) < scale) & np.isfinite(drive), x, np.nan), run
