"""One rule file to rules and shapes, every mistake of the file collected with its place."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any

from protlint.netlist.forms import Atom, Form, read_forms
from protlint.quantities.units import read_quantity
from protlint.sources import InputError
from protlint.topology.limiter import NETS
from protlint.topology.mistakes import Mistakes
from protlint.topology.terms import (
    ANY,
    COMBINING,
    DIRECTED,
    HEADS,
    MANY,
    PINS,
    TESTS,
    TWO_TERMINAL,
    Body,
    Clause,
    Cure,
    Each,
    Either,
    Item,
    Rule,
    Shape,
    ShapeUse,
    Test,
)  # fmt: skip

CURES = ("(exchange ROLE.PIN ROLE.PIN)", "(move ROLE.PIN NET)", "(replace ROLE KIND)", "(part ROLE)", "(turn ROLE NET NET)")
"""The changes a fault may ask for."""


def read_rule_file(text: str, file: str, mistakes: Mistakes) -> tuple[list[Rule], list[Shape]]:
    """Return the rules and shapes of one file, as far as they can be understood."""
    try:
        forms = read_forms(text, file)
    except InputError as error:
        mistakes.found.append(error)
        return [], []
    rules, shapes = [], []
    for form in forms:
        if form.head in ("topology", "fault"):
            rule = _Reader(mistakes, file).rule(form)
            rules += [rule] if rule else []
        elif form.head == "shape":
            shape = _Reader(mistakes, file).shape(form)
            shapes += [shape] if shape else []
        elif form.head != "comment":
            mistakes.say(form, f"expected (topology ...), (fault ...) or (shape ...), not ({form.head} ...)")
    return rules, shapes


class _Reader:
    """Reads one rule or shape; what cannot be understood is noted and left out."""

    def __init__(self, mistakes: Mistakes, file: str) -> None:
        self.say = mistakes.say
        self.file = file

    def rule(self, form: Form) -> Rule | None:
        name = self.word(form, 1, "the rule's name")
        if name is None:
            return None
        fields: dict[str, Any] = {"name": name, "fault": form.head == "fault", "file": self.file, "form": form}
        lists: dict[str, list[Any]] = {
            "instead": [], "rejoined": [], "joined": [], "unites": [], "bounds": [], "grounded": [], "cure": [],
        }  # fmt: skip
        readers: dict[str, Callable[[Form], None]] = {
            "says": lambda one: fields.update(says=" ".join(self.texts(one))),
            "cited": lambda one: fields.update(cited=self.texts(one)),
            "used": lambda one: fields.update(used=" ".join(self.texts(one))),
            "drawing": lambda one: fields.update(drawing=self.texts(one)),
            "mirrored": lambda one: fields.update(mirrored=True),
            "precedence": lambda one: fields.update(precedence=self.number(one, 1) or 0),
            "builds-on": lambda one: self.base(one, fields),
            "bound": lambda one: lists["bounds"].append(self.bound(one)),
            "unites": lambda one: lists["unites"].append(self.pair(one)),
            "grounded-load": lambda one: lists["grounded"].append(self.grounded_load(one)),
            "nets": lambda one: fields.update(nets=tuple(self.net_choices(one))),
            "instead-of": lambda one: lists["instead"].append(self.instead(one)),
        }
        if fields["fault"]:
            del readers["builds-on"]
            readers |= {
                "spoils": lambda one: self.base(one, fields),
                "rejoin": lambda one: lists["rejoined"].append(self.clause(one, rejoins=True)),
                "joined": lambda one: lists["joined"].append(self.pair(one)),
                "cure": lambda one: lists["cure"].append(tuple(self.cures(one))),
            }
        rest = []
        for part in form[2:]:
            if isinstance(part, Form) and part.head in readers:
                readers[part.head](part)
            else:
                rest.append(part)
        body = self.body(form, rest)
        kept: dict[str, Any] = {key: tuple(one for one in value if one is not None) for key, value in lists.items()}
        return Rule(**fields, **kept, body=body)

    def shape(self, form: Form) -> Shape | None:
        name = self.word(form, 1, "the shape's name")
        if name is None or len(form) < 3 or not isinstance(form[2], Form):
            self.say(form, "expected (shape NAME (PORT ...) variants ...)")
            return None
        ports = tuple(str(port) for port in form[2] if isinstance(port, Atom))
        variants, says = [], ""
        for part in form[3:]:
            if isinstance(part, Form) and part.head == "says":
                says = " ".join(self.texts(part))
            elif isinstance(part, Form) and part.head:
                variants.append((part.head, self.body(part, part[1:])))
            else:
                self.say(form, "expected variants such as (single clause ...)")
        if not variants:
            self.say(form, f"shape {name} has no variant")
        return Shape(name, ports, tuple(variants), says, self.file, form)

    def body(self, form: Form, parts: Iterable[object]) -> Body:
        items: list[Item] = []
        may: list[Clause | Each] = []
        where: list[Test] = []
        for part in parts:
            if not isinstance(part, Form):
                self.say(form, f"expected a clause in parentheses, not {part!s}")
            elif part.head == "may":
                may += [one for one in map(self.item, self.forms(part, 1)) if isinstance(one, Clause | Each)]
            elif part.head == "where":
                where += [one for one in map(self.test, self.forms(part, 1)) if one]
            elif part.head != "comment":
                item = self.item(part)
                items += [item] if item is not None else []
        return Body(tuple(items), tuple(may), tuple(where))

    def item(self, form: Form) -> Item | None:
        if form.head == "either":
            branches = [(one.head, self.body(one, one[1:])) for one in self.forms(form, 1)]
            if len(branches) < 2 or not all(name for name, _ in branches):
                self.say(form, "either needs two or more named branches: (either (NAME clause ...) (NAME clause ...))")
            return Either(tuple(branches), form)
        if form.head == "each":
            least, most = self.counts(form)
            clauses = tuple(one for one in map(self.clause, self.forms(form, 3)) if isinstance(one, Clause))
            if not clauses:
                self.say(form, "each needs clauses: (each LEAST MOST clause ...)")
                return None
            return Each(least, most, clauses, form)
        return self.clause(form)

    def clause(self, form: Form, *, rejoins: bool = False) -> Clause | ShapeUse | None:
        start = 1 if rejoins else 0
        role = self.word(form, start, "a role")
        if role is None:
            return None
        if role.split(".")[0] not in HEADS:
            self.say(form, f"unknown role {role!r}: a role begins with one of {', '.join(sorted(HEADS))}")
        kinds, joins = self.kinds(form, start + 1, optional=rejoins)
        if kinds is None:
            return None
        if len(kinds) == 1 and kinds[0] not in PINS:
            return self.shape_use(form, role, kinds[0])
        unknown = [kind for kind in kinds if kind not in PINS]
        if unknown:
            self.say(form, f"unknown kind {unknown[0]!r}")
            return None
        fields: dict[str, Any] = {}
        pins: list[tuple[str, str]] = []
        for one in self.forms(form, joins):
            self.join_or_option(one, kinds, pins, fields)
        if bool(pins) == ("ends" in fields):
            self.say(form, f"{role} needs either pins, as (base NET), or ends, as (across NET NET)")
            return None
        if fields.pop("path", False):
            fields.setdefault("count", (1, MANY))
        return Clause(role, kinds, form, pins=tuple(pins), **fields)

    def join_or_option(
        self, form: Form, kinds: tuple[str, ...], pins: list[tuple[str, str]], fields: dict[str, Any]
    ) -> None:
        head = form.head
        if head in ("across", "along", "path"):
            if not TWO_TERMINAL.issuperset(kinds) or (head == "along" and not DIRECTED.issuperset(kinds)):
                self.say(form, f"{head} does not fit {' or '.join(kinds)}")
            ends = self.pair(form)
            if ends is not None:
                fields.update(ends=ends, along=head == "along", path=head == "path")
        elif head == "count":
            fields["count"] = self.counts(form)
        elif head == "under":
            fields["under_ohm"] = self.ohms(form, 1)
        elif head == "place":
            fields["place"] = " ".join(self.texts(form))
        elif head == "when":
            fields["when"] = tuple(one for one in map(self.test, self.forms(form, 1)) if one)
        elif head == "until" and form[1:] == ["driven"]:
            fields["until_driven"] = True
        elif kinds and all(head in PINS[kind] for kind in kinds):
            net = self.word(form, 1, "a net")
            if head in dict(pins):
                self.say(form, f"pin {head} is joined twice")
            elif net is not None:
                pins.append((head, net))
        elif not kinds and any(head in known for known in PINS.values()):
            pins.append((head, self.word(form, 1, "a net") or ANY))
        else:
            self.say(form, f"unknown join or option {head!r} for {' or '.join(kinds)}")

    def shape_use(self, form: Form, role: str, shape: str) -> ShapeUse:
        ports = []
        for one in self.forms(form, 2):
            net = self.word(one, 1, "a net")
            if net is not None:
                ports.append((one.head, net))
        return ShapeUse(role, shape, tuple(ports), form)

    def kinds(self, form: Form, place: int, *, optional: bool) -> tuple[tuple[str, ...] | None, int]:
        """Return the kinds asked for and where the joins begin."""
        given = form[place] if len(form) > place else None
        if isinstance(given, Atom):
            return (str(given),), place + 1
        if isinstance(given, Form) and given.head in PINS and all(isinstance(one, Atom) for one in given) and not optional:
            return tuple(map(str, given)), place + 1
        if optional:
            return (), place
        self.say(form, "expected a kind (npn, resistor ...) or a shape after the role")
        return None, place

    def base(self, form: Form, fields: dict[str, Any]) -> None:
        fields["base"] = self.word(form, 1, "the name of a rule")
        fields["branches"] = tuple(str(one) for one in form[2:] if isinstance(one, Atom))

    def instead(self, form: Form) -> tuple[str, tuple[Item, ...], Form] | None:
        role = self.word(form, 1, "a role")
        items = tuple(one for one in map(self.item, self.forms(form, 2)) if one is not None)
        return None if role is None else (role, items, form)

    def bound(self, form: Form) -> tuple[str, float] | None:
        role, ohms = self.word(form, 1, "a role"), self.ohms(form, 2)
        return None if role is None or ohms is None else (role, ohms)

    def grounded_load(self, form: Form) -> tuple[str, Form] | None:
        if len(form) == 2 and isinstance(form[1], Atom):
            return str(form[1]), form
        self.say(form, "expected (grounded-load NET)")
        return None

    def ohms(self, form: Form, place: int) -> float | None:
        try:
            return read_quantity(str(form[place]) if len(form) == place + 1 else "", "resistance")
        except ValueError as error:
            self.say(form, str(error))
            return None

    def net_choices(self, form: Form) -> Iterable[tuple[str, tuple[tuple[str, tuple[Test, ...]], ...]]]:
        for one in self.forms(form, 1):
            if one.head not in NETS:
                self.say(one, f"unknown net {one.head!r}: a limiter's nets are {', '.join(NETS)}")
            choices: list[tuple[str, tuple[Test, ...]]] = []
            for choice in one[1:]:
                if isinstance(choice, Form):
                    tests = tuple(test for test in map(self.test, self.forms(choice, 1)) if test)
                    choices.append((choice.head, tests))
                else:
                    choices.append((str(choice), ()))
            yield one.head, tuple(choices)

    def cures(self, form: Form) -> Iterable[Cure]:
        wanted = {cure.split()[0][1:]: cure.count(" ") for cure in CURES}
        for one in self.forms(form, 1):
            of = tuple(str(item) for item in one[1:])
            if wanted.get(one.head) != len(of):
                self.say(
                    one, "a cure is (exchange ROLE.PIN ROLE.PIN), (move ROLE.PIN NET), (replace ROLE KIND) or (remove ROLE)"
                )
            else:
                yield Cure(one.head, of)

    def test(self, form: Form) -> Test | None:
        if form.head in COMBINING:
            of = tuple(one for one in map(self.test, self.forms(form, 1)) if one)
            if not of or (form.head == "not" and len(of) != 1):
                self.say(form, f"{form.head} needs {'one test' if form.head == 'not' else 'tests'}")
                return None
            return Test(form.head, of)
        if form.head not in TESTS:
            self.say(form, f"unknown test {form.head!r}: the tests are {', '.join((*TESTS, *sorted(COMBINING)))}")
            return None
        if len(form) != 1 + TESTS[form.head] or not all(isinstance(one, Atom) for one in form):
            self.say(form, f"{form.head} takes {TESTS[form.head]} net name{'' if TESTS[form.head] == 1 else 's'}")
            return None
        return Test(form.head, tuple(map(str, form[1:])))

    def word(self, form: Form, place: int, what: str) -> str | None:
        if len(form) > place and isinstance(form[place], Atom):
            return str(form[place])
        self.say(form, f"expected {what} in ({form.head} ...)")
        return None

    def pair(self, form: Form) -> tuple[str, str] | None:
        if len(form) == 3 and all(isinstance(one, Atom) for one in form):
            if form[1] != form[2] or form.head == "across":
                return str(form[1]), str(form[2])
            self.say(form, "both ends are the same net")
            return None
        self.say(form, f"expected ({form.head} NET NET)")
        return None

    def texts(self, form: Form) -> tuple[str, ...]:
        if len(form) < 2 or not all(isinstance(one, str) and not isinstance(one, Atom) for one in form[1:]):
            self.say(form, f'expected ({form.head} "text" ...)')
        return tuple(str(one) for one in form[1:])

    def forms(self, form: Form, start: int) -> list[Form]:
        for one in form[start:]:
            if not isinstance(one, Form):
                self.say(form, f"expected something in parentheses, not {one!s}")
        return [one for one in form[start:] if isinstance(one, Form)]

    def number(self, form: Form, place: int) -> int | None:
        text = str(form[place]) if len(form) > place else ""
        if text == "many":
            return MANY
        if text.isascii() and text.isdigit() and len(text) < 6:
            return int(text)
        self.say(form, f"expected a whole number or many in ({form.head} ...)")
        return None

    def counts(self, form: Form) -> tuple[int, int]:
        least, most = self.number(form, 1), self.number(form, 2)
        if least is None or most is None:
            return 0, MANY
        if least > most or most == 0:
            self.say(form, f"the least count, {least}, is above the most, {most}" if most else "a count of nothing")
            return 0, MANY
        return least, most
