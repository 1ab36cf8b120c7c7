"""Equal circuits are solved once: a bounded memory of solutions keyed by the circuit without its names."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from protlint.solve.circuit import Circuit
from protlint.solve.corners import NET_PARAMETERS
from protlint.solve.solution import Advice, Loop, Point, Solution, Worst

Key = tuple[Any, ...]
Names = tuple[tuple[str, ...], tuple[str, ...]]
"""Device names and node names."""

LARGEST = 256
"""How many solutions are kept at most; the ones longest unused go first."""


@dataclass(slots=True)
class Memo:
    """Solutions of one review by canonical circuit and ambients, with the names they were solved under."""

    kept: OrderedDict[Key, tuple[Names, Solution]] = field(default_factory=OrderedDict)

    def recall(self, circuit: Circuit, ambients_degC: tuple[float, ...]) -> Solution | None:
        """Return the solution of an equal circuit under this circuit's names, or None."""
        key, names = canonical(circuit, ambients_degC)
        found = self.kept.get(key)
        if found is None:
            return None
        self.kept.move_to_end(key)
        then, solution = found
        assumed = circuit.assumed + tuple(sentence for device in circuit.devices for sentence in device.assumed)
        devices, nodes = (dict(zip(old, new, strict=True)) for old, new in zip(then, names, strict=True))
        return replace(renamed(solution, devices, nodes), assumed=assumed)

    def keep(self, circuit: Circuit, ambients_degC: tuple[float, ...], solution: Solution) -> None:
        """Keep a solution."""
        key, names = canonical(circuit, ambients_degC)
        self.kept[key] = (names, solution)
        while len(self.kept) > LARGEST:
            self.kept.popitem(last=False)


def canonical(circuit: Circuit, ambients_degC: tuple[float, ...]) -> tuple[Key, Names]:
    """Return a key that equal circuits share whatever their names, and the names in the key's order.

    Nodes and devices are numbered in the order in which the circuit lists them.
    """
    nodes: dict[str, int] = {}
    for node in (node for device in circuit.devices for node in device.nodes):
        nodes.setdefault(node, len(nodes))
    for node in (*circuit.held, circuit.output, circuit.drive.node, *circuit.shorts):
        nodes.setdefault(node, len(nodes))
    devices = {device.name: place for place, device in enumerate(circuit.devices)}
    rows = tuple(
        (
            device.kind,
            tuple(nodes[node] for node in device.nodes),
            tuple(sorted(device.model.items())),
            device.tolerance,
            device.hfe,
            device.vbe_spread_V,
            device.rise_K,
        )
        for device in circuit.devices
    )
    drive = circuit.drive
    key = (
        rows,
        tuple((nodes[node], limits) for node, limits in circuit.held.items()),
        (nodes[drive.node], drive.low_V, drive.high_V, drive.resistance_ohm, drive.current_A),
        tuple(None if one is None else nodes.get(one, -1) for one in (drive.low_follows, drive.high_follows)),
        nodes[circuit.output],
        tuple(nodes[node] for node in circuit.shorts),
        tuple(
            tuple(devices.get(name, -1) for name in names)
            for names in (circuit.shunt, circuit.pass_devices, circuit.sense, circuit.latch)
        ),
        (circuit.output_V, circuit.output_reach_V, circuit.ground_leg, circuit.regulates),
        (circuit.output_capacitance_F, circuit.output_inductance_H),
        ambients_degC,
    )
    return key, (tuple(devices), tuple(nodes))


def renamed_point(point: Point, devices: Mapping[str, str]) -> Point:
    """Return a point with its devices called by other names."""
    return replace(point, states={devices.get(name, name): state for name, state in point.states.items()})


def renamed(solution: Solution, devices: Mapping[str, str], nodes: Mapping[str, str]) -> Solution:
    """Return a solution with its devices and nodes called by other names."""

    def point(old: Point | None) -> Point | None:
        return None if old is None else renamed_point(old, devices)

    def several(old: tuple[Point, ...]) -> tuple[Point, ...]:
        return tuple(new for one in old if (new := point(one)) is not None)

    def owner(name: str, parameter: str) -> str:
        return (nodes if parameter in NET_PARAMETERS else devices).get(name, name)

    def step(text: str) -> str:
        name, _, parameter = text.rpartition(".")
        return f"{owner(name, parameter)}.{parameter}"

    def worst(old: Worst | None) -> Worst | None:
        return None if old is None else replace(old, corner={step(text): place for text, place in old.corner.items()})

    def loop(old: Loop | None) -> Loop | None:
        if old is None:
            return None
        return replace(old, worst=worst(old.worst), worst_without_wiring=worst(old.worst_without_wiring))

    return replace(
        solution,
        locus=several(solution.locus),
        held_short=point(solution.held_short),
        worst_point=point(solution.worst_point),
        at_carry=point(solution.at_carry),
        high_short=several(solution.high_short),
        unlimited=several(solution.unlimited),
        high_locus=tuple(several(points) for points in solution.high_locus),
        sensitivities=tuple(replace(one, device=owner(one.device, one.parameter)) for one in solution.sensitivities),
        corners={end: {step(text): position for text, position in steps.items()} for end, steps in solution.corners.items()},
        loop=loop(solution.loop),
        advice=None if solution.advice is None else _advice_renamed(solution.advice, devices, nodes),
        short=None if solution.short is None else nodes.get(solution.short, solution.short),
        shorts=tuple(replace(one, node=nodes.get(one.node, one.node), point=point(one.point)) for one in solution.shorts),
    )


def _advice_renamed(advice: Advice, devices: Mapping[str, str], nodes: Mapping[str, str]) -> Advice:
    """Return advice with devices and nodes called by other names."""

    def other(name: str | None) -> str | None:
        return None if name is None else devices.get(name, name)

    fits = tuple(
        replace(
            fit,
            nodes=(nodes.get(fit.nodes[0], fit.nodes[0]), nodes.get(fit.nodes[1], fit.nodes[1])),
            instead_of=other(fit.instead_of),
        )
        for fit in advice.fits
    )
    effects = tuple(replace(one, part=devices.get(one.part, one.part)) for one in advice.effects)
    return replace(advice, effects=effects, costs=other(advice.costs), fits=fits)
