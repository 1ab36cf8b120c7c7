"""Limiters that belong together: complementary halves on one output, and like channels."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.board.graph import Board
from protlint.topology.limiter import Limiter


def find_pairs(limiters: Sequence[Limiter]) -> tuple[tuple[str, str], ...]:
    """Return (N half, P half) for followers of either polarity on one output, by limiter id; each limiter once."""
    waiting: dict[int, list[Limiter]] = {}
    for limiter in limiters:
        output = limiter.nets["output"]
        if limiter.polarity == "p" and output is not None and output == limiter.nets["far"]:
            waiting.setdefault(output, []).append(limiter)
    pairs = []
    for limiter in limiters:
        output = limiter.nets["output"]
        if limiter.polarity == "n" and output == limiter.nets["far"] and output is not None and waiting.get(output):
            pairs.append((limiter.id, waiting[output].pop(0).id))
    return tuple(pairs)


def find_sets(board: Board, limiters: Sequence[Limiter]) -> tuple[tuple[str, ...], ...]:
    """Return the ids of like channels, two or more: one topology and polarity, as many parts in every role, the same types
    of pass device and driver. Values may differ: that is what a check looks for. The shunts' types may too: another gain
    group in one channel is what purchasing does, and no sign that the channel is meant otherwise."""
    alike: dict[tuple[object, ...], list[str]] = {}
    for limiter in limiters:
        alike.setdefault(_likeness(board, limiter), []).append(limiter.id)
    return tuple(tuple(ids) for ids in alike.values() if len(ids) > 1)


def _likeness(board: Board, limiter: Limiter) -> tuple[object, ...]:
    counts = tuple(sorted((role, len(elements)) for role, elements in limiter.elements.items() if elements))
    types = tuple(
        board.parts[part].part_number or board.parts[part].kind
        for role in ("pass", "driver")
        for element in limiter.elements.get(role, ())
        for part in board.elements[element].parts
    )
    return limiter.topology, limiter.polarity, limiter.nets["output"] == limiter.nets["far"], counts, types
