"""What is one because something joins it, against networkx's connected components."""

from __future__ import annotations

import networkx
from hypothesis import given
from hypothesis import strategies as st

from protlint.joining import joined

GROUPS = st.lists(st.lists(st.integers(0, 30), max_size=4), max_size=30)


@given(GROUPS)
def test_each_member_goes_by_the_lowest_it_is_joined_with(groups: list[list[int]]) -> None:
    graph = networkx.Graph()
    for group in groups:
        networkx.add_path(graph, group)
    expected = {member: min(together) for together in networkx.connected_components(graph) for member in together}
    assert joined(groups) == expected


@given(GROUPS)
def test_names_are_joined_as_numbers_are(groups: list[list[int]]) -> None:
    named = joined([[f"{member:02}" for member in group] for group in groups])
    assert named == {f"{member:02}": f"{lowest:02}" for member, lowest in joined(groups).items()}


def test_nothing_joined_is_nothing() -> None:
    assert joined([]) == {}
