"""What is one because something joins it: nets by links, bits of ports by what shorts them."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Protocol, TypeVar

T = TypeVar("T", int, str)


class Parents(Protocol[T]):
    """For each member another one that it is joined with, or itself: a list by number, or a dict."""

    def __getitem__(self, member: T, /) -> T: ...

    def __setitem__(self, member: T, parent: T, /) -> None: ...


def root(parents: Parents[T], member: T) -> T:
    """Return the member that stands for all that ``member`` is joined with, shortening the way there."""
    while parents[member] != member:
        parents[member] = parents[parents[member]]
        member = parents[member]
    return member


def joined(groups: Iterable[Sequence[T]]) -> dict[T, T]:
    """Return, for each member of some groups, the lowest of all that the groups join it with.

    Each group lists members that are one; an empty one, as of a fuse with nothing on its pins, joins nothing.
    """
    parents: dict[T, T] = {}
    for group in groups:
        if not group:
            continue
        for member in group:
            parents.setdefault(member, member)
        lowest = root(parents, group[0])
        for other in group[1:]:
            one = root(parents, other)
            lowest, one = (lowest, one) if lowest < one else (one, lowest)
            parents[one] = lowest
    return {member: root(parents, member) for member in parents}
