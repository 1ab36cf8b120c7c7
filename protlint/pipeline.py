"""The road end to end: files in, a review out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import date
from pathlib import Path
from typing import Literal

from protlint.board.attributes import file_habits
from protlint.board.graph import Board, build_board
from protlint.board.parts_list import Difference, PartsList, differences, read_parts_list
from protlint.checks.afterwards import foretold, told_once
from protlint.checks.asking import ask, with_levels
from protlint.checks.board_case import BoardCase
from protlint.checks.case import Case
from protlint.checks.catalogue import CheckRow, load_catalogue
from protlint.checks.derating import derating_remarks
from protlint.checks.exchanged import with_exchange
from protlint.checks.load import StartUp, start_up_of
from protlint.checks.part_fails import IfPartFails, if_a_part_fails
from protlint.checks.table import BOARD_CHECKS
from protlint.findings import (
    FOR_WANT_OF,
    LEVELS,
    UNSOLVED,
    Finding,
    NotChecked,
    identifying_parts,
    stamp_fingerprints,
)
from protlint.idle import idle_tables
from protlint.limits import LimiterLimits, Limits, needs_of
from protlint.limits_file import load_limits
from protlint.netlist import read_netlist
from protlint.netlist.forms import no_collection
from protlint.netlist.model import Netlist
from protlint.partdata.book import Book, load_book
from protlint.solve.answers import solve
from protlint.solve.bench import Bench, build_bench
from protlint.solve.circuit import Circuit
from protlint.solve.comparison import Comparison, compare_formula
from protlint.solve.conditions import Known
from protlint.solve.dynamics import with_dynamics
from protlint.solve.memo import Memo
from protlint.solve.solution import Solution
from protlint.topology.language import Rules, load_rules
from protlint.topology.limiter import Found, Limiter
from protlint.topology.outputs import find_on_board
from protlint.waivers import Waivers, apply_waivers, load_waivers

Verdict = Literal["passes", "fails", "rests on assumptions", "not judged"]
"""``not judged`` where the circuit could not be solved; ``fails`` with an error that is not waived; ``rests on assumptions``
where a number leans on something nobody stated; else ``passes``."""


@dataclass(frozen=True, slots=True)
class ReviewedLimiter:
    """One limiter with everything that was worked out and asked."""

    limiter: Limiter
    needs: LimiterLimits
    circuit: Circuit | None
    solution: Solution
    verdict: Verdict
    not_checked: tuple[NotChecked, ...] = ()
    assumed: tuple[str, ...] = ()
    bench: Bench = field(default_factory=lambda: Bench(None))
    if_a_part_fails: IfPartFails | None = None
    """What the output passes with a part failed, None where the limiter was not solved."""
    start_up: StartUp | None = None
    """How the output comes up into the stated load capacitance, None where none is stated."""
    formula: Comparison | None = None
    """The closed form beside the solved held short, None where none fits."""


@dataclass(frozen=True, slots=True)
class Review:
    """The whole answer for one netlist; limiters and findings in report order, the worst first.

    ``assumed`` is what was assumed about the board as a whole, ``not_checked`` what could not be checked of it; ``remarks``
    is said once, below everything: expired waivers, waivers and limits that fit nothing, part data that contradicts itself.
    """

    board: Board
    limits: Limits
    found: Found
    limiters: tuple[ReviewedLimiter, ...]
    findings: tuple[Finding, ...]
    assumed: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()
    not_checked: tuple[NotChecked, ...] = ()


@dataclass(frozen=True, slots=True)
class Desk:
    """What a review needs besides the netlist, read once and good for many boards."""

    limits: Limits
    book: Book
    rules: Rules
    catalogue: Mapping[str, CheckRow]
    parts_list: PartsList | None = None
    waivers: Waivers | None = None
    on: date | None = None


@dataclass(frozen=True, slots=True)
class _Whole:
    """A board under review: what every limiter's review shares."""

    board: Board
    desk: Desk
    differences: Mapping[str, tuple[Difference, ...]]
    solved: Memo = field(default_factory=Memo)
    known: Known = field(default_factory=Known)


def set_up(
    *,
    limits: str | Path | None = None,
    parts: str | Path | Sequence[str | Path] = (),
    parts_list: str | Path | None = None,
    waivers: str | Path | None = None,
    rules: str | Path | Sequence[str | Path] = (),
    on: date | None = None,
) -> Desk:
    """Read every file but the netlist.

    Raises
    ------
    ProtlintError : a file is missing or wrong, with file, line and column.
    """
    catalogue = load_catalogue()
    parts, rules = _several(parts), _several(rules)
    return Desk(
        limits=load_limits(limits, known_checks={name: row.thresholds.keys() for name, row in catalogue.items()}),
        book=load_book(parts),
        rules=load_rules(rules),
        catalogue=catalogue,
        parts_list=read_parts_list(parts_list) if parts_list is not None else None,
        waivers=load_waivers(waivers) if waivers is not None else None,
        on=on,
    )


def _several(paths: str | Path | Sequence[str | Path]) -> Sequence[str | Path]:
    return (paths,) if isinstance(paths, str | Path) else paths


def review(
    path: str | Path,
    *,
    limits: str | Path | None = None,
    parts: str | Path | Sequence[str | Path] = (),
    parts_list: str | Path | None = None,
    waivers: str | Path | None = None,
    rules: str | Path | Sequence[str | Path] = (),
    design: str | None = None,
    encoding: str | None = None,
    on: date | None = None,
) -> Review:
    """Review every limiter of a netlist.

    Parameters
    ----------
    path : the EDIF netlist; ``-`` is standard input.
    limits, parts, parts_list, waivers, rules : the user's files, as the command's options of the same names; of part data
        and rules one or several.
    design, encoding : which of several designs, and the file's encoding where it is not to be found out.
    on : the day that waivers are judged by; today where None.

    Raises
    ------
    ProtlintError : a file is missing or wrong, with file, line and column.
    """
    with no_collection():
        desk = set_up(limits=limits, parts=parts, parts_list=parts_list, waivers=waivers, rules=rules, on=on)
        return review_netlist(read_netlist(path, design=design, encoding=encoding), desk)


def review_netlist(netlist: Netlist, desk: Desk) -> Review:
    """Review every limiter of a netlist that is already read."""
    with no_collection():
        return _reviewed(netlist, desk)


def _reviewed(netlist: Netlist, desk: Desk) -> Review:
    board = build_board(netlist, limits=desk.limits, book=desk.book, parts_list=desk.parts_list)
    found, boards = find_on_board(board, desk.rules)
    reviewed: list[ReviewedLimiter] = []
    findings: list[Finding] = []
    cases: dict[str, Case] = {}
    shared = _Whole(board, desk, _differences(board, desk))
    for limiter in found.limiters:
        its_board = boards.get(limiter.id, board)
        one, case, its_findings = _review_limiter(replace(shared, board=its_board), limiter)
        reviewed.append(one)
        cases[limiter.id] = case
        findings += its_findings
    more, unanswered = _ask_of_the_board(BoardCase(board, found, cases, desk.limits, desk.catalogue))
    more = [told for one in more for told in _foretold(one, cases, findings)]
    reviewed = [replace(one, not_checked=(*one.not_checked, *unanswered.pop(one.limiter.id, ()))) for one in reviewed]
    of_the_board = [one for left in unanswered.values() for one in left]
    return _finish(board, found, reviewed, told_once(findings) + more, desk, of_the_board)


def _ask_of_the_board(whole: BoardCase) -> tuple[list[Finding], dict[str | None, list[NotChecked]]]:
    """Put the checks of the whole board; return their findings, and by limiter what could not be checked."""
    findings: list[Finding] = []
    unanswered: dict[str | None, list[NotChecked]] = {}
    for check, put in BOARD_CHECKS.items():
        for answer in put(whole):
            if isinstance(answer, Finding):
                settings = (whole.needs_at(answer).checks, whole.limits.checks)
                findings += with_levels((answer,), check, whole.rows, settings)
            else:
                unanswered.setdefault(answer.limiter, []).append(answer.what)
    return findings, unanswered


def _foretold(finding: Finding, cases: Mapping[str, Case], findings: Sequence[Finding]) -> list[Finding]:
    """Return a finding of the whole board with what comes of its remedy, where that is about one limiter."""
    if finding.limiter is None or finding.limiter not in cases:
        return [finding]
    return foretold(cases[finding.limiter], [finding], [one for one in findings if one.limiter == finding.limiter])


def _differences(board: Board, desk: Desk) -> dict[str, tuple[Difference, ...]]:
    """Return what a parts list says otherwise than the netlist, by part id."""
    if desk.parts_list is None:
        return {}
    habits = file_habits(board.netlist, desk.limits)
    kinds = {part.id: part.kind for part in board.parts}
    parts = [part for part in board.netlist.parts if part.id in kinds]
    by_part: dict[str, tuple[Difference, ...]] = {}
    for one in differences(parts, [kinds[part.id] for part in parts], habits, desk.parts_list):
        by_part[one.part] = (*by_part.get(one.part, ()), one)
    return by_part


def _review_limiter(whole: _Whole, limiter: Limiter) -> tuple[ReviewedLimiter, Case, list[Finding]]:
    """Return one limiter reviewed, its case, and its findings; equal benches are solved once."""
    board, desk = whole.board, whole.desk
    needs = needs_of(desk.limits, *_names(board, limiter))
    bench = build_bench(board, limiter, limits=desk.limits, needs=needs)
    lacking = "; ".join(one.needs for one in bench.missing)
    solution = Solution(not_solved=f"{FOR_WANT_OF}{lacking}" if lacking else "its circuit is not known")
    if bench.circuit is not None:
        solution = solve(bench.circuit, desk.limits.ambient_degC, memo=whole.solved)
        solution = with_dynamics(bench.circuit, solution, desk.limits.ambient_degC, memo=whole.solved)
    case = Case(
        board,
        limiter,
        bench,
        solution,
        needs,
        desk.limits,
        desk.catalogue,
        differences=whole.differences,
        known=whole.known,
        solved=whole.solved,
    )
    not_checked = [NotChecked(what, case.limits_key(key) if key == "output" else key) for what, key in solution.not_checked]
    if solution.not_solved is not None:
        not_checked.append(NotChecked(UNSOLVED, solution.not_solved.removeprefix(FOR_WANT_OF)))
    findings, unanswered = ask(case)
    findings = with_exchange(case, foretold(case, findings, findings))
    not_checked += unanswered
    if case.unbounded:
        not_checked.append(NotChecked(UNSOLVED, case.drive_bound))
        solution = Solution(not_solved=f"{FOR_WANT_OF}{case.drive_bound}", assumed=solution.assumed)
        case = replace(case, solution=solution)
    reviewed = ReviewedLimiter(
        limiter=limiter,
        needs=needs,
        circuit=bench.circuit,
        solution=solution,
        verdict="passes",
        not_checked=tuple(dict.fromkeys(not_checked)),
        assumed=(*(sentence for _, sentence in bench.assumed), *dict.fromkeys(case.assumptions)),
        bench=bench,
        if_a_part_fails=if_a_part_fails(case),
        start_up=start_up_of(case),
        formula=compare_formula(bench.circuit, solution) if bench.circuit is not None else None,
    )
    return reviewed, case, findings


def _names(board: Board, limiter: Limiter) -> tuple[str, ...]:
    """Return the names a limits file may call a limiter by: pass device, sense resistors, output net."""
    output = limiter.nets["output"]
    nets = board.nets[output].names if output is not None else ()
    return (limiter.id, *limiter.roles.get("pass", ()), *limiter.roles.get("sense", ()), *nets)


def _finish(
    board: Board,
    found: Found,
    reviewed: list[ReviewedLimiter],
    findings: list[Finding],
    desk: Desk,
    not_checked: Sequence[NotChecked],
) -> Review:
    """Place, name, waive and sort the findings, and give every limiter its verdict."""
    findings = [_placed(board, finding) for finding in findings]
    known = {one.limiter.id: identifying_parts(one.limiter.roles) for one in reviewed}
    marked: Sequence[Finding] = stamp_fingerprints(findings, known)
    listed = desk.parts_list.remarks if desk.parts_list is not None else ()
    spoken_of = [name for one in reviewed for name in _names(board, one.limiter)]
    spoken_of += [name for finding in marked for name in (*finding.parts, *finding.nets)]
    idle = idle_tables(desk.limits, board, spoken_of)
    remarks: tuple[str, ...] = (*desk.book.remarks, *listed, *derating_remarks(desk.limits.derating), *idle)
    if desk.waivers is not None:
        marked, more = apply_waivers(marked, desk.waivers, on=desk.on)
        remarks += tuple(more)
    judged = [replace(one, verdict=_verdict(one, marked, desk.limits)) for one in reviewed]
    order = {one.limiter.id: place for place, one in enumerate(sorted(judged, key=lambda one: _badness(one, marked)))}
    return Review(
        board=board,
        limits=desk.limits,
        found=found,
        limiters=tuple(sorted(judged, key=lambda one: order[one.limiter.id])),
        findings=tuple(
            sorted(marked, key=lambda one: (order.get(one.limiter or "", -1), one.waived is not None, _rank(one)))
        ),
        assumed=tuple(board.assumed) + tuple(desk.limits.assumed),
        remarks=remarks,
        not_checked=tuple(dict.fromkeys(not_checked)),
    )


def _placed(board: Board, finding: Finding) -> Finding:
    """Give a finding the place in the netlist where its first part stands."""
    if finding.file is not None:
        return finding
    found = board.part_of.get(finding.parts[0]) if finding.parts else None
    line, column = (None, None) if found is None else (found.part.line, found.part.column)
    return replace(finding, file=board.netlist.file, line=line, column=column)


def _rank(finding: Finding) -> int:
    return LEVELS.index(finding.level) if finding.level is not None else len(LEVELS)


def _badness(one: ReviewedLimiter, findings: Sequence[Finding]) -> tuple[int, ...]:
    """Return a sort key: failing limiters first, by their counts of findings of each level."""
    own = [finding for finding in findings if finding.limiter == one.limiter.id and finding.waived is None]
    verdicts: tuple[Verdict, ...] = ("fails", "not judged", "rests on assumptions", "passes")
    return (verdicts.index(one.verdict), *(-sum(finding.level == level for finding in own) for level in LEVELS))


def _verdict(one: ReviewedLimiter, findings: Sequence[Finding], limits: Limits) -> Verdict:
    own = [finding for finding in findings if finding.limiter == one.limiter.id and finding.waived is None]
    if any(finding.level == "error" for finding in own):
        return "fails"
    if one.solution.not_solved is not None:
        return "not judged"
    if one.assumed or limits.assumed:
        return "rests on assumptions"
    return "passes"
