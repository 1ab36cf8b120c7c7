"""Merged elements: their resistance from their parts', and how current and voltage divide among them.

A merge tree is a board part index, or ``("bank" | "chain", (child, ...))``. Trees are walked with a stack: a ladder of
resistors can be as deep as the board is large.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True)
class Share:
    """A part's fraction of its element's current and of its voltage (1 and 1 where the part stands alone)."""

    current: float
    voltage: float


def part_shares(tree: Any, resistance_ohm: Mapping[int, float]) -> dict[int, Share]:
    """Return each part's share by board part index.

    In a bank the current divides as the conductances, in a chain the voltage as the resistances (Kirchhoff's laws).
    ``resistance_ohm`` gives every part's resistance, none of them 0.
    """
    merged = _merged(tree, lambda index: resistance_ohm[index])
    shares: dict[int, Share] = {}
    pending: list[tuple[Any, Share]] = [(tree, Share(1.0, 1.0))]
    while pending:
        branch, share = pending.pop()
        if isinstance(branch, int):
            shares[branch] = share
            continue
        how, children = branch
        whole_ohm = merged[id(branch)]
        for child in children:
            child_ohm = merged[id(child)] if not isinstance(child, int) else resistance_ohm[child]
            if how == "bank":
                pending.append((child, Share(share.current * whole_ohm / child_ohm, share.voltage)))
            else:
                pending.append((child, Share(share.current, share.voltage * child_ohm / whole_ohm)))
    return shares


def merged_resistance(tree: Any, resistance_ohm: Callable[[int], float]) -> float:
    """Return the resistance of a merge tree in ohm; ``resistance_ohm`` gives a part's by board part index."""
    return resistance_ohm(tree) if isinstance(tree, int) else _merged(tree, resistance_ohm)[id(tree)]


def _merged(tree: Any, resistance_ohm: Callable[[int], float]) -> dict[int, float]:
    """Return the resistance of every bank and chain in a tree, by the identity of its node."""
    order, pending = [], [tree]
    while pending:
        branch = pending.pop()
        if not isinstance(branch, int):
            order.append(branch)
            pending.extend(branch[1])
    merged: dict[int, float] = {}
    for branch in reversed(order):
        how, children = branch
        values = [resistance_ohm(child) if isinstance(child, int) else merged[id(child)] for child in children]
        if how == "chain":
            merged[id(branch)] = sum(values)
        else:
            merged[id(branch)] = 0.0 if 0.0 in values else 1.0 / sum(1.0 / value for value in values)
    return merged
