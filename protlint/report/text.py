"""The report for people at a terminal: the worst limiter first, 80 columns, figures with their units."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from protlint.findings import LEVELS
from protlint.report.behaviour import ROLE_WORDS, sentences
from protlint.report.digest import (
    Section,
    alike,
    assumptions,
    from_memory,
    left_open,
    place_of,
    remarks,
    sections,
    sentence,
    summary_line,
    unchecked,
    unsolved,
    waiver_of,
)
from protlint.report.figures import UNKNOWN, aligned, ambient, figure, percent, three_digits, triple, unit_for
from protlint.report.layout import COLUMNS, fitting, painted, shortened, table, tail, width, wrapped
from protlint.report.memory import FROM_MEMORY, remembered, resting
from protlint.report.safe import readable, throughout
from protlint.report.shape import Document, boards_of

INDEX_FROM = 12
"""From this many findings on an index by check stands above them."""

OVERVIEW_FROM = 2
"""A single limiter needs no overview."""

MOST_ROWS = 30
"""Of an overview; the sections below have them all."""

POLARITY_WORDS = {"n": "n type", "p": "p type"}


def rendered_text(report: Document, *, colour: bool = False) -> str:
    """Return the report as text lines of 80 columns; ``colour`` adds the colours of a terminal."""
    safe: Document = throughout(report, readable)
    lines: list[str] = []
    end: list[str] = []
    boards = boards_of(safe)
    if len(boards) == 1 and "boards" in safe and not safe["unread"]:  # one needs no sum
        boards = [{**boards[0], "remarks": [*boards[0]["remarks"], *safe["remarks"]]}]
    elif "boards" in safe:
        end = _together(safe, colour)
    for board in boards:
        lines += [*_board(board, colour), ""]
    lines += [*end, *wrapped(safe["caution"])]
    return "\n".join(lines) + "\n"


def _board(board: Document, colour: bool) -> list[str]:
    netlist = board["netlist"]
    title = f"{netlist['file']}: {summary_line(board)}"
    lines = [painted(line, "heading", colour=colour) for line in wrapped(title, indent=2, first="")]
    if not board["limiters"] and not board["findings"]:
        lines += ["", *wrapped("`protlint survey` on this file shows what was read and what is missing.", indent=2)]
    groups = alike(sections(board))
    lines += _overview(groups, colour)
    if len(board["findings"]) >= INDEX_FROM:
        lines += _index(board["findings"], colour)
    for group in groups:
        limiter, name, found = group[0]
        lines += ["", *_section(limiter, name, found, colour), *_alike(group, colour)]
    lines += _listing("Not checked of the board, for want of", unchecked(board["not_checked"]), colour)
    lines += _listing("Assumed", assumptions(board), colour)
    lines += _listing("From memory, to be held against a data sheet", from_memory(board), colour)
    lines += _listing("Remarks", remarks(board), colour)
    return lines


def _overview(groups: Sequence[Sequence[Section]], colour: bool) -> list[str]:
    """Put the limiters of a board in rows, the worst first: what each gives at its worst against what the board needs."""
    rows = [["limiter", "verdict", "carries", "needed", "most", "cap", "holds"]]
    for group in groups:
        limiter, name, found = group[0]
        if limiter is None:
            wrong = name is not None and any(one["level"] == "error" for one in found)
            rows += [[str(name), "does not limit", *[UNKNOWN] * 5]] if wrong else []
            continue
        more = f" +{len(group) - 1}" if len(group) > 1 else ""
        hand, needs = limiter["in_hand"], limiter["needs"]
        holds = limiter["currents"][len(limiter["currents"]) // 2]["holds_A"]
        figures = (hand["least_carries_A"], needs["carry_A"], hand["greatest_most_A"], needs["cap_A"], holds)
        rows.append([limiter["id"] + more, limiter["verdict"], *map(aligned, figures)])
    if len(rows) <= OVERVIEW_FROM:
        return []
    room = COLUMNS - sum(2 + max(width(row[column]) for row in rows) for column in range(1, len(rows[0])))
    rows = [[tail(name, room - 2), *cells] for name, *cells in rows]
    shown = rows[: MOST_ROWS + 1]
    rest = [f"  and {len(rows) - len(shown)} more"] if len(rows) > len(shown) else []
    title = painted("Overview: carries and most at their worst, holds as drawn", "heading", colour=colour)
    return ["", title, *table(shown, left=(0, 1)), *rest]


def _index(findings: Sequence[Document], colour: bool) -> list[str]:
    """List the checks that fired with their counts and limiters, so that a long report can be surveyed."""
    groups: dict[tuple[int, str], list[Document]] = {}
    for finding in findings:
        if finding["waived"] is None:
            groups.setdefault((LEVELS.index(finding["level"]), finding["check"]), []).append(finding)
    lines = ["", painted("Findings by check", "heading", colour=colour)]
    for (level, check), found in sorted(groups.items()):
        names = list(dict.fromkeys(finding["limiter"] or "the board" for finding in found))
        lead = f"  {len(found):>4} {LEVELS[level]:<7} {shortened(check, 30):<30}  "
        lines.append(lead + fitting(names, COLUMNS - width(lead)))
    return lines


def _section(limiter: Document | None, name: str | None, found: Sequence[Document], colour: bool) -> list[str]:
    if limiter is None:
        title = f"{name}: not a working limiter" if name else "The board"
        lines = [painted(line, "heading", colour=colour) for line in wrapped(title, indent=2, first="")]
    else:
        lines = _heading(limiter, found, colour) + _currents(limiter)
    for finding in found:
        lines += ["", *_finding(finding, colour)]
    if limiter is not None:
        told = [line for text in sentences(limiter) for line in wrapped(text, indent=6, first="    ")]
        lines += ["", "  " + painted("how it behaves", "heading", colour=colour), *told] if told else []
        lines += _not_checked(limiter, colour)
        rests = [line for text in resting(limiter) for line in wrapped(text, indent=6, first="    - ")]
        lines += ["", "  " + painted("rests on figures from memory", "heading", colour=colour), *rests] if rests else []
    return lines


def _alike(group: Sequence[Section], colour: bool) -> list[str]:
    """Name the limiters with the same figures and findings as the one shown, each with its findings' fingerprints."""
    if len(group) == 1:
        return []
    text = f"The same figures, with the same findings on their own parts, have {len(group) - 1} more:"
    lines = ["", *wrapped(text, indent=2, first="  ")]
    for _, name, found in group[1:]:
        own = f"{name}: {', '.join(finding['fingerprint'] for finding in found)}" if found else str(name)
        lines += [painted(line, "quiet", colour=colour) for line in wrapped(own, indent=6, first="    ")]
    return lines


def _heading(limiter: Document, found: Sequence[Document], colour: bool) -> list[str]:
    """Say the verdict in words with the figures it stands on, then what the limiter is made of."""
    verdict = limiter["verdict"]
    head = f"{limiter['id']} {verdict}"
    lines = wrapped(f"{head}{remembered(limiter)}{_why(limiter, found)}", indent=2, first="")
    if lines[0].startswith(head):
        lines[0] = (
            f"{painted(limiter['id'], 'heading', colour=colour)} {painted(verdict, verdict, colour=colour)}"
            f"{lines[0][len(head) :]}"
        )
    roles = [f"{ROLE_WORDS[role]} {', '.join(parts)}" for role, parts in limiter["roles"].items() if parts]
    kind = f"{limiter['topology']}, {POLARITY_WORDS.get(limiter['polarity'], limiter['polarity'])}"
    lines += wrapped(f"{kind}: {'; '.join(roles)}", indent=4, first="  ")
    nets = [f"{role} {net}" for role, net in limiter["nets"].items() if net is not None]
    if nets:
        lines += wrapped("nets: " + ", ".join(nets), indent=4, first="  ")
    return lines


def _why(limiter: Document, found: Sequence[Document]) -> str:
    """Name the errors, and what is carried and passed against what is needed, or else what is held."""
    if limiter["not_solved"]:
        return unsolved(limiter)
    errors = dict.fromkeys(one["check"] for one in found if one["level"] == "error" and one["waived"] is None)
    names = f" {', '.join(errors)}" if errors else ""
    hand, needs, usual = limiter["in_hand"], limiter["needs"], limiter["currents"][len(limiter["currents"]) // 2]
    wanted = (
        (f"carries {figure(hand['least_carries_A'], 'A')} at least", needs["carry_A"], "needed"),
        (f"most {figure(hand['greatest_most_A'], 'A')}", needs["cap_A"], "allowed"),
    )
    facts = [f"{says} ({figure(need, 'A')} {word})" for says, need, word in wanted if need is not None]
    held = f"holds {figure(usual['holds_A'], 'A')} in a short at {ambient(usual['ambient_degC'])}"
    return f"{names}: {', '.join(facts) or held}"


def _currents(limiter: Document) -> list[str]:
    """Show carries, most and holds at the three ambients against what the board needs."""
    if limiter["not_solved"]:
        return []
    columns = ("carries", "most", "holds")
    needs, hand, currents = limiter["needs"], limiter["in_hand"], limiter["currents"]
    unit, scale = unit_for((row[f"{name}_A"] for row in currents for name in columns), "A")
    rows = [["ambient", *columns]]
    for row in currents:
        cells = (triple(_scaled(row[f"{name}_range_A"], scale), _scaled(row[f"{name}_A"], scale)) for name in columns)
        rows.append([ambient(row["ambient_degC"]), *cells])
    wanted = ((needs["carry_A"], "at least", hand["carry_A"]), (needs["cap_A"], "at most", hand["cap_A"]))
    if any(need is not None for need, _, _ in wanted):
        stated = [f"{words} {three_digits(need / scale)}" if need is not None else UNKNOWN for need, words, _ in wanted]
        rows.append(["needed", *stated, ""])
        rows.append(["in hand", *(_spare(spare, need, scale) for need, _, spare in wanted), ""])
    return ["", f"  Currents in {unit}: low / usual / high", *table(rows)]


def _scaled(value: Any, scale: float) -> Any:
    if isinstance(value, list):
        return [end / scale for end in value]
    return None if value is None else value / scale


def _spare(spare: float | None, need: float | None, scale: float) -> str:
    if spare is None or not need:
        return UNKNOWN
    return f"{three_digits(spare / scale)} ({percent(spare / need)})"


def _finding(finding: Document, colour: bool) -> list[str]:
    level = finding["level"] if finding["waived"] is None else "waived"
    place = f" ({', '.join(finding['parts'])})" if finding["parts"] else ""
    mark = "; rests on an assumption" if finding["assumption"] else ""
    indent = 10
    lead = f"  {level:<7} "
    lines = wrapped(finding["check"] + place + mark, indent=indent, first=lead)
    lines[0] = lines[0].replace(level, painted(level, level, colour=colour), 1)
    lines += wrapped(sentence(finding), indent=indent)
    if finding["remedy"]:
        lines += wrapped(f"remedy: {finding['remedy']}", indent=indent)
    lines += _steps(finding["working"], indent, colour)
    for line in finding["working"]:
        lines += wrapped(f"from memory: {line['formula']}", indent=indent) if line["quantity"] == FROM_MEMORY else []
    if finding["waived"] is not None:
        lines += wrapped(f"waived {finding['level']}: {waiver_of(finding)}", indent=indent)
    where = f"{place_of(finding)} {finding['fingerprint']}"
    lines += [painted(line, "quiet", colour=colour) for line in wrapped(where, indent=indent)]
    return lines


def _steps(working: Sequence[Document], indent: int, colour: bool) -> list[str]:
    """Show the figures that lead to the finding; how each was worked out stands in the other faces."""
    figures = [f"{line['quantity']} {figure(line['value'], line['unit'])}" for line in working if line["value"] is not None]
    if not figures:
        return []
    return [painted(line, "quiet", colour=colour) for line in wrapped(f"from: {'; '.join(figures)}", indent=indent)]


def _not_checked(limiter: Document, colour: bool) -> list[str]:
    """List what was not checked by what it needs; what kept the limiter from being solved its heading has told."""
    items = [line for text in unchecked(left_open(limiter)) for line in wrapped(text, indent=6, first="    - ")]
    return ["", "  " + painted("not checked, for want of", "warning", colour=colour), *items] if items else []


def _listing(title: str, texts: Sequence[str], colour: bool) -> list[str]:
    """Return texts as items under a title, or nothing for none."""
    if not texts:
        return []
    items = [line for text in texts for line in wrapped(text, indent=4, first="  - ")]
    return ["", painted(title, "heading", colour=colour), *items]


def _together(report: Document, colour: bool) -> list[str]:
    """Sum several boards up, and say what could not be reviewed and what fits none of them."""
    count = report["summary"]["boards"]
    title = f"{count} boards together: {summary_line(report)}" if count > 1 else "No board was read"
    lines = [painted(line, "heading", colour=colour) for line in wrapped(title, indent=2, first="")]
    for error in report["unread"]:
        lines += wrapped(f"not reviewed: {place_of(error)}: {error['message']}", indent=4, first="  - ")
    for remark in report["remarks"]:
        lines += wrapped(remark, indent=4, first="  - ")
    return [*lines, ""]
