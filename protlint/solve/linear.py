"""An expanded network at operating points: its conductances and capacitances as matrices.

The linear circuit is (G + s C) x = 0 in the unknowns of ``protlint.solve.expanded``, with C = A^T c A, where A are the rows
of the stores and c (stores, stores) their capacitances. Lanes come first in matrices, as ``numpy.linalg`` wants them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from protlint.solve import gummel_poon
from protlint.solve.charges import (
    BipolarCharges,
    Charges,
    DiodeCharges,
    Stored,
    bipolar_charges,
    charges_of,
    diode_charges,
    mosfet_charges,
)
from protlint.solve.dc import evaluate
from protlint.solve.devices import Array, Evaluation
from protlint.solve.expanded import SHORT, Expanded
from protlint.solve.lanes import Parameters
from protlint.solve.parameters import LINK_OHM


@dataclass(frozen=True, slots=True)
class Condition:
    """Device parameters of lanes: static ones, and charges by group (None for the drive)."""

    p: Parameters
    charges: tuple[Charges | None, ...]


@dataclass(frozen=True, slots=True)
class Snapshot:
    """An expanded network at given voltages, all (rows, lanes): static currents and conductances of every junction row, the
    conductances of every resistance row, charges and capacitances of every store, and the crossed ones.

    ``slopes`` are the groups' own conductance blocks, in the sense of ``Evaluation.current_slope``.
    """

    junction_A: Array
    slopes: tuple[Array, ...]
    conductance: Array
    charge: Array
    capacitance: Array
    cross: Array


def condition(expanded: Expanded, p: Parameters, ambient_K: Array) -> Condition:
    """Return the parameters of lanes with their charges added.

    Raises
    ------
    CircuitError
        Where a charge parameter is absurd.
    """
    return Condition(p, tuple(charges_of(group, ambient_K) for group in expanded.network.groups))


def unfold(expanded: Expanded, node_V: Array, inner: Array, p: Parameters) -> Array:
    """Return all unknowns and known nodes (nodes, lanes) from a static solution; inductors' currents are left at zero."""
    network = expanded.network
    voltages = np.zeros((len(expanded.nodes), node_V.shape[1]))
    at = {node: place for place, node in enumerate(expanded.nodes)}
    for place, node in enumerate(network.nodes):
        if node in at:
            voltages[at[node]] = node_V[place]
    if SHORT in at:
        voltages[at[SHORT]] = node_V[network.output]
    evaluations = evaluate(network, p, inner)
    drops = _series_ohm(expanded, p, inner, evaluations)
    first = len(network.resistors)
    for row, series in enumerate(expanded.series):
        group, ends = network.groups[series.group], expanded.resistances[first + row]
        j = evaluations[series.group].port_A[:, series.row] * group.sign[series.row]
        voltages[int(np.argmin(ends))] = voltages[int(np.argmax(ends))] - drops[row] * _inward(series.name, j)
    return voltages


def snapshot(expanded: Expanded, at: Condition, voltages: Array, passive: Array) -> Snapshot:
    """Evaluate an expanded network at all its voltages (nodes, lanes).

    ``passive`` are the values of its capacitors and inductors (passive stores, lanes or 1), inductors' as minus L.
    """
    network, lanes = expanded.network, voltages.shape[1]
    inner = expanded.junctions @ voltages
    evaluations = evaluate(network, at.p, inner)
    junction_A = np.empty_like(inner)
    for group, evaluation in zip(network.groups, evaluations, strict=True):
        junction_A[group.rows] = evaluation.port_A.reshape(-1, lanes)
    stored = expanded.stores @ voltages
    charge, capacitance, cross = _device_stores(expanded, at, inner, stored, evaluations)
    held = stored[len(charge) :]
    values = np.broadcast_to(passive, held.shape)
    conductance = np.concatenate(
        (
            np.broadcast_to(at.p.conductance, (len(network.resistors), lanes)),
            1.0 / np.maximum(_series_ohm(expanded, at.p, inner, evaluations), LINK_OHM),
        )
    )
    return Snapshot(
        junction_A=junction_A,
        slopes=tuple(evaluation.current_slope for evaluation in evaluations),
        conductance=conductance,
        charge=np.concatenate((charge, values * held)),
        capacitance=np.concatenate((capacitance, values)),
        cross=cross,
    )


def passive_values(expanded: Expanded) -> Array:
    """Return the nominal values of capacitors (F) and inductors (minus H), (passive stores, 1)."""
    values = [-device.model["L"] if device.kind == "inductor" else device.model["C"] for device in expanded.passive]
    return np.array(values).reshape(-1, 1)


def conductance_matrix(expanded: Expanded, shot: Snapshot) -> Array:
    """Return G (lanes, unknowns, unknowns)."""
    count = expanded.unknown
    rows = np.concatenate((expanded.resistances, expanded.junctions))[:, :count]
    matrix: Array = rows.T @ (row_conductances(expanded, shot) @ rows) + expanded.constant[:, :count]
    return matrix


def row_conductances(expanded: Expanded, shot: Snapshot) -> Array:
    """Return what a voltage across each row draws through each row: (lanes, rows, rows), resistances, then junctions."""
    first, lanes = shot.conductance.shape
    rows = first + len(expanded.junctions)
    between = np.zeros((lanes, rows, rows))
    diagonal = np.arange(first)
    between[:, diagonal, diagonal] = shot.conductance.T
    for group, slope in zip(expanded.network.groups, shot.slopes, strict=True):
        members = np.arange(slope.shape[2])
        places = [first + group.rows.start + port * len(members) + members for port in range(group.ports)]
        for port, own in enumerate(places):
            for other, controlling in enumerate(places):
                between[:, own, controlling] = slope[port, other].T
    return between


def store_matrix(expanded: Expanded, shot: Snapshot) -> Array:
    """Return c (lanes, stores, stores)."""
    count, lanes = shot.capacitance.shape
    matrix = np.zeros((lanes, count, count))
    diagonal = np.arange(count)
    matrix[:, diagonal, diagonal] = shot.capacitance.T
    for place, (row, column) in enumerate(expanded.cross):
        matrix[:, row, column] += shot.cross[place]
    return matrix


def control_rows(expanded: Expanded, names: Sequence[str]) -> list[tuple[int, int, Array, Array]]:
    """Return (group, row, incidence of the output, incidence of the control) of the named devices' controlled sources.

    The source's current flows from a device's first terminal to its common one; a diode's conductance counts as its source.
    """
    found = []
    for place, group in enumerate(expanded.network.groups):
        own = expanded.junctions[group.rows, : expanded.unknown].reshape(group.ports, -1, expanded.unknown)
        for row, device in enumerate(group.devices):
            if device.name in names:
                control = own[0, row]
                output = control - own[1, row] if group.ports == 2 else control
                found.append((place, row, output, control))
    return found


def transconductance(shot: Snapshot, group: int, row: int) -> Array:
    """Return the transconductance of a device (lanes,): of a bipolar or MOSFET the part of its conductances that is not
    mutual, of a diode its conductance."""
    slope = shot.slopes[group][:, :, row]
    result: Array = slope[0, 1] - slope[1, 0] if len(slope) == 2 else slope[0, 0]
    return result


def _inward(name: str, j: Array) -> Array:
    """Return the current through a series resistance into its device, from the device's port currents (ports, lanes)."""
    inward: Array = j[0] if len(j) == 1 else -j[0]
    if name == "R_B":
        inward = j[0] + j[1]
    elif name in ("R_C", "R_D"):
        inward = -j[1]
    return inward


def _series_ohm(expanded: Expanded, p: Parameters, inner: Array, evaluations: Sequence[Evaluation]) -> Array:
    """Return the resistances inside devices (series, lanes)."""
    found = np.empty((len(expanded.series), inner.shape[1]))
    for place, series in enumerate(expanded.series):
        record = p.records[series.group]
        if not isinstance(record, gummel_poon.Bipolars):
            value = getattr(record, series.name)
        elif series.name != "R_B":
            value = record.R_side[("R_E", "R_C").index(series.name)]
        elif record.R_BM is None:
            value = record.R_B
        else:
            evaluation = evaluations[series.group]
            assert isinstance(evaluation, gummel_poon.Evaluated)
            value = gummel_poon.base_resistance(record, evaluation.transport.q_B, evaluation.port_A.sum(axis=0))
        found[place] = value[series.row]
    return found


def _device_stores(
    expanded: Expanded, at: Condition, inner: Array, stored: Array, evaluations: Sequence[Evaluation]
) -> tuple[Array, Array, Array]:
    """Return charges and capacitances (device stores, lanes) and the crossed capacitances (bipolars, lanes)."""
    lanes = inner.shape[1]
    charge, capacitance, cross = [], [], [np.zeros((0, lanes))]
    place = 0
    for group, p, evaluation in zip(expanded.network.groups, at.charges, evaluations, strict=True):
        if p is None:
            continue
        rows = inner[group.rows].reshape(group.ports, -1, lanes)
        count = rows.shape[1]
        found: Stored
        if isinstance(p, DiodeCharges):
            found = diode_charges(rows[0], evaluation.port_A[0], evaluation.current_slope[0, 0], p)
        else:
            third = _third(expanded, place + 2 * count, count, stored, rows[1])
            if isinstance(p, BipolarCharges):
                assert isinstance(evaluation, gummel_poon.Evaluated)
                found = bipolar_charges(rows, third, evaluation.transport, p)
                assert found.cross is not None
                cross.append(found.cross)
            else:
                found = mosfet_charges(rows, third, p)
        charge.append(found.charge.reshape(-1, lanes))
        capacitance.append(found.capacitance.reshape(-1, lanes))
        place += len(charge[-1])
    if not charge:
        return np.zeros((0, lanes)), np.zeros((0, lanes)), cross[0]
    kept = list(expanded.store_of)
    return np.concatenate(charge)[kept], np.concatenate(capacitance)[kept], np.concatenate(cross)


def _third(expanded: Expanded, first: int, count: int, stored: Array, instead: Array) -> Array:
    """Return the voltages of a group's third stores (devices, lanes), ``instead`` where a device has none."""
    found = np.zeros_like(instead)
    for row in range(count):
        if first + row in expanded.store_of:
            found[row] = stored[expanded.store_of.index(first + row)]
    return found
