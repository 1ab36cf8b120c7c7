"""Finds the limiters of a board on which some outputs bear a supply's name."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from protlint.board.graph import Board
from protlint.board.outputs import outputs_named_as_supplies, with_outputs_free
from protlint.topology.index import Index
from protlint.topology.language import Rules
from protlint.topology.likely import runs_against_supplies
from protlint.topology.limiter import Found
from protlint.topology.match import find_limiters
from protlint.topology.sets import find_pairs, find_sets


def find_on_board(board: Board, rules: Rules) -> tuple[Found, Mapping[str, Board]]:
    """Return all that is found, and by limiter id the board to solve those limiters on whose output is named as a supply.

    To such a limiter its output is no supply; to every other one the net stays held at the voltage its name states.
    """
    found = find_limiters(board, rules)
    outputs = outputs_named_as_supplies(board)
    if not outputs:
        return found, {}
    free = with_outputs_free(board, outputs)
    freed = find_limiters(free, rules)
    named = Index(board)
    making = [one for one in freed.limiters if one.nets["output"] in outputs and not runs_against_supplies(one, named)]
    faults = [one for one in freed.faults if one.group.nets["output"] in outputs]
    taken = {shunt for one in (*making, *(fault.group for fault in faults)) for shunt in one.elements["shunt"]}
    others = [one for one in found.limiters if taken.isdisjoint(one.elements["shunt"])]
    limiters = sorted((*others, *making), key=lambda one: one.elements["shunt"])
    names = board.net_names
    said = {
        f"{names[output]} is taken as the output of {one.id}, which makes it of {names[outputs[output]]}"
        for one in (*making, *(fault.group for fault in faults))
        if (output := one.nets["output"]) is not None
    }
    again = replace(
        found,
        limiters=tuple(limiters),
        faults=(*(one for one in found.faults if taken.isdisjoint(one.group.elements["shunt"])), *faults),
        remarks=(*found.remarks, *sorted(said)),
        pairs=find_pairs(limiters),
        sets=find_sets(board, limiters),
        unsearched={
            net: tuple(dict.fromkeys((*found.unsearched.get(net, ()), *freed.unsearched.get(net, ()))))
            for net in sorted({*found.unsearched, *freed.unsearched})
        },
    )
    return again, {one.id: free for one in making}
