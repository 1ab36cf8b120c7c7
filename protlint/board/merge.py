"""What is one thing to circuit people: nets joined by links, resistors in parallel (banks) and in series (chains).

Plain functions on indices, free of the board's dataclasses.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from protlint.joining import joined

Tree = object
"""A board part's index, or ``("bank" | "chain", (tree, ...))``."""

MOST_NESTED = 40
"""Banks in chains in banks ... stop merging at this depth (a ladder of ten thousand rungs is no one's sense resistor)."""


@dataclass(frozen=True, slots=True)
class Resistance:
    """One resistor, or several merged: its two ends, its value in ohm (None where any is unknown), how it was merged.

    ``first`` is the first board part in it; ``joint`` is a single part's index, or the two resistances that were merged.
    """

    ends: tuple[int, int]
    value: float | None
    first: int
    joint: int | tuple[Resistance, Resistance]
    kind: str = "single"
    depth: int = 0

    @property
    def tree(self) -> Tree:
        """How it was merged, like merges flattened: a bank's children in board order, a chain's from end to end."""
        if isinstance(self.joint, int):
            return self.joint
        members = _bank_members(self) if self.kind == "bank" else _chain_members(self)
        return self.kind, tuple(member.tree for member in members)


def unite(count: int, groups: Iterable[Sequence[int]]) -> list[int]:
    """Return, for each of ``count`` nets, the lowest index among the nets it is joined with.

    Each of ``groups`` lists nets that are one.
    """
    lowest = joined(groups)
    return [lowest.get(net, net) for net in range(count)]


def merge_resistances(resistances: Sequence[Resistance], passable: Sequence[bool]) -> list[Resistance]:
    """Merge banks and unbranched chains, again and again, until nothing changes.

    A net continues a chain only where ``passable`` says that nothing but resistors hangs on it and exactly two are left
    there. Time is linear in the number of resistors: every merge removes one.

    Parameters
    ----------
    resistances : single resistors in board order; both ends on one net is allowed and merges with nothing.
    passable : by net index, whether a chain may run through it.

    Returns
    -------
    list : the merged ones in the board order of their first part.
    """
    between: dict[tuple[int, int], Resistance] = {}
    neighbours: dict[int, set[int]] = {}
    shorted: list[Resistance] = []
    pending: list[int] = []

    def put(one: Resistance) -> None:
        first, second = sorted(one.ends)
        if first == second:
            shorted.append(one)
            return
        other = between.get((first, second))
        between[first, second] = one if other is None else _in_parallel(other, one)
        neighbours.setdefault(first, set()).add(second)
        neighbours.setdefault(second, set()).add(first)
        pending.extend(one.ends)

    def key(net: int, other: int) -> tuple[int, int]:
        return min(net, other), max(net, other)

    for one in resistances:
        put(one)
    while pending:
        net = pending.pop()
        if passable[net] and len(neighbours[net]) == 2:
            others = sorted(neighbours[net])
            one, other = (between[key(net, end)] for end in others)
            if max(one.depth, other.depth) < MOST_NESTED:
                for end in others:
                    del between[key(net, end)]
                    neighbours[end].discard(net)
                neighbours[net].clear()
                put(_in_series(one, other, net))
    return sorted((*between.values(), *shorted), key=lambda one: one.first)


def parts_of(tree: Tree) -> tuple[int, ...]:
    """Return the board part indices in a merge tree, in board order."""
    if isinstance(tree, int):
        return (tree,)
    found: list[int] = []
    stack = [tree]
    while stack:
        node = stack.pop()
        if isinstance(node, tuple):
            stack += node[1]
        elif isinstance(node, int):
            found.append(node)
    return tuple(sorted(found))


def _in_parallel(one: Resistance, other: Resistance) -> Resistance:
    value = None
    if one.value is not None and other.value is not None:
        value = one.value * other.value / (one.value + other.value)
    one, other = sorted((one, other), key=lambda member: member.first)
    return Resistance(one.ends, value, one.first, (one, other), "bank", _depth("bank", one, other))


def _in_series(one: Resistance, other: Resistance, middle: int) -> Resistance:
    one, other = sorted((one, other), key=lambda member: member.first)
    value = None if one.value is None or other.value is None else one.value + other.value
    ends = (_other_end(one, middle), _other_end(other, middle))
    return Resistance(ends, value, one.first, (one, other), "chain", _depth("chain", one, other))


def _depth(kind: str, *members: Resistance) -> int:
    return max(member.depth + (member.kind != kind) for member in members)


def _other_end(one: Resistance, net: int) -> int:
    return one.ends[1] if one.ends[0] == net else one.ends[0]


def _bank_members(bank: Resistance) -> list[Resistance]:
    members, stack = [], [bank]
    while stack:
        one = stack.pop()
        if one.kind == "bank" and not isinstance(one.joint, int):
            stack += one.joint
        else:
            members.append(one)
    return sorted(members, key=lambda member: member.first)


def _chain_members(chain: Resistance) -> list[Resistance]:
    """Return what stands in a chain, walking from its first end to its second."""
    members, stack, net = [], [chain], chain.ends[0]
    while stack:
        one = stack.pop()
        if one.kind == "chain" and not isinstance(one.joint, int):
            nearer, further = one.joint
            if net not in nearer.ends:
                nearer, further = further, nearer
            stack += (further, nearer)
        else:
            members.append(one)
            net = _other_end(one, net)
    return members
