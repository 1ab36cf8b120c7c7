"""Corners: what may depart from nominal, how far, and the worst that it can do together.

An *axis* is one thing with a stated spread: a resistor's value within its tolerance, a bipolar's V_BE (I_S exp(-dV/(NF V_T))
at the solved temperature) or B_F within its bounds (the bound itself at every temperature), a diode's forward voltage, a
MOSFET's threshold, a supply, either end of the drive (one that follows a supply moves with it). A *corner* is an array
(axes, lanes) of positions from -1, the low end, over 0, nominal, to +1, the high end.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from protlint.limits import Range
from protlint.solve.circuit import Circuit
from protlint.solve.constants import T0_K
from protlint.solve.devices import Array, IntArray
from protlint.solve.lanes import Variation
from protlint.solve.network import Network

DRIVE_ENDS = ("low_V", "high_V")
NET_PARAMETERS = ("V", *DRIVE_ENDS)
"""Parameters that belong to a net, not to a device."""


@dataclass(frozen=True, slots=True)
class Axis:
    """One thing that varies: the device (or held net, or the drive's net), its parameter, and where it lies.

    ``place`` is the family or table it belongs to and ``index`` its row there. ``low`` and ``high`` are the ends: factors of
    a resistance, volts added to V_BE, B_F itself, or volts of a supply or a drive's end.
    """

    device: str
    parameter: str
    place: str
    index: int
    low: float
    high: float


def axes_of(network: Network) -> tuple[Axis, ...]:
    """Return an axis for everything in the circuit that has a spread."""
    found = [axis for axis in _device_axes(network) if axis.low < axis.high]
    circuit = network.circuit
    for index, node in enumerate(network.held):
        found += _range_axes(node, "V", "held", index, circuit.held[node])
    for row, name in enumerate(DRIVE_ENDS):
        if row not in _followed(network):
            found += _range_axes(circuit.drive.node, name, "drive", row, _drive_end(circuit, row))
    return tuple(found)


def small_steps(network: Network, ambient_K: float, share: float = 0.005, vbe_V: float = 1e-3) -> tuple[Axis, ...]:
    """Return an axis of small steps for every resistor, V_BE, B_F, supply and drive end, for sensitivities.

    Resistors, B_F and voltages step by ``share`` of their value, V_BE by ``vbe_V``.
    """
    found: list[Axis] = []
    for axis in _device_axes(network):
        if axis.parameter == "R":
            found.append(replace(axis, low=1.0 - share, high=1.0 + share))
        elif axis.place.endswith("bf"):
            base = next(group for group in network.groups if group.family == "bipolar").base
            usual = float(base["BF"][axis.index, 0] * (ambient_K / T0_K) ** base["XTB"][axis.index, 0])
            found.append(replace(axis, low=usual * (1.0 - share), high=usual * (1.0 + share)))
        else:
            found.append(replace(axis, low=-vbe_V, high=vbe_V))
    circuit = network.circuit
    ends = [(node, "V", "held", index, circuit.held[node]) for index, node in enumerate(network.held)]
    ends += [
        (circuit.drive.node, name, "drive", row, _drive_end(circuit, row))
        for row, name in enumerate(DRIVE_ENDS)
        if row not in _followed(network)
    ]
    for node, name, place, index, usual_range in ends:
        if usual_range.usual:
            step = abs(usual_range.usual) * share
            found.append(Axis(node, name, place, index, usual_range.usual - step, usual_range.usual + step))
    return tuple(found)


def variation(network: Network, axes: Sequence[Axis], corner: Array, ambient_K: Array) -> Variation:
    """Return the devices' departure from nominal at a corner (axes, lanes), ambient (lanes,)."""
    lanes = corner.shape[1]
    resistance: Array | None = None
    shift: dict[str, Array] = {}
    bf: Array | None = None
    for axis, position in zip(axes, corner, strict=True):
        if axis.place == "resistor":
            if resistance is None:
                resistance = np.ones((len(network.resistors), lanes))
            resistance[axis.index] = _between(axis, position, 1.0)
        elif axis.place == "bf":
            group = next(group for group in network.groups if group.family == "bipolar")
            if bf is None:
                bf = np.full((len(group.devices), lanes), np.nan)
            temperature = ambient_K + group.rise_K[axis.index, 0]
            usual = group.base["BF"][axis.index, 0] * (temperature / T0_K) ** group.base["XTB"][axis.index, 0]
            bf[axis.index] = _between(axis, position, usual)
        elif axis.place in ("bipolar", "mosfet", "diode"):
            if axis.place not in shift:
                group = next(group for group in network.groups if group.family == axis.place)
                shift[axis.place] = np.zeros((len(group.devices), lanes))
            shift[axis.place][axis.index] = _between(axis, position, 0.0)
    return Variation(resistance, shift or None, bf)


def held_voltages(network: Network, axes: Sequence[Axis], corner: Array) -> tuple[Array, Array]:
    """Return the held nodes' voltages (held nodes, lanes) and the drive's low and high ends (2, lanes) at a corner."""
    circuit, lanes = network.circuit, corner.shape[1]
    held = np.empty((len(network.held), lanes))
    held[:] = np.array([circuit.held[node].usual for node in network.held]).reshape(-1, 1)
    ends = np.empty((2, lanes))
    ends[:] = np.array([[circuit.drive.low_V.usual], [circuit.drive.high_V.usual]])
    for axis, position in zip(axes, corner, strict=True):
        if axis.place == "held":
            held[axis.index] = _between(axis, position, circuit.held[axis.device].usual)
        elif axis.place == "drive":
            ends[axis.index] = _between(axis, position, _drive_end(circuit, axis.index).usual)
    for row, place in _followed(network).items():
        ends[row] = held[place] + (_drive_end(circuit, row).usual - circuit.held[network.held[place]].usual)
    return held, ends


def one_at_a_time(axes: int) -> Array:
    """Return the corners (axes, 2 axes) of one axis at its low end each, then one at its high end each."""
    return np.concatenate((-np.eye(axes), np.eye(axes)), axis=1)


def extremes(
    evaluate: Callable[[Array, IntArray], Array], nominal: Array, axes: int, rounds: int = 4
) -> tuple[Array, Array]:
    """Find the corners that make each of several figures least and greatest.

    ``evaluate(corner (axes, lanes), figure (lanes,))`` returns the figures with those indices at those corners; ``nominal``
    (figures,) are their nominal values. Signs come from one axis at a time. Then, from all at their worst together, every
    axis is tried again at its other end, and kept where that is worse still, until nothing is: what one axis does can turn
    round where the others lie. Returns corners (axes, 2 figures), lowest first, and the figures there (2 figures,). A
    figure that does not exist is NaN and never an extreme.
    """
    figures = len(nominal)
    direction = np.repeat([-1.0, 1.0], figures)
    which = np.tile(np.arange(figures), 2)
    corner = np.zeros((axes, 2 * figures))
    best = direction * nominal[which]
    if axes == 0:
        return corner, nominal[which]
    single = one_at_a_time(axes)
    alone = evaluate(np.tile(single, figures), np.repeat(np.arange(figures), 2 * axes)).reshape(figures, 2, axes)
    for column in range(2 * figures):
        gain = np.nan_to_num(direction[column] * (alone[which[column]] - nominal[which[column]]), nan=-1.0)
        corner[:, column] = np.where((gain > 0.0).any(axis=0), np.where(gain[0] > gain[1], -1.0, 1.0), 0.0)
    found = direction * evaluate(corner, which)
    better = found > best
    corner[:, ~better] = 0.0
    best = np.where(better, found, best)
    corner, best = _with_the_slope(evaluate, corner, best, alone, direction)
    columns = np.arange(2 * figures)
    for _ in range(rounds):
        trial, owner = _neighbours(corner, columns)
        gain = np.nan_to_num(direction[owner] * evaluate(trial, which[owner]), nan=-np.inf) - best[owner]
        moves = [
            _moves(corner[:, column], trial, np.where(owner == column, gain, -np.inf), best[column]) for column in columns
        ]
        columns = np.array([column for column, move in zip(columns, moves, strict=True) if move is not None], dtype=np.intp)
        if not len(columns):
            break
        tried = np.concatenate([move for move in moves if move is not None], axis=1)
        value = (direction[columns].repeat(2) * evaluate(tried, which[columns].repeat(2))).reshape(-1, 2)
        chosen = np.argmax(np.nan_to_num(value, nan=-np.inf), axis=1)
        rows = np.arange(len(columns))
        corner[:, columns] = tried.reshape(axes, -1, 2)[:, rows, chosen]
        best[columns] = np.fmax(best[columns], value[rows, chosen])
    return corner, direction * best


def _with_the_slope(
    evaluate: Callable[[Array, IntArray], Array], corner: Array, best: Array, alone: Array, direction: Array
) -> tuple[Array, Array]:
    """Move what neither end gains alone the way the figure slopes, all at once, where that is worse still.

    Of devices in parallel each alone spoils the sharing, whichever way it moves; together they do not.
    """
    which = np.tile(np.arange(len(alone)), 2)
    slope = np.nan_to_num(np.sign(alone[:, 1] - alone[:, 0]))[which].T * direction
    moved = np.where(corner == 0.0, slope, corner)
    other = np.flatnonzero((moved != corner).any(axis=0))
    found = np.full_like(best, np.nan)
    if len(other):
        found[other] = direction[other] * evaluate(moved[:, other], which[other])
    better = found > best
    return np.where(better, moved, corner), np.where(better, found, best)


def _neighbours(corner: Array, columns: IntArray) -> tuple[Array, IntArray]:
    """Return the corners that differ from chosen columns in one axis, turned to its other end (from nominal to either), and
    the column of each."""
    trials, owners = [], []
    for column in columns:
        here = corner[:, column]
        at_end, nominal = np.flatnonzero(here != 0.0), np.flatnonzero(here == 0.0)
        axis = np.concatenate((at_end, nominal, nominal))
        trial = np.repeat(here[:, None], len(axis), axis=1)
        trial[axis, np.arange(len(axis))] = np.concatenate((-here[at_end], -np.ones(len(nominal)), np.ones(len(nominal))))
        trials.append(trial)
        owners.append(np.full(len(axis), column))
    return np.concatenate(trials, axis=1), np.concatenate(owners)


def _moves(corner: Array, trials: Array, gains: Array, best: float) -> Array | None:
    """Return the corner after the best single change and after all changes that gain by themselves (axes, 2)."""
    better = np.flatnonzero(gains > 1e-9 * abs(best))
    if not len(better):
        return None
    together = corner.copy()
    for lane in better[np.argsort(gains[better], kind="stable")]:
        changed = trials[:, lane] != corner
        together[changed] = trials[changed, lane]
    return np.stack((trials[:, int(np.argmax(gains))], together), axis=1)


def _device_axes(network: Network) -> list[Axis]:
    found = [
        Axis(device.name, "R", "resistor", index, 1.0 - device.tolerance, 1.0 + device.tolerance)
        for index, device in enumerate(network.resistors)
        if device in network.circuit.devices and device.kind == "resistor"
    ]
    names = {"bipolar": "V_BE", "mosfet": "V_TO", "diode": "V_F"}
    for group in network.groups:
        for index, device in enumerate(group.devices):
            below, above = device.vbe_spread_V
            found.append(Axis(device.name, names[group.family], group.family, index, -below, above))
            if group.family == "bipolar":
                low, high = device.hfe if device.hfe is not None else (0.0, 0.0)
                found.append(Axis(device.name, "B_F", "bf", index, low, high))
    return found


def _followed(network: Network) -> dict[int, int]:
    """Return which ends of the drive (0 low, 1 high) move with a held net, and its place among those."""
    drive, places = network.circuit.drive, {node: place for place, node in enumerate(network.held)}
    return {row: places[node] for row, node in enumerate((drive.low_follows, drive.high_follows)) if node in places}


def _range_axes(node: str, parameter: str, place: str, index: int, limits: Range) -> list[Axis]:
    return [Axis(node, parameter, place, index, limits.low, limits.high)] if limits.low < limits.high else []


def _drive_end(circuit: Circuit, row: int) -> Range:
    return circuit.drive.high_V if row else circuit.drive.low_V


def _between(axis: Axis, position: Array, usual: Array | float) -> Array:
    """Return the value at a position: straight lines from the low end over the usual value to the high end."""
    low, high = usual - axis.low, axis.high - usual
    return usual + np.where(position < 0.0, position * low, position * high)
