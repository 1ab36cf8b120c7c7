"""From a walk over the plan to whole matches: late tests, groups that fit again, parts that may be there."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from protlint.topology.flatten import Pattern
from protlint.topology.index import Index
from protlint.topology.plan import Plans
from protlint.topology.questions import holds, is_late
from protlint.topology.search import Elements, State, search
from protlint.topology.steps import Entry, make_task
from protlint.topology.terms import Clause, Each

Key = tuple[str, str, tuple[tuple[str, Elements], ...]]


@dataclass(slots=True)
class Match:
    """A pattern that fits: its nets by name, the elements of each role, and where elements stand."""

    pattern: Pattern
    nets: dict[str, int]
    elements: dict[str, list[int]] = field(default_factory=dict)
    places: dict[int, str] = field(default_factory=dict)
    required: int = 0

    def add(self, clause: Clause, elements: Elements) -> None:
        """Give a clause's elements its role."""
        for element in elements:
            known = self.elements.setdefault(clause.role, [])
            if element not in known:
                known.append(element)
            if clause.place is not None:
                self.places.setdefault(element, clause.place)

    @property
    def own(self) -> set[int]:
        """Every element of the match."""
        return {element for elements in self.elements.values() for element in elements}

    @property
    def order(self) -> tuple[Elements, ...]:
        """Its elements as they were found, role by role: of two equal matches the one in board order counts."""
        return tuple(tuple(elements) for _, elements in sorted(self.elements.items()))

    @property
    def key(self) -> Key:
        """What makes two matches the same: the rule, and the parts by role."""
        roles = tuple((role, tuple(sorted(elements))) for role, elements in sorted(self.elements.items()) if elements)
        return self.pattern.rule, self.pattern.polarity, roles


def plans_for(patterns: Sequence[Pattern]) -> Plans:
    """Return the plans to search for some patterns."""
    return Plans([make_task(number, one.clauses, one.where, one.unites) for number, one in enumerate(patterns)])


class Fitter:
    """Finds the matches of a list of patterns on one board, by plans made for these patterns."""

    def __init__(self, index: Index, patterns: Sequence[Pattern], plans: Plans, *, piece: bool = False) -> None:
        self.index = index
        self.patterns = patterns
        self.planner = plans.of_pieces if piece else plans.planner(index.by_kind)

    def matches(self) -> list[Match]:
        """Return every match, each once, in board order of its parts."""
        found: dict[Key, Match] = {}
        for entry, state in search(self.index, self.planner, self.planner.root, State(())):
            match = self._whole(self.patterns[entry.task.number], entry, state)
            if match is not None:
                known = found.setdefault(match.key, match)
                if match.order < known.order:
                    found[match.key] = match
        return [found[key] for key in sorted(found)]

    def add_optional(self, match: Match) -> None:
        """Add all parts that may be there and are, in the order of the rule; a part is taken once."""
        pattern = match.pattern
        met = set(match.nets)
        for item in pattern.may:
            names = item.nets()
            if any(name in met and name not in match.nets for name in names):
                continue  # it hangs on a net of an earlier part that is not there
            if isinstance(item, Clause):
                met.update(names)
            bound = tuple(name for name in names if name in match.nets)
            for nets, found in self._again(pattern, item, match, bound, match.own):
                for clause, elements in found:
                    match.add(clause, elements)
                if isinstance(item, Clause):
                    for name, net in nets.items():
                        match.nets.setdefault(name, net)

    def _whole(self, pattern: Pattern, entry: Entry, state: State) -> Match | None:
        nets = dict(zip(entry.names, state.nets, strict=True))
        own = set(state.used)
        if not all(holds(test, nets, self.index, own) for test in pattern.where if is_late(test)):
            return None
        match = Match(pattern, nets)
        by_clause = dict(zip(entry.found, state.found, strict=True))
        for place, clause in enumerate(pattern.clauses):
            match.add(clause, by_clause[place])
        match.required = len(own)
        return match if self._repeated(match, own) else None

    def _repeated(self, match: Match, own: set[int]) -> bool:
        """Add the further places where a group fits; tell whether it fits often enough."""
        pattern = match.pattern
        for each in pattern.again:
            elsewhere = {name for clause in pattern.clauses if clause not in each.clauses for name in clause.nets()}
            bound = tuple(name for name in each.nets() if name in elsewhere)
            # A resistor before several bases is in the path to each of them.
            paths = {clause.role for clause in each.clauses if clause.count is not None}
            shared = {element for role in paths for element in match.elements.get(role, ())}
            instances = 1
            for _, found in self._again(pattern, each, match, bound, own - shared):
                instances += 1
                for clause, elements in found:
                    match.add(clause, elements)
                    if clause.count is None:
                        match.required += len(elements)
            if not each.least <= instances:
                return False
        return True

    def _again(
        self, pattern: Pattern, item: Clause | Each, match: Match, bound: tuple[str, ...], used: set[int]
    ) -> Iterator[tuple[dict[str, int], list[tuple[Clause, Elements]]]]:
        """Yield every place where an item fits with some of its nets bound, none of whose own parts is in another."""
        clauses = item.clauses if isinstance(item, Each) else (item,)
        free = set(item.nets()) - set(bound)
        names = tuple(name for name in match.nets if name not in free)
        nets = tuple(match.nets[name] for name in names)
        flags = tuple(self.index.flag[net] for net in nets)
        key = (id(pattern), id(item), names, flags)
        node = self.planner.starts.get(key)
        if node is None:
            task = make_task(0, clauses, (), pattern.unites, zero=pattern.clauses)
            node = self.planner.starts[key] = self.planner.start(task, names, flags)
        taken: set[int] = set()
        found = []
        for entry, state in search(self.index, self.planner, node, State(nets, (), tuple(sorted(used)))):
            by_clause = sorted(zip(entry.found, state.found, strict=True))
            found.append((tuple(elements for _, elements in by_clause), dict(zip(entry.names, state.nets, strict=True))))
        held = self.index.voltage_V
        found.sort(key=lambda one: (sum(net in held for name, net in one[1].items() if name not in names), one[0]))
        for elements, its_nets in found:
            own = {one for clause, these in zip(clauses, elements, strict=True) if clause.count is None for one in these}
            own = own or {one for these in elements for one in these}
            if own and taken.isdisjoint(own):
                taken |= own
                yield its_nets, list(zip(clauses, elements, strict=True))
