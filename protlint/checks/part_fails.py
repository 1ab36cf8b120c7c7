"""What if a part fails: what the output then passes into a short, and which fuse stands in its way."""

from __future__ import annotations

from dataclasses import dataclass

from protlint.checks.case import UNBOUNDED_A, Case
from protlint.solve.failures import failures


@dataclass(frozen=True, slots=True)
class PartFails:
    """One part (or a bank or chain that stands for one) failed: its role, how, and what the output passes into the short,
    as drawn at usual ambient; None where that could not be solved. ``of_holds`` is that over holds.

    No model holds beyond what the pass devices are rated for, and they do not: where the circuit would pass more,
    ``output_A`` is that rating and ``of_holds`` None, for only the supply and the wiring bound it then.
    """

    parts: tuple[str, ...]
    role: str
    how: str
    output_A: float | None
    of_holds: float | None


@dataclass(frozen=True, slots=True)
class IfPartFails:
    """The table of one limiter, and the fuses upstream that the board names; none where ``fuses`` is empty."""

    rows: tuple[PartFails, ...]
    fuses: tuple[str, ...]


def if_a_part_fails(case: Case) -> IfPartFails | None:
    """Return what each failed part lets through, everything else at its usual value, or None where the limiter was not
    solved: a table to compare with holds, judged by no check."""
    solution = case.solution
    if case.bench.circuit is None or solution.short is None or solution.not_solved is not None:
        return None
    stops = case.limiter.elements.get("base-stop", ())
    found = failures(
        case.circuit,
        stops=[name for name, index in case.bench.element_of.items() if index in stops],
        on_V=case.drive_ends_V[1].usual,
        short_V=case.circuit.held[solution.short].usual,
        sources=solution.sources,
        ambient_degC=case.limits.ambient_degC[1],
        known=case.known,
    )
    holds_A = solution.held_short.output_A if solution.held_short is not None else 0.0
    rows = []
    for one in found:
        element = case.board.elements[case.bench.element_of[one.device]]
        parts = tuple(case.board.parts[index].id for index in element.parts)
        output_A, bears_A = one.output_A, _bears_A(case)
        of_holds = output_A / holds_A if output_A is not None and holds_A > 0.0 else None
        if output_A is not None and output_A > bears_A:
            output_A, of_holds = bears_A, None
        rows.append(PartFails(parts, one.role, one.how, output_A, of_holds))
    return IfPartFails(tuple(rows), fuses_upstream(case))


def _bears_A(case: Case) -> float:
    """Return the current that the pass devices are rated for together, the peak one where known."""
    total_A = 0.0
    for part_id in case.parts("pass"):
        ratings = [case.rating(part_id, name) for name in ("ic_peak", "id_peak", "ic", "id")]
        known = [rating.value for rating in ratings if rating is not None]
        total_A += known[0] if known else UNBOUNDED_A
    return total_A


def fuses_upstream(case: Case) -> tuple[str, ...]:
    """Return the ids of the fuses in the load current's way: at either end of the stage, and at the short."""
    board, limiter = case.board, case.limiter
    ends = [net for net in (limiter.nets["far"], limiter.bound.get("load")) if net is not None]
    short = [net.index for net in board.supplies if net.name == case.solution.short]
    grounds = {net.index for net in board.supplies if net.supply and net.supply.voltage_V.usual == 0.0}
    found = {index for net in (*ends, *short) if net not in grounds for index, _ in board.elements_at[net]}
    fuses = (board.elements[index] for index in sorted(found) if board.elements[index].kind == "fuse")
    return tuple(board.parts[part].id for fuse in fuses for part in fuse.parts)
