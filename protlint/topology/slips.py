"""What makes a flat pattern impossible to search, or is bound to be a slip of the pen."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.topology.flatten import Pattern, Resolved
from protlint.topology.mistakes import Mistakes
from protlint.topology.steps import is_anchor
from protlint.topology.terms import ANY, Clause, Each


def check_pattern(pattern: Pattern, resolved: Resolved, mistakes: Mistakes) -> None:
    """Note what makes a pattern impossible to search or is bound to be a slip of the pen."""
    if not any(is_anchor(clause) for clause in pattern.clauses):
        mistakes.say(resolved.rule.form, "nothing to begin the search at: a rule needs a part that is no resistor")
        return
    bound = {name for clause in pattern.clauses for name in clause.nets()}
    for clause in pattern.clauses:
        for test in clause.when:
            for name in set(test.nets()) - bound:
                mistakes.say(clause.form, f"the test {test} asks about {name}, which no clause joins")
    for clause in _apart_from_the_rest(pattern.clauses):
        mistakes.say(clause.form, f"nothing joins this {clause.role} to the rest of {pattern.rule}")
    known = set(bound)
    for item in pattern.may:
        if known.isdisjoint(item.nets()):
            mistakes.say(item.form, "nothing joins this to what must be there")
        known.update(item.nets())
    for test in pattern.where:
        for name in sorted(set(test.nets()) - bound):
            mistakes.say(resolved.rule.form, f"the test {test} asks about {name}, which no clause joins")
    for name, form in resolved.grounded:
        if name not in bound:
            mistakes.say(form, f"the load is to be on {name}, which no clause joins")
    for net, choices in pattern.nets.items() if not pattern.fault else ():
        for name, asked in choices:
            for one in {name, *(name for test in asked for name in test.nets())} - known:
                mistakes.say(resolved.rule.form, f"net {net} is to be {one}, which no clause joins")
    _check_single_names(pattern, mistakes)


def _apart_from_the_rest(clauses: Sequence[Clause]) -> list[Clause]:
    """Return the clauses that do not hang together with most of them."""
    groups: list[tuple[list[Clause], set[str]]] = []
    for clause in clauses:
        together, nets = [clause], set(clause.nets())
        joined = [group for group in groups if not group[1].isdisjoint(nets)]
        for other in joined:
            together = other[0] + together
            nets |= other[1]
            groups.remove(other)
        groups.append((together, nets))
    most = max(groups, key=lambda group: len(group[0]))
    return [clause for group in groups if group is not most for clause in group[0]]


def _check_single_names(pattern: Pattern, mistakes: Mistakes) -> None:
    """A name joined once and never spoken of again is a slip: what does not matter is called any."""
    times: dict[str, int] = {}
    items: tuple[Clause | Each, ...] = (*pattern.clauses, *pattern.may)
    for item in items:
        clauses = item.clauses if isinstance(item, Each) else (item,)
        for clause in clauses:
            for name in (*clause.nets(), *(name for test in clause.when for name in test.nets())):
                times[name] = times.get(name, 0) + 1
    spoken = {name for pair in pattern.unites for name in pair}
    spoken |= {name for test in pattern.where for name in test.nets()}
    spoken |= {name for choices in pattern.nets.values() for name, _ in choices}
    for clause in pattern.clauses:
        for name in clause.nets():
            if times[name] == 1 and name not in spoken and name != ANY:
                mistakes.say(clause.form, f"net {name} is joined here and nowhere else; call it {ANY} if it does not matter")
