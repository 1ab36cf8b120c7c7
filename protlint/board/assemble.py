"""Identified parts to a board: nets united across links, banks and chains merged, elements listed by net."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence, Set

from protlint.board.drives import stated_drives
from protlint.board.graph import Board, BoardNet, BoardPart, Element, SeenPart, Supply
from protlint.board.merge import Resistance, merge_resistances, parts_of, unite
from protlint.limits import Limits
from protlint.netlist.model import Netlist, Part


def assemble(
    netlist: Netlist,
    seen: Sequence[SeenPart],
    *,
    limits: Limits,
    supply_of: Callable[[Sequence[str], Limits], Supply | None],
) -> Board:
    """Return the board of a netlist whose parts are identified: ``seen`` stands in the order of ``netlist.parts``.

    A link is a part of kind ``link`` or a resistor of 0 ohm that is fitted; the nets on its pins become one. A pin that
    the file joins to two nets makes one node of them, as the EDIF standard has it, unless both are supplies.
    """
    root, assumed = _united_nets(netlist, seen, limits, supply_of)
    order = {net: index for index, net in enumerate(sorted(set(root)))}
    index_of = [order[net] for net in root]
    parts = tuple(
        BoardPart(
            index, part, known.kind, known.kind_from, _roles(part, known, index_of), known.roles_from, known.part_number,
            known.values, known.entry, _sections(part, known, index_of) if known.sections else (),
        )
        for index, (part, known) in enumerate(zip(netlist.parts, seen, strict=True))
    )  # fmt: skip
    nets = _nets(netlist, parts, index_of, len(order), limits, supply_of)
    drives = stated_drives(parts, nets, index_of, limits)
    elements = _elements(parts, nets, drives.keys(), limits)
    at: list[list[tuple[int, str]]] = [[] for _ in nets]
    for element in elements:
        for role, net in element.terminals.items():
            at[net].append((element.index, role))
    return Board(netlist, parts, nets, elements, tuple(map(tuple, at)), tuple(assumed), tuple(index_of), drives)


def is_link(part: BoardPart | SeenPart) -> bool:
    """Tell whether a part joins its nets into one: a fitted link, or a fitted resistor of 0 ohm."""
    return part.values.fitted and (part.kind == "link" or (part.kind == "resistor" and part.values.value == 0.0))


def _united_nets(
    netlist: Netlist,
    seen: Sequence[SeenPart],
    limits: Limits,
    supply_of: Callable[[Sequence[str], Limits], Supply | None],
) -> tuple[list[int], list[str]]:
    """Return for each netlist net the first net it is one with, and what had to be assumed for that."""

    def voltage_V(net: int) -> float | None:
        supply = supply_of((netlist.nets[net].name,), limits)
        return None if supply is None else supply.voltage_V.usual

    assumed: list[str] = []
    joined: list[tuple[int, ...]] = []
    for twice in netlist.pins_on_two_nets:
        voltages_V = [voltage_V(net) for net in twice.nets]
        if None in voltages_V or voltages_V[0] == voltages_V[1]:
            joined.append(twice.nets)
        else:
            names = " and ".join(netlist.nets[net].name for net in twice.nets)
            whose = netlist.parts[twice.part].id
            assumed.append(f"pin {twice.pin} of {whose} is on two supplies, {names}; they are taken as apart")
    for part, known in zip(netlist.parts, seen, strict=True):
        if not is_link(known):
            continue
        nets = tuple(sorted({pin.net for pin in part.pins}))
        if len(nets) < 2:
            continue
        joined.append(nets)
        if len({voltage_V(net) for net in nets} - {None}) > 1:
            names = " and ".join(netlist.nets[net].name for net in nets if voltage_V(net) is not None)
            assumed.append(f"{part.id} joins supplies of different voltage, {names}; the first is taken to hold")
    return unite(len(netlist.nets), joined), assumed


def _roles(part: Part, known: SeenPart, index_of: Sequence[int]) -> dict[str, int]:
    """Return every terminal's net by role; a pin without a role, or a second net under one, goes by the pin's own name."""
    roles = {role: index_of[part.pins[positions[0]].net] for role, positions in known.roles.items()}
    if len(roles) == len(part.pins):  # one pin each, as nearly all parts have it
        return roles
    placed: set[int] = set()
    for role, positions in known.roles.items():
        for position in positions:
            net = index_of[part.pins[position].net]
            if roles.setdefault(role, net) == net:
                placed.add(position)
    for position, pin in enumerate(part.pins):
        if position in placed:
            continue
        net = index_of[pin.net]
        for name in (pin.name, f"{pin.name} (pin {pin.number or position + 1})"):
            if roles.setdefault(name, net) == net:
                break
    return roles


def _sections(part: Part, known: SeenPart, index_of: Sequence[int]) -> tuple[dict[str, int], ...]:
    return tuple(
        {role: index_of[part.pins[positions[0]].net] for role, positions in section.items()} for section in known.sections
    )


def _nets(
    netlist: Netlist,
    parts: Sequence[BoardPart],
    index_of: Sequence[int],
    count: int,
    limits: Limits,
    supply_of: Callable[[Sequence[str], Limits], Supply | None],
) -> tuple[BoardNet, ...]:
    names: list[dict[str, None]] = [{} for _ in range(count)]
    for net, index in zip(netlist.nets, index_of, strict=True):
        names[index][net.name] = None
    pins: list[list[tuple[int, str]]] = [[] for _ in range(count)]
    for part in parts:
        for role, index in part.roles.items():
            pins[index].append((part.index, role))
    nets = []
    for index, of_net in enumerate(map(tuple, names)):
        if len(of_net) > 1:
            of_net = tuple(sorted(of_net, key=lambda name: supply_of((name,), limits) is None))
        nets.append(BoardNet(index, of_net, tuple(pins[index]), supply_of(of_net, limits)))
    return tuple(nets)


def _elements(parts: Sequence[BoardPart], nets: Sequence[BoardNet], driven: Set[int], limits: Limits) -> tuple[Element, ...]:
    """Return the elements in the board order of their first part."""
    made: list[tuple[int, str, Mapping[str, int], float | None, object]] = []
    resistances = []
    for part in parts:
        if not part.values.fitted or is_link(part):
            continue
        if _is_plain_resistor(part):
            ends = part.roles["1"], part.roles["2"]
            resistances.append(Resistance(ends, part.values.value, part.index, part.index))
        else:
            for roles in part.sections or (part.roles,):
                made.append((part.index, part.kind, roles, part.values.value, part.index))
    for one in merge_resistances(resistances, _passable(parts, nets, driven, limits)):
        made.append((one.first, "resistor", {"1": one.ends[0], "2": one.ends[1]}, one.value, one.tree))
    made.sort(key=lambda one: one[0])
    return tuple(
        Element(index, kind, terminals, parts_of(tree), value, tree)
        for index, (_, kind, terminals, value, tree) in enumerate(made)
    )


ENDS = frozenset({"1", "2"})
"""The roles of a resistor's terminals."""


def _is_plain_resistor(part: BoardPart) -> bool:
    return part.kind == "resistor" and part.roles.keys() == ENDS


def _passable(parts: Sequence[BoardPart], nets: Sequence[BoardNet], driven: Set[int], limits: Limits) -> list[bool]:
    """Tell by net whether a chain of resistors may run through it.

    It may not where the net is held, where the limits file speaks of it, or where anything but a resistor hangs on it. A
    test point, a link and a part that is not fitted take no current: they do not count.
    """
    free = [_is_plain_resistor(part) or _takes_no_current(part) for part in parts]
    return [
        net.supply is None
        and net.index not in driven
        and all(free[part] for part, _ in net.pins)
        and limits.limiters.keys().isdisjoint(net.names)
        for net in nets
    ]


_TEST_POINT = re.compile(r"(?i)(?:.*/)?(?:TP|TEST)[-_]?[0-9]+[A-Z]?$|.*test[ _-]?(?:point|pad)")


def _takes_no_current(part: BoardPart) -> bool:
    if not part.values.fitted or is_link(part):
        return True
    one_pin = len(part.part.pins) == 1 and part.kind in ("connector", "unknown")
    return one_pin and any(_TEST_POINT.match(name) for name in (part.id, part.part.cell))
