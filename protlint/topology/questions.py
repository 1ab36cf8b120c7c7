"""The questions a rule may ask about nets, answered on a board."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping, Set

from protlint.board.regulators import regulator_across
from protlint.topology.index import CONTROLLED, RAIL, Index
from protlint.topology.terms import DIRECTED, Test

LATE = frozenset(
    {
        "no-input", "inner", "undriven", "closed", "held", "leaves", "nearer", "pulled", "read", "twin", "regulator",
        "npn-follows", "pnp-follows",
    }
)  # fmt: skip
"""Questions that can be answered only when every required part is known."""

PASSIVE = frozenset({"resistor", "capacitor", "inductor", "fuse"}) | DIRECTED


def is_late(test: Test) -> bool:
    """Tell whether a test, or one inside it, has to wait for the whole match."""
    return test.name in LATE or any(isinstance(one, Test) and is_late(one) for one in test.of)


def by_flags(test: Test, flags: Mapping[str, int]) -> bool | None:
    """Answer a test from the flags of its nets alone; None where they do not tell."""
    if test.name in ("not", "or", "and"):
        answers = [by_flags(one, flags) for one in test.of if isinstance(one, Test)]
        if test.name == "not":
            return None if answers[0] is None else not answers[0]
        decisive = test.name == "or"
        if decisive in answers:
            return decisive
        return None if None in answers else not decisive
    if test.name in ("n-type", "p-type"):
        return test.name == "n-type"
    is_rail = [flags[name] == RAIL for name in test.of if isinstance(name, str)]
    if test.name == "supply":
        return is_rail[0]
    if test.name in ("ground", "lowest", "highest", "pulls-down", "pulls-up"):
        return None if is_rail[0] else False
    if test.name in ("same", "apart") and is_rail[0] != is_rail[1]:
        return test.name == "apart"
    return None


def holds(test: Test, nets: Mapping[str, int], index: Index, own: Collection[int] = ()) -> bool:
    """Answer a test about bound nets; ``own`` are the elements of the match (used by the late ones)."""
    if test.name == "not":
        return not any(holds(one, nets, index, own) for one in test.of if isinstance(one, Test))
    if test.name == "or":
        return any(holds(one, nets, index, own) for one in test.of if isinstance(one, Test))
    if test.name == "and":
        return all(holds(one, nets, index, own) for one in test.of if isinstance(one, Test))
    if test.name in ("n-type", "p-type"):
        return test.name == "n-type"
    net, *others = (nets[name] for name in test.of if isinstance(name, str))
    voltage_V = index.voltage_V.get(net)
    match test.name:
        case "supply":
            return voltage_V is not None
        case "ground":
            return voltage_V == 0.0
        case "lowest":
            return voltage_V is not None and voltage_V == index.lowest_V
        case "highest":
            return voltage_V is not None and voltage_V == index.highest_V
        case "pulls-down":
            return _turns_off(voltage_V, others[0], others[1], index, 1.0)
        case "pulls-up":
            return _turns_off(voltage_V, others[0], others[1], index, -1.0)
        case "same":
            return net == others[0]
        case "apart":
            return net != others[0]
        case "no-input":
            return _no_input(net, set(nets.values()), index, own)
        case "inner":
            return _inner(net, index, own)
        case "closed":
            return _leads_only_to(net, set(nets.values()), index, own)
        case "leaves":
            return leaves(net, index)
        case "nearer":
            return _resistance_ohm(net, others[0], index) < _resistance_ohm(net, others[1], index)
        case "held":
            return _leads_only_to(net, {*nets.values(), *index.voltage_V}, index, own)
        case "pulled":
            beside = (one for one in index.on_net(net, ("resistor",)) if one not in own)
            return any(end in index.voltage_V for one in beside for end in index.terminals[one].values() if end != net)
        case "read":
            return _read(net, index, own)
        case "twin":
            return _twin(net, others[0], index, own)
        case "regulator":
            ends = [(taking, giving) for taking in index.board_nets(net) for giving in index.board_nets(others[0])]
            return any(regulator_across(index.board, taking, giving) is not None for taking, giving in ends)
        case "npn-follows" | "pnp-follows":
            return _followed(net, _FOLLOWERS[test.name], index, own)
        case "undriven":
            return all(element in own or index.kind[element] in PASSIVE for element, _ in index.at[net])
    raise KeyError(test.name)


def _turns_off(voltage_V: float | None, load: int, far: int, index: Index, sign: float) -> bool:
    """Tell whether a supply, tied to the control of a pass device, turns it off; ``sign`` is -1 for the mirror.

    With its far end on a supply, a device of the N kind is turned off by what is no higher than that. A follower from a
    positive supply is turned off by ground and below, one from ground or a negative supply by what is lower than that.
    Where neither is known, by the board's lowest supply.
    """
    if voltage_V is None:
        return False
    if far in index.voltage_V:
        return sign * (voltage_V - index.voltage_V[far]) <= 0.0
    if load in index.voltage_V:
        load_V = index.voltage_V[load]
        return sign * voltage_V <= 0.0 if sign * load_V > 0.0 else sign * (voltage_V - load_V) < 0.0
    return voltage_V == (index.lowest_V if sign > 0.0 else index.highest_V)


def _no_input(net: int, bound: Set[int], index: Index, own: Collection[int]) -> bool:
    """Tell whether no capacitor brings a signal onto a net from outside the match."""
    held = bound | index.voltage_V.keys()
    for element, _ in index.at[net]:
        if index.kind[element] == "capacitor" and element not in own:
            for other in set(index.terminals[element].values()) - {net} - held:
                if not _leads_only_to(other, held, index, own):
                    return False
    return True


FARTHEST = 16
"""The most nets looked at to tell where a net leads."""


def _leads_only_to(net: int, ends: Set[int], index: Index, own: Collection[int]) -> bool:
    """Tell whether all that hangs on a net besides the match leads to some other nets through resistors and diodes.

    A capacitor leads nowhere: what is asked is what can hold the net at a voltage.
    """
    seen, waiting = {net}, [net]
    while waiting:
        here = waiting.pop()
        for element, _ in index.at[here]:
            if element in own or index.kind[element] == "capacitor":
                continue
            if index.kind[element] not in ("resistor", *DIRECTED):
                return False
            beyond = set(index.terminals[element].values()) - seen - ends
            if len(seen) > FARTHEST or any(index.flag[one] for one in beyond):
                return False
            seen |= beyond
            waiting += beyond
    return True


def _read(net: int, index: Index, own: Collection[int]) -> bool:
    """Tell whether an IC's pin is on a net, or behind a resistor of the net that leads nowhere else but to capacitors."""
    for element, _ in index.at[net]:
        if index.kind[element] == "ic":
            return True
        if index.kind[element] == "resistor" and element not in own:
            for other in set(index.terminals[element].values()) - {net}:
                kinds = {index.kind[one] for one, _ in index.at[other] if one != element} if not index.flag[other] else set()
                if "ic" in kinds and kinds <= {"ic", "capacitor"}:
                    return True
    return False


LEAVING = frozenset({"connector", "inductor", "fuse"})
"""What leads off the board, or to what leads off it."""


def leaves(net: int, index: Index) -> bool:
    """Tell whether something that leads off the board is on a net."""
    return any(index.kind[element] in LEAVING for element, _ in index.at[net])


def _resistance_ohm(net: int, other: int, index: Index) -> float:
    """Return the least resistance of a resistor between two nets; infinite where there is none, or none of known value."""
    joining = (one for one in index.between(net, other, ("resistor",)) if set(index.terminals[one].values()) == {net, other})
    values = (index.board.elements[element].value for element in joining)
    return min((value for value in values if value is not None), default=math.inf)


def _twin(base: int, emitter: int, index: Index, own: Collection[int]) -> bool:
    return any(
        element not in own and role == "base" and index.terminals[element].get("emitter") == emitter
        for element, role in index.at[base]
    )


def _inner(net: int, index: Index, own: Collection[int]) -> bool:
    """Tell whether a net leads to transistors only, and so that they are no load: a bias current and no output.

    That is a net with another transistor's base or gate on it, or one that feeds emitters or sources, straight or through a
    resistor each: the tail of a differential pair, the foot of a cascode. A single MOSFET's source may be a switch behind
    the limiter, so it is a load.
    """
    if index.flag[net]:
        return False
    fed: list[tuple[int, str]] = []
    for element, role in index.at[net]:
        kind = index.kind[element]
        if element in own or kind in ("capacitor", *DIRECTED):
            continue
        if kind == "resistor":
            fed += _emitter_behind(element, net, index)
        elif kind in CONTROLLED:
            fed.append((element, role))
        else:
            return False
    if any(role in ("base", "gate") for _, role in fed):
        return True
    feeds_emitters = bool(fed) and all(role in ("emitter", "source") for _, role in fed)
    return feeds_emitters and (len(fed) > 1 or fed[0][1] == "emitter")


def _emitter_behind(resistor: int, net: int, index: Index) -> list[tuple[int, str]]:
    """Return the emitter or source that a resistor leads to where nothing else is there."""
    other = next((one for one in index.terminals[resistor].values() if one != net), net)
    if index.flag[other]:
        return []
    beyond = [(element, role) for element, role in index.at[other] if element != resistor]
    return beyond if len(beyond) == 1 and beyond[0][1] in ("emitter", "source") else []


_FOLLOWERS = {
    "npn-follows": (("npn", "emitter"), ("npn-darlington", "emitter"), ("nmos", "source")),
    "pnp-follows": (("pnp", "emitter"), ("pnp-darlington", "emitter"), ("pmos", "source")),
}


def _followed(net: int, pins: Collection[tuple[str, str]], index: Index, own: Collection[int]) -> bool:
    return any(element not in own and (index.kind[element], role) in pins for element, role in index.at[net])
