"""Is the output fed past the limiter: other ways from a supply to the output net that nothing senses."""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass

from protlint.board.graph import Board, Element, Supply
from protlint.board.regulators import regulator_across
from protlint.checks.board_case import BoardAnswer, BoardCase, Unanswered
from protlint.checks.case import ALL_ASSUMPTIONS, Case
from protlint.checks.likeness import usual_holds_A
from protlint.checks.sizing import greatest_most_A
from protlint.findings import Finding, Level, NotChecked, WorkingLine
from protlint.quantities import format_quantity, preferred
from protlint.topology.index import CROWDED

LONGEST = 3
"""Parts in a row that are followed from the output to a supply."""

Step = tuple[Element, int, str]
"""An element, the net on its other side, and how it conducts."""


@dataclass(frozen=True, slots=True)
class Road:
    """A way from a supply to the output: its elements from the output on, how each conducts, the supply's net and its
    voltage at that end of its range which drives the most; ``end`` says which in words, empty without a range.

    ``resistance_ohm`` is what limits its current, 0 where nothing does, None where a value is not known.
    """

    elements: tuple[Element, ...]
    hows: tuple[str, ...]
    supply: int
    supply_V: float
    end: str
    resistance_ohm: float | None


def second_road(whole: BoardCase) -> Iterator[BoardAnswer]:
    """Yield a finding for every other way from a supply to a limiter's output that can give a current worth speaking of.

    A way through resistors counts where its current into the short is above a share of what the limiter holds. What belongs
    to another limiter is limited by that one.
    """
    guarded = {index for limiter in whole.found.limiters for these in limiter.elements.values() for index in these}
    for case in whole.cases.values():
        short_V, holds_A = _short_V(case), usual_holds_A(case)
        if short_V is None or holds_A is None:
            continue  # nothing of this limiter was solved, and that is said
        yield from _regulator(case, holds_A)
        least_A = case.threshold("second-road", "share") * holds_A
        for road in roads(case, short_V, least_A, guarded):
            if road.resistance_ohm is None:
                what = NotChecked("second-road", f"the value of {', '.join(_parts(case, road))}")
                yield Unanswered(case.limiter.id, what)
            elif not road.resistance_ohm or abs(road.supply_V - short_V) > least_A * road.resistance_ohm:
                yield _finding(case, road, abs(road.supply_V - short_V), holds_A)


def _finding(case: Case, road: Road, drop_V: float, holds_A: float) -> Finding:
    board, parts = case.board, _parts(case, road)
    supply, output = board.nets[road.supply].name, _output_name(case)
    lines = [WorkingLine("voltage", f"from {supply}{road.end} to the short", drop_V, "V")]
    said, level = "which nothing in this way limits", None
    if road.resistance_ohm:
        current_A = drop_V / road.resistance_ohm
        said = f"up to {format_quantity(current_A, 'A')} into the short"
        lines.append(WorkingLine("resistance", f"of {', '.join(parts)} in a row", road.resistance_ohm, "ohm"))
        lines.append(WorkingLine("current", "Ohm's law", current_A, "A"))
        level, more = _against_the_cap(case, current_A)
        lines += more
    lines.append(WorkingLine("holds", f"what {case.limiter.id} itself lets into the short", holds_A, "A"))
    ways = ", ".join(f"{name} ({how})" for name, how in zip(_names(case, road), road.hows, strict=True))
    feeds = "feeds" if _sources(case) else "drains"
    return case.finding(
        "second-road",
        f"{supply} {feeds} {output} past {', '.join(case.parts('sense'))} as well, through {ways}: {said}",
        parts=(*parts, *case.parts("sense")),
        nets=(output, supply),
        working=tuple(lines),
        remedy=_remedy(case, parts, drop_V / (case.threshold("second-road", "share") * holds_A)),
        level=level,
        assumption=level == "error" and case.assumes(*ALL_ASSUMPTIONS),
        subject=" ".join(parts),
    )


def _regulator(case: Case, holds_A: float) -> Iterator[Finding]:
    """Yield a note where the limiter stands around the booster of a three-terminal regulator, whose own current reaches the
    output past the sense resistance (by the data sheets of such regulators: I_O = I_booster + I_regulator)."""
    board, nets, current_A = case.board, case.limiter.nets, case.circuit.drive.current_A
    output = nets["output"]
    drives = [net for net in (nets["drive"], nets["feed"]) if net is not None and output is not None]
    found = [one for net in drives if (one := regulator_across(board, net, output or 0)) is not None]
    if not found or current_A is None:
        return
    name = board.parts[found[0]].id
    level, more = _against_the_cap(case, current_A)
    yield case.finding(
        "second-road",
        f"{name} gives {_output_name(case)} a current of its own besides, up to {format_quantity(current_A, 'A')}",
        parts=(name, *case.parts("sense")),
        nets=(_output_name(case),),
        working=(
            WorkingLine("holds", f"what {case.limiter.id} itself lets into the short", holds_A, "A"),
            WorkingLine(f"most of {name}", "limits file", current_A, "A"),
            *more,
        ),
        remedy=f"take a cap with room for {format_quantity(current_A, 'A')} more than {case.limiter.id} passes",
        level=level or "note",
        assumption=level == "error" and case.assumes(*ALL_ASSUMPTIONS),
        subject="regulator",
    )


def _against_the_cap(case: Case, current_A: float) -> tuple[Level | None, list[WorkingLine]]:
    """Return error and its working where limiter and second way together go over the cap."""
    most_A, cap_A = greatest_most_A(case.solution), case.needs.cap_A
    if most_A is None or cap_A is None or most_A + current_A <= cap_A:
        return None, []
    together = WorkingLine("with the limiter's most", "its high end and this current", most_A + current_A, "A")
    return "error", [together, WorkingLine("cap", "limits file", cap_A, "A")]


def _remedy(case: Case, parts: tuple[str, ...], least_ohm: float) -> str:
    """Say what to do: off the output, behind the sense resistance, or so much resistance that it does not count."""
    output, near = _output_name(case), case.limiter.nets["sense"]
    steps = [f"take {parts[0]} off {output}"]
    if near is not None and case.limiter.nets["far"] == case.limiter.nets["output"]:
        steps.append(f"join it to {case.board.nets[near].name}, before {', '.join(case.parts('sense'))}")
    steps.append(f"put {format_quantity(preferred(least_ohm, direction='up'), 'ohm')} or more into this way")
    return ", or ".join(steps)


def roads(case: Case, short_V: float, least_A: float, guarded: Collection[int]) -> Iterator[Road]:
    """Yield the ways from supplies to the output, beside the limiter's bench, in board order.

    A supply counts where it drives current the limiter's way into a short at ``short_V``; a way whose resistance keeps even
    the farthest supply's current below ``least_A`` is left. ``guarded`` are elements that belong to limiters.
    """
    board, output = case.board, case.limiter.nets["output"]
    assert output is not None
    sign = 1.0 if _sources(case) else -1.0
    reach_V = max((sign * (_most_V(net.supply, sign) - short_V) for net in board.supplies if net.supply), default=0.0)
    solved = set(case.bench.element_of.values())
    stack: list[tuple[int, tuple[Element, ...], tuple[str, ...]]] = [(output, (), ())]
    while stack:
        net, elements, hows = stack.pop()
        supply = board.nets[net].supply
        if supply is not None and net != output:
            supply_V, limits = _most_V(supply, sign), supply.voltage_V
            if board.nets[net].name == case.solution.short:
                continue  # from the short's own net nothing flows into the short
            if sign * (supply_V - short_V) > _drop_V(elements, hows):
                name = "high" if sign > 0.0 else "low"
                end = f" at its {name} end, {format_quantity(supply_V, 'V')}," if limits.low < limits.high else ""
                yield Road(elements, hows, net, supply_V, end, _resistance_ohm(elements))
            continue
        if len(elements) == LONGEST or (elements and len(board.elements_at[net]) > CROWDED):
            continue
        for element, other, how in reversed(list(_steps(board, net, sign))):
            if element.index in solved or element.index in guarded or element in elements:
                continue
            if ((_resistance_ohm((*elements, element)) or 0.0) * least_A) < reach_V:
                stack.append((other, (*elements, element), (*hows, how)))


def _most_V(supply: Supply, sign: float) -> float:
    """Return the end of a supply's range that brings most current to the output (``sign`` 1) or takes most away (-1)."""
    return supply.voltage_V.high if sign > 0.0 else supply.voltage_V.low


def _steps(board: Board, net: int, sign: float) -> Iterator[Step]:
    """Yield what can bring current to a net (``sign`` 1) or take it away (-1), and from where."""
    toward, away = (0, 1) if sign > 0.0 else (1, 0)
    for index, role in board.elements_at[net]:
        element = board.elements[index]
        for ends, how in CONDUCTS.get(element.kind, ()):
            other = element.terminals.get(ends[toward])
            if role == ends[away] and other is not None and other != net:
                yield element, other, how


_BIPOLAR_N, _BIPOLAR_P = ((("collector", "emitter"), "a device"),), ((("emitter", "collector"), "a device"),)
_ENDS = (("1", "2"), ("2", "1"))
CONDUCTS: dict[str, tuple[tuple[tuple[str, str], str], ...]] = {
    "npn": _BIPOLAR_N,
    "npn-darlington": _BIPOLAR_N,
    "pnp": _BIPOLAR_P,
    "pnp-darlington": _BIPOLAR_P,
    "nmos": ((("drain", "source"), "a device"), (("source", "drain"), "its body diode")),
    "pmos": ((("source", "drain"), "a device"), (("drain", "source"), "its body diode")),
    "diode": ((("anode", "cathode"), "a diode"),),
    "zener": ((("anode", "cathode"), "a diode"), (("cathode", "anode"), "a zener")),
    "thyristor": ((("anode", "cathode"), "a device"),),
    "resistor": tuple((ends, "a resistor") for ends in _ENDS),
    "inductor": tuple((ends, "an inductor") for ends in _ENDS),
    "fuse": tuple((ends, "a fuse") for ends in _ENDS),
}
"""From which terminal to which a kind can conduct, and as what."""


def _drop_V(elements: tuple[Element, ...], hows: tuple[str, ...]) -> float:
    """Return the voltage below which a way gives nothing: its zeners'. One whose voltage is not known is taken for a clamp
    that stands above the supplies."""
    zeners = [one.value for one, how in zip(elements, hows, strict=True) if how == "a zener"]
    return sum(float("inf") if value is None else value for value in zeners)


def _resistance_ohm(elements: tuple[Element, ...]) -> float | None:
    values = [one.value for one in elements if one.kind == "resistor"]
    return None if None in values else sum(value for value in values if value is not None)


def _sources(case: Case) -> bool:
    """Tell whether the load current flows out of the output net (else into it)."""
    follower = case.limiter.nets["far"] == case.limiter.nets["output"]
    return follower == (case.limiter.polarity == "n")


def _short_V(case: Case) -> float | None:
    """Return the short's voltage at that end of its range which takes the most from a second way; None without one."""
    circuit = case.bench.circuit
    held = None if circuit is None else circuit.held.get(case.solution.short or "")
    if held is None:
        return None
    return held.low if _sources(case) else held.high


def _parts(case: Case, road: Road) -> tuple[str, ...]:
    return tuple(case.board.parts[part].id for element in road.elements for part in element.parts)


def _names(case: Case, road: Road) -> tuple[str, ...]:
    return tuple(", ".join(case.board.parts[part].id for part in element.parts) for element in road.elements)


def _output_name(case: Case) -> str:
    output = case.limiter.nets["output"]
    return "the output" if output is None else case.board.nets[output].name
