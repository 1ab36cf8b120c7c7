"""Rules to flat patterns: builds-on and instead-of resolved, alternatives and shapes multiplied out, the mirror added."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from itertools import product
from typing import Any

from protlint.netlist.forms import Form
from protlint.topology.mistakes import Mistakes
from protlint.topology.terms import ANY, Body, Clause, Each, Either, Item, Rule, Shape, ShapeUse, Test


@dataclass(frozen=True, slots=True)
class Resolved:
    """A rule with what it inherits: the whole of its clauses, united names, grounded loads and net choices, and
    the rules it builds on."""

    rule: Rule
    body: Body
    bounds: Mapping[str, float]
    unites: tuple[tuple[str, str], ...]
    grounded: tuple[tuple[str, Form], ...]
    nets: Mapping[str, tuple[tuple[str, tuple[Test, ...]], ...]]
    mirrored: bool
    ancestors: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Pattern:
    """One flat pattern: clauses that must all fit, groups that may fit again, parts that may be there, tests.

    ``labels`` are the alternatives it was made from; ``polarity`` is ``n`` as the rule is written and ``p`` mirrored.
    """

    rule: str
    fault: bool
    labels: tuple[str, ...]
    polarity: str
    clauses: tuple[Clause, ...]
    again: tuple[Each, ...]
    may: tuple[Clause | Each, ...]
    where: tuple[Test, ...]
    unites: tuple[tuple[str, str], ...]
    grounded: tuple[str, ...]
    nets: Mapping[str, tuple[tuple[str, tuple[Test, ...]], ...]]


def resolve(rules: Mapping[str, Rule], mistakes: Mistakes) -> dict[str, Resolved]:
    """Return every rule that can be resolved, by name; unknown bases and cycles are noted as mistakes."""
    resolved: dict[str, Resolved] = {}
    for name in rules:
        line: list[str] = []
        while name is not None and name in rules and name not in resolved and name not in line:
            line.append(name)
            base = rules[name].base
            if base is None:
                break
            if base not in rules:
                mistakes.say(rules[name].form, f"{name} builds on {base}, which is no rule")
                break
            if rules[base].fault:
                mistakes.say(rules[name].form, f"{name} builds on {base}, which is a fault")
            if base in line:
                mistakes.say(rules[name].form, f"{name} builds on itself: {' on '.join([*line, base])}")
                break
            name = base
        for one in reversed(line):
            rule = rules[one]
            if rule.base is None:
                resolved[one] = Resolved(
                    rule, rule.body, dict(rule.bounds), rule.unites, rule.grounded, dict(rule.nets), rule.mirrored, ()
                )
            elif rule.base in resolved:
                resolved[one] = _built_on(resolved[rule.base], rule, mistakes)
    return resolved


def flatten(resolved: Resolved, shapes: Mapping[str, Shape], mistakes: Mistakes) -> list[Pattern]:
    """Return the flat patterns of a rule, its mirror images behind them."""
    patterns = []
    bounded = _once_each(lambda item: _bounded(item, resolved.bounds))
    for labels, body in _expand(resolved.body, shapes, mistakes, ()):
        clauses, again = [], []
        for item in map(bounded, body.items):
            if isinstance(item, Clause):
                clauses.append(item)
            elif isinstance(item, Each):
                clauses += item.clauses
                again.append(item)
                if item.least == 0:
                    mistakes.say(item.form, "a group that need not be there belongs under may")
        rule = resolved.rule
        patterns.append(
            Pattern(
                rule.name, rule.fault, labels, "n", tuple(clauses), tuple(again), body.may, body.where, resolved.unites,
                tuple(name for name, _ in resolved.grounded), resolved.nets,
            )
        )  # fmt: skip
    if not resolved.mirrored:
        return patterns
    mirrored = _once_each(lambda item: item.mirrored())
    return patterns + [_mirrored(one, mirrored) for one in patterns]


def _once_each(change: Callable[[Any], Any]) -> Callable[[Any], Any]:
    """Return a change that is made once of each object: what alternatives are multiplied out of stands in many patterns."""
    done: dict[int, tuple[Any, Any]] = {}

    def changed(item: Any) -> Any:
        if id(item) not in done:
            done[id(item)] = item, change(item)
        return done[id(item)][1]

    return changed


def _bounded(item: Item, bounds: Mapping[str, float]) -> Item:
    """Return an item with the bounds on resistances that its rule sets by role."""
    if isinstance(item, Clause) and item.role in bounds:
        return replace(item, under_ohm=bounds[item.role])
    if isinstance(item, Each):
        within = [replace(one, under_ohm=bounds.get(one.role, one.under_ohm)) for one in item.clauses]
        return replace(item, clauses=tuple(within))
    return item


def _mirrored(pattern: Pattern, mirrored: Callable[[Any], Any]) -> Pattern:
    def tests(choices: tuple[tuple[str, tuple[Test, ...]], ...]) -> tuple[tuple[str, tuple[Test, ...]], ...]:
        return tuple((name, tuple(map(mirrored, asked))) for name, asked in choices)

    return replace(
        pattern,
        polarity="p",
        clauses=tuple(map(mirrored, pattern.clauses)),
        again=tuple(map(mirrored, pattern.again)),
        may=tuple(map(mirrored, pattern.may)),
        where=tuple(map(mirrored, pattern.where)),
        nets={net: tests(choices) for net, choices in pattern.nets.items()},
    )


def _built_on(base: Resolved, rule: Rule, mistakes: Mistakes) -> Resolved:
    body = base.body
    for branch in rule.branches:
        chosen = _select(body, branch)
        if chosen == body:
            mistakes.say(rule.form, f"{rule.base} has no branch {branch!r}")
        body = chosen
    for role, items, form in rule.instead:
        changed = _replace(body, role, items)
        if changed == body:
            mistakes.say(form, f"{rule.base} has no {role!r} to put something instead of")
        body = changed
    for clause in rule.rejoined:
        changed = _rejoin(body, clause)
        if changed == body:
            mistakes.say(clause.form, f"{rule.base} has no {clause.role!r} to join otherwise")
        body = changed
    if rule.fault:
        body = replace(body, may=())  # what might be there besides tells nothing about a fault
    names = {gone: kept for kept, gone in rule.joined}
    nets = {**base.nets, **dict(rule.nets)}
    renamed = {
        net: tuple((names.get(name, name), tuple(test.renamed(names) for test in asked)) for name, asked in choices)
        for net, choices in nets.items()
    }
    unites = tuple((names.get(one, one), names.get(other, other)) for one, other in (*base.unites, *rule.unites))
    return Resolved(
        rule=rule,
        body=_renamed(body, names) + rule.body,
        bounds={**base.bounds, **dict(rule.bounds)},
        unites=tuple(pair for pair in unites if pair[0] != pair[1]),
        grounded=tuple((names.get(name, name), form) for name, form in (*base.grounded, *rule.grounded)),
        nets=renamed,
        mirrored=base.mirrored or rule.mirrored,
        ancestors=(base.rule.name, *base.ancestors),
    )


def _select(body: Body, branch: str) -> Body:
    """Return the body with one branch taken wherever an either has it."""
    taken = Body((), body.may, body.where)
    for item in body.items:
        if isinstance(item, Either):
            branches = dict(item.branches)
            if branch in branches:
                taken += branches[branch]
                continue
            item = replace(item, branches=tuple((name, _select(one, branch)) for name, one in item.branches))
        taken += Body((item,))
    return taken


def _replace(body: Body, role: str, new: tuple[Item, ...]) -> Body:
    """Return the body with other items in the place of those of a role."""
    items: list[Item] = []
    done = False
    for item in body.items:
        if isinstance(item, Clause | ShapeUse) and item.role == role:
            items += () if done else new
            done = True
        elif isinstance(item, Either):
            items.append(replace(item, branches=tuple((name, _replace(one, role, new)) for name, one in item.branches)))
        else:
            items.append(item)
    return replace(body, items=tuple(items))


def _rejoin(body: Body, clause: Clause) -> Body:
    """Return the body with the clause of the same role joined otherwise, and of another kind where that is given."""
    items: list[Item] = []
    for item in body.items:
        if isinstance(item, Clause) and item.role == clause.role:
            item = replace(clause, kinds=clause.kinds or item.kinds, place=item.place)
        elif isinstance(item, Either):
            item = replace(item, branches=tuple((name, _rejoin(one, clause)) for name, one in item.branches))
        items.append(item)
    return replace(body, items=tuple(items))


def _nets_of(body: Body) -> Iterator[str]:
    for item in body.items:
        if isinstance(item, Either):
            for _, branch in item.branches:
                yield from _nets_of(branch)
        else:
            yield from item.nets()
    for item in body.may:
        yield from item.nets()
    for test in body.where:
        yield from test.nets()


def _renamed(body: Body, names: Mapping[str, str]) -> Body:
    if not names:
        return body
    items: list[Item] = []
    for item in body.items:
        if isinstance(item, Either):
            items.append(replace(item, branches=tuple((name, _renamed(one, names)) for name, one in item.branches)))
        else:
            items.append(item.renamed(names))
    may = tuple(one.renamed(names) for one in body.may)
    return Body(tuple(items), may, tuple(test.renamed(names) for test in body.where))


def _expand(
    body: Body, shapes: Mapping[str, Shape], mistakes: Mistakes, inside: tuple[str, ...]
) -> Iterator[tuple[tuple[str, ...], Body]]:
    """Yield every way to take the alternatives of a body, with the names of those taken."""
    choices = [list(_choices(item, shapes, mistakes, inside)) for item in body.items]
    for picked in product(*choices):
        labels = tuple(label for taken, _ in picked for label in taken)
        whole = Body((), body.may, body.where)
        for _, part in picked:
            whole += part
        yield labels, whole


def _choices(
    item: Item, shapes: Mapping[str, Shape], mistakes: Mistakes, inside: tuple[str, ...]
) -> Iterator[tuple[tuple[str, ...], Body]]:
    if isinstance(item, Either):
        for name, branch in item.branches:
            for labels, body in _expand(branch, shapes, mistakes, inside):
                yield (name, *labels), body
    elif isinstance(item, ShapeUse):
        shape = shapes.get(item.shape)
        ports = dict(item.ports)
        if shape is None:
            mistakes.say(item.form, f"unknown kind or shape {item.shape!r}")
        elif item.shape in inside:
            mistakes.say(item.form, f"shape {item.shape} stands inside itself")
        elif set(ports) != set(shape.ports) or len(item.ports) != len(ports):
            mistakes.say(item.form, f"shape {item.shape} joins {', '.join(shape.ports)}")
        else:
            for name, variant in shape.variants:
                # What is no port is the shape's own: no name of the rule's can meet it by chance.
                own = {net: f"{item.shape}.{net}" for net in _nets_of(variant) if net not in ports and net != ANY}
                renamed = _renamed(variant, {**own, **ports})
                for labels, body in _expand(renamed, shapes, mistakes, (*inside, item.shape)):
                    yield (name, *labels), body
    else:
        yield (), Body((item,))
