"""What to search next: patterns become steps, and steps shared by many patterns are taken once.

A plan is a tree that grows as it is walked. At each node the patterns still possible are grouped by the step each would
take next; which step that is depends on what is bound and on how freely the nets just bound may be walked, so a supply is
never enumerated and a crowded net is left for last.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from protlint.topology.index import RAIL
from protlint.topology.questions import is_late
from protlint.topology.terms import ANY, MANY, Clause, Test

NEW = -1
"""In a step, an end that is bound by it."""


@dataclass(frozen=True, slots=True)
class PartStep:
    """Find an element by its pins: ``known`` pairs a pin with a slot; ``new`` a pin with the slots its net must differ
    from. With nothing known it is where a search begins."""

    kinds: tuple[str, ...]
    known: tuple[tuple[str, int], ...]
    new: tuple[tuple[str, tuple[int, ...]], ...]


@dataclass(frozen=True, slots=True)
class BridgeStep:
    """Find a two-terminal element between slots ``a`` and ``b``; one of them may be new, both where a search begins."""

    kinds: tuple[str, ...]
    a: int
    b: int
    directed: bool
    under_ohm: float | None
    apart: tuple[tuple[int, ...], ...]


@dataclass(frozen=True, slots=True)
class PathStep:
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


@dataclass(frozen=True, slots=True)
class AskStep:
    """Ask a test whose nets are slots, written as digits."""

    test: Test


Step = PartStep | BridgeStep | PathStep | AskStep


@dataclass(frozen=True, slots=True)
class Task:
    """What a search is to fulfil: clauses and early tests, with the pairs of names that may stand for one net."""

    number: int
    clauses: tuple[Clause, ...]
    tests: tuple[Test, ...]
    alike: frozenset[frozenset[str]]


@dataclass(frozen=True, slots=True)
class Entry:
    """A task at some node: names in the order of their slots, clauses in the order found, and what is left of it."""

    task: Task
    names: tuple[str, ...]
    found: tuple[int, ...]
    left: tuple[int, ...]
    asked: tuple[int, ...]


@dataclass(slots=True)
class Node:
    """A place in the plan: ``done`` the tasks fulfilled here, ``branches`` each step with its continuations by flags."""

    done: list[Entry] = field(default_factory=list)
    branches: dict[Step, tuple[list[Entry], dict[tuple[int, ...], Node]]] = field(default_factory=dict)


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
    alike = {frozenset((one, other)) for members in group.values() for one in members for other in members if one != other}
    for pair in unites:
        ones, others = (group.get(name, {name}) for name in pair)
        alike |= {frozenset((one, other)) for one in ones for other in others if one != other}
    early = [test for clause in clauses for test in clause.when] + [test for test in tests if not is_late(test)]
    return Task(number, tuple(clauses), tuple(early), frozenset(alike))


class Planner:
    """Chooses steps, given how many parts of each kind the board has."""

    def __init__(self, counts: Mapping[str, int]) -> None:
        self.counts = counts

    def root(self, tasks: Sequence[Task]) -> Node:
        """Return the node where searches of tasks begin, each at its rarest part that is no resistor.

        Tasks that ask for a kind the board has none of are left out.
        """
        node = Node()
        for task in tasks:
            needed = [clause for clause in task.clauses if clause.count is None or clause.count[0] > 0]
            if any(self._number(clause) == 0 for clause in needed):
                continue
            anchors = [
                (self._number(clause), place)
                for place, clause in enumerate(task.clauses)
                if clause.count is None and "resistor" not in clause.kinds
            ]
            entry = Entry(task, (), (), tuple(range(len(task.clauses))), tuple(range(len(task.tests))))
            self._branch(node, *self._element_step(entry, min(anchors)[1]))
        return node

    def start(self, task: Task, names: Sequence[str], flags: Sequence[int]) -> Node:
        """Return the node where a task goes on from nets that are already bound."""
        entry = Entry(task, tuple(names), (), tuple(range(len(task.clauses))), tuple(range(len(task.tests))))
        return self.node([entry], tuple(flags))

    def node(self, entries: Sequence[Entry], flags: tuple[int, ...]) -> Node:
        """Return the node for entries whose slots have these flags; what cannot go on without walking a rail drops out."""
        node = Node()
        for entry in entries:
            if not entry.left and not entry.asked:
                node.done.append(entry)
                continue
            chosen = self._next(entry, flags)
            if chosen is not None:
                self._branch(node, *chosen)
        return node

    @staticmethod
    def _branch(node: Node, step: Step, after: Entry) -> None:
        node.branches.setdefault(step, ([], {}))[0].append(after)

    def _next(self, entry: Entry, flags: tuple[int, ...]) -> tuple[Step, Entry] | None:
        bound = {name: slot for slot, name in enumerate(entry.names)}
        for place in entry.asked:
            test = entry.task.tests[place]
            if all(name in bound for name in test.nets()):
                asked = tuple(one for one in entry.asked if one != place)
                slots = {name: str(bound[name]) for name in test.nets()}
                return AskStep(test.renamed(slots)), _after(entry, asked=asked)
        options = []
        for place in entry.left:
            clause = entry.task.clauses[place]
            ends = clause.nets()
            known = [bound[name] for name in ends if name in bound]
            if not known:
                continue
            path = clause.count is not None
            if len(known) == len(ends):
                options.append((0, 0, path, 0, self._number(clause), place))
                continue
            flag = min(flags[slot] for slot in known)
            if flag != RAIL:
                long = clause.count is not None and clause.count[1] > 1
                options.append((1, flag, long, path, self._number(clause), place))
            elif clause.count is not None and clause.count[0] == 0:
                # A rail is not walked, but a path of nothing needs no walk.
                options.append((2, flag, False, path, self._number(clause), place))
        if not options:
            return None
        place = min(options)[-1]
        if entry.task.clauses[place].count is None:
            return self._element_step(entry, place)
        return self._path_step(entry, place, bound, flags)

    def _element_step(self, entry: Entry, place: int) -> tuple[Step, Entry]:
        clause = entry.task.clauses[place]
        names = list(entry.names)
        if clause.ends is not None:
            ends, apart = [], []
            for name in clause.ends:
                if name in names:
                    ends.append(names.index(name))
                else:
                    ends.append(NEW)
                    apart.append(_apart(entry.task, name, names))
                    names.append(name)
            step: Step = BridgeStep(clause.kinds, ends[0], ends[1], clause.along, clause.under_ohm, tuple(apart))
        else:
            known, new = [], []
            for pin, name in clause.pins:
                if name == ANY:
                    continue
                if name in names:
                    known.append((pin, names.index(name)))
                else:
                    new.append((pin, _apart(entry.task, name, names)))
                    names.append(name)
            step = PartStep(clause.kinds, tuple(known), tuple(new))
        return step, _after(entry, place=place, names=names)

    @staticmethod
    def _path_step(entry: Entry, place: int, bound: Mapping[str, int], flags: tuple[int, ...]) -> tuple[Step, Entry]:
        clause = entry.task.clauses[place]
        assert clause.ends is not None and clause.count is not None
        first, second = clause.ends
        direction = 1 if clause.along else 0
        # A path is walked from its free end: from the other it would lead over everything that hangs on a rail.
        if first not in bound or (second in bound and flags[bound[first]] > flags[bound[second]]):
            first, second, direction = second, first, -direction
        names = list(entry.names)
        end, apart = bound.get(second, NEW), tuple[int, ...]()
        if end == NEW:
            apart = _apart(entry.task, second, names)
            names.append(second)
        least, most = clause.count
        if end == NEW and flags[bound[first]] == RAIL:
            most = 0
        step = PathStep(clause.kinds, bound[first], end, least, min(most, MANY), direction, clause.until_driven, apart)
        return step, _after(entry, place=place, names=names)

    def _number(self, clause: Clause) -> int:
        return sum(self.counts.get(kind, 0) for kind in clause.kinds)


def _apart(task: Task, name: str, names: Sequence[str]) -> tuple[int, ...]:
    return tuple(slot for slot, other in enumerate(names) if frozenset((name, other)) not in task.alike)


def _after(
    entry: Entry, *, place: int | None = None, names: Sequence[str] | None = None, asked: tuple[int, ...] | None = None
) -> Entry:
    return Entry(
        task=entry.task,
        names=entry.names if names is None else tuple(names),
        found=entry.found if place is None else (*entry.found, place),
        left=tuple(one for one in entry.left if one != place),
        asked=entry.asked if asked is None else asked,
    )
