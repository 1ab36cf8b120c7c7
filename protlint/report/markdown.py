"""The report as Markdown, short enough for a comment on a pull request."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.findings import LEVELS
from protlint.report.digest import (
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
    working_line,
)
from protlint.report.figures import UNKNOWN, ambient, figure, triple, unit_for
from protlint.report.memory import remembered, resting
from protlint.report.safe import markdown, throughout
from protlint.report.shape import Document, boards_of

MOST_CHARACTERS = 60_000
"""Code hosts cut or refuse comments of more than 65,536 characters."""

MOST_ERRORS, MOST_UNREAD = 40, 50
"""Errors, and files that could not be reviewed, as many as a table of boards is followed by."""

BUDGETS = ((True, 10_000), (False, 10_000), (False, 60), (False, 12))
"""Tried in turn until the text is short enough: with or without working, and the most findings of a level to list."""


def rendered_markdown(report: Document) -> str:
    """Return the report as Markdown; what had to be left out to keep it short is said."""
    safe: Document = throughout(report, markdown)
    text = ""
    for working, most in BUDGETS:
        boards = zip(boards_of(safe), boards_of(report), strict=True)
        lines = [line for board, raw in boards for line in _board(board, raw, working, most)]
        lines += _unread(safe.get("unread", []))
        lines += _folded("Remarks", [f"- {text}" for text in safe["remarks"]]) if "boards" in safe else []
        text = "\n".join([*lines, f"_{safe['caution']}_"]) + "\n"
        if len(text) <= MOST_CHARACTERS:
            return text
    return _brief(safe)


def _brief(report: Document) -> str:
    """Return a table of the boards, the worst first, and the errors, as far as it all stays short."""
    boards = sorted(boards_of(report), key=lambda board: [-board["summary"][f"{level}s"] for level in LEVELS])
    counted = ("limiters", "errors", "warnings", "notes", "waived", "not_checked")
    head = [
        f"## protlint: {len(boards)} {'board' if len(boards) == 1 else 'boards'}",
        "",
        summary_line(report) + ".",
        "",
        f"| board | {' | '.join(name.replace('_', ' ') for name in counted)} |",
        f"|{'---|' * (len(counted) + 1)}",
    ]
    errors = [one for board in boards for one in board["findings"] if one["level"] == "error" and one["waived"] is None]
    listed = _findings("Errors", errors, False, MOST_ERRORS, folded=False)
    if len("\n".join(listed)) > MOST_CHARACTERS // 2:
        listed = []
    foot = ["", *listed, *_unread(report.get("unread", [])[:MOST_UNREAD]), f"_{report['caution']}_"]
    room = MOST_CHARACTERS - len("\n".join([*head, *foot])) - 100
    rows: list[str] = []
    for board in boards:
        row = f"| {board['netlist']['file']} | {' | '.join(str(board['summary'][name]) for name in counted)} |"
        room -= len(row) + 1
        if room < 0:
            break
        rows.append(row)
    more = [f"\nand {len(boards) - len(rows)} more boards; the JSON report has them all"] if len(rows) < len(boards) else []
    return "\n".join([*head, *rows, *more, *foot]) + "\n"


def _finding_lines(finding: Document, *, working: bool = True) -> list[str]:
    """Return one finding as a list item with its working below it; the texts in it are escaped already."""
    parts = f" ({', '.join(finding['parts'])})" if finding["parts"] else ""
    whom = f"**{finding['limiter']}**" if finding["limiter"] else "**the board**"
    lines = [f"- {whom}{parts}: {finding['check']}. {sentence(finding)}"]
    if finding["waived"] is not None:
        lines.append(f"  Waived: {waiver_of(finding)}")
    lines += [f"  Remedy: {finding['remedy']}"] if finding["remedy"] else []
    lines += ["  Rests on an assumption."] if finding["assumption"] else []
    lines = [*(f"{line}  " for line in lines), f"  {place_of(finding)} {finding['fingerprint']}"]
    return lines + ([f"  - {working_line(line)}" for line in finding["working"]] if working else [])


def _board(board: Document, raw: Document, working: bool, most: int) -> list[str]:
    """Show one board; ``raw`` is the same before its texts were escaped, for what is looked up by name."""
    lines = [f"## protlint: {board['netlist']['file']}", "", summary_line(board) + ".", ""]
    lines += _limiters(board)
    for level in LEVELS:
        found = [one for one in board["findings"] if one["level"] == level and one["waived"] is None]
        lines += _findings(f"{level.capitalize()}s", found, working, most, folded=level == "note")
    waived = [one for one in board["findings"] if one["waived"] is not None]
    lines += _findings("Waived", waived, False, most, folded=True)
    lines += _folded("Not checked", [f"- {text}" for text in _not_checked(board)])
    lines += _folded("Assumed", [f"- {text}" for text in assumptions(board)])
    lines += _folded("From memory, to be held against a data sheet", [f"- {text}" for text in from_memory(board)])
    rests = [markdown(f"{limiter['id']}: {text}") for limiter in raw["limiters"] for text in resting(limiter)]
    lines += _folded("What rests on figures from memory", [f"- {text}" for text in rests])
    lines += _folded("Remarks", [f"- {text}" for text in remarks(board)])
    return lines


def _limiters(board: Document) -> list[str]:
    """Show every limiter in a row, the worst first."""
    rows = [limiter for limiter, _, _ in sections(board) if limiter is not None]
    if not rows:
        return []
    usual = rows[0]["currents"][1]["ambient_degC"]
    title = ("limiter", "verdict", "topology", "carries at least", "needed", "most", "cap", f"holds at {ambient(usual)}")
    lines = [f"| {' | '.join(title)} |", f"|{'---|' * len(title)}"]
    for limiter in rows:
        hand, needs, row = limiter["in_hand"], limiter["needs"], limiter["currents"][1]
        unit, scale = unit_for([row["holds_A"]], "A")
        ends = [end / scale for end in row["holds_range_A"]] if row["holds_range_A"] else None
        holds = f"{triple(ends, row['holds_A'] / scale)} {unit}" if row["holds_A"] is not None else UNKNOWN
        cells = (
            limiter["id"],
            limiter["verdict"] + remembered(limiter),
            limiter["topology"],
            figure(hand["least_carries_A"], "A"),
            figure(needs["carry_A"], "A"),
            figure(hand["greatest_most_A"], "A"),
            figure(needs["cap_A"], "A"),
            holds,
        )
        lines.append(f"| {' | '.join(cells)} |")
    return [*lines, ""]


def _findings(title: str, found: Sequence[Document], working: bool, most: int, *, folded: bool) -> list[str]:
    if not found:
        return []
    lines = [line for finding in found[:most] for line in _finding_lines(finding, working=working)]
    if len(found) > most:
        lines.append(f"- and {len(found) - most} more; the JSON report has them all")
    title = f"{title} ({len(found)})"
    return _folded(title, lines) if folded else [f"### {title}", "", *lines, ""]


def _folded(title: str, lines: Sequence[str]) -> list[str]:
    """Fold lines away under a title (HTML that the usual Markdown hosts know), or return nothing for none."""
    return [f"<details><summary>{title}</summary>", "", *lines, "", "</details>", ""] if lines else []


def _not_checked(board: Document) -> list[str]:
    texts = [f"the board, for want of {need}" for need in unchecked(board["not_checked"])]
    for limiter in board["limiters"]:
        texts += [f"{limiter['id']} was not solved{unsolved(limiter)}"] if limiter["not_solved"] else []
        texts += [f"{limiter['id']}, for want of {need}" for need in unchecked(left_open(limiter))]
    return texts


def _unread(errors: Sequence[Document]) -> list[str]:
    if not errors:
        return []
    return ["## Not reviewed", "", *(f"- {place_of(error)}: {error['message']}" for error in errors), ""]
