"""Finds the limiters of a board: every rule that fits, and one limiter for every shunt."""

from __future__ import annotations

from collections.abc import Collection, Sequence

from protlint.board.graph import Board
from protlint.netlist.forms import no_collection
from protlint.topology.doubtful import doubtful_among, explained
from protlint.topology.faults import find_faults
from protlint.topology.fitting import Fitter, Match
from protlint.topology.index import Index
from protlint.topology.language import Rules
from protlint.topology.limiter import Found, Limiter
from protlint.topology.naming import build_limiter
from protlint.topology.sets import find_pairs, find_sets
from protlint.topology.settle import settled
from protlint.topology.turned import find_turned


def find_limiters(board: Board, rules: Rules) -> Found:
    """Return every limiter on a board, in board order of its shunt, and every fault on what is left of it."""
    with no_collection():
        index = Index(board)
        fitter = Fitter(index, (*rules.patterns, *rules.fault_patterns), rules.plans)
        matches = fitter.matches()
        remarks: list[str] = []
        fitting = _sound(fitter, matches, rules, remarks)
        doubtful = doubtful_among(fitting, index)
        limiters = [one for one in fitting if one not in doubtful]
        faults = find_faults(index, [match for match in matches if match.pattern.fault], rules, limiters)
        tried, unsearched = find_turned(index, limiters, lambda piece: _sound_on(piece, rules))
        kept, told = explained(doubtful, settled(faults, tried, index), index)
        limiters = [one for one in fitting if one in kept or one not in doubtful]
    return Found(
        limiters=tuple(limiters),
        faults=told,
        remarks=tuple(remarks),
        pairs=find_pairs(limiters),
        sets=find_sets(board, limiters),
        unsearched=unsearched,
    )


def _sound_on(board: Board, rules: Rules) -> list[Limiter]:
    """Return the limiters of a small board, nothing else of it being asked."""
    fitter = Fitter(Index(board), rules.patterns, rules.sound_plans, piece=True)
    return _sound(fitter, fitter.matches(), rules, [])


def _sound(fitter: Fitter, matches: Sequence[Match], rules: Rules, remarks: list[str]) -> list[Limiter]:
    """Return the limiter of every shunt that sound rules fit, with all that may belong to it."""
    board = fitter.index.board
    limiters: list[Limiter] = []
    chosen = _one_for_each_shunt([match for match in matches if not match.pattern.fault], rules, board, remarks)
    sensed = {element for match, _ in chosen for element in match.elements["pass"]}
    for match, also in chosen:
        fitter.add_optional(match)
        _leave_out_sensed(match, sensed)
        limiters.append(build_limiter(match, fitter.index, also, {one.id for one in limiters}))
    return limiters


def _one_for_each_shunt(
    matches: Sequence[Match], rules: Rules, board: Board, remarks: list[str]
) -> list[tuple[Match, tuple[str, ...]]]:
    """Return the match that names each shunt best, with the other topologies that fit it.

    A rule beats what it builds on; then the match with more required parts wins, then the rule's stated precedence.
    """
    by_shunt: dict[int, list[Match]] = {}
    for match in matches:
        for shunt in match.elements["shunt"]:
            by_shunt.setdefault(shunt, []).append(match)
    chosen: dict[int, tuple[Match, tuple[str, ...]]] = {}
    for shunt in sorted(by_shunt):
        rivals = by_shunt[shunt]
        ancestors = {name for one in rivals for name in rules.resolved[one.pattern.rule].ancestors}
        best = max(rivals, key=lambda one: (one.pattern.rule not in ancestors, *_rank(one, rules)))
        others = sorted({one.pattern.rule for one in rivals} - ancestors - {best.pattern.rule})
        chosen.setdefault(id(best), (best, tuple(others)))
        level = [
            one.pattern.rule for one in rivals if one.pattern.rule in others and _rank(one, rules) == _rank(best, rules)
        ]
        if level:
            part = board.parts[board.elements[shunt].parts[0]].id
            remarks.append(f"{part} fits {best.pattern.rule} and {', '.join(dict.fromkeys(level))} alike")
    return list(chosen.values())


def _leave_out_sensed(match: Match, sensed: Collection[int]) -> None:
    """Take pass devices that have a shunt of their own out of those beside this one that have none."""
    beside = match.elements.get("pass.unsensed")
    if beside:
        match.elements["pass.unsensed"] = [element for element in beside if element not in sensed]


def _rank(match: Match, rules: Rules) -> tuple[int, int]:
    return match.required, rules.resolved[match.pattern.rule].rule.precedence
