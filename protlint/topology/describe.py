"""A rule's clauses in words."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.quantities.units import format_quantity
from protlint.topology.terms import MANY, Body, Clause, Each, Either, Item, ShapeUse, Test


def describe(body: Body, indent: str = "") -> Iterator[str]:
    """Yield a line for every clause; alternatives and groups are indented below their own line."""
    for item in body.items:
        yield from _item(item, indent)
    for optional in body.may:
        lines = list(_item(optional, indent))
        yield f"{lines[0]} (where present)"
        yield from lines[1:]
    for test in body.where:
        yield f"{indent}where {_question(test)}"


def _item(item: Item, indent: str) -> Iterator[str]:
    if isinstance(item, Either):
        yield f"{indent}either:"
        for name, branch in item.branches:
            yield f"{indent}  {name}:"
            yield from describe(branch, f"{indent}    ")
    elif isinstance(item, Each):
        most = "more" if item.most == MANY else str(item.most)
        yield f"{indent}each of {item.least} to {most}:" if item.most != MANY else f"{indent}each of {item.least} or {most}:"
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
        text = f"{_number(clause.count)} {what} in a row from {clause.ends[0]} to {clause.ends[1]}"
    if clause.along:
        text += ", anode first"
    if clause.under_ohm is not None:
        text += f", under {format_quantity(clause.under_ohm, 'ohm')}"
    if clause.place is not None:
        text += f": {clause.place}"
    if clause.when:
        text += f", if {' and '.join(map(_question, clause.when))}"
    return text


def _number(count: tuple[int, int]) -> str:
    least, most = count
    if most == MANY:
        return "any number of" if least == 0 else f"{least} or more"
    return str(least) if least == most else f"{least} to {most}"


_WORDS = {
    "ground": "{0} is ground",
    "supply": "{0} is a supply",
    "lowest": "{0} is the lowest supply",
    "highest": "{0} is the highest supply",
    "apart": "{0} and {1} are not one net",
    "same": "{0} and {1} are one net",
    "busier": "{0} has more parts on it than {1}",
    "no-input": "no capacitor brings a signal onto {0}",
    "inner": "{0} leads to no load, only to the emitters of a pair or to bases and gates",
    "undriven": "nothing outside this group drives {0}",
    "closed": "nothing hangs on {0} that leads out of this group",
    "held": "nothing hangs on {0} but what leads to this group or to a supply",
    "read": "an IC reads {0}, straight or through a resistor",
    "twin": "another transistor has its base on {0} and its emitter on {1}, as in a current mirror",
    "npn-follows": "the emitter of an NPN or the source of an N-channel device outside this group drives {0}",
    "pnp-follows": "the emitter of a PNP or the source of a P-channel device outside this group drives {0}",
}


def _question(test: Test) -> str:
    if test.name in _WORDS:
        return _WORDS[test.name].format(*test.of)
    parts = [_question(one) for one in test.of if isinstance(one, Test)]
    return f"not ({parts[0]})" if test.name == "not" else f" {test.name} ".join(parts)
