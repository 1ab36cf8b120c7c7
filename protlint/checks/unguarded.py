"""Power pass devices that feed an output through a resistor as if to be limited, and nothing watches that resistor."""

from __future__ import annotations

from collections import deque
from collections.abc import Collection, Iterator
from dataclasses import dataclass

from protlint.board.graph import Board, BoardPart, Element
from protlint.board.shares import part_shares
from protlint.checks.board_case import BoardAnswer, BoardCase, Unanswered
from protlint.findings import Finding, NotChecked, WorkingLine
from protlint.limits import fits
from protlint.quantities import format_quantity
from protlint.topology.excerpt import is_rail
from protlint.topology.index import CROWDED

LEAD = {
    "npn": ("emitter", "collector", "base"), "pnp": ("emitter", "collector", "base"),
    "npn-darlington": ("emitter", "collector", "base"), "pnp-darlington": ("emitter", "collector", "base"),
    "nmos": ("source", "drain", "gate"), "pmos": ("source", "drain", "gate"),
}  # fmt: skip
"""The terminal whose lead a sense resistance stands in, the other one of the load current, and the control."""

OTHER_POLARITY = {
    "npn": ("pnp",), "pnp": ("npn",), "npn-darlington": ("pnp",), "pnp-darlington": ("npn",), "nmos": ("pnp",),
    "pmos": ("npn",),
}  # fmt: skip
"""What drives the output device of a complementary pair."""

FARTHEST = 4
"""Resistors in a row through which somebody may watch a net."""

TURN_ON_V = 0.65
"""Drop at which a small transistor takes over, for the current a shunt would hold; common practice of the trade."""


@dataclass(frozen=True, slots=True)
class Stage:
    """A pass device that stands alone: its element, the resistor in its lead, the nets around."""

    device: Element
    resistor: Element
    near: int
    far: int
    load: int
    control: int | None

    @property
    def nets(self) -> tuple[int, int, int]:
        """The nets that the load current passes."""
        return self.near, self.far, self.load


def limiter_absent(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield a finding for each output that a power device feeds through a resistor that nothing watches, without a fuse."""
    check = "limiter-absent"
    by_output: dict[int, list[tuple[Stage, float]]] = {}
    leaving = _leaving(whole)
    for stage in _stages(whole):
        output = _output(whole, stage, leaving)
        if output is None or _fused(whole.board, stage) or _watched(whole.board, stage):
            continue
        rated_A = _rated_A(whole.board, stage.resistor)
        if not _is_power(whole, stage, rated_A):
            continue
        if rated_A is None:
            names = ", ".join(_ids(whole.board, stage.resistor))
            yield Unanswered(
                None, NotChecked(check, f"the power rating of {names}, in the lead of {_id(whole.board, stage)}")
            )
        elif rated_A * (stage.resistor.value or 0.0) > whole.threshold(check, "drop"):
            by_output.setdefault(output, []).append((stage, rated_A))
    for output, stages in by_output.items():
        yield _finding(whole, output, stages)


def _stages(whole: BoardCase) -> Iterator[Stage]:
    """Yield every device that no limiter and no fault claims with a resistor in its lead, in board order."""
    board, found = whole.board, whole.found
    groups = (*found.limiters, *(fault.group for fault in found.faults))
    claimed = {index for group in groups for these in group.elements.values() for index in these}
    claimed |= {index for case in whole.cases.values() for index in case.bench.element_of.values()}
    for device in board.elements:
        if device.kind not in LEAD or device.index in claimed:
            continue
        lead, other, control = (device.terminals.get(role) for role in LEAD[device.kind])
        if lead is None or other is None:
            continue
        yield from _with_resistor(board, device, lead, other, control)
        if _driven_by_its_complement(board, device, other, control):
            yield from _with_resistor(board, device, other, lead, control)


def _with_resistor(board: Board, device: Element, near: int, load: int, control: int | None) -> Iterator[Stage]:
    if is_rail(board, near):
        return
    for index, _ in board.elements_at[near]:
        resistor = board.elements[index]
        if resistor.kind == "resistor" and resistor.value:
            far = next((net for net in resistor.terminals.values() if net != near), near)
            if far not in (near, load, control):
                yield Stage(device, resistor, near, far, load, control)


def _driven_by_its_complement(board: Board, device: Element, near: int, control: int | None) -> bool:
    """Tell whether a device is the output of a complementary pair: its driver's emitter stands at its collector."""
    drivers = OTHER_POLARITY[device.kind]
    if control is None or len(board.elements_at[near]) > CROWDED:
        return False
    return any(
        role == "emitter"
        and board.elements[index].kind in drivers
        and board.elements[index].terminals.get("collector") == control
        for index, role in board.elements_at[near]
    )


def _leaving(whole: BoardCase) -> set[int]:
    """Return the nets that leave the board, straight or through an inductor or a fuse, and the outputs of limiters."""
    board = whole.board
    leaving = {net for part in board.parts if part.kind == "connector" for net in part.roles.values()}
    series = [set(one.terminals.values()) for one in board.elements if one.kind in ("inductor", "fuse")]
    beyond = {net for ends in series if not leaving.isdisjoint(ends) for net in ends}
    outputs = (limiter.nets["output"] for limiter in whole.found.limiters)
    return leaving | beyond | {net for net in outputs if net is not None}


def _output(whole: BoardCase, stage: Stage, leaving: Collection[int]) -> int | None:
    """Return the output net that a stage feeds from a supply, or None where it does not."""
    board = whole.board
    for supply, output in ((stage.load, stage.far), (stage.far, stage.load)):
        if board.nets[supply].supply is not None and board.nets[output].supply is None:
            return output if output in leaving or _limits_speak_of(whole, output) else None
    return None


def _limits_speak_of(whole: BoardCase, net: int) -> bool:
    names = whole.board.nets[net].names
    return any(key != "*" and fits(key, name) for key in whole.limits.limiters for name in names)


def _fused(board: Board, stage: Stage) -> bool:
    """Tell whether a fuse of its own stands in the path; one on a supply is everybody's."""
    return any(
        board.elements[index].kind == "fuse"
        for net in stage.nets
        if board.nets[net].supply is None
        for index, _ in board.elements_at[net]
    )


def _watched(board: Board, stage: Stage) -> bool:
    """Tell whether an IC, a connector or another transistor watches the lead, straight or through resistors.

    The way does not lead on through the device's own control, where its drive comes from.
    """
    own = _own_controls(board, stage)
    queue, seen = deque([(stage.near, 0)]), {stage.near, stage.far, stage.load, *own}
    while queue:
        net, steps = queue.popleft()
        if any(board.parts[part].kind in ("ic", "connector", "unknown") for part, _ in board.nets[net].pins):
            return True
        for index, role in board.elements_at[net]:
            element = board.elements[index]
            if element.kind in LEAD and element.index != stage.device.index and _watches(element, role, own):
                return True
            if element.kind == "resistor" and index != stage.resistor.index and steps < FARTHEST:
                for other in element.terminals.values():
                    if other not in seen and board.nets[other].supply is None:
                        seen.add(other)
                        queue.append((other, steps + 1))
    return False


def _own_controls(board: Board, stage: Stage) -> set[int]:
    """Return the nets of the device's control and of the drivers before it."""
    own: set[int] = set()
    pending = [] if stage.control is None else [stage.control]
    while pending:
        net = pending.pop()
        if net in own or is_rail(board, net):
            continue
        own.add(net)
        for index, role in board.elements_at[net]:
            element = board.elements[index]
            roles = LEAD.get(element.kind)
            if roles is not None and role in roles[:2] and roles[2] in element.terminals and index != stage.device.index:
                pending.append(element.terminals[roles[2]])
    return own


def _watches(element: Element, role: str, own: Collection[int]) -> bool:
    """Tell whether a transistor's pin on the lead watches it: its control, or the emitter of one that is no driver."""
    lead, _, control = LEAD[element.kind]
    if role == control:
        return True
    return role == lead and element.terminals.get(control) not in own


def _is_power(whole: BoardCase, stage: Stage, rated_A: float | None) -> bool:
    """Tell whether a device is a power device: by its current rating, or, where that is not known, by the resistor's."""
    check, part = "limiter-absent", _part(whole.board, stage)
    rating = None
    if part.entry is not None:
        rating = part.entry.ratings.get("ic") or part.entry.ratings.get("id")
    if rating is not None:
        enough = rated_A is None or rated_A >= whole.threshold(check, "sensed")
        return enough and rating.value >= whole.threshold(check, "power_device")
    return rated_A is not None and rated_A >= whole.threshold(check, "unknown_device")


def _rated_A(board: Board, resistor: Element) -> float | None:
    """Return the current at which the first part of a resistance reaches its power rating; None where one is not known."""
    known: dict[int, tuple[float, float]] = {}
    for part in (board.parts[index] for index in resistor.parts):
        ohm, power_W = part.values.value, _power_W(part)
        if not ohm or power_W is None:
            return None
        known[part.index] = (ohm, power_W)
    shares = part_shares(resistor.tree, {index: ohm for index, (ohm, _) in known.items()})
    return min(float((power_W / ohm) ** 0.5) / shares[index].current for index, (ohm, power_W) in known.items())


def _power_W(part: BoardPart) -> float | None:
    if part.values.power_W is not None:
        return part.values.power_W
    figure = None if part.entry is None else part.entry.ratings.get("power")
    return None if figure is None else figure.value


def _finding(whole: BoardCase, output: int, stages: list[tuple[Stage, float]]) -> Finding:
    board = whole.board
    devices = tuple(dict.fromkeys(_id(board, stage) for stage, _ in stages))
    resistors = tuple(dict.fromkeys(name for stage, _ in stages for name in _ids(board, stage.resistor)))
    stage, rated_A = stages[0]
    ohm = stage.resistor.value or 0.0
    cap_A = _cap_A(whole, output, (*devices, *resistors))
    lines = [
        WorkingLine(f"rated current of {', '.join(_ids(board, stage.resistor))}", "sqrt(P / R)", rated_A, "A"),
        WorkingLine("drop at its rating", "that current times R", rated_A * ohm, "V"),
        WorkingLine(
            "a shunt would hold about", f"{TURN_ON_V:g} V / R", TURN_ON_V / ohm, "A", "common practice of the trade"
        ),
    ]
    if cap_A is not None:
        lines.append(WorkingLine("cap", "limits file", cap_A, "A"))
    names = [board.nets[net].name for net in (output, *stage.nets)]
    return Finding(
        check="limiter-absent",
        limiter=None,
        parts=(*devices, *resistors),
        nets=tuple(dict.fromkeys(names)),
        message=f"{', '.join(devices)} feed{'s' if len(devices) == 1 else ''} {names[0]} through {', '.join(resistors)}, "
        f"and nothing watches the drop: no shunt, no fuse, no pin of an IC",
        working=tuple(lines),
        remedy=_remedy(board, stage),
        level="note" if cap_A is None else "warning",
    )


def _remedy(board: Board, stage: Stage) -> str:
    kind = "an NPN" if stage.device.kind.startswith("n") else "a PNP"
    if LEAD[stage.device.kind][0] not in (role for role, net in stage.device.terminals.items() if net == stage.near):
        kind = "a PNP" if kind == "an NPN" else "an NPN"  # in a complementary pair the driver's polarity decides
    near, far = board.nets[stage.near].name, board.nets[stage.far].name
    about = format_quantity(TURN_ON_V / (stage.resistor.value or 1.0), "A")
    return (
        f"fit {kind} with its emitter on {far}, its base through 100 ohm on {near} and its collector where the drive of "
        f"{_id(board, stage)} arrives: it would hold about {about}"
    )


def _cap_A(whole: BoardCase, output: int, parts: tuple[str, ...]) -> float | None:
    """Return the cap that the limits file gives this output, by net or part; what stands under ``*`` is for limiters."""
    names = (*whole.board.nets[output].names, *parts)
    caps = [
        needs.cap_A
        for key, needs in whole.limits.limiters.items()
        if key != "*" and needs.cap_A is not None and any(fits(key, name) for name in names)
    ]
    return caps[-1] if caps else None


def _part(board: Board, stage: Stage) -> BoardPart:
    return board.parts[stage.device.parts[0]]


def _id(board: Board, stage: Stage) -> str:
    return _part(board, stage).id


def _ids(board: Board, element: Element) -> tuple[str, ...]:
    return tuple(board.parts[part].id for part in element.parts)
