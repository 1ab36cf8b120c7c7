"""The words of the rule language and what a rule is once it is read."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

from protlint.netlist.forms import Form
from protlint.topology.limiter import ROLES

BIPOLAR = frozenset({"collector", "base", "emitter"})
FIELD = frozenset({"drain", "gate", "source"})
PINS: Mapping[str, frozenset[str]] = {
    "npn": BIPOLAR, "pnp": BIPOLAR, "npn-darlington": BIPOLAR, "pnp-darlington": BIPOLAR, "nmos": FIELD, "pmos": FIELD,
    "thyristor": frozenset({"anode", "cathode", "gate"}), "diode": frozenset({"anode", "cathode"}),
    "zener": frozenset({"anode", "cathode"}), "resistor": frozenset({"1", "2"}), "capacitor": frozenset({"1", "2"}),
    "inductor": frozenset({"1", "2"}), "fuse": frozenset({"1", "2"}),
}  # fmt: skip
"""The kinds a clause may ask for, and the pins each has."""

TWO_TERMINAL = frozenset(kind for kind, pins in PINS.items() if len(pins) == 2)
DIRECTED = frozenset({"diode", "zener"})
MIRROR = {
    "npn": "pnp", "pnp": "npn", "npn-darlington": "pnp-darlington", "pnp-darlington": "npn-darlington", "nmos": "pmos",
    "pmos": "nmos", "lowest": "highest", "highest": "lowest", "npn-follows": "pnp-follows", "pnp-follows": "npn-follows",
    "pulls-down": "pulls-up", "pulls-up": "pulls-down", "n-type": "p-type", "p-type": "n-type",
}  # fmt: skip
"""What ``mirrored`` swaps, besides the direction of ``along``."""

HEADS = frozenset(role.replace("_", "-") for role in ROLES)
"""What a role in a rule may begin with; after a dot it may say more (``preset.upper``)."""

MANY = 8
"""``many`` in a count: the most elements of a path, a bank or an unbranched chain counting as one."""

ANY = "any"
"""The net name that stands for whatever net there is."""

TESTS: Mapping[str, int] = {
    "ground": 1, "supply": 1, "lowest": 1, "highest": 1, "apart": 2, "same": 2, "no-input": 1, "inner": 1,
    "undriven": 1, "closed": 1, "held": 1, "leaves": 1, "nearer": 3, "pulled": 1, "read": 1, "twin": 2,
    "npn-follows": 1, "pnp-follows": 1, "pulls-down": 3, "pulls-up": 3, "regulator": 2, "n-type": 0, "p-type": 0,
}  # fmt: skip
"""Questions about nets, with the number of nets each takes; ``not``, ``or`` and ``and`` combine them."""

COMBINING = frozenset({"not", "or", "and"})


@dataclass(frozen=True, slots=True)
class Test:
    """A question about bound nets; ``of`` holds net names, or tests where the name combines."""

    name: str
    of: tuple[str, ...] | tuple[Test, ...]

    def nets(self) -> Iterator[str]:
        """Yield the net names it asks about."""
        for one in self.of:
            if isinstance(one, Test):
                yield from one.nets()
            else:
                yield one

    def renamed(self, names: Mapping[str, str]) -> Test:
        """Return the same question about nets of other names."""
        of = tuple(one.renamed(names) if isinstance(one, Test) else names.get(one, one) for one in self.of)
        return Test(self.name, of)  # type: ignore[arg-type]

    def mirrored(self) -> Test:
        """Return the question with its supplies swapped."""
        of = tuple(one.mirrored() if isinstance(one, Test) else one for one in self.of)
        return Test(MIRROR.get(self.name, self.name), of)  # type: ignore[arg-type]

    def __str__(self) -> str:
        return f"({' '.join((self.name, *map(str, self.of)))})"


@dataclass(frozen=True, slots=True)
class Clause:
    """One thing a rule asks for: a part by its pins, a two-terminal part by its ends, or a path of such parts.

    ``pins`` pairs a pin with a net name; ``ends`` names the two nets of ``across``, ``along`` or ``path``. ``count`` is None
    for a single element and the least and most elements of a path otherwise. ``under_ohm`` bounds a resistance, ``place``
    says where a part stands, ``when`` holds tests on this clause's own nets, and ``until_driven`` makes a path go on through
    nets that hold nothing but resistors and capacitors.
    """

    role: str
    kinds: tuple[str, ...]
    form: Form = field(compare=False, repr=False)
    pins: tuple[tuple[str, str], ...] = ()
    ends: tuple[str, str] | None = None
    along: bool = False
    count: tuple[int, int] | None = None
    under_ohm: float | None = None
    place: str | None = None
    when: tuple[Test, ...] = ()
    until_driven: bool = False
    _nets: tuple[str, ...] = field(init=False, compare=False, repr=False)

    def __post_init__(self) -> None:
        names = self.ends if self.ends is not None else [net for _, net in self.pins]
        object.__setattr__(self, "_nets", tuple([name for name in names if name != ANY]))

    def nets(self) -> tuple[str, ...]:
        """Return the net names it joins, ``any`` left out."""
        return self._nets

    def renamed(self, names: Mapping[str, str]) -> Clause:
        """Return the same clause joined to nets of other names."""
        ends = None if self.ends is None else (names.get(self.ends[0], self.ends[0]), names.get(self.ends[1], self.ends[1]))
        pins = tuple((pin, names.get(net, net)) for pin, net in self.pins)
        return replace(self, pins=pins, ends=ends, when=tuple(test.renamed(names) for test in self.when))

    def mirrored(self) -> Clause:
        """Return the clause of the other polarity."""
        kinds = tuple(MIRROR.get(kind, kind) for kind in self.kinds)
        ends = self.ends[::-1] if self.ends is not None and self.along else self.ends
        return replace(self, kinds=kinds, ends=ends, when=tuple(test.mirrored() for test in self.when))


@dataclass(frozen=True, slots=True)
class Each:
    """A group of clauses that may fit several times over, every time with nets and parts of its own."""

    least: int
    most: int
    clauses: tuple[Clause, ...]
    form: Form = field(compare=False, repr=False)

    def nets(self) -> tuple[str, ...]:
        """Return the net names its clauses join."""
        return tuple(dict.fromkeys(name for clause in self.clauses for name in clause.nets()))

    def renamed(self, names: Mapping[str, str]) -> Each:
        """Return the same group joined to nets of other names."""
        return replace(self, clauses=tuple(clause.renamed(names) for clause in self.clauses))

    def mirrored(self) -> Each:
        """Return the group of the other polarity."""
        return replace(self, clauses=tuple(clause.mirrored() for clause in self.clauses))


@dataclass(frozen=True, slots=True)
class ShapeUse:
    """A clause that asks for a shape: ``ports`` pairs the shape's port with a net name."""

    role: str
    shape: str
    ports: tuple[tuple[str, str], ...]
    form: Form = field(compare=False, repr=False)

    def nets(self) -> tuple[str, ...]:
        """Return the net names it joins."""
        return tuple(net for _, net in self.ports)

    def renamed(self, names: Mapping[str, str]) -> ShapeUse:
        """Return the same use joined to nets of other names."""
        return replace(self, ports=tuple((port, names.get(net, net)) for port, net in self.ports))


@dataclass(frozen=True, slots=True)
class Either:
    """Named alternatives, exactly one of which is taken."""

    branches: tuple[tuple[str, Body], ...]
    form: Form = field(compare=False, repr=False)


Item = Clause | Each | ShapeUse | Either


@dataclass(frozen=True, slots=True)
class Body:
    """What a rule, a branch or a shape's variant holds: what must be there, what may be, and tests."""

    items: tuple[Item, ...] = ()
    may: tuple[Clause | Each, ...] = ()
    where: tuple[Test, ...] = ()

    def __add__(self, other: Body) -> Body:
        return Body(self.items + other.items, self.may + other.may, self.where + other.where)


@dataclass(frozen=True, slots=True)
class Shape:
    """A reusable piece: its ports and its variants by name."""

    name: str
    ports: tuple[str, ...]
    variants: tuple[tuple[str, Body], ...]
    says: str
    file: str
    form: Form = field(compare=False, repr=False)


@dataclass(frozen=True, slots=True)
class Cure:
    """One change that makes a fault sound.

    ``exchange`` two connections, ``move`` one to a net, ``replace`` a part by one of another kind, ``part`` the ends of one
    that are on one net, ``turn`` what does not point from one net to the other in a string of diodes. A connection is
    ``role.pin`` or ``role.net``.
    """

    what: str
    of: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Rule:
    """A topology or a fault as its file has it, with nothing resolved yet.

    ``base`` is the rule it builds on or spoils and ``branches`` the either-branches it keeps of that; ``instead`` maps a
    role of the base to what stands in its place; ``bounds`` pairs a role with the ohms its resistance has to stay
    below; ``grounded`` holds the net names whose load lies between them and ground, with where that is said; ``nets`` maps
    a report net to (net name, tests) choices; ``cure`` lists alternatives, of which the first that finds its parts counts.
    """

    name: str
    fault: bool
    file: str
    form: Form = field(compare=False, repr=False)
    says: str = ""
    cited: tuple[str, ...] = ()
    used: str = ""
    drawing: tuple[str, ...] = ()
    mirrored: bool = False
    precedence: int = 0
    base: str | None = None
    branches: tuple[str, ...] = ()
    instead: tuple[tuple[str, tuple[Item, ...], Form], ...] = ()
    rejoined: tuple[Clause, ...] = ()
    joined: tuple[tuple[str, str], ...] = ()
    body: Body = Body()
    bounds: tuple[tuple[str, float], ...] = ()
    unites: tuple[tuple[str, str], ...] = ()
    grounded: tuple[tuple[str, Form], ...] = ()
    nets: tuple[tuple[str, tuple[tuple[str, tuple[Test, ...]], ...]], ...] = ()
    cure: tuple[tuple[Cure, ...], ...] = ()
