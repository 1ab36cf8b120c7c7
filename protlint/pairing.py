"""Pairs of two reports' boards and limiters: boards by what their files are called, limiters by
structure, so that renumbered designators and renamed nets make no noise."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from functools import partial
from pathlib import PurePosixPath
from typing import Any

Report = Mapping[str, Any]
Pair = tuple[Report, Report]

LEAST_LIKENESS = 5.0
"""Below this two limiters are not one limiter changed, but one gone and one new."""


def matched_boards(before: Sequence[Report], after: Sequence[Report]) -> list[tuple[Report | None, Report | None]]:
    """Pair the boards of two sides: those after in their order, with None where none was before; then those only before.

    Boards go by their file: the whole name, the name below the folder that all of the side lie in, as much of its end as
    only one on each side has; then, for those renamed, by content, and by design.
    """
    if len(before) == len(after) == 1:
        return [(before[0], after[0])]
    left, right = dict(enumerate(before)), dict(enumerate(after))
    pairs: dict[int, Report] = {}
    below = {id(board): _below(_way(board), side) for side in (before, after) for board in side}
    longest = max((len(_way(board)) for board in (*before, *after)), default=0)
    stages: list[Callable[[Report], Any]] = [_way, lambda board: below[id(board)]]
    stages += [partial(_ending, length=length) for length in range(longest, 0, -1)]
    stages += [partial(_fact, name=name) for name in ("sha256", "design")]
    for stage in stages:
        ours, theirs = (_alone({place: stage(board) for place, board in side.items()}) for side in (left, right))
        for key in ours.keys() & theirs.keys():
            pairs[theirs[key]] = left.pop(ours[key])
            del right[theirs[key]]
    return [(pairs.get(place), board) for place, board in enumerate(after)] + [(board, None) for board in left.values()]


def _way(board: Report) -> tuple[str, ...]:
    """Return the parts of a board's file name."""
    return PurePosixPath(board["netlist"]["file"] if "netlist" in board else board["file"] or "").parts


def _ending(board: Report, *, length: int) -> tuple[str, ...]:
    return _way(board)[-length:]


def _fact(board: Report, *, name: str) -> Any:
    return board["netlist"][name] if "netlist" in board else None


def _below(way: tuple[str, ...], side: Sequence[Report]) -> tuple[str, ...]:
    """Return what is left of a way without the folders that all boards of a side lie in."""
    folders = [_way(board)[:-1] for board in side]
    shared = next(
        (length for length in range(len(way) - 1, 0, -1) if all(one[:length] == way[:length] for one in folders)), 0
    )
    return way[shared:]


def _alone(keys: Mapping[int, Any]) -> dict[Any, int]:
    """Return the places of keys that stand once."""
    often = Counter(keys.values())
    return {key: place for place, key in keys.items() if key and often[key] == 1}


def matched(before: Sequence[Report], after: Sequence[Report]) -> tuple[list[Pair], list[Report], list[Report]]:
    """Pair limiters of two reports, and return the pairs, those only before and those only after.

    Limiters that are alike part by part are paired first (of several, those of one name or one output net); the rest by
    likeness, the likest first.
    """
    pairs: list[tuple[int, int]] = []
    left, right = dict(enumerate(before)), dict(enumerate(after))
    for alike in (_by_name, _by_output, _by_structure):
        waiting: dict[Any, list[int]] = {}
        for place, limiter in left.items():
            waiting.setdefault(alike(limiter), []).append(place)
        for place, limiter in list(right.items()):
            same = waiting.get(alike(limiter))
            if same:
                pairs.append((same.pop(0), place))
                del left[pairs[-1][0]], right[place]
    scored = sorted(
        ((-_likeness(old, new), i, j) for i, old in left.items() for j, new in right.items()),
    )
    for score, i, j in scored:
        if -score >= LEAST_LIKENESS and i in left and j in right:
            pairs.append((i, j))
            del left[i], right[j]
    return [(before[i], after[j]) for i, j in sorted(pairs)], list(left.values()), list(right.values())


def _by_structure(limiter: Report) -> Any:
    parts = Counter((part["role"], *type_of(part)) for part in limiter["parts"])
    return limiter["topology"], limiter["polarity"], frozenset(parts.items())


def _by_output(limiter: Report) -> Any:
    return _by_structure(limiter), limiter["nets"]["output"]


def _by_name(limiter: Report) -> Any:
    return _by_output(limiter), limiter["id"]


def type_of(part: Report) -> tuple[Any, ...]:
    """Return what a part is, apart from its name: kind, part number, value in SI units."""
    return part["kind"], part["part_number"], part["value"]


def _likeness(old: Report, new: Report) -> float:
    """Return how much two limiters have in common: names weigh little, structure weighs more."""
    if old["polarity"] != new["polarity"]:
        return 0.0
    score = 3.0 if old["topology"] == new["topology"] else 0.0
    score += 2.0 if old["id"] == new["id"] else 0.0
    score += sum(1.0 for net in old["nets"] if old["nets"][net] is not None and old["nets"][net] == new["nets"].get(net))
    ours, theirs = (Counter((part["role"], *type_of(part)) for part in one["parts"]) for one in (old, new))
    shared, whole = (ours & theirs).total(), max(ours.total(), theirs.total(), 1)
    return score + 4.0 * shared / whole
