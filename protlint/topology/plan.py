"""What to search next: patterns become steps, and steps shared by many patterns are taken once.

A plan is a tree that grows as it is walked. At each node the patterns still possible are grouped by the step each would
take next; which step that is depends on what is bound and on how freely the nets just bound may be walked, so a supply is
never enumerated and a crowded net is left for last.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

from protlint.topology.index import CROWD, FREE, RAIL, pin_bits
from protlint.topology.questions import by_flags
from protlint.topology.steps import NEW, AskStep, BridgeStep, Entry, PartStep, PathStep, Step, Task, is_anchor
from protlint.topology.terms import ANY, MANY, PINS, Clause

MOST_KEPT = 64
"""Plans kept for boards of different make-up."""

_Rank = tuple[bool, bool, bool, int, int]
"""Of a clause: whether it asks for a part at least, for one at most, or may be a path of nothing; how far it may lead; how
many parts of its kinds there are."""

LONG = 3
"""Where a long walk between two bound nets ranks: after what leads only a little way, before a long walk into the open."""


@dataclass(slots=True)
class Branch:
    """One step at a node: the tasks that take it, what must be on the nets of slots for it, its continuations by flags."""

    entries: list[Entry]
    needs: tuple[tuple[int, int], ...]
    children: dict[tuple[int, ...], Node] = field(default_factory=dict)


@dataclass(slots=True)
class Node:
    """A place in the plan: ``done`` the tasks fulfilled here, ``branches`` what to do next."""

    done: list[Entry] = field(default_factory=list)
    branches: dict[Step, Branch] = field(default_factory=dict)


class Plans:
    """The plans for a list of tasks, made when asked for and kept: boards of much the same make-up share one."""

    def __init__(self, tasks: Sequence[Task]) -> None:
        self.tasks = tasks
        self._planners: dict[tuple[tuple[str, int], ...], Planner] = {}

    @cached_property
    def of_pieces(self) -> Planner:
        """The planner for small pieces of boards, whatever is on them: one for all costs less than the best for each."""
        return Planner(self.tasks, dict.fromkeys(PINS, 1))

    def planner(self, by_kind: Mapping[str, Sequence[int]]) -> Planner:
        """Return the planner for a board with these elements by kind; numbers count by their power of two."""
        sizes = {kind: len(elements).bit_length() for kind, elements in by_kind.items() if kind in PINS}
        key = tuple(sorted(sizes.items()))
        if key not in self._planners:
            if len(self._planners) >= MOST_KEPT:
                self._planners.clear()
            self._planners[key] = Planner(self.tasks, sizes)
        return self._planners[key]


class Planner:
    """Chooses steps, given how many parts of each kind there are (any measure that orders them).

    ``root`` is where searches for the tasks begin; ``starts`` keeps the nodes of tasks that go on from bound nets.
    """

    def __init__(self, tasks: Sequence[Task], sizes: Mapping[str, int]) -> None:
        self.sizes = sizes
        self._ranks: dict[int, tuple[Task, tuple[_Rank, ...]]] = {}
        self.starts: dict[tuple[object, ...], Node] = {}
        self.root = self._root(tasks)

    def _root(self, tasks: Sequence[Task]) -> Node:
        """Return the node where searches of tasks begin.

        A task begins at a part of a rare kind that is no resistor; a kind that another task has to begin at anyway costs
        nothing more. Tasks that ask for a kind the board has none of are left out.
        """
        starts = []
        for task in tasks:
            ranks = self._ranked(task)
            anchors = [(ranks[place][-1], place) for place, clause in enumerate(task.clauses) if is_anchor(clause)]
            if anchors and all(number > 0 for needed, *_, number in ranks if needed):
                starts.append((min(anchors)[0], task, anchors))
        node = Node()
        chosen: set[tuple[str, ...]] = set()
        for _, task, anchors in sorted(starts, key=lambda one: (-one[0], one[1].number)):
            shared = [place for _, place in anchors if task.clauses[place].kinds in chosen]
            place = shared[0] if shared else min(anchors)[1]
            chosen.add(task.clauses[place].kinds)
            self._branch(node, *self._element_step(_whole(task, ()), place))
        return node

    def start(self, task: Task, names: Sequence[str], flags: Sequence[int]) -> Node:
        """Return the node where a task goes on from nets that are already bound."""
        return self.node([_whole(task, names)], (), flags)

    def node(self, entries: Sequence[Entry], before: Sequence[int], flags: Sequence[int]) -> Node:
        """Return the node for entries, given the flags of the slots bound before and of those bound just now.

        What cannot go on without walking a rail drops out.
        """
        node = Node()
        every = (*before, *flags)
        for entry in entries:
            chosen = self._next(entry.with_flags(len(before), flags) if flags else entry, every)
            if isinstance(chosen, Entry):
                node.done.append(chosen)
            elif chosen is not None:
                self._branch(node, *chosen)
        return node

    def _branch(self, node: Node, step: Step, after: Entry) -> None:
        branch = node.branches.get(step)
        if branch is None:
            branch = node.branches[step] = Branch([], self._needs(step))
        branch.entries.append(after)

    @staticmethod
    def _needs(step: Step) -> tuple[tuple[int, int], ...]:
        """Return (slot, bits) pairs: the step leads nowhere unless one of the bits stands in the mask of the slot's net."""
        if isinstance(step, PartStep):
            return tuple((slot, pin_bits(step.kinds, pin)) for pin, slot in step.known)
        if isinstance(step, AskStep) or (isinstance(step, PathStep) and step.least == 0):
            return ()
        return tuple((slot, pin_bits(step.kinds)) for slot in (step.a, step.b) if slot != NEW)

    def _next(self, entry: Entry, flags: Sequence[int]) -> tuple[Step, Entry] | Entry | None:
        """Return the next step and the entry after it, the entry itself where it is fulfilled, None where it cannot be."""
        task, names, found, left, asked, bound, free, crowd = entry
        waiting = []
        for place in asked:
            if task.asks[place] & ~bound:
                waiting.append(place)
                continue
            test = task.tests[place]
            slots = {name: names.index(name) for name in task.asked_of[place]}
            answer = by_flags(test, {name: flags[slot] for name, slot in slots.items()})
            if answer is None:
                later = tuple([one for one in asked if one != place])
                step = AskStep(test.renamed({name: str(slot) for name, slot in slots.items()}))
                return step, Entry(task, names, found, left, later, bound, free, crowd)
            if not answer:
                return None
        if len(waiting) < len(asked):
            entry = Entry(task, names, found, left, tuple(waiting), bound, free, crowd)
        if not left:
            return entry
        best: tuple[int, ...] | None = None
        joins, ranks = task.joins, self._ranked(task)
        for place in left:
            join = joins[place]
            known = join & bound
            if not known:
                continue
            needed, single, empty, width, number = ranks[place]
            flag = FREE if known & free else CROWD if known & crowd else RAIL
            if known == join:
                if flag == RAIL and needed and join & (join - 1):
                    return None  # what lies between two supplies belongs to anybody and nobody
                # Whether something is between two nets is asked first, unless it takes a long walk or a crowd to tell.
                option = (0, flag, 0, number, place) if single and flag == FREE else (1, flag, LONG, number, place)
            elif flag != RAIL:
                option = (1, flag, width, number, place)
            elif empty:
                # A rail is not walked, but a path of nothing needs no walk.
                option = (2, flag, 0, number, place)
            else:
                continue
            if best is None or option < best:
                best = option
        if best is None:
            return None
        place = best[-1]
        if task.clauses[place].count is None:
            return self._element_step(entry, place)
        return self._path_step(entry, place, flags)

    @staticmethod
    def _element_step(entry: Entry, place: int) -> tuple[Step, Entry]:
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
        return step, _after(entry, place, names)

    @staticmethod
    def _path_step(entry: Entry, place: int, flags: Sequence[int]) -> tuple[Step, Entry]:
        clause = entry.task.clauses[place]
        bound = {name: slot for slot, name in enumerate(entry.names)}
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
        return step, _after(entry, place, names)

    def _ranked(self, task: Task) -> tuple[_Rank, ...]:
        known = self._ranks.get(id(task))
        if known is None:
            known = self._ranks[id(task)] = task, tuple([self._rank(clause) for clause in task.clauses])
        return known[1]

    def _rank(self, clause: Clause) -> _Rank:
        least, most = clause.count or (1, 1)
        return least > 0, most == 1, least == 0, _width(clause), sum([self.sizes.get(kind, 0) for kind in clause.kinds])


def _width(clause: Clause) -> int:
    """Return how far a clause may lead: resistors hang on most nets and lead far, other kinds seldom do."""
    if "resistor" not in clause.kinds:
        return 0 if clause.count is None else 1
    return 2 if clause.count is None or clause.count[1] == 1 else LONG + 1


def _apart(task: Task, name: str, names: Sequence[str]) -> tuple[int, ...]:
    alike = task.alike.get(name, ())
    return tuple([slot for slot, other in enumerate(names) if other not in alike])


def _whole(task: Task, names: Sequence[str]) -> Entry:
    """Return the entry of a task of which nothing is found yet."""
    return Entry(task, tuple(names), (), tuple(range(len(task.clauses))), tuple(range(len(task.tests))))


def _after(entry: Entry, place: int, names: Sequence[str]) -> Entry:
    """Return the entry with one more clause found."""
    task, _, found, left, asked, bound, free, crowd = entry
    left = tuple([one for one in left if one != place])
    return Entry(task, tuple(names), (*found, place), left, asked, bound, free, crowd)
