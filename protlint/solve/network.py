"""A circuit compiled for solving: node numbers, device groups, incidence matrices, and parameters at temperature.

``compile_network`` turns a ``Circuit`` into a ``Network`` once; everything that is solved afterwards is a batch of *lanes*
(operating conditions) on it. Nodes are numbered unknown ones first, then the known ones: the held nodes in the circuit's
order, the output, and the drive's source (the drive node itself where the drive is stiff).

Unknowns are the node voltages and the inner junction voltages of the devices (``protlint.solve.devices``); a device's
inner voltages stand in rows of one array ``inner`` of shape (ports, lanes): first junction of every bipolar, second junction
of every bipolar, the same for MOSFETs, then diodes, then the limited drive if there is one.

Small signals and integration in time stand on the same pieces with the inner nodes laid open (``protlint.solve.expanded``).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from protlint.solve.circuit import Circuit, Device
from protlint.solve.devices import Array
from protlint.solve.elimination import Pattern, least_degree_order, pattern_of, scatter
from protlint.solve.parameters import LINK_OHM, CircuitError, complete
from protlint.solve.solvable import check_ends, check_floating, check_links

DRIVE_SOURCE = "drive source"
"""Name of the node behind the drive's resistance or current limit."""

LEAST_SOURCE_OHM = 1e-3
"""Resistance of a drive that states none, where its current is limited or goes straight into a junction: there a stiff one
would mean currents beyond all numbers."""

PORT_FAMILIES = (("bipolar", ("npn", "pnp"), 2), ("mosfet", ("nmos", "pmos"), 2), ("diode", ("diode", "zener"), 1))
"""Families of devices in the order of their ports: name, kinds, ports of a device."""


@dataclass(frozen=True, slots=True)
class Group:
    """Devices of one family: which of the circuit's they are, +1 or -1 each (mirror types), and their parameters by name.

    ``sign`` and each of ``base`` have shape (devices, 1); ``rows`` are its rows of ``inner`` and of the incidence matrix.
    """

    family: str
    devices: tuple[Device, ...]
    ports: int
    rows: slice
    sign: Array
    base: dict[str, Array]
    rise_K: Array
    is_shunt: Array


@dataclass(frozen=True, slots=True)
class Network:
    """A compiled circuit; see the module's description for the order of nodes and ports.

    ``incidence`` is (ports, nodes) with +1 at the control or positive end, -1 for the mirror types, so that every port sees
    an NPN or N-channel device; ``resistor_incidence`` (resistors, nodes). ``port_parts`` and ``resistor_parts`` are their
    columns of unknown and of known nodes.
    ``pattern`` is the structure of the nodal matrix of the unknown nodes, which stand in its order of elimination;
    ``scatter`` (entries, conductances) adds the groups' port conductances into it, ``resistor_scatter`` the resistors',
    ``bridge_scatter`` (entries,) one siemens across every port.
    """

    circuit: Circuit
    nodes: tuple[str, ...]
    unknown: int
    held: tuple[str, ...]
    groups: tuple[Group, ...]
    resistors: tuple[Device, ...]
    resistor_base: dict[str, Array]
    incidence: Array
    resistor_incidence: Array
    port_parts: tuple[Array, Array]
    resistor_parts: tuple[Array, Array]
    pattern: Pattern
    scatter: Array
    resistor_scatter: Array
    bridge_scatter: Array
    limited_drive: bool

    @property
    def output(self) -> int:
        """Index of the output node."""
        return len(self.nodes) - 2

    @property
    def drive(self) -> int:
        """Index of the drive's source node."""
        return len(self.nodes) - 1

    @property
    def ports(self) -> int:
        """How many ports, and rows of ``inner``, there are."""
        return len(self.incidence)


def compile_network(circuit: Circuit) -> Network:
    """Compile a circuit.

    Raises
    ------
    CircuitError
        With the reason, where it cannot be solved: absurd parameters, floating nodes, supplies joined by a link.
    """
    models = {device.name: complete(device) for device in circuit.devices}
    if len(models) != len(circuit.devices):
        raise CircuitError("two devices share one name")
    held = tuple(node for node in circuit.held if node not in (circuit.output, circuit.drive.node))
    check_ends(circuit)
    stiff = circuit.drive.resistance_ohm == 0.0 and circuit.drive.current_A is None and not _drives_a_junction(circuit)
    known = (*held, circuit.output, circuit.drive.node if stiff else DRIVE_SOURCE)
    conducting = [device for device in circuit.devices if device.kind != "capacitor"]
    unknown = tuple(dict.fromkeys(node for device in conducting for node in device.nodes if node not in known))
    if not stiff and circuit.drive.node not in unknown:
        unknown = (*unknown, circuit.drive.node)
    check_links(conducting, models, known, circuit)
    check_floating(conducting, unknown, known, circuit.drive.node if not stiff else None)
    together = [device.nodes for device in conducting]
    unknown = least_degree_order(unknown, together)
    pattern = pattern_of(unknown, together)
    place = {node: index for index, node in enumerate((*unknown, *known))}

    groups, port_ends = _groups(circuit, conducting, models, place)
    resistors = tuple(device for device in conducting if device.kind in ("resistor", "inductor"))
    if circuit.drive.current_A is None and not stiff:
        source = {"R": circuit.drive.resistance_ohm or LEAST_SOURCE_OHM}
        resistors = (*resistors, Device(DRIVE_SOURCE, "resistor", (DRIVE_SOURCE, circuit.drive.node), source))
        models[DRIVE_SOURCE] = complete(resistors[-1])
    resistor_base = {
        name: _column(models[device.name].get(name, LINK_OHM if name == "R" else 0.0) for device in resistors)
        for name in ("R", "TC1", "TC2")
    } | {"rise_K": _column(device.rise_K for device in resistors)}
    incidence = _incidence(port_ends, len(place))
    for group in groups:
        incidence[group.rows] *= np.tile(group.sign, (group.ports, 1))
    resistor_incidence = _incidence([(place[a], place[b]) for a, b in (device.nodes for device in resistors)], len(place))
    pairs = [pair for group in groups for pair in _port_pairs(group)]
    return Network(
        circuit=circuit,
        nodes=(*unknown, *known),
        unknown=len(unknown),
        held=held,
        groups=tuple(groups),
        resistors=resistors,
        resistor_base=resistor_base,
        incidence=incidence,
        resistor_incidence=resistor_incidence,
        port_parts=_parts(incidence, len(unknown)),
        resistor_parts=_parts(resistor_incidence, len(unknown)),
        pattern=pattern,
        scatter=scatter(pattern, incidence[:, : len(unknown)], pairs),
        resistor_scatter=scatter(pattern, resistor_incidence[:, : len(unknown)], _each_alone(len(resistors))),
        bridge_scatter=scatter(pattern, incidence[:, : len(unknown)], _each_alone(len(incidence))).sum(axis=1),
        limited_drive=circuit.drive.current_A is not None,
    )


def _groups(
    circuit: Circuit, conducting: Sequence[Device], models: dict[str, dict[str, float]], place: dict[str, int]
) -> tuple[list[Group], list[tuple[int, int]]]:
    """Return the devices' groups in the order of their ports, and the two nodes of every port."""
    groups: list[Group] = []
    port_ends: list[tuple[int, int]] = []
    for family, kinds, ports in PORT_FAMILIES:
        members = tuple(device for device in conducting if device.kind in kinds)
        if not members:
            continue
        ends = [[place[node] for node in device.nodes] for device in members]
        start = len(port_ends)
        if ports == 2:
            port_ends += [(control, common) for _, control, common in ends]
            port_ends += [(control, other) for other, control, _ in ends]
        else:
            port_ends += [(anode, cathode) for anode, cathode in ends]
        groups.append(_group(family, members, ports, slice(start, len(port_ends)), models, circuit.shunt))
    if circuit.drive.current_A is not None:
        row = len(port_ends)
        port_ends.append((place[DRIVE_SOURCE], place[circuit.drive.node]))
        groups.append(_group("drive", (), 1, slice(row, row + 1), models, ()))
    return groups, port_ends


def _drives_a_junction(circuit: Circuit) -> bool:
    """Tell whether the drive's node is that of a base or a diode."""
    node = circuit.drive.node
    return any(
        node == device.nodes[1] if device.kind in ("npn", "pnp") else node in device.nodes
        for device in circuit.devices
        if device.kind in ("npn", "pnp", "diode", "zener")
    )


def _group(
    family: str,
    members: tuple[Device, ...],
    ports: int,
    rows: slice,
    models: dict[str, dict[str, float]],
    shunt: Sequence[str],
) -> Group:
    names = tuple(models[members[0].name]) if members else ()
    table = np.array([[models[device.name][name] for device in members] for name in names], dtype=np.float64)
    return Group(
        family=family,
        devices=members,
        ports=ports,
        rows=rows,
        sign=_column(-1.0 if device.kind in ("pnp", "pmos") else 1.0 for device in members) if members else np.ones((1, 1)),
        base=dict(zip(names, table.reshape(len(names), len(members), 1), strict=True)),
        rise_K=_column(device.rise_K for device in members),
        is_shunt=_column(float(device.name in shunt) for device in members),
    )


def _column(values: Iterable[float]) -> Array:
    return np.array(list(values), dtype=np.float64).reshape(-1, 1)


def _incidence(ends: Sequence[tuple[int, int]], nodes: int) -> Array:
    matrix = np.zeros((len(ends), nodes))
    for row, (positive, negative) in enumerate(ends):
        matrix[row, positive] += 1.0
        matrix[row, negative] -= 1.0
    return matrix


def _port_pairs(group: Group) -> list[tuple[int, int]]:
    """Return the (row, column) ports of a group's conductances in the order of ``Evaluation.current_slope``."""
    count = (group.rows.stop - group.rows.start) // group.ports
    first = group.rows.start
    return [
        (first + row * count + device, first + column * count + device)
        for row in range(group.ports)
        for column in range(group.ports)
        for device in range(count)
    ]


def _parts(incidence: Array, unknown: int) -> tuple[Array, Array]:
    return np.ascontiguousarray(incidence[:, :unknown]), np.ascontiguousarray(incidence[:, unknown:])


def _each_alone(count: int) -> list[tuple[int, int]]:
    return [(row, row) for row in range(count)]
