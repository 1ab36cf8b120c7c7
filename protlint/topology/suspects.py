"""Transistors that lie together as those of a limiter do, whichever way each of them stands, or but for one pin."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence, Set
from dataclasses import dataclass

from protlint.topology.index import CONTROLLED, CROWDED, FREE, Index
from protlint.topology.limiter import Limiter
from protlint.topology.terms import PINS

SENSE_OHM = 100.0
"""Sense resistors of limiters are smaller; common practice of the trade."""

STOPS = 2
"""The most resistances between the sense resistance and the shunt's base: the leg of a preset and the base stop."""

DRIVERS = 2
"""The most drivers before a pass device."""

CONTROL = {kind: next(pin for pin in ("base", "gate") if pin in PINS[kind]) for kind in CONTROLLED}
"""The pin that controls a kind."""

LEAD = {
    kind: next(
        pair for pair in (("emitter", "collector"), ("source", "drain"), ("cathode", "anode")) if pair[0] in PINS[kind]
    )
    for kind in CONTROLLED
}
"""The pin of a shunt of each kind that is on the far end, and the one that is on the drive."""

RESISTOR = frozenset({"resistor"})
HANGING = frozenset({"resistor", "capacitor"})
"""What lies between the sense resistance and a shunt's base."""

STRING = 4
"""The most diodes in a row that are taken for a shunt."""


@dataclass(frozen=True, slots=True)
class Group:
    """Elements of which one may stand turned round: ``core`` are those to try, ``shunts`` what the limiter's shunt is.

    Where the shunt itself is to be tried, its lead belongs on the net ``far`` and its control on one of ``taps``.
    ``beside`` are what they stand with: a pass device, or, ``in_limiter``, a sound limiter that lacks only one of the core.
    Where there are ``moves``, the shunt stands as it should but for one pin, which belongs on one of these nets.
    """

    core: tuple[int, ...]
    shunts: frozenset[int]
    beside: tuple[int, ...]
    in_limiter: bool = False
    far: int | None = None
    taps: frozenset[int] = frozenset()
    moves: tuple[tuple[str, int], ...] = ()


def suspected_groups(index: Index, limiters: Sequence[Limiter]) -> Iterator[Group]:
    """Yield the groups of transistors, none of them in a sound limiter, that lie as those of a limiter do.

    All but the one to try stand as they should.
    """
    taken = {element for one in limiters for elements in one.elements.values() for element in elements}
    seen = set()
    for near, far in _sense_resistors(index):
        carriers = _carriers(index, near, taken)
        taps = _onward(index, (near,), STOPS, RESISTOR, far) if carriers else {}
        found = list(_shunts(index, taps, far, taken))
        for carrier, is_right in carriers if found or _has_diodes(index, far) else ():
            apart = [(shunt, takes) for shunt, takes in found if shunt != carrier]
            for core, shunts in _turned_apart(index, far, near, carrier, is_right, apart, taken | {carrier}):
                if (core, shunts, carrier) not in seen:
                    seen.add((core, shunts, carrier))
                    of_shunt = core == shunts
                    yield Group(
                        core,
                        frozenset(shunts),
                        (carrier,),
                        far=far if of_shunt else None,
                        taps=frozenset(taps) if of_shunt else frozenset(),
                    )
        for carrier in (one for one, is_right in carriers if is_right):
            for shunt, moves in _with_a_pin_astray(index, taps, far, carrier, taken | {carrier}):
                if moves:
                    yield Group((shunt,), frozenset({shunt}), (carrier,), moves=moves)
    for limiter in limiters:
        yield from _beside(index, limiter, taken)


def _sense_resistors(index: Index) -> Iterator[tuple[int, int]]:
    """Yield the ends of every resistor that may be a sense resistance, the near one first; most have two near ends."""
    for resistor in index.by_kind.get("resistor", ()):
        ends = index.ends(resistor)
        if ends is not None and ends[0] != ends[1] and _is_small(index, resistor):
            yield from (pair for pair in (ends, (ends[1], ends[0])) if index.flag[pair[0]] == FREE)


def _is_small(index: Index, resistor: int) -> bool:
    value = index.board.elements[resistor].value
    return value is None or 0.0 < value < SENSE_OHM


def _carriers(index: Index, near: int, taken: Set[int]) -> list[tuple[int, bool]]:
    """Return the transistors whose current may go through a sense resistance, and whether they stand right for that: with
    another pin than their base at its near end, or behind a small resistor of their own."""
    small = (one for one in index.on_net(near, ("resistor",)) if _is_small(index, one))
    leads = dict.fromkeys(
        (near, *(net for one in small for net in index.terminals[one].values() if index.flag[net] == FREE))
    )
    found = {one: index.terminals[one] for net in leads for one in _free(index, net, taken)}
    return [
        (one, any(net in leads and pin != CONTROL[index.kind[one]] for pin, net in pins.items()))
        for one, pins in found.items()
    ]


def _turned_apart(
    index: Index,
    far: int,
    near: int,
    carrier: int,
    is_right: bool,
    shunts: Sequence[tuple[int, Set[int]]],
    taken: Set[int],
) -> Iterator[tuple[tuple[int, ...], tuple[int, ...]]]:
    """Yield which elements to try (one or several), and the shunt, for one pass device at one sense resistance."""
    rows_end = _has_diodes(index, far)
    if not shunts and not rows_end:
        return
    pins = index.terminals[carrier]
    drives = _drives(index, [pins[CONTROL[index.kind[carrier]]]], {carrier})
    any_drives: set[int] = set()
    beyond: dict[int, set[int]] = {}
    if rows_end or any(takes for _, takes in shunts):  # else the shunt itself is what stands wrong
        any_drives = _drives(index, [net for net in pins.values() if net != near], {carrier})
        beyond = _beyond_drivers(index, drives, taken) if is_right else {}
    for shunt, takes in shunts:
        all_pins = set(index.terminals[shunt].values())
        if is_right and not drives.isdisjoint(_takes(index, all_pins - {far})):
            yield (shunt,), (shunt,)
        yield from (((one,), (shunt,)) for one in _carrier_or_driver(carrier, takes, any_drives, beyond) if one != shunt)
        if is_right and not drives.isdisjoint(takes):
            own = all_pins | drives
            others = dict.fromkeys(one for net in all_pins for one in _free(index, net, taken) if one != shunt)
            yield from (((one,), (shunt,)) for one in others if len(own & set(index.terminals[one].values())) > 1)
    if not rows_end:
        return
    for drive in sorted(any_drives.union(*beyond.values())):
        for row in _rows(index, drive, far):
            yield from (((one,), row) for one in _carrier_or_driver(carrier, {drive}, any_drives, beyond))


def _carrier_or_driver(carrier: int, takes: Set[int], any_drives: Set[int], beyond: Mapping[int, Set[int]]) -> Iterator[int]:
    """Yield the pass device and the drivers of which one, turned, would be driven from where a shunt takes the drive."""
    if not takes.isdisjoint(any_drives):
        yield carrier
    yield from (driver for driver, nets in beyond.items() if not takes.isdisjoint(nets))


def _shunts(index: Index, taps: Iterable[int], far: int, taken: Set[int]) -> Iterator[tuple[int, Set[int]]]:
    """Yield the transistors that may be the shunt across a sense resistance, with pins at its far end and on what leads to
    its near end, and the nets they take the drive from, as they stand: none where they stand wrong."""
    for tap in taps:
        for shunt in _free(index, tap, taken):
            pins, kind = index.terminals[shunt], index.kind[shunt]
            if far in pins.values():
                lead, take = LEAD[kind]
                stands = pins[lead] == far and pins[CONTROL[kind]] == tap
                yield shunt, _takes(index, {pins[take]}) if stands else set()


def _with_a_pin_astray(
    index: Index, taps: Iterable[int], far: int, carrier: int, taken: Set[int]
) -> Iterator[tuple[int, tuple[tuple[str, int], ...]]]:
    """Yield the transistors of which two pins stand as those of a pass device's shunt, with where the third may belong.

    The third is on another net of the limiter, or together with another pin: on any other net it makes a circuit of its own.
    A base has left a resistor hanging, or is straight on the load: else it makes a mirror, or a junction used as a diode. A
    collector that goes with other transistors' bases makes a mirror too.
    """
    pins = index.terminals[carrier]
    near = next(iter(taps))
    load = next((net for pin, net in pins.items() if pin != CONTROL[index.kind[carrier]] and net != near), near)
    taps = [net for net in taps if net != load]
    around = dict.fromkeys((*taps, *(net for net in (far, load, *pins.values()) if index.flag[net] == FREE)))
    astray: list[tuple[int, str]] = []
    for shunt in dict.fromkeys(one for net in around for one in _free(index, net, taken)):
        own, (lead, take) = index.terminals[shunt], LEAD[index.kind[shunt]]
        base, emitter, collector = own[CONTROL[index.kind[shunt]]], own[lead], own[take]
        if base in taps and emitter == far:
            if collector in (far, load) or (collector in taps and not _controls_others(index, collector, shunt)):
                astray.append((shunt, take))
        elif base in taps and (emitter in taps or emitter == load or emitter in _takes(index, {collector})):
            astray.append((shunt, lead))
        elif emitter == far and base not in taps and (base in (load, far) or base in _takes(index, {collector})):
            astray.append((shunt, CONTROL[index.kind[shunt]]))
    if not astray:
        return
    hanging = [net for net in taps if net != near and _hangs(index, net)]
    takes = _takes(index, _drives(index, [pins[CONTROL[index.kind[carrier]]]], {carrier}))
    for shunt, pin in astray:
        own, (lead, take) = index.terminals[shunt], LEAD[index.kind[shunt]]
        if pin == take:
            yield shunt, tuple((pin, net) for net in sorted(takes - {near, far, *own.values()}))
        elif own[take] in takes:
            bases = hanging or ([near] if own[pin] == load else [])
            yield shunt, ((pin, far),) if pin == lead else tuple((pin, net) for net in bases)


def _controls_others(index: Index, net: int, but: int) -> bool:
    """Tell whether a net is on the control of another transistor, as that of a mirror's input is."""
    return any(one != but and pin in CONTROL.values() for one, pin in index.at[net])


def _hangs(index: Index, net: int) -> bool:
    """Tell whether a net is as a shunt's base leaves it: nothing there but passives, and perhaps a latch's collector."""
    return all(index.kind[one] in HANGING or pin == "collector" for one, pin in index.at[net])


def _takes(index: Index, nets: Iterable[int]) -> set[int]:
    """Return some nets and those beyond a steering diode."""
    return set(_onward(index, sorted(net for net in nets if index.flag[net] == FREE), 1, frozenset({"diode"})))


def _has_diodes(index: Index, net: int) -> bool:
    """Tell whether a row of diodes may end on a net: a crowd on a supply is clamps and rectifiers."""
    return len(index.at[net]) <= CROWDED and any(index.kind[one] == "diode" for one, _ in index.at[net])


def _rows(index: Index, drive: int, far: int) -> Iterator[tuple[int, ...]]:
    """Yield the diodes in a row from a net to the far end, two or more, whichever way each of them points."""
    rows: list[tuple[int, tuple[int, ...]]] = [(drive, ())]
    while rows:
        net, row = rows.pop()
        for diode in index.on_net(net, ("diode",)) if len(row) < STRING else ():
            other = next((one for one in index.terminals[diode].values() if one != net), net)
            if other == far and row and diode not in row:
                yield (*row, diode)
            elif index.flag[other] == FREE and diode not in row:
                rows.append((other, (*row, diode)))


def _drives(index: Index, controls: Iterable[int], but: Set[int]) -> set[int]:
    """Return the nets from which a control is driven: itself, through a stop, through drivers that stand right."""
    found = set(_through(index, [net for net in controls if index.flag[net] == FREE], 1))
    edge = set(found)
    for _ in range(DRIVERS):
        driven = {one for net in edge for one in _free(index, net, but)}
        bases = {index.terminals[one][CONTROL[index.kind[one]]] for one in driven} - found
        edge = set(_through(index, [net for net in bases if index.flag[net] == FREE], 1)) - found
        found |= edge
    return found


def _beyond_drivers(index: Index, drives: Set[int], taken: Set[int]) -> dict[int, set[int]]:
    """Return the transistors that may be drivers, and from where each is driven whichever pin its base is."""
    drivers = dict.fromkeys(one for net in sorted(drives) for one in _free(index, net, taken))
    return {one: _drives(index, index.terminals[one].values(), {*taken, one}) for one in drivers}


def _beside(index: Index, limiter: Limiter, taken: Set[int]) -> Iterator[Group]:
    """Yield the transistors whose every net is a sound limiter's, or one resistor on from it: they may belong to it."""
    elements = tuple(one for ones in limiter.elements.values() for one in ones)
    own = {net for one in elements for net in index.terminals[one].values() if index.flag[net] == FREE}
    reached = _through(index, sorted(own), 1)
    for one in sorted({one for net in reached for one in _free(index, net, taken)}):
        nets = {net for net in index.terminals[one].values() if index.flag[net] == FREE}
        if len(nets) > 1 and nets <= reached.keys():
            yield Group((one,), frozenset(limiter.elements["shunt"]), elements, in_limiter=True)


def _free(index: Index, net: int, taken: Set[int]) -> list[int]:
    """Return the transistors on a net that belong to no limiter and have all their pins."""
    return [one for one in index.transistors(net) if one not in taken]


def _through(index: Index, nets: Iterable[int], steps: int) -> dict[int, None]:
    """Return some nets and those that so many resistors lead to from them, past no supply."""
    return _onward(index, nets, steps, RESISTOR)


def _onward(index: Index, nets: Iterable[int], steps: int, kinds: Set[str], past: int | None = None) -> dict[int, None]:
    """Return some nets and those that so many parts of these kinds lead to from them, past no supply, no crowd and not
    the net ``past``."""
    found = dict.fromkeys(nets)
    edge = list(found)
    for _ in range(steps):
        leading = [element for net in edge for element, _ in index.at[net] if index.kind[element] in kinds]
        onward = (net for element in leading for net in index.terminals[element].values())
        edge = [net for net in dict.fromkeys(onward) if net not in found and net != past and index.flag[net] == FREE]
        found.update(dict.fromkeys(edge))
    return found
