"""How far a limiter's circuit reaches on its board, and what drives it.

From the limiter's own nets the walk goes through resistors, diodes, transistors, capacitors, inductors and fuses, and stops
at supplies, at the output, at the power side of the pass device, at the drive, and at any other net that something off the
bench drives. An IC input drives nothing.
"""

from __future__ import annotations

import heapq
from collections import deque
from dataclasses import dataclass

from protlint.board.drives import is_input
from protlint.board.graph import Board, Element
from protlint.board.regulators import regulator_across
from protlint.limits import DriveLimits
from protlint.solve.lead import lead_to_supply, other_nets
from protlint.topology.limiter import Limiter

MOST_DEVICES = 80
"""A larger bench is not solved: its drive has to be named instead."""

TWO_TERMINAL = frozenset({"resistor", "capacitor", "inductor", "diode", "zener", "fuse"})
PASSES_DC = TWO_TERMINAL - {"capacitor"}
CONTROL = {
    "npn": "base", "pnp": "base", "npn-darlington": "base", "pnp-darlington": "base", "nmos": "gate", "pmos": "gate",
}  # fmt: skip
"""The control terminal of each transistor kind."""

STEP_COST, TRANSISTOR_COST = 1, 3
"""A drive through passive parts is nearer than one behind a transistor."""

FARTHEST, MOST_NETS = 12, 100
"""What lies beyond as many steps, or behind as many nets, is not taken for a drive or a control."""


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What is on the bench.

    ``elements`` are board element indices in board order. ``drive`` is the net that brings the drive, with its entry in the
    limits file where there is one; ``fed_by`` the supply net that feeds the drive where nothing takes it away (exactly one
    of the two is set, or neither where no drive was found). ``power`` is the net at the far side of the load current from
    the output, ``power_path`` the series parts (a fuse, say) between it and a supply. ``left_out`` says in plain words what
    was taken as off or open.
    """

    elements: tuple[int, ...]
    output: int
    power: int
    power_path: tuple[int, ...]
    drive: int | None
    drive_entry: DriveLimits | None
    drive_pins: tuple[tuple[int, str], ...]
    fed_by: int | None
    left_out: tuple[str, ...]


def survey_surroundings(board: Board, limiter: Limiter) -> Surroundings:
    """Return what belongs on a limiter's bench."""
    own = {index for indices in limiter.elements.values() for index in indices}
    output = limiter.nets["output"]
    far, start = limiter.nets["far"], limiter.nets["drive"]
    assert output is not None and far is not None and start is not None
    power = _power_side(board, limiter, output, far)
    walls = {output, power} | {net.index for net in board.supplies}
    starts = [start] if limiter.nets["feed"] is None else [start, limiter.nets["feed"]]
    drive, entry, pins, fed_by = _find_drive(board, own, walls, [net for net in starts if net is not None], limiter)
    stops = walls | board.drives.keys() | ({drive} if drive is not None else set())
    elements, left_out = _collect(board, own, stops, drive)
    power_path = lead_to_supply(board, power, _barred(board, limiter, output) - {power}, sources=sources_current(limiter))
    return Surroundings(
        elements=tuple(sorted(elements.union(power_path))),
        output=output,
        power=power,
        power_path=power_path,
        drive=drive,
        drive_entry=entry,
        drive_pins=pins,
        fed_by=fed_by,
        left_out=tuple(left_out),
    )


def sources_current(limiter: Limiter) -> bool:
    """Tell whether a limiter's load current flows out of its output (else into it)."""
    return (limiter.nets["far"] == limiter.nets["output"]) == (limiter.polarity == "n")


def _barred(board: Board, limiter: Limiter, output: int) -> set[int]:
    """Return the nets that no lead of the power side runs through: the output and the ends of the sense resistance."""
    ends = {net for index in limiter.elements.get("sense", ()) for net in board.elements[index].terminals.values()}
    return ends | {net for name in ("sense", "far") if (net := limiter.nets[name]) is not None} | {output}


def _power_side(board: Board, limiter: Limiter, output: int, far: int) -> int:
    """Return the net on the other side of the pass device and the sense resistance from the output."""
    if far != output:
        return far
    if "load" in limiter.bound:
        return limiter.bound["load"]
    device = board.elements[limiter.elements["pass"][0]]
    return device.terminals.get("collector", device.terminals.get("drain", far))


def drivers_on(board: Board, net: int) -> tuple[tuple[int, str], ...]:
    """Return the (board part, pin) that drive a net: connectors, and IC pins that are not inputs."""
    found = []
    for index, role in board.nets[net].pins:
        part = board.parts[index]
        if part.kind == "connector" or (part.kind == "ic" and not is_input(part, role)):
            found.append((index, role))
    return tuple(found)


def _find_drive(
    board: Board, own: set[int], walls: set[int], starts: list[int], limiter: Limiter
) -> tuple[int | None, DriveLimits | None, tuple[tuple[int, str], ...], int | None]:
    """Return the nearest driving net (a ``[drive]`` entry beats all), or the supply that feeds the drive on."""
    output = limiter.nets["output"]
    assert output is not None
    best: dict[int, int] = {}
    queue = [(0, net) for net in starts]
    driven: list[tuple[int, int]] = []
    fed: list[tuple[int, int]] = []
    while queue:
        cost, net = heapq.heappop(queue)
        if net in best or cost > FARTHEST or len(best) > MOST_NETS:
            continue
        best[net] = cost
        if net in board.drives:
            return net, board.drives[net], drivers_on(board, net), None
        if net in walls:
            if board.nets[net].supply is not None:
                fed.append((cost, net))
            continue
        if drivers_on(board, net) or regulator_across(board, net, output) is not None:
            driven.append((cost, net))
            continue
        for index, _ in board.elements_at[net]:
            element = board.elements[index]
            if index in own and element.kind not in PASSES_DC:
                continue
            if element.kind in PASSES_DC or element.kind in CONTROL:
                step = STEP_COST if element.kind in PASSES_DC else TRANSISTOR_COST
                for other in other_nets(element, net):
                    heapq.heappush(queue, (cost + step, other))
    if driven:
        net = min(driven)[1]
        return net, None, drivers_on(board, net), None
    return None, None, (), _feeding_supply(board, fed, limiter)


def _feeding_supply(board: Board, fed: list[tuple[int, int]], limiter: Limiter) -> int | None:
    """Return the supply that turns the pass device on hardest among those the drive leads to.

    It has to lie beyond the far end of the sense resistance (beyond ground, where that end is the output): a supply on the
    wrong side, reached through the sense resistance or a diode string, turns nothing on.
    """
    sign = 1.0 if limiter.polarity == "n" else -1.0
    far = limiter.nets["far"]
    far_supply = board.nets[far].supply if far is not None else None
    start_V = far_supply.voltage_V.usual if far_supply is not None else 0.0
    usable = []
    for cost, net in fed:
        supply = board.nets[net].supply
        if supply is not None and sign * (supply.voltage_V.usual - start_V) > 0.0:
            usable.append((-sign * supply.voltage_V.usual, cost, net))
    return min(usable)[2] if usable else None


def _collect(board: Board, own: set[int], stops: set[int], drive: int | None) -> tuple[set[int], list[str]]:
    """Walk from the limiter's own elements; return the elements on the bench and what was left out of it."""
    elements = set(own)
    left_out: dict[int, str] = {}
    seen: set[int] = set()
    queue = deque(sorted({net for index in own for net in board.elements[index].terminals.values()}))
    while queue:
        net = queue.popleft()
        if net in seen or net in stops:
            continue
        seen.add(net)
        for index, _ in board.elements_at[net]:
            element = board.elements[index]
            if index in elements or index in left_out or element.kind not in TWO_TERMINAL | CONTROL.keys():
                continue
            if element.kind in CONTROL:
                switch = _switched_by(board, element, stops, drive)
                if switch is not None:
                    names = ", ".join(board.parts[part].id for part in element.parts)
                    left_out[index] = f"{names} is taken as off: {board.nets[switch].name} controls it"
                    continue
            elements.add(index)
            queue.extend(other_nets(element, net))
        if len(elements) > MOST_DEVICES:
            break
    return elements, [left_out[index] for index in sorted(left_out)]


def _switched_by(board: Board, element: Element, stops: set[int], drive: int | None) -> int | None:
    """Return the driven net, other than the drive, that a transistor's control leads to through passive parts."""
    control = element.terminals.get(CONTROL[element.kind])
    queue = deque([control] if control is not None else [])
    seen: set[int] = set()
    found: int | None = None
    while queue and len(seen) < MOST_NETS:
        net = queue.popleft()
        if net in seen:
            continue
        seen.add(net)
        if net == drive:
            return None
        if net in stops:
            continue
        if found is None and drivers_on(board, net):
            found = net
            continue
        for index, _ in board.elements_at[net]:
            if board.elements[index].kind in PASSES_DC:
                queue.extend(other_nets(board.elements[index], net))
    return found
