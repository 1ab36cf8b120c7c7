"""What sound rules take for a limiter and what cannot be one: told as what is wrong, not judged as a limiter."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.topology.index import Index
from protlint.topology.likely import is_driven_by_supply, is_likely, runs_against_supplies
from protlint.topology.limiter import FaultMatch, Limiter
from protlint.topology.terms import MIRROR


def doubtful_among(limiters: Sequence[Limiter], index: Index) -> list[Limiter]:
    """Return the limiters that the supplies forbid, as no such current can flow or a supply itself drives a device, and
    those whose driver would take its current from the shunt's base, where a latching transistor's collector belongs."""
    return [
        one
        for one in limiters
        if runs_against_supplies(one, index) or is_driven_by_supply(one, index) or _drives_from_tap(one, index)
    ]


def explained(
    doubtful: Sequence[Limiter], faults: Sequence[FaultMatch], index: Index
) -> tuple[list[Limiter], tuple[FaultMatch, ...]]:
    """Return which of some doubtful limiters stay limiters, and the faults to tell, those of the others among them.

    ``faults`` were found with the doubtful taken for none. Where one of them makes a likely limiter of the same shunt it
    counts; else the current's direction is what is wrong; and a doubtful one of which neither can be said stays.
    """
    kept: list[Limiter] = []
    told = list(faults)
    for limiter in doubtful:
        shunt = set(limiter.roles["shunt"])
        about = [fault for fault in told if not shunt.isdisjoint(fault.group.roles["shunt"])]
        if any(is_likely(fault.group, index, fault.turned) for fault in about):
            continue
        told = [fault for fault in told if fault not in about]
        if runs_against_supplies(limiter, index):
            told.append(_against_supplies(limiter, index))
        else:
            kept.append(limiter)
    return kept, tuple(told)


def _drives_from_tap(limiter: Limiter, index: Index) -> bool:
    tap = limiter.bound.get("tap")
    drivers = (one for role, ones in limiter.elements.items() if role.split(".")[0] == "driver" for one in ones)
    return tap is not None and any(index.terminals[one].get("collector") == index.net_of[tap] for one in drivers)


def _against_supplies(limiter: Limiter, index: Index) -> FaultMatch:
    """Return as a fault a limiter all transistors of which are of the wrong polarity for the supplies it lies between."""
    board = index.board
    roles = ("pass", "driver", "shunt")
    devices = [one for role, ones in limiter.elements.items() if role.split(".")[0] in roles for one in ones]
    kinds = {board.parts[part].id: index.kind[one] for one in devices for part in board.elements[one].parts}
    carrier = ", ".join(limiter.roles["pass"])
    load, far = (board.nets[limiter.bound[name]].name for name in ("load", "far"))
    first, last = (load, far) if limiter.polarity == "n" else (far, load)
    return FaultMatch(
        fault="pass-polarity-wrong",
        spoils=limiter.topology,
        group=limiter,
        says=f"{', '.join(kinds)} are of the wrong polarity: {carrier} could only carry a current from {first} to {last}, "
        f"and of these {last} is the higher",
        exchange=(),
        replaces=tuple((part, MIRROR[kind]) for part, kind in kinds.items() if kind in MIRROR),
    )
