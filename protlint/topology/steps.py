"""The steps a search takes, and the tasks it takes them for.

A plan has tens of thousands of steps and entries: they are named tuples, which are made and compared several times as fast
as frozen dataclasses. Steps of two kinds are never equal, as no two kinds have equally many fields.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import NamedTuple

from protlint.topology.index import CROWD, FREE
from protlint.topology.questions import is_late
from protlint.topology.terms import Clause, Test

NEW = -1
"""In a step, an end that is bound by it."""


class PartStep(NamedTuple):
    """Find an element by its pins: ``known`` pairs a pin with a slot; ``new`` a pin with the slots its net must differ
    from. With nothing known it is where a search begins."""

    kinds: tuple[str, ...]
    known: tuple[tuple[str, int], ...]
    new: tuple[tuple[str, tuple[int, ...]], ...]


class BridgeStep(NamedTuple):
    """Find a two-terminal element between slots ``a`` and ``b``; one of them may be new, both where a search begins."""

    kinds: tuple[str, ...]
    a: int
    b: int
    directed: bool
    under_ohm: float | None
    apart: tuple[tuple[int, ...], ...]


class PathStep(NamedTuple):
    """Find a path of elements from slot ``a`` to slot ``b`` (or a new end); ``direction`` is 1 from anode to cathode on the
    way, -1 against it, 0 where it does not matter."""

    kinds: tuple[str, ...]
    a: int
    b: int
    least: int
    most: int
    direction: int
    until_driven: bool
    apart: tuple[int, ...]


class AskStep(NamedTuple):
    """Ask a test whose nets are slots, written as digits."""

    test: Test


Step = PartStep | BridgeStep | PathStep | AskStep


@dataclass(frozen=True, slots=True)
class Task:
    """What a search is to fulfil: clauses and early tests.

    ``bits`` gives every name a bit; ``joins`` holds for each clause, ``asks`` for each test, the bits of its names, which
    for a test are ``asked_of``. ``alike`` gives for a name those that may stand for the same net.
    """

    number: int
    clauses: tuple[Clause, ...]
    tests: tuple[Test, ...]
    bits: Mapping[str, int]
    joins: tuple[int, ...]
    asks: tuple[int, ...]
    asked_of: tuple[tuple[str, ...], ...]
    alike: Mapping[str, frozenset[str]]


class Entry(NamedTuple):
    """A task at some node: names in the order of their slots, clauses in the order found, and what is left of it.

    ``bound`` holds the bits of the names bound, ``free`` and ``crowd`` of those on free and on crowded nets.
    """

    task: Task
    names: tuple[str, ...]
    found: tuple[int, ...]
    left: tuple[int, ...]
    asked: tuple[int, ...]
    bound: int = 0
    free: int = 0
    crowd: int = 0

    def with_flags(self, bound_before: int, flags: Sequence[int]) -> Entry:
        """Return the entry with the names behind those bound before bound to nets of these flags."""
        task, names, found, left, asked, bound, free, crowd = self
        bits = task.bits
        for name, flag in zip(names[bound_before:], flags, strict=True):
            bit = bits.get(name, 0)
            bound |= bit
            if flag == FREE:
                free |= bit
            elif flag == CROWD:
                crowd |= bit
        return Entry(task, names, found, left, asked, bound, free, crowd)


def make_task(
    number: int,
    clauses: Sequence[Clause],
    tests: Sequence[Test],
    unites: Sequence[tuple[str, str]],
    zero: Sequence[Clause] = (),
) -> Task:
    """Return a task; names are alike where paths that may be empty (in ``clauses`` or ``zero``) or ``unites`` join them."""
    group: dict[str, set[str]] = {}
    for clause in (*clauses, *zero):
        if clause.ends is not None and clause.count is not None and clause.count[0] == 0:
            one, other = (group.setdefault(end, {end}) for end in clause.ends)
            one |= other
            for name in one:
                group[name] = one
    alike = {name: set(members) for name, members in group.items()}
    for pair in unites:
        ones, others = (group.get(name, {name}) for name in pair)
        for name in ones:
            alike.setdefault(name, set()).update(others)
        for name in others:
            alike.setdefault(name, set()).update(ones)
    early = tuple([test for clause in clauses for test in clause.when] + [test for test in tests if not is_late(test)])
    joined = [clause.nets() for clause in clauses]
    asked = [tuple(test.nets()) for test in early]
    names = dict.fromkeys(name for nets in (*joined, *asked) for name in nets)
    bits = {name: 1 << place for place, name in enumerate(names)}
    return Task(
        number=number,
        clauses=tuple(clauses),
        tests=early,
        bits=bits,
        joins=tuple(_union(bits, nets) for nets in joined),
        asks=tuple(_union(bits, nets) for nets in asked),
        asked_of=tuple(asked),
        alike={name: frozenset(members) for name, members in alike.items()},
    )


def _union(bits: Mapping[str, int], names: Sequence[str]) -> int:
    union = 0
    for name in names:
        union |= bits[name]
    return union


def is_anchor(clause: Clause) -> bool:
    """Tell whether a search may begin at a clause: a part of its own, and no resistor."""
    return clause.count is None and "resistor" not in clause.kinds
