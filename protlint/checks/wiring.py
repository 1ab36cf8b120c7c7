"""Is a limiter drawn wrong: every fault that matching found, with the connections to change."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from protlint.board.graph import Board, BoardPart
from protlint.checks.board_case import BoardAnswer, BoardCase
from protlint.findings import Finding, WorkingLine
from protlint.topology.likely import CONTROLS
from protlint.topology.limiter import FaultMatch

WIRING_FAULTS = (
    "collector-emitter-swapped",
    "base-emitter-swapped",
    "shunt-pins-exchanged",
    "shunt-pin-misplaced",
    "base-on-far-end",
    "shunt-polarity-wrong",
    "collector-not-on-the-drive",
    "sense-bypassed",
    "wrong-device-sensed",
    "pass-pins-exchanged",
    "pass-polarity-wrong",
)
"""The checks that a fault rule answers, or a transistor that stands turned round or has a pin astray."""


def wiring_check(fault: str) -> Callable[[BoardCase], Iterator[BoardAnswer]]:
    """Return the check that yields a finding for every fault of this name that matching found."""

    def check(whole: BoardCase) -> Iterator[BoardAnswer]:
        for match in whole.found.faults:
            if match.fault == fault:
                yield _finding(whole.board, match)

    return check


def _finding(board: Board, match: FaultMatch) -> Finding:
    group = match.group
    roles = ("shunt", "sense", "pass", "driver", "base_stop")
    named = (*group.roles["shunt"], *_changed(match), *(part for role in roles for part in group.roles[role]))
    parts = tuple(dict.fromkeys(named))
    remembered = [part for part in parts if part in board.part_of and board.part_of[part].pins_from_memory]
    return Finding(
        check=match.fault,
        limiter=group.id,
        parts=parts,
        nets=tuple(dict.fromkeys(board.nets[net].name for net in group.nets.values() if net is not None)),
        message=f"{match.says}; {_consequence(board, match)}{_if_remembered(remembered)}",
        working=_working(board, match),
        remedy=_remedy(board, match),
        assumption=bool(remembered),
    )


def _if_remembered(parts: Sequence[str]) -> str:
    return f"; all this if the pin order of {', '.join(parts)} is as protlint has it from memory" if parts else ""


def _consequence(board: Board, match: FaultMatch) -> str:
    """Say what comes of a fault; the pass device is not named for what it does not do."""
    shunt, carrier = (", ".join(match.group.roles[role]) for role in ("shunt", "pass"))
    if match.beside:
        return f"as drawn it does not do its part in the limiter of {shunt}"
    if match.fault.startswith("pass-"):
        return f"as drawn the drive does not control the load current, and {shunt} limits nothing"
    if match.fault == "shunt-pin-misplaced":
        ((part, pin), _), *_ = match.moves
        roles = board.part_of[part].roles
        if pin in CONTROLS and roles[pin] in (roles.get("collector"), roles.get("anode")):
            return f"as drawn the drive is clamped, whatever the current of {carrier}"
        if pin in CONTROLS:
            return f"as drawn it answers to the voltage there, and nothing limits the current of {carrier}"
    return f"as drawn nothing limits the current of {carrier}"


def _changed(match: FaultMatch) -> list[str]:
    """Return the parts whose connections change."""
    changed = [part for pair in match.exchange for part, _ in pair] + [part for (part, _), _ in match.moves]
    return changed + [part for part, _ in match.replaces] + list(match.links or match.parts_ends)


def _working(board: Board, match: FaultMatch) -> tuple[WorkingLine, ...]:
    """Say of every connection that is wrong where it is and where it belongs."""
    changed = set(_changed(match))
    parts = {part: board.part_of[part] for part in changed}
    lines = []
    for one, other in match.exchange:
        nets = [board.nets[parts[part].roles[pin]].name for part, pin in (one, other)]
        lines += [_line(one, *nets), _line(other, *reversed(nets))]
    for (part, pin), net in match.moves:
        lines.append(_line((part, pin), board.nets[parts[part].roles[pin]].name, board.nets[net].name))
    for part, kind in match.replaces:
        lines.append(WorkingLine(part, f"of kind {_kind(parts[part])}; the place takes {_article(kind)}", None, ""))
    for part in match.parts_ends:
        nets = list(dict.fromkeys(board.nets[net].name for net in board.part_of[part].roles.values()))
        lines.append(WorkingLine(f"drop across {part}", f"both ends on {', '.join(nets)}", 0.0, "V"))
    return tuple(lines)


def _line(connection: tuple[str, str], now: str, then: str) -> WorkingLine:
    return WorkingLine(".".join(connection), f"is on {now}, belongs on {then}", None, "")


def _kind(part: BoardPart) -> str:
    return f"{part.kind}, part number {part.part_number}" if part.part_number else part.kind


def _article(kind: str) -> str:
    return f"an {kind.upper()}" if kind.startswith("n") else f"a {kind.upper()}"


def _remedy(board: Board, match: FaultMatch) -> str:
    """Return every change of the cure as one sentence."""
    steps = []
    if match.exchange:
        steps.append("exchange " + "; ".join(f"{'.'.join(one)} and {'.'.join(other)}" for one, other in match.exchange))
    steps += [f"move {'.'.join(connection)} to {board.nets[net].name}" for connection, net in match.moves]
    steps += [f"fit {_article(kind)} as {part}" for part, kind in match.replaces]
    if match.links:
        steps.append(f"take out {', '.join(match.links)}, which shorts {', '.join(match.parts_ends)}")
    elif match.parts_ends:
        near = ", ".join((*match.group.roles["pass"], *match.group.roles["base_stop"]))
        steps.append(f"part the ends of {', '.join(match.parts_ends)}: one with {near}, the other where both are now")
    return "; ".join(steps)
