"""The edges of a bench: which nets are held, what a short ties the output to, and what drives the stage.

Every function writes what it assumed, what it lacks and what holds each net into the bench's :class:`Notes`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

from protlint.board.graph import Board
from protlint.board.regulators import regulator_across
from protlint.limits import DriveLimits, LimiterLimits, Limits, Range, driver_of
from protlint.solve.circuit import FEED, Drive
from protlint.solve.surroundings import Surroundings, sources_current
from protlint.toml.text import toml_key
from protlint.topology.limiter import Limiter


@dataclass(frozen=True, slots=True)
class Missing:
    """Something a bench lacks, and the key that would supply it.

    ``subject`` is ``supply``, ``short``, ``drive``, ``value``, ``part`` or ``circuit``; ``part`` is the part it is about,
    ``net`` the net whose line in ``[supply]`` or whose ``[drive]`` table is asked for.
    """

    subject: str
    part: str | None
    needs: str
    net: str | None = None


@dataclass(slots=True)
class Notes:
    """What a bench says of itself as it comes together: ``assumed`` holds (subject, sentence) pairs, ``unread`` the ids of
    capacitors and inductors whose value cannot be read."""

    assumed: list[tuple[str, str]] = field(default_factory=list)
    missing: list[Missing] = field(default_factory=list)
    words: dict[str, str] = field(default_factory=dict)
    unread: list[str] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class Place:
    """One limiter on its board with its surroundings: what every function here is given."""

    board: Board
    limiter: Limiter
    around: Surroundings
    limits: Limits
    needs: LimiterLimits

    @property
    def node_of(self) -> Sequence[str]:
        """The node that stands for each net of the board: the nets' own names."""
        return self.board.net_names

    def usual_V(self, net: int) -> float | None:
        """Return a net's usual voltage where it is a supply."""
        supply = self.board.nets[net].supply
        return None if supply is None else supply.voltage_V.usual

    @property
    def sources_current(self) -> bool:
        """Tell whether the load current flows out of the output (else into it)."""
        return sources_current(self.limiter)


def hold_supplies(place: Place, notes: Notes) -> dict[str, Range]:
    """Return every supply on the bench by node, the board's ground always among them."""
    board, held = place.board, dict[str, Range]()
    nets = {net for index in place.around.elements for net in board.elements[index].terminals.values()}
    ground = ground_net(board)
    for net in sorted(nets | ({ground} if ground is not None else set())):
        if board.nets[net].supply is not None:
            _hold(place, net, held, notes)
    if power_V(place) is None:
        name = board.nets[_unnamed_supply(place)].name
        notes.missing.append(Missing("supply", None, f"[supply] {toml_key(name)}", net=name))
    return held


def _unnamed_supply(place: Place) -> int:
    """Return which net to ask a supply's voltage of, where neither side of the limiter is known as one.

    That is the power side, as the limiter was read; but where a diode would tie its voltage to ground, the limiter stands
    the other way round: the raw supply is where its output was taken to be.
    """
    board, power = place.board, place.around.power
    on_power, on_ground = ("anode", "cathode") if place.sources_current else ("cathode", "anode")
    for index, role in board.elements_at[power]:
        element = board.elements[index]
        if element.kind == "diode" and role == on_power and place.usual_V(element.terminals[on_ground]) == 0.0:
            return place.around.output
    return power


def _hold(place: Place, net: int, held: dict[str, Range], notes: Notes) -> str:
    supply = place.board.nets[net].supply
    assert supply is not None
    node = place.node_of[net]
    if node not in held:
        held[node] = supply.voltage_V
        notes.words[node] = f"held at {supply.voltage_V.usual:g} V (by {supply.known_from})"
        if supply.known_from == "assumed":
            notes.assumed.append(("supply", f"{node} is taken as {supply.voltage_V.usual:g} V"))
    return node


def _hold_elsewhere(place: Place, name: str, held: dict[str, Range], notes: Notes) -> str:
    """Hold a supply that the limits file names and no net of this board carries: the load hangs on it elsewhere."""
    held[name] = place.limits.supplies_V[name]
    notes.words[name] = f"held at {held[name].usual:g} V (by limits file); on no net of this board"
    return name


def ground_net(board: Board) -> int | None:
    """Return the 0 V net with the most pins, or None where the board has none."""
    grounds = [(-len(net.pins), net.index) for net in board.supplies if net.supply and net.supply.voltage_V.usual == 0.0]
    return min(grounds)[1] if grounds else None


def power_V(place: Place) -> float | None:
    """Return the voltage the load current comes from: the power side's own, or that behind its series parts."""
    direct = place.usual_V(place.around.power)
    if direct is not None:
        return direct
    for index in place.around.power_path:
        for net in place.board.elements[index].terminals.values():
            voltage_V = place.usual_V(net)
            if voltage_V is not None:
                return voltage_V
    return None


def short_nodes(place: Place, held: dict[str, Range], notes: Notes) -> tuple[str, ...]:
    """Return the nodes a short may tie the output to; they join ``held``.

    The limits file decides. Else it is ground where the load current flows to or from ground, else the supply that a load
    on the board hangs on, else (assumed) the board's farthest supply on that side.
    """
    board, output = place.board, place.board.nets[place.around.output].name
    from_V = power_V(place)
    if from_V is None:
        return ()
    sign = 1.0 if place.sources_current else -1.0
    if place.needs.shorted_to:
        return _stated_shorts(place, held, notes, lambda short_V: sign * (from_V - short_V) > 0.0)
    if sign * from_V > 0.0:
        ground = ground_net(board)
        if ground is not None:
            return (_hold(place, ground, held, notes),)
        elsewhere = [name for name, voltage in place.limits.supplies_V.items() if voltage.usual == 0.0]
        if elsewhere:
            return (_hold_elsewhere(place, elsewhere[0], held, notes),)
        held["0 V"] = Range(0.0, 0.0, 0.0)
        notes.words["0 V"] = "ground; no net of the board is known as ground"
        notes.assumed.append(("short", f"a short ties {output} to 0 V; no net of the board is known as ground"))
        return ("0 V",)
    beyond = {
        net.index: abs(net.supply.voltage_V.usual - from_V)
        for net in board.supplies
        if net.supply and sign * (from_V - net.supply.voltage_V.usual) > 0.0
    }
    loaded = beyond.keys() & _nets_behind_loads(place)
    choice = loaded or beyond.keys()
    if not choice:
        notes.missing.append(Missing("short", None, f"[limiter.{toml_key(place.limiter.id)}] shorted_to"))
        return ()
    net = max(choice, key=lambda one: (beyond[one], -one))
    if not loaded:
        notes.assumed.append(("short", f"a short ties {output} to {board.nets[net].name}: no load of it is on the board"))
    return (_hold(place, net, held, notes),)


def _nets_behind_loads(place: Place) -> set[int]:
    """Return the nets that two-terminal parts outside the bench, one or a string of them, tie the output to."""
    board = place.board
    nets: set[int] = {place.around.output}
    waiting = [place.around.output]
    while waiting:
        for index, _ in board.elements_at[waiting.pop()]:
            terminals = set(board.elements[index].terminals.values())
            if index not in place.around.elements and len(terminals) == 2:
                waiting += sorted(net for net in terminals - nets if len(board.nets[net].pins) == 2)
                nets |= terminals
    return nets - {place.around.output}


def _stated_shorts(place: Place, held: dict[str, Range], notes: Notes, draws: Callable[[float], bool]) -> tuple[str, ...]:
    """Return the nodes of the supplies that ``shorted_to`` names; ``draws`` tells whether one at a voltage draws current."""
    nodes = []
    for name in place.needs.shorted_to:
        nets = [net.index for net in place.board.supplies if name in net.names]
        if nets:
            nodes.append(_hold(place, nets[0], held, notes))
        elif name in place.limits.supplies_V:
            nodes.append(_hold_elsewhere(place, name, held, notes))
        else:
            notes.missing.append(Missing("short", None, f"[supply] {toml_key(name)}, which shorted_to names"))
    drawing = tuple(node for node in nodes if draws(held[node].usual))
    if nodes and not drawing:
        where = " and ".join(f"{node} at {held[node].usual:g} V" for node in nodes)
        notes.missing.append(
            Missing("short", None, f"another shorted_to: {where} draws no current through {place.limiter.id}")
        )
    return drawing


def drive_of(place: Place, held: dict[str, Range], notes: Notes) -> tuple[Drive | None, int | None]:
    """Return the drive, and the supply net whose drive connections move to the drive's node.

    A drive that comes straight from a supply gets a node of its own, so that it can rise from its off end while the supply
    stays where it is.
    """
    around, board = place.around, place.board
    if not held:
        return None, None
    lowest_V, highest_V = min(one.usual for one in held.values()), max(one.usual for one in held.values())
    lowest, highest = Range(lowest_V, lowest_V, lowest_V), Range(highest_V, highest_V, highest_V)
    if around.drive is not None:
        regulator = regulator_across(board, around.drive, around.output)
        if regulator is not None:
            return _drawn_by(place, regulator, lowest, highest, notes), None
        return _driven(place, held, lowest, highest, notes), None
    if around.fed_by is not None:
        supply = board.nets[around.fed_by].supply
        assert supply is not None
        node = place.node_of[around.fed_by] + FEED
        notes.words[node] = f"feed from {board.nets[around.fed_by].name}: {supply.voltage_V.usual:g} V"
        fed_by, own = place.node_of[around.fed_by], place.limiter.nets["drive"]
        stated_on = None if own is None else place.node_of[own]
        upwards = place.limiter.polarity == "n"
        drive = Drive(
            node=node,
            low_V=lowest if upwards else supply.voltage_V,
            high_V=supply.voltage_V if upwards else highest,
            low_follows=None if upwards else fed_by,
            high_follows=fed_by if upwards else None,
            stated_on=stated_on,
        )
        return drive, around.fed_by
    feed = place.limiter.nets["feed"]
    net = place.limiter.nets["drive"] if feed is None or place.usual_V(feed) is not None else feed
    name = "?" if net is None else board.nets[net].name
    if place.usual_V(around.power) is None and around.power in (net, feed):  # its voltage is what is missing
        if power_V(place) is not None:
            power = board.nets[around.power].name
            needs = f"[supply] {toml_key(power)}: behind its lead it feeds the drive as well"
            notes.missing.append(Missing("supply", None, needs, net=power))
        return None, None
    needs = f"[drive.{toml_key(name)}]: nothing on the board is seen to drive it"
    notes.missing.append(Missing("drive", None, needs, net=name))
    return None, None


def _driven(place: Place, held: Mapping[str, Range], lowest: Range, highest: Range, notes: Notes) -> Drive:
    """Return the drive of a driven net, from the limits file as far as that goes."""
    net = place.around.drive
    assert net is not None
    node = place.node_of[net]
    entry = place.around.drive_entry or _driver_entry(place, [index for index, _ in place.around.drive_pins])
    own = [voltage_V for _, voltage_V in _own_supplies(place, ("ic",))]
    if len({one.usual for one in own}) > 1:  # an IC does not reach beyond what feeds it
        lowest, highest = (Range(one.usual, one.usual, one.usual) for one in (own[0], own[-1]))
    low, high = lowest, highest
    follows: list[str | None] = [None, None]
    if entry is not None:
        low, high = entry.low_V or lowest, entry.high_V or highest
        if entry.from_rails_V is not None:
            rails = _own_supplies(place, ("ic", "connector")) or [("", lowest), ("", highest)]
            (lower, lower_V), (upper, upper_V) = rails[0], rails[-1]
            low = entry.low_V or _moved(lower_V, entry.from_rails_V)
            high = entry.high_V or _moved(upper_V, -entry.from_rails_V)
            ends = ((entry.low_V, lower), (entry.high_V, upper))
            follows = [node if stated_V is None and node in held else None for stated_V, node in ends]
    stated = entry is not None and (entry.from_rails_V is not None or (entry.low_V is not None and entry.high_V is not None))
    if not stated and low.usual == high.usual:  # of the supplies it could reach, one is not known
        notes.words[node] = "drive, its ends not known"
        return Drive(node=node, low_V=low, high_V=high, assumed=True)
    if not stated:
        stiff = "" if entry and entry.current_A is not None else "stiff and "
        notes.assumed.append(
            ("drive", f"the drive on {node} is taken as {stiff}able to reach {low.usual:g} V and {high.usual:g} V")
        )
    notes.words[node] = f"drive from {low.usual:g} V to {high.usual:g} V" + ("" if stated else ", assumed")
    return Drive(
        node=node,
        low_V=low,
        high_V=high,
        resistance_ohm=entry.resistance_ohm if entry else 0.0,
        current_A=entry.current_A if entry else None,
        assumed=not stated,
        low_follows=follows[0],
        high_follows=follows[1],
    )


def _drawn_by(place: Place, regulator: int, lowest: Range, highest: Range, notes: Notes) -> Drive | None:
    """Return the drive of a booster: what a three-terminal regulator draws, from nothing up to its own limit.

    A source of half the supplies' span over that limit, cut off at the limit, lets what is drawn rise evenly.
    """
    net, part = place.around.drive, place.board.parts[regulator]
    assert net is not None
    entry = place.around.drive_entry or _driver_entry(place, (regulator,))
    if entry is None or entry.current_A is None:
        node, number = toml_key(place.node_of[net]), part.part_number
        key = f"[drive.{node}] current" if number is None else f"[driver.{toml_key(number)}] current"
        asked = place.node_of[net] if number is None else None
        notes.missing.append(Missing("drive", None, f"{key}: the most that {part.id} draws", net=asked))
        return None
    low, high = entry.low_V or lowest, entry.high_V or highest
    notes.words[place.node_of[net]] = f"{part.id} draws up to {entry.current_A:g} A from it"
    return Drive(
        node=place.node_of[net],
        low_V=low,
        high_V=high,
        resistance_ohm=entry.resistance_ohm or 0.5 * (high.usual - low.usual) / entry.current_A,
        current_A=entry.current_A,
    )


def _driver_entry(place: Place, parts: Sequence[int]) -> DriveLimits | None:
    """Return the ``[driver]`` entry of the first of some parts that has one, by its part number, else that of any drive."""
    return driver_of(place.limits, *(place.board.parts[index].part_number for index in parts))


def _own_supplies(place: Place, kinds: tuple[str, ...]) -> list[tuple[str, Range]]:
    """Return the supplies on the pins of what drives the net, where it is of these kinds, with their nodes, lowest first."""
    driving = [place.board.parts[index] for index, _ in place.around.drive_pins]
    nets = {net for part in driving if part.kind in kinds for net in part.roles.values()}
    supplies = [(place.node_of[net], place.board.nets[net].supply) for net in sorted(nets)]
    own = [(node, supply.voltage_V) for node, supply in supplies if supply is not None]
    return sorted(own, key=lambda one: one[1].usual)


def _moved(end: Range, step_V: float) -> Range:
    return Range(end.low + step_V, end.usual + step_V, end.high + step_V)
