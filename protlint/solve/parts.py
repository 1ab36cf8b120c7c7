"""The devices of a bench: board elements with model parameters, spreads and temperature rises."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from protlint.board.graph import BoardPart, Element
from protlint.board.shares import merged_resistance
from protlint.solve.boundary import Missing, Notes, Place
from protlint.solve.circuit import Device
from protlint.solve.derive import Derived, derive
from protlint.solve.thyristor import ANODE, NEEDED, two_transistors
from protlint.toml.text import toml_key

TERMINALS = {
    "npn": ("collector", "base", "emitter"),
    "pnp": ("collector", "base", "emitter"),
    "nmos": ("drain", "gate", "source"),
    "pmos": ("drain", "gate", "source"),
    "diode": ("anode", "cathode"),
    "zener": ("anode", "cathode"),
    "resistor": ("1", "2"),
    "fuse": ("1", "2"),
    "capacitor": ("1", "2"),
    "inductor": ("1", "2"),
}
"""Terminal roles in the order of :attr:`Device.nodes`."""

PASSIVE_PARAMETER = {"resistor": "R", "fuse": "R", "capacitor": "C", "inductor": "L"}

FUSE_OHM = 0.05
"""Cold resistance taken for a fuse that states none; common practice of the trade for fuses of a few amperes."""


def devices_of(place: Place, index: int, *, nodes: Mapping[str, str], notes: Notes) -> list[Device]:
    """Return the devices of one board element: one, or two for a Darlington part, or none where it lacks something.

    ``nodes`` maps the element's terminal roles to node names. What is missing or assumed goes into ``notes``.
    """
    element = place.board.elements[index]
    parts = [place.board.parts[part] for part in element.parts]
    if element.kind in PASSIVE_PARAMETER:
        return _passive(place, element, parts, nodes, notes)
    part = parts[0]
    kind = element.kind.removesuffix("-darlington")
    if kind == "thyristor":
        return _thyristor(place, index, part, nodes, notes)
    if kind not in TERMINALS:
        notes.missing.append(Missing("circuit", part.id, f"a model of {part.id}: a {kind} is not modelled"))
        return []
    if not set(TERMINALS[kind]) <= nodes.keys():
        notes.missing.append(Missing("part", part.id, f"pin roles of {part.id}, in [pins] or its part data"))
        return []
    derived = _derived(element.kind, part, **_load(place, index))
    notes.assumed += [("model", f"{part.id}: {sentence}") for sentence in derived.assumed]
    rise_K = _rise_K(place, index)
    hands = _darlington(part, derived, nodes) if element.kind.endswith("-darlington") else [(part.id, derived.model, nodes)]
    devices = []
    for name, model, its_nodes in hands:
        bipolar = kind in ("npn", "pnp")
        devices.append(
            Device(
                name=name,
                kind=kind,
                nodes=tuple(its_nodes[role] for role in TERMINALS[kind]),
                model=model,
                hfe=derived.hfe if bipolar else None,
                vbe_spread_V=_spread_V(place, derived, bipolar=bipolar),
                rise_K=rise_K,
                part_number=part.part_number or "",
                assumed=derived.assumed,
                derived=derived.derived,
                charges_assumed=derived.charges_assumed,
            )
        )
    return devices


def _spread_V(place: Place, derived: Derived, *, bipolar: bool) -> tuple[float, float]:
    """Return how far a junction's or gate's voltage may lie from usual.

    What the limits file states for bipolars holds for every part that is known; where it states nothing, or the part is
    not known, the wider of its default and the part's own spread.
    """
    own_V = derived.vbe_spread_V
    if not bipolar:
        return own_V or (0.0, 0.0)
    board_V = place.limits.vbe_spread_V
    if own_V is None or not (derived.assumed or place.limits.assumes("vbe_spread_V")):
        return board_V
    return max(own_V[0], board_V[0]), max(own_V[1], board_V[1])


def _derived(kind: str, part: BoardPart, *, carries_load: bool = False, carried_A: float | None = None) -> Derived:
    """Return a part's model: its own, or one derived from its data-sheet figures, or the default of its kind.

    Without a model of its own a device has the gain that its data sheet gives at the current the board needs of it.
    """
    entry = part.entry
    ratings = {name: figure.value for name, figure in entry.ratings.items()} if entry is not None else {}
    if entry is not None and not entry.model and carried_A is not None:
        ratings |= entry.gains_at(carried_A)
    if kind == "zener" and "vz" not in ratings and part.values.value is not None:
        ratings["vz"] = part.values.value
    return derive(kind, ratings, entry.model if entry is not None else {}, carries_load=carries_load)


def _load(place: Place, index: int) -> dict[str, Any]:
    """Return whether a part carries the load current and, where the board states what it needs, its share of that."""
    sharing = place.limiter.elements.get("pass", ())
    if index not in sharing:
        return {}
    needed_A = place.needs.carry_A or place.needs.regulate_A
    return {"carries_load": True, "carried_A": needed_A / len(sharing) if needed_A else None}


def _passive(place: Place, element: Element, parts: list[BoardPart], nodes: Mapping[str, str], notes: Notes) -> list[Device]:
    name = "+".join(part.id for part in parts)
    ends = tuple(nodes[role] for role in TERMINALS[element.kind] if role in nodes)
    if len(ends) != 2:
        notes.missing.append(Missing("part", parts[0].id, f"two connected pins of {name}"))
        return []
    if ends[0] == ends[1]:
        return []
    parameter = PASSIVE_PARAMETER[element.kind]
    if element.kind == "resistor":
        return _resistor(place, element, parts, name, ends, notes)
    value = element.value
    if element.kind == "fuse":
        entry = parts[0].entry
        value = entry.ratings["resistance"].value if entry is not None and "resistance" in entry.ratings else FUSE_OHM
        if value == FUSE_OHM:
            notes.assumed.append(("circuit", f"{name} is taken as {FUSE_OHM:g} ohm when cold"))
    kind = "resistor" if element.kind == "fuse" else element.kind
    if value is None:
        # no current at rest depends on it
        notes.unread.append(parts[0].id)
        return [Device(name=name, kind=kind, nodes=ends, model={})]
    return [Device(name=name, kind=kind, nodes=ends, model={parameter: value})]


def _resistor(
    place: Place, element: Element, parts: list[BoardPart], name: str, ends: tuple[str, ...], notes: Notes
) -> list[Device]:
    """Return a resistor, or a merged bank or chain with the spread that its parts' tolerances give together."""
    unread = [part for part in parts if part.values.value is None]
    if unread:
        notes.missing += [Missing("value", part.id, f"a readable value of {part.id}") for part in unread]
        return []
    stated = {part.index: part.values.tolerance for part in parts}
    tolerance = {
        index: place.limits.resistor_tolerance if fraction is None else fraction for index, fraction in stated.items()
    }
    values_ohm = {part.index: part.values.value or 0.0 for part in parts}
    if None in stated.values() and place.limits.assumes("resistor_tolerance"):
        notes.assumed.append(("tolerance", f"{name}: a tolerance of {place.limits.resistor_tolerance * 100:g} %"))

    def merged_ohm(sign: int) -> float:
        return merged_resistance(element.tree, lambda one: values_ohm[one] * (1.0 + sign * tolerance[one]))

    usual_ohm, high_ohm = merged_ohm(0), merged_ohm(1)
    return [Device(name=name, kind="resistor", nodes=ends, model={"R": usual_ohm}, tolerance=high_ohm / usual_ohm - 1.0)]


def _thyristor(place: Place, index: int, part: BoardPart, nodes: Mapping[str, str], notes: Notes) -> list[Device]:
    """Return a thyristor's two transistors, the one at the gate under the part's own name, and its gate resistance."""
    if not {"anode", "gate", "cathode"} <= nodes.keys():
        notes.missing.append(Missing("part", part.id, f"pin roles of {part.id}, in [pins] or its part data"))
        return []
    ratings = {} if part.entry is None else {name: figure.value for name, figure in part.entry.ratings.items()}
    number = part.part_number if part.entry is None else part.entry.part_number
    lacking = [name for name in NEEDED if name not in ratings]
    if lacking:
        keys = ", ".join(f"{toml_key(number)}.ratings.{name}" if number else f"ratings.{name}" for name in lacking)
        first = "" if number else f"a part number for {part.id}, then its "
        notes.missing += [Missing("circuit", part.id, f"a model of {part.id}: {first}{keys}")]
        return []
    pair = two_transistors(ratings)
    notes.assumed += [("model", f"{part.id}: {sentence}") for sentence in pair.assumed]
    below_V, above_V = place.limits.vbe_spread_V
    spread_V = (below_V, above_V if pair.above_V is None else max(above_V, pair.above_V))
    rise_K, inner = _rise_K(place, index), f"{part.id} inner layer"
    anode, gate, cathode = nodes["anode"], nodes["gate"], nodes["cathode"]
    return [
        Device(
            part.id,
            "npn",
            (inner, gate, cathode),
            pair.npn,
            vbe_spread_V=spread_V,
            assumed=pair.assumed,
            derived=pair.derived,
            rise_K=rise_K,
            part_number=number or "",
        ),
        Device(part.id + ANODE, "pnp", (gate, inner, anode), pair.pnp, rise_K=rise_K, part_number=number or ""),
        Device(
            f"{part.id} gate",
            "resistor",
            (gate, cathode),
            {"R": pair.gate_ohm, "TC1": pair.gate_per_K},
            tolerance=pair.gate_spread,
            rise_K=rise_K,
        ),
    ]


def _darlington(
    part: BoardPart, derived: Derived, nodes: Mapping[str, str]
) -> list[tuple[str, Mapping[str, float], Mapping[str, str]]]:
    """Return the two transistors of a Darlington part: (name, model, nodes by role)."""
    middle = f"{part.id} inner emitter"
    first = {**nodes, "emitter": middle}
    second = {**nodes, "base": middle}
    return [(f"{part.id} driver", derived.driver_model, first), (part.id, derived.model, second)]


def _rise_K(place: Place, index: int) -> float:
    """Return how far above ambient a limits file puts a device."""
    if index in place.limiter.elements.get("shunt", ()):
        return place.needs.shunt_rise_K or 0.0
    if any(index in place.limiter.elements.get(role, ()) for role in ("pass", "driver")):
        return place.needs.pass_rise_K or 0.0
    return 0.0
