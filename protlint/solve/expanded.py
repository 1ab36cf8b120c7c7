"""A compiled network with everything that moves in time: inner device nodes, capacitors, inductors.

The static solver folds series resistances into the devices; with charges inside, the inner nodes have to stand. The
*unknowns* here are the network's unknown nodes, the nodes that only capacitors touch, the inner nodes of devices, and the
currents of inductors; the known nodes follow. What lies between nodes is kept as rows of incidence matrices over all of
them: resistances, junctions (the ports of ``protlint.solve.network``), and *stores*, which hold a charge each: those of
devices first, then capacitors, then inductors, whose row picks their own current and whose charge is minus their flux.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Literal

import numpy as np

from protlint.solve.charges import missing_charges
from protlint.solve.circuit import Device
from protlint.solve.dc import NODE_LEAK_S
from protlint.solve.devices import Array
from protlint.solve.network import Group, Network
from protlint.solve.parameters import LINK_OHM, CircuitError

LONE_LEAK_S = 1e-8
"""From nodes that only capacitors touch to 0 V: they have to have a voltage, and 100 Mohm shapes no loop."""

SHORT = "wiring to the short"
"""Name of the inductance of the wiring, and of the node behind it."""
OUTPUT_CAPACITOR = "output capacitance"

Output = Literal["held", "wired", "free"]
"""The output's node: held, held through the inductance of the wiring, or left to what flows into it."""

Ends = tuple[str, str]
"""Names of a row's positive and negative node; an inductor's store has its own current and nothing."""


@dataclass(frozen=True, slots=True)
class Series:
    """A resistance inside a device: the place of its group, its device's row there, and its name in the static model."""

    group: int
    row: int
    name: str


@dataclass(frozen=True, slots=True)
class Expanded:
    """An expanded network; incidence matrices are (rows, unknowns and known nodes).

    ``nodes`` names the unknowns, then the known nodes in the network's order. ``resistances`` has a row for each resistor of
    the network (zero for its inductors), then one for each of ``series``. Rows of ``junctions`` and of device stores are
    turned round for mirror types, so that their voltages are those of NPN and N-channel devices. ``store_of`` says for each
    device store which of all the groups' stores, laid out group by group and kind by kind, it is; ``store_owner`` whose each
    store is; ``cross`` are the (row, column) pairs of stores of one bipolar whose charges depend on each other. ``passive``
    are the capacitors and inductors behind the last stores. ``constant`` (unknowns, all nodes) holds the leaks, and of
    the inductors their coupling and the resistance of a link, which the static solver takes them for.
    """

    network: Network
    nodes: tuple[str, ...]
    unknown: int
    series: tuple[Series, ...]
    resistances: Array
    junctions: Array
    stores: Array
    store_of: tuple[int, ...]
    store_owner: tuple[str, ...]
    cross: tuple[tuple[int, int], ...]
    passive: tuple[Device, ...]
    constant: Array

    def index(self, node: str) -> int:
        """Return a node's place among the unknowns and known nodes."""
        return self.nodes.index(node)


@dataclass(slots=True)
class _Rows:
    """Rows by the names of their ends while the network comes together."""

    inner: list[str] = field(default_factory=list)
    series: list[Series] = field(default_factory=list)
    series_ends: list[Ends] = field(default_factory=list)
    junctions: list[Ends] = field(default_factory=list)
    stores: list[Ends] = field(default_factory=list)
    store_of: list[int] = field(default_factory=list)
    store_owner: list[str] = field(default_factory=list)
    cross: list[tuple[int, int]] = field(default_factory=list)


def expand(network: Network, *, output: Output = "held", split: str | None = None) -> Expanded:
    """Expand a network.

    ``split`` names a device whose control terminal is cut from its net: it gets a node of its own, called
    :func:`split_node`.

    Raises
    ------
    CircuitError
        Where dynamic data is missing; the message lists the part-data keys.
    """
    circuit = network.circuit
    missing = missing_charges(circuit)
    if missing:
        raise CircuitError("; ".join(missing))
    known = list(network.nodes[network.unknown :])
    unknown = list(network.nodes[: network.unknown])
    if output != "held":
        known[known.index(circuit.output)] = SHORT
        unknown.append(circuit.output)
    passive = _passive(network, output)
    seen = {*known, *unknown}
    lone = list(dict.fromkeys(node for device in passive for node in device.nodes if node not in seen))
    rows = _Rows(inner=[*unknown, *lone])
    if split is not None:
        rows.inner.append(split_node(split))
    place = 0
    for position, group in enumerate(network.groups):
        place = _add_group(rows, position, group, place, split)
    if network.limited_drive:
        rows.junctions.append(_ends(network, network.incidence[-1]))
    inductors = [device for device in passive if device.kind == "inductor"]
    nodes = (*rows.inner, *(_current(device) for device in inductors), *known)
    index = {node: position for position, node in enumerate(nodes)}
    count = len(nodes) - len(known)
    constant = np.zeros((count, len(nodes)))
    for place, node in enumerate(rows.inner):
        constant[place, place] = LONE_LEAK_S if node in lone else NODE_LEAK_S
    for device in inductors:
        _couple(constant, device, index)
    rows.store_owner += [device.name for device in passive]
    rows.stores += [(device.nodes[0], device.nodes[1]) for device in passive if device.kind != "inductor"]
    rows.stores += [(_current(device), "") for device in inductors]
    resistors = [
        ("", "") if device.kind == "inductor" else (device.nodes[0], device.nodes[1]) for device in network.resistors
    ]
    return Expanded(
        network=network,
        nodes=nodes,
        unknown=count,
        series=tuple(rows.series),
        resistances=_incidence([*resistors, *rows.series_ends], index),
        junctions=_incidence(rows.junctions, index),
        stores=_incidence(rows.stores, index),
        store_of=tuple(rows.store_of),
        store_owner=tuple(rows.store_owner),
        cross=tuple(rows.cross),
        passive=passive,
        constant=constant,
    )


def _couple(constant: Array, inductor: Device, index: dict[str, int]) -> None:
    """Add an inductor: its current flows out of one node into the other, and the voltage between them drives it."""
    own = index[_current(inductor)]
    constant[own, own] = 0.0 if inductor.name == SHORT else -LINK_OHM
    for node, sign in zip(inductor.nodes, (1.0, -1.0), strict=True):
        constant[own, index[node]] += sign
        if index[node] < len(constant):
            constant[index[node], own] += sign


def split_node(device: str) -> str:
    """Return the name of the node a device's control terminal gets when it is cut from its net."""
    return f"{device} control"


def _passive(network: Network, output: Output) -> tuple[Device, ...]:
    """Return the capacitors, then the inductors; with a loose output the board's capacitance there, and the wiring."""
    circuit = network.circuit
    capacitors = [device for device in circuit.devices if device.kind == "capacitor"]
    inductors = [device for device in circuit.devices if device.kind == "inductor"]
    if output != "held":
        capacitors.append(
            Device(OUTPUT_CAPACITOR, "capacitor", (circuit.output, SHORT), {"C": circuit.output_capacitance_F})
        )
    if output == "wired":
        inductors.append(Device(SHORT, "inductor", (circuit.output, SHORT), {"L": 0.0}))
    return (*capacitors, *inductors)


def _add_group(rows: _Rows, position: int, group: Group, place: int, split: str | None) -> int:
    """Add a group's inner nodes, series resistances, junctions and stores; return the layout's next free place."""
    inner = [_inner_nodes(rows, position, group, row, split) for row in range(len(group.devices))]
    count = len(inner)
    names = [device.name for device in group.devices]
    if group.family == "diode":
        ends = [(node["A"], node["K"]) for node in inner]
        rows.junctions += ends
        rows.stores += ends
        rows.store_of += range(place, place + count)
        rows.store_owner += names
        return place + count
    if group.family == "drive":
        return place
    control = [_turned(group, row, node["control"], node["common"]) for row, node in enumerate(inner)]
    other = [_turned(group, row, node["control"], node["other"]) for row, node in enumerate(inner)]
    rows.junctions += control + other
    if group.family == "bipolar":
        third = [_turned(group, row, node["terminal"], node["other"]) for row, node in enumerate(inner)]
        wanted = [device.model.get("XCJC", 1.0) < 1.0 for device in group.devices]
        first = len(rows.stores)
        rows.cross += [(first + row, first + count + row) for row in range(count)]
    else:
        third = [_turned(group, row, group.devices[row].nodes[2], node["other"]) for row, node in enumerate(inner)]
        wanted = [device.model.get("CBD", 0.0) > 0.0 for device in group.devices]
    rows.stores += control + other + [ends for ends, is_wanted in zip(third, wanted, strict=True) if is_wanted]
    rows.store_of += range(place, place + 2 * count)
    rows.store_of += [place + 2 * count + row for row in range(count) if wanted[row]]
    rows.store_owner += names + names + [name for name, is_wanted in zip(names, wanted, strict=True) if is_wanted]
    return place + 3 * count


def _turned(group: Group, row: int, positive: str, negative: str) -> Ends:
    return (positive, negative) if group.sign[row, 0] > 0.0 else (negative, positive)


def _inner_nodes(rows: _Rows, position: int, group: Group, row: int, split: str | None) -> dict[str, str]:
    """Return where a device's junctions lie; a terminal with a series resistance gets an inner node."""
    device = group.devices[row]
    if group.family == "drive":
        return {}
    if group.family == "diode":
        terminals = {"A": (device.nodes[0], "RS", "R_S"), "K": (device.nodes[1], "", "")}
    else:
        terminal = split_node(device.name) if device.name == split else device.nodes[1]
        names = (
            (("RC", "R_C"), ("RB", "R_B"), ("RE", "R_E"))
            if group.family == "bipolar"
            else (("RD", "R_D"), ("", ""), ("RS", "R_S"))
        )
        terminals = {
            "other": (device.nodes[0], *names[0]),
            "control": (terminal, *names[1]),
            "common": (device.nodes[2], *names[2]),
        }
    found = {}
    for role, (outer, parameter, name) in terminals.items():
        found[role] = outer
        if parameter and _has_resistance(group, row, parameter):
            found[role] = f"{device.name} inner {role}"
            rows.inner.append(found[role])
            rows.series.append(Series(position, row, name))
            rows.series_ends.append((outer, found[role]))
    if group.family != "diode":
        found["terminal"] = terminals["control"][0]
    return found


def _has_resistance(group: Group, row: int, parameter: str) -> bool:
    names = ("RB", "RBM") if parameter == "RB" else (parameter,)
    return any(float(group.base[name][row, 0]) > 0.0 for name in names)


def _current(device: Device) -> str:
    return f"current of {device.name}"


def _ends(network: Network, row: Array) -> Ends:
    return network.nodes[int(np.argmax(row))], network.nodes[int(np.argmin(row))]


def _incidence(ends: Sequence[Ends], index: dict[str, int]) -> Array:
    matrix = np.zeros((len(ends), len(index)))
    for row, (positive, negative) in enumerate(ends):
        for node, sign in ((positive, 1.0), (negative, -1.0)):
            if node:
                matrix[row, index[node]] += sign
    return matrix
