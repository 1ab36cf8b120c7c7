"""The questions a rule may ask about nets, answered on a board."""

from __future__ import annotations

from collections.abc import Collection, Mapping

from protlint.topology.index import RAIL, Index
from protlint.topology.terms import DIRECTED, Test

LATE = frozenset({"no-input", "tail", "undriven"})
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
    is_rail = [flags[name] == RAIL for name in test.of if isinstance(name, str)]
    if test.name == "supply":
        return is_rail[0]
    if test.name in ("ground", "lowest", "highest"):
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
        case "same":
            return net == others[0]
        case "apart":
            return net != others[0]
        case "busier":
            return len(index.at[net]) > len(index.at[others[0]])
        case "no-input":
            return _no_input(net, set(nets.values()), index, own)
        case "tail":
            return _tail(net, index, own)
        case "undriven":
            return all(element in own or index.kind[element] in PASSIVE for element, _ in index.at[net])
    raise KeyError(test.name)


def _no_input(net: int, bound: Collection[int], index: Index, own: Collection[int]) -> bool:
    """Tell whether no capacitor brings a signal onto a net from outside the match."""
    for element, _ in index.at[net]:
        if index.kind[element] == "capacitor" and element not in own:
            others = set(index.terminals[element].values()) - {net}
            if not all(other in bound or other in index.voltage_V for other in others):
                return False
    return True


def _tail(net: int, index: Index, own: Collection[int]) -> bool:
    """Tell whether a net feeds nothing but emitters or sources, straight or through resistors of their own.

    That is the tail of a differential pair or the foot of a cascode: a bias current, and no load that needs protection.
    """
    if index.flag[net]:
        return False
    fed = [(element, role) for element, role in index.at[net] if element not in own and index.kind[element] != "capacitor"]
    if not fed:
        return False
    for element, role in fed:
        if index.kind[element] == "resistor":
            other = next((one for one in index.terminals[element].values() if one != net), net)
            beyond = [pair for pair in index.at[other] if pair[0] != element]
            if index.flag[other] or not beyond or any(pin not in ("emitter", "source") for _, pin in beyond):
                return False
        elif role not in ("emitter", "source"):
            return False
    return True
