"""Merging resistors changes no resistance: held against nodal analysis (Kirchhoff's current law) solved by numpy."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from protlint.board.merge import Resistance, merge_resistances, parts_of
from protlint.board.shares import merged_resistance

NETS = 6
ENDS = (0, 1)
"""The nets the resistance is measured between; nothing passes through them."""


def seen_from_the_ends(resistances: list[Resistance]) -> float:
    """Return the resistance between the two ends; infinite where nothing joins them."""
    joined = {ENDS[0]}
    while True:
        further = {end for one in resistances if joined & set(one.ends) for end in one.ends} - joined
        if not further:
            break
        joined |= further
    if ENDS[1] not in joined:
        return float("inf")
    order = {net: place for place, net in enumerate(sorted(joined - {ENDS[1]}))}
    matrix = np.zeros((len(order), len(order)))
    for one in resistances:
        first, second = one.ends
        assert one.value is not None
        if first == second or not {first, second} <= joined:
            continue
        for net, other in ((first, second), (second, first)):
            if net in order:
                matrix[order[net], order[net]] += 1.0 / one.value
                if other in order:
                    matrix[order[net], order[other]] -= 1.0 / one.value
    current = np.zeros(len(order))
    current[order[ENDS[0]]] = 1.0
    return float(np.linalg.solve(matrix, current)[order[ENDS[0]]])


networks = st.lists(
    st.tuples(st.integers(0, NETS - 1), st.integers(0, NETS - 1), st.sampled_from([1.0, 2.2, 10.0, 47.0])), max_size=14
)


@given(networks, st.lists(st.booleans(), min_size=NETS, max_size=NETS))
def test_the_resistance_between_two_nets_stays(rows: list[tuple[int, int, float]], passable: list[bool]) -> None:
    passable = [False, False, *passable[2:]]
    single = [Resistance((one, other), value, place, place) for place, (one, other, value) in enumerate(rows)]
    merged = merge_resistances(single, passable)
    before, after = seen_from_the_ends(single), seen_from_the_ends(merged)
    assert before == after or abs(after / before - 1.0) < 1e-9
    assert sorted(part for one in merged for part in parts_of(one.tree)) == list(range(len(rows)))
    for one in merged:
        assert one.value is not None
        assert abs(merged_resistance(one.tree, lambda part: rows[part][2]) / one.value - 1.0) < 1e-9


@given(networks)
def test_nothing_is_left_to_merge(rows: list[tuple[int, int, float]]) -> None:
    passable = [False, False, *[True] * (NETS - 2)]
    single = [Resistance((one, other), value, place, place) for place, (one, other, value) in enumerate(rows)]
    merged = merge_resistances(single, passable)
    pairs = [tuple(sorted(one.ends)) for one in merged if one.ends[0] != one.ends[1]]
    assert len(pairs) == len(set(pairs))
    for net in range(2, NETS):
        assert sum(net in pair for pair in pairs) != 2
