"""A comparison of two revisions as lines of 80 columns."""

from __future__ import annotations

import json
from collections.abc import Sequence

from protlint.findings import LEVELS
from protlint.report.behaviour import ROLE_WORDS
from protlint.report.digest import place_of
from protlint.report.figures import UNKNOWN, counted, figure, percent
from protlint.report.layout import painted, wrapped
from protlint.report.safe import json_text, readable, throughout
from protlint.report.shape import CAUTION, Document

UNITS = {"carries_A": "A", "most_A": "A", "holds_A": "A", "damping": "", "pass_power_W": "W"}

WORDS = {
    "carries_A": "carries",
    "most_A": "most",
    "holds_A": "holds",
    "damping": "damping",
    "pass_power_W": "pass device, held short",
}

NEEDS = {
    "carry_A": ("carry", "A"), "cap_A": ("cap", "A"), "output_V": ("output", "V"), "short_s": ("short", "s"),
    "short_continuous": ("a continuous short", ""), "regulate_A": ("regulate", "A"),
}  # fmt: skip
"""Keys of the limits file by those of a report that differ from them, with their units."""

CHANGES = ("new", "risen", "gone")


def rendered_comparison(comparison: Document, *, colour: bool = False) -> str:
    """Return a comparison as text."""
    safe: Document = throughout(comparison, readable)
    lines = _together(safe, colour) if "boards" in safe else _board(safe, colour)
    return "\n".join([*lines, "", *wrapped(safe["caution"])]) + "\n"


def _together(comparison: Document, colour: bool) -> list[str]:
    """Tell of every board that changed, came or went; name the others."""
    boards = comparison["boards"]
    changed = [board for board in boards if _happened(board)]
    came, went = (sum(board[side] is None for board in boards) for side in ("before", "after"))
    still = [board for board in boards if not _happened(board)]
    same = [board["after"]["file"] for board in still if None not in (board["before"], board["after"])]
    counts = {"added": came, "removed": went, "changed": len(boards) - came - went - len(same), "unchanged": len(same)}
    said = ", ".join(f"{count} {word}" for word, count in counts.items() if count)
    whole = f"{len(boards)} boards together" if len(boards) > 1 else "1 board"
    title = f"{whole}: {said or 'none compared'}; {_counts(boards)}"
    lines = [painted(line, "heading", colour=colour) for line in wrapped(title, indent=2, first="")]
    for board in changed:
        lines += ["", *_board(board, colour)]
    added = [board["after"]["file"] for board in still if board["before"] is None]
    removed = [board["before"]["file"] for board in still if board["after"] is None]
    listed = {"Unchanged": same, "Added, without a limiter": added, "Removed, without a limiter": removed}
    for what, files in listed.items():
        lines += ["", *wrapped(f"{what}: {', '.join(files)}", indent=2, first="")] if files else []
    errors = [f"{place_of(error)}: {error['message']}" for error in comparison["not_compared"]]
    lines += _listed("Remarks that are new", comparison["remarks"]["new"], colour)
    return lines + _listed("Not compared", errors, colour)


def _listed(title: str, texts: Sequence[str], colour: bool) -> list[str]:
    """Return texts as items under a title, or nothing for none."""
    items = [line for text in texts for line in wrapped(text, indent=4, first="  - ")]
    return ["", painted(title, "heading", colour=colour), *items] if items else []


def _happened(board: Document) -> bool:
    """Tell whether there is more to say of a board than that it is there, or there no more."""
    kinds = (board["limiters"][word] for word in ("added", "removed", "changed"))
    new = board["remarks"]["new"] if board["before"] is not None else []
    return any((*kinds, *(board["findings"][word] for word in CHANGES), new))


def _board(comparison: Document, colour: bool) -> list[str]:
    limiters, findings = comparison["limiters"], comparison["findings"]
    before, after = comparison["before"], comparison["after"]
    if before is None:
        said = f"{after['file']}, added"
    elif after is None:
        said = f"{before['file']}, removed"
    else:
        said = f"{before['file']} to {after['file']}"
    title = f"{said}: {_counts([comparison])}"
    lines = [painted(line, "heading", colour=colour) for line in wrapped(title, indent=2, first="")]
    for word, drawn_wrong, instead in (
        ("added", "gone", "now a working limiter"),
        ("removed", "new", "no longer a working limiter"),
    ):
        faulty = {finding["limiter"] for finding in findings[drawn_wrong]}
        for limiter in limiters[word]:
            happened = instead if limiter["id"] in faulty else word
            text = f"{limiter['id']} {happened}: {limiter['topology']}, {limiter['verdict']}"
            lines += ["", *wrapped(text, indent=2, first="")]
    for change in limiters["changed"]:
        lines += ["", *_limiter(change, colour)]
    for word in CHANGES:
        lines += _findings(word, findings[word], colour)
    return lines + _listed("Remarks that are new", comparison["remarks"]["new"] if before is not None else [], colour)


def _counts(boards: Sequence[Document]) -> str:
    """Count what happened to limiters and findings over boards."""
    told = []
    for things, words in (("limiters", ("added", "removed", "changed")), ("findings", CHANGES)):
        counts = {word: sum(len(board[things][word]) for board in boards) for word in words}
        counts["unchanged"] = sum(board[things]["unchanged"] for board in boards)
        told.append(f"{things} {', '.join(f'{count} {word}' for word, count in counts.items() if count) or 'none'}")
    return "; ".join(told)


def rendered_comparison_json(comparison: Document) -> str:
    """Return a comparison as JSON text."""
    return json_text(json.dumps(comparison, ensure_ascii=False, indent=2, allow_nan=False)) + "\n"


def comparison_document(comparison: Document) -> Document:
    """Return a comparison with what every face carries."""
    return {**comparison, "caution": CAUTION}


def held_back_by(comparison: Document, gate: str) -> list[str]:
    """Return why a gate on new findings does not hold; what was less before and is an error now is a new error too."""
    if gate == "never":
        return []
    levels = [str(level) for level in LEVELS]
    boards = comparison.get("boards", [comparison])
    found = [finding for board in boards for word in ("new", "risen") for finding in board["findings"][word]]
    reasons = []
    for level in levels[: levels.index(gate.removeprefix("new:")) + 1]:
        count = sum(finding["level"] == level and finding["waived"] is None for finding in found)
        reasons += [f"{counted(count, f'new {level}')}"] if count else []
    return reasons


def _limiter(change: Document, colour: bool) -> list[str]:
    now = f" (now {change['after']})" if change["after"] != change["before"] else ""
    lines = [painted(line, "heading", colour=colour) for line in wrapped(f"{change['before']}{now}", indent=2, first="")]
    for key, pair in change["words"].items():
        lines += wrapped(f"{key}: {pair['before']}, now {pair['after']}", indent=4, first="  ")
    for name, pair in change["figures"].items():
        lines += wrapped(f"{WORDS[name]}: {_shift(pair, UNITS[name])}", indent=4, first="  ")
    for part in change["parts"]:
        lines += wrapped(_part(part), indent=4, first="  - ")
    if change["figures"] and not change["parts"]:
        lines += wrapped(
            "no part of it changed: what it is joined to, supplies, drive, part data or limits did", indent=4, first="  - "
        )
    for key, pair in change["needs"].items():
        name, unit = NEEDS.get(key, (key, ""))
        was, now = (_need(pair[side], unit) for side in ("before", "after"))
        lines += wrapped(f"limits file: {name} {was}, now {now}", indent=4, first="  - ")
    return lines


def _need(value: object, unit: str) -> str:
    if value is None or value is False or value == []:
        return "not stated"
    if isinstance(value, dict):
        return f"{figure(value['current_A'], 'A')} for {figure(value['lasts_s'], 's')}"
    if isinstance(value, list):
        return ", ".join(value)
    return "stated" if isinstance(value, bool) or not isinstance(value, int | float) else figure(value, unit)


def _shift(pair: Document, unit: str) -> str:
    was, now = pair["before"], pair["after"]
    shift = f" ({'+' if now > was else ''}{percent(now / was - 1.0)})" if was and now is not None else ""
    old, new = ("not known" if value is None else figure(value, unit) for value in (was, now))
    return f"{old}, now {new}{shift}"


def _part(part: Document) -> str:
    was, now = part["before"], part["after"]
    role = ROLE_WORDS[part["role"]]
    if was is None or now is None:
        return f"{role} {_named(now or was)} {'added' if was is None else 'gone'}"
    moved = part["moves_holds"]
    effect = f"; by itself it moves holds by {'+' if moved > 0 else ''}{percent(moved)}" if moved is not None else ""
    return f"{role} {_named(was)}, now {_named(now)}{effect}"


def _named(part: Document) -> str:
    value = figure(part["value"], part["unit"] or "") if part["value"] is not None else part["part_number"] or part["kind"]
    return f"{part['id']} {value or UNKNOWN}"


def _findings(word: str, findings: Sequence[Document], colour: bool) -> list[str]:
    lines: list[str] = []
    for finding in findings:
        level = finding["level"] if finding["waived"] is None else "waived"
        whom = f" {finding['limiter']}" if finding["limiter"] else ""
        lead = f"  {word:<6} {level:<7} "
        body = wrapped(f"{finding['check']}{whom}: {finding['message']}", indent=17, first=lead)
        body[0] = body[0].replace(f" {level} ", f" {painted(level, level, colour=colour)} ", 1)
        lines += body
    return ["", *lines] if lines else []
