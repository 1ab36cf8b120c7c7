"""The bench: a limiter and its surroundings on the board as a solvable circuit, in words people can check."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from protlint.board.graph import Board
from protlint.limits import LimiterLimits, Limits
from protlint.solve.boundary import Missing, Notes, Place, drive_of, hold_supplies, short_nodes
from protlint.solve.circuit import Circuit, Device
from protlint.solve.parts import devices_of
from protlint.solve.surroundings import MOST_DEVICES, survey_surroundings
from protlint.toml.text import toml_key
from protlint.topology.limiter import Limiter

LATCH = "others.latch"
"""The role of a transistor that holds the shunt on once it has tripped."""


@dataclass(frozen=True, slots=True)
class Bench:
    """A limiter's circuit with the way back to the board.

    ``circuit`` is None where something is missing; ``missing`` then says what. ``element_of`` maps a device's name to the
    board element it stands for; ``nets`` maps each net's name to what holds it; ``assumed`` holds (subject, sentence)
    pairs, the subject being ``drive``, ``short``, ``supply``, ``model``, ``tolerance`` or ``circuit``; ``unread`` the ids
    of capacitors and inductors whose value cannot be read: no current depends on it, but loop and step do.
    """

    circuit: Circuit | None
    missing: tuple[Missing, ...] = ()
    element_of: Mapping[str, int] = field(default_factory=dict)
    nets: Mapping[str, str] = field(default_factory=dict)
    assumed: tuple[tuple[str, str], ...] = ()
    unread: tuple[str, ...] = ()

    @property
    def parts_without_value(self) -> tuple[str, ...]:
        """Return the ids of parts whose value the circuit needs and lacks."""
        return tuple(one.part for one in self.missing if one.subject == "value" and one.part is not None)


def build_bench(board: Board, limiter: Limiter, *, limits: Limits, needs: LimiterLimits) -> Bench:
    """Return the circuit of a limiter as it stands on its board, or what is missing for it."""
    around = survey_surroundings(board, limiter)
    place = Place(board, limiter, around, limits, needs)
    if len(around.elements) > MOST_DEVICES:
        return Bench(None, (_too_large(place),))
    notes = Notes(assumed=[("circuit", sentence) for sentence in around.left_out])
    held = hold_supplies(place, notes)
    shorts = short_nodes(place, held, notes)
    drive, feed = drive_of(place, held, notes)
    devices: list[Device] = []
    element_of: dict[str, int] = {}
    for index in around.elements:
        made = devices_of(place, index, nodes=_nodes(place, index, feed, drive.node if drive else ""), notes=notes)
        devices += made
        element_of |= {device.name: index for device in made}
    if notes.missing or drive is None or not shorts:
        return Bench(None, tuple(notes.missing), element_of, notes.words, tuple(notes.assumed), tuple(notes.unread))
    touched = {node for device in devices for node in device.nodes}
    circuit = Circuit(
        devices=tuple(devices),
        held={node: value for node, value in held.items() if node in touched or node in shorts},
        drive=drive,
        output=place.node_of[around.output],
        shorts=shorts,
        shunt=_transistors(devices, _named(limiter, "shunt", element_of)),
        pass_devices=_named(limiter, "pass", element_of),
        sense=_named(limiter, "sense", element_of),
        output_V=needs.output_V,
        output_reach_V=(min(one.low for one in held.values()), max(one.high for one in held.values())),
        ground_leg=_has_ground_leg(place),
        regulates=_regulates(place),
        output_capacitance_F=sum(_at_the_output(place, "capacitor", notes, to_supply=True)),
        output_inductance_H=max(_at_the_output(place, "inductor", notes, to_supply=False), default=0.0),
        latch=_latch(board, limiter, devices, element_of),
        assumed=tuple(sentence for _, sentence in notes.assumed),
    )
    notes.words[circuit.output] = "the output"
    words = {node: notes.words.get(node, "solved for") for node in sorted(touched | set(notes.words))}
    return Bench(circuit, (), element_of, words, tuple(notes.assumed), tuple(notes.unread))


def _transistors(devices: list[Device], names: tuple[str, ...]) -> tuple[str, ...]:
    """Return which of some devices are no resistors: a thyristor brings its gate's."""
    resistors = {device.name for device in devices if device.kind == "resistor"}
    return tuple(name for name in names if name not in resistors)


def _latch(board: Board, limiter: Limiter, devices: list[Device], element_of: Mapping[str, int]) -> tuple[str, ...]:
    """Return the transistors that hold the shunt on: of a pair the other one, of a thyristor its inner PNP."""
    others = limiter.elements.get(LATCH, ())
    fired = [one for one in limiter.elements.get("shunt", ()) if board.elements[one].kind == "thyristor"]
    return tuple(
        device.name
        for device in devices
        if element_of[device.name] in others or (element_of[device.name] in fired and device.kind == "pnp")
    )


def _too_large(place: Place) -> Missing:
    net = place.limiter.nets["drive"]
    name = "?" if net is None else place.board.nets[net].name
    return Missing("drive", None, f"[drive.{toml_key(name)}]: more than {MOST_DEVICES} parts hang on this drive", net=name)


def _nodes(place: Place, index: int, feed: int | None, feed_node: str) -> dict[str, str]:
    """Return an element's nodes by role; what a feeding supply gives the drive's parts comes from the feed's own node."""
    element = place.board.elements[index]
    nodes = {role: place.node_of[net] for role, net in element.terminals.items()}
    carries_load = any(index in place.limiter.elements.get(role, ()) for role in ("pass", "driver", "sense", "shunt"))
    if feed is None or carries_load or index in place.around.power_path:
        return nodes
    return {role: feed_node if element.terminals[role] == feed else node for role, node in nodes.items()}


def _named(limiter: Limiter, role: str, element_of: Mapping[str, int]) -> tuple[str, ...]:
    indices = {index for name, found in limiter.elements.items() if name.split(".")[0] == role for index in found}
    return tuple(name for name, index in element_of.items() if index in indices)


def _has_ground_leg(place: Place) -> bool:
    """Tell whether a preset leg makes the limit follow the output voltage.

    Where the far end of the sense resistance is the output, that is a leg to a net that stays put; where it is not, a leg
    to the output.
    """
    legs = [index for role, indices in place.limiter.elements.items() if role.split(".")[0] == "preset" for index in indices]
    nets = {net for index in legs for net in place.board.elements[index].terminals.values()}
    if place.limiter.nets["far"] == place.around.output:
        return any(place.usual_V(net) is not None for net in nets)
    return place.around.output in nets


def _at_the_output(place: Place, kind: str, notes: Notes, *, to_supply: bool) -> list[float]:
    """Return the values of the board's parts of a kind from the output to supplies, or to other nets, outside the circuit,
    as far as they can be read; note those that cannot."""
    board, values = place.board, []
    for index, _ in board.elements_at[place.around.output]:
        element = board.elements[index]
        others = [net for net in element.terminals.values() if net != place.around.output]
        if element.kind != kind or not any((place.usual_V(net) is not None) == to_supply for net in others):
            continue
        if not to_supply and index in place.around.elements:
            continue
        if element.value is not None:
            values.append(element.value)
        else:
            notes.unread += [id for part in element.parts if (id := board.parts[part].id) not in notes.unread]
    return values


def _regulates(place: Place) -> bool:
    """Tell whether a sink or source is fed straight from a supply, with nothing on the board to take the drive away."""
    if place.needs.regulate_A is not None:
        return True
    collector_out = place.limiter.nets["far"] != place.around.output
    own = {index for indices in place.limiter.elements.values() for index in indices}
    return (
        collector_out
        and place.around.fed_by is not None
        and set(place.around.elements) <= own | set(place.around.power_path)
    )
