"""Every transistor of every limiter turned every way it can be drawn: named, with exactly the change that undoes it.

Of each circuit of fixtures/circuits one pass device, driver, shunt or latching transistor at a time has two pins exchanged,
all three pins shifted round, or the other polarity; a shunt both at once, too. Two pins exchanged is a slip at the
schematic; all three is what a symbol or footprint of another package does.
"""

from __future__ import annotations

import tomllib
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from itertools import permutations
from pathlib import Path

import pytest

from protlint.board.graph import Board
from protlint.netlist import read_netlist
from protlint.netlist.model import Netlist
from protlint.topology.limiter import FaultMatch, Found
from tests.support import edits
from tests.support.paths import FIXTURES
from tests.topology.test_faults import found_on

PINS = {
    "npn": ("collector", "base", "emitter"), "nmos": ("drain", "gate", "source"), "thyristor": ("anode", "gate", "cathode"),
}  # fmt: skip
ALIKE = {
    "pnp": "npn", "npn-darlington": "npn", "pnp-darlington": "npn", "pmos": "nmos",
}  # fmt: skip
ONE_OF_ITS_KIND = ("thyristor",)
"""What has no other polarity."""

Stands = tuple[str, tuple[str, ...]]
"""How a transistor stands: its kind, and the nets of its pins."""

LEAST_RIGHT = 0.99
"""The share of all that is found with exactly the cure that undoes it, and nothing else said."""

LEAST_RIGHT_SHUNT = 1.0
"""The same of shunts alone."""


@dataclass(frozen=True, eq=False)
class Slip:
    circuit: str
    role: str
    part: str
    how: str
    drawn: Netlist
    sound: Stands


def stands(board: Board, part: str) -> Stands:
    one = board.part_of[part]
    return one.kind, tuple(board.nets[one.roles[pin]].name for pin in pins_of(one.kind))


def pins_of(kind: str) -> tuple[str, ...]:
    return PINS[ALIKE.get(kind, kind)]


@cache
def slips() -> tuple[Slip, ...]:
    return tuple(one for path in sorted((FIXTURES / "circuits").glob("*.edf")) for one in _slips_of(path))


def _slips_of(path: Path) -> Iterator[Slip]:
    wanted = tomllib.loads(path.with_suffix(".toml").read_text(encoding="utf-8"))["limiter"]
    netlist = read_netlist(path)
    board, _ = found_on(netlist)
    roles = {role: parts for role, parts in wanted[0]["roles"].items() if role in ("pass", "driver", "shunt", "others")}
    for role, parts in roles.items() if len(wanted) == 1 else ():
        for part in parts:
            kind = board.part_of[part].kind
            if ALIKE.get(kind, kind) not in PINS:
                continue
            pins, sound = pins_of(kind), stands(board, part)
            for order in permutations(range(3)):
                drawn = netlist
                for pin, place in zip(pins, order, strict=True):
                    drawn = edits.moved(drawn, part, pin, sound[1][place])
                turned = sum(place != index for index, place in enumerate(order))
                if turned:
                    yield Slip(path.stem, role, part, f"{turned} pins", drawn, sound)
                if kind not in ONE_OF_ITS_KIND and (role == "shunt" or not turned):
                    other = edits.other_polarity(drawn, part)
                    yield Slip(path.stem, role, part, f"polarity, {turned} pins" if turned else "polarity", other, sound)


def undone(board: Board, fault: FaultMatch, part: str) -> Stands:
    """Return how a transistor stands once a fault's cure is applied."""
    one = board.part_of[part]
    kind, roles = one.kind, {pin: board.nets[net].name for pin, net in one.roles.items()}
    for (first, pin), (second, other) in fault.exchange:
        if first == second == part:
            roles[pin], roles[other] = roles[other], roles[pin]
    for (moved, pin), net in fault.moves:
        if moved == part:
            roles[pin] = board.nets[net].name
    kind = next((new for replaced, new in fault.replaces if replaced == part), kind)
    return kind, tuple(roles[pin] for pin in pins_of(kind))


@cache
def answer(slip: Slip) -> str:
    """Return what is said of a slip: ``right``, ``named otherwise``, ``still a limiter`` or ``nothing``."""
    board, found = found_on(slip.drawn)
    if any(fault.turned == slip.part and undone(board, fault, slip.part) == slip.sound for fault in found.faults):
        return "right" if len(found.faults) == 1 else "named otherwise"
    return "named otherwise" if found.faults else "still a limiter" if found.limiters else "nothing"


def table(heading: str, between: str, said: Counter[tuple[str, str, str]], total: Mapping[str, int]) -> list[str]:
    """Return the lines of a table: how often each answer was given to what was done, and together."""
    lines = [f"{heading:<34}" + "".join(f"{one:>17}" for one in total)]
    for which, how in sorted({(which, how) for which, how, _ in said}):
        lines.append(f"{which + between + how:<34}" + "".join(f"{said[which, how, one] or '-':>17}" for one in total))
    return [*lines, f"{'together':<34}" + "".join(f"{number:>17}" for number in total.values())]


def test_the_table_of_transistors_turned_round(show: Callable[[Sequence[str]], None]) -> None:
    """Print what is said of every slip, by the transistor's role and by what was done to it."""
    said = Counter((slip.role, slip.how, answer(slip)) for slip in slips())
    answers = ("right", "named otherwise", "still a limiter", "nothing")
    total = {one: sum(number for (_, _, what), number in said.items() if what == one) for one in answers}
    show(table("turned round", ": ", said, total))
    assert total["nothing"] == 0
    assert total["right"] >= LEAST_RIGHT * sum(total.values())
    shunts = [answer(slip) for slip in slips() if slip.role == "shunt"]
    assert shunts.count("right") >= LEAST_RIGHT_SHUNT * len(shunts)


def the_only_one(circuit: str, part: str, *pairs: tuple[str, str], other: bool = False) -> tuple[FaultMatch, Found]:
    netlist = read_netlist(FIXTURES / "circuits" / f"{circuit}.edf")
    for one, two in pairs:
        netlist = edits.exchanged(netlist, (part, one), (part, two))
    _, found = found_on(edits.other_polarity(netlist, part) if other else netlist)
    (fault,) = found.faults
    return fault, found


@pytest.mark.parametrize(
    "circuit, part, pairs, other, name",
    [
        ("sink-npn", "Q2", [("collector", "emitter")], False, "collector-emitter-swapped"),
        ("follower-pnp", "Q2", [("base", "emitter")], False, "base-emitter-swapped"),
        ("sink-npn", "Q2", [("collector", "base")], False, "collector-not-on-the-drive"),
        ("sink-npn", "Q2", [("collector", "base"), ("base", "emitter")], False, "shunt-pins-exchanged"),
        ("sink-npn", "Q2", [("collector", "emitter")], True, "shunt-polarity-wrong"),
        ("latched-thyristor", "T1", [("anode", "cathode")], False, "shunt-pins-exchanged"),
        ("latched-pair-pnp", "Q3", [("base", "emitter")], False, "shunt-pins-exchanged"),
        ("latched-pair-npn", "Q3", [], True, "shunt-polarity-wrong"),
        ("latched-pair-pnp", "Q3", [], True, "shunt-polarity-wrong"),
        ("mosfet-low-side", "M1", [("drain", "source")], False, "pass-pins-exchanged"),
        ("sink-npn", "Q1", [], True, "pass-polarity-wrong"),
    ],
)
def test_each_way_has_its_name(circuit: str, part: str, pairs: list[tuple[str, str]], other: bool, name: str) -> None:
    fault, _ = the_only_one(circuit, part, *pairs, other=other)
    assert (fault.fault, fault.turned) == (name, part)
    assert part in fault.says


def test_a_turned_device_beside_others_leaves_their_limiter() -> None:
    fault, found = the_only_one("parallel-common-sense", "Q1", ("collector", "emitter"))
    (limiter,) = found.limiters
    assert fault.beside
    assert "Q1" not in limiter.roles["pass"]
    assert "Q1" in fault.group.roles["pass"]


CORE = ("drive", "take", "load", "near", "far", "tap")
"""The nets of a rule between which a shunt's pin may be mistaken."""

LEAST_MOVED = 0.87
"""The share of single pins moved to a neighbouring net that is told as a wiring fault. Most of the
rest leave a limiter (the base straight on the sense resistor) or make a mirror: base and collector together on the drive,
with no stop left hanging."""


def moved_shunts() -> Iterator[tuple[str, str, Netlist, str, Stands]]:
    """Yield (pin, where to, netlist, shunt, as it stood) for each pin of each shunt on each other net of its limiter."""
    for path in sorted((FIXTURES / "circuits").glob("*.edf")):
        netlist = read_netlist(path)
        board, found = found_on(netlist)
        limiter = found.limiters[0]
        nets = {name: board.nets[limiter.bound[name]].name for name in CORE if name in limiter.bound}
        part = limiter.roles["shunt"][0]
        kind = board.part_of[part].kind
        if len(found.limiters) > 1 or ALIKE.get(kind, kind) not in PINS:
            continue
        sound = stands(board, part)
        for pin, here in zip(pins_of(kind), sound[1], strict=True):
            for where, net in {net: name for name, net in reversed(nets.items()) if net != here}.items():
                yield pin, net, edits.moved(netlist, part, pin, where), part, sound


def test_the_table_of_single_pins_moved(show: Callable[[Sequence[str]], None]) -> None:
    """Print what is said where one pin of a shunt is on another net of its limiter.

    Where the netlist has a resistor on either side of which the pin may belong, the other side is a fault told, and sound.
    """
    said: Counter[tuple[str, str, str]] = Counter()
    answers = ("undone", "a fault", "still a limiter", "nothing")
    for pin, where, drawn, part, sound in moved_shunts():
        board, found = found_on(drawn)
        told = "still a limiter" if found.limiters else "nothing"
        if found.faults:
            told = "undone" if [undone(board, one, part) for one in found.faults] == [sound] else "a fault"
        said[pin, where, told] += 1
    total = {one: sum(number for (_, _, what), number in said.items() if what == one) for one in answers}
    show(table("moved, to", " to ", said, total))
    assert total["undone"] + total["a fault"] >= LEAST_MOVED * sum(total.values())
    for pin, where, told in said:
        assert told != "nothing" or pin == "base" or (pin, where) == ("emitter", "drive"), (pin, where)


@pytest.mark.parametrize(
    "pin, net, name, words",
    [
        ("emitter", "BS", "shunt-pin-misplaced", "base and emitter of Q2 are both on BS: it never turns on"),
        ("emitter", "BASE", "shunt-pin-misplaced", "collector and emitter of Q2 are both on BASE: it takes no drive away"),
        ("emitter", "OUT", "shunt-pin-misplaced", "not on GND, the far end of R2"),
        ("base", "BASE", "shunt-pin-misplaced", "both on BASE: it is a diode from the drive to GND"),
        ("base", "OUT", "shunt-pin-misplaced", "not on the near end of R2"),
        ("base", "GND", "base-on-far-end", "base and emitter of Q2 are both on GND: it never turns on"),
        ("collector", "GND", "collector-not-on-the-drive", "collector and emitter of Q2 are both on GND"),
        ("collector", "SNS", "collector-not-on-the-drive", "not on the drive of Q1: it takes no drive away"),
        ("collector", "BS", "collector-not-on-the-drive", "it is a diode, and takes no drive away"),
    ],
)
def test_each_pin_astray_is_told_by_what_it_does_there(pin: str, net: str, name: str, words: str) -> None:
    netlist = read_netlist(FIXTURES / "circuits" / "sink-npn.edf")
    board, _ = found_on(netlist)
    belongs = board.nets[board.part_of["Q2"].roles[pin]].name
    board, found = found_on(edits.moved(netlist, "Q2", pin, net))
    (fault,) = found.faults
    assert fault.fault == name
    assert words in fault.says
    assert [(one, board.nets[to].name) for one, to in fault.moves] == [(("Q2", pin), belongs)]
