"""A rule's clauses in words."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from protlint.quantities.units import format_quantity
from protlint.topology.terms import MANY, Body, Clause, Each, Either, Item, Shape, ShapeUse, Test


def describe(body: Body, indent: str = "") -> Iterator[str]:
    """Yield a line for every clause and test, what need not be there last; groups are indented below their own line."""
    for item in body.items:
        yield from _item(item, indent)
    for test in body.where:
        yield f"{indent}where {_question(test)}"
    if body.may:
        yield f"{indent}and, where present:"
    for optional in body.may:
        yield from _item(optional, f"{indent}  ")


def describe_shapes(body: Body, shapes: Mapping[str, Shape]) -> Iterator[str]:
    """Yield what the shapes are that a body uses, and those inside them, each once: what it is, and its variants."""
    waiting, seen = list(_shapes_in(body)), set[str]()
    for name in waiting:
        shape = shapes.get(name)
        if shape is None or name in seen:
            continue
        seen.add(name)
        yield f"{name}: {shape.says}"
        yield f"  one of {', '.join(variant for variant, _ in shape.variants)}"
        for _, variant_body in shape.variants:
            waiting += _shapes_in(variant_body)


def _shapes_in(body: Body) -> Iterator[str]:
    for item in body.items:
        if isinstance(item, ShapeUse):
            yield item.shape
        elif isinstance(item, Either):
            for _, branch in item.branches:
                yield from _shapes_in(branch)


def _item(item: Item, indent: str) -> Iterator[str]:
    if isinstance(item, Either):
        yield f"{indent}either:"
        for name, branch in item.branches:
            yield f"{indent}  {name}:"
            yield from describe(branch, f"{indent}    ")
    elif isinstance(item, Each):
        often = (
            "any number of times"
            if item.least == 0
            else "once or more"
            if item.least == 1
            else f"{item.least} times or more"
        )
        yield f"{indent}{often if item.most == MANY else f'{item.least} to {item.most} times'}:"
        for clause in item.clauses:
            yield from _item(clause, f"{indent}  ")
    elif isinstance(item, ShapeUse):
        joins = ", ".join(f"{port} on {net}" for port, net in item.ports)
        yield f"{indent}{item.role}: {item.shape}, {joins}"
    else:
        yield f"{indent}{item.role}: {_clause(item)}"


def _clause(clause: Clause) -> str:
    what = " or ".join(clause.kinds)
    if clause.ends is None:
        text = f"{what}, " + ", ".join(f"{pin} on {net}" for pin, net in clause.pins)
    elif clause.count is None:
        text = f"{what} from {clause.ends[0]} to {clause.ends[1]}"
    else:
        text = f"{_number(clause.count, what)} from {clause.ends[0]} to {clause.ends[1]}"
    if clause.along:
        text += ", anode first"
    if clause.under_ohm is not None:
        text += f", under {format_quantity(clause.under_ohm, 'ohm')}"
    if clause.place is not None:
        text += f": {clause.place}"
    if clause.when:
        text += f", if {' and '.join(map(_question, clause.when))}"
    return text


def _number(count: tuple[int, int], what: str) -> str:
    least, most = count
    many = f"{what}s in a row" if " or " not in what else f"of {what} in a row"
    if most == 1:
        return what if least else f"no more than one {what}"
    if most == MANY:
        return f"any number of {many}" if least == 0 else f"{least} or more {many}"
    return f"{least} {many}" if least == most else f"{least} to {most} {many}"


_WORDS = {
    "ground": "{0} is ground",
    "supply": "{0} is a supply",
    "lowest": "{0} is the lowest supply",
    "highest": "{0} is the highest supply",
    "pulls-down": "{0} is a supply that turns a pass device between {1} and {2} off (down)",
    "pulls-up": "{0} is a supply that turns a pass device between {1} and {2} off (up)",
    "apart": "{0} and {1} are not one net",
    "same": "{0} and {1} are one net",
    "n-type": "the rule is taken as it is written",
    "p-type": "the rule is taken in its mirror",
    "no-input": "no capacitor brings a signal onto {0}",
    "inner": "{0} leads to no load, only to the emitters of a pair or to bases and gates",
    "undriven": "nothing outside this group drives {0}",
    "closed": "nothing hangs on {0} that leads out of this group",
    "held": "nothing hangs on {0} but what leads to this group or to a supply",
    "leaves": "a connector, an inductor or a fuse hangs on {0}",
    "nearer": "a smaller resistor leads from {0} to {1} than to {2}",
    "pulled": "a resistor outside this group joins {0} to a supply",
    "read": "an IC reads {0}, straight or through a resistor",
    "twin": "another transistor has its base on {0} and its emitter on {1}, as in a current mirror",
    "regulator": "an IC takes its supply from {0} and gives it on to {1}, as a three-terminal regulator does",
    "npn-follows": "the emitter of an NPN or the source of an N-channel device outside this group drives {0}",
    "pnp-follows": "the emitter of a PNP or the source of a P-channel device outside this group drives {0}",
}


def _question(test: Test) -> str:
    if test.name in _WORDS:
        return _WORDS[test.name].format(*test.of)
    parts = [_question(one) for one in test.of if isinstance(one, Test)]
    return f"not ({parts[0]})" if test.name == "not" else f" {test.name} ".join(parts)
