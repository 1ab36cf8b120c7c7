"""What several faces tell in the same way: order, counts, places, the gate, who rests on what, what needs which key."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator, Mapping, Sequence

from protlint.findings import FOR_WANT_OF, LEVELS, UNSOLVED, some_of
from protlint.report.figures import counted, figure
from protlint.report.shape import VERDICTS, Document, boards_of

Section = tuple[Document | None, str | None, list[Document]]
"""A limiter (None for findings of none), its id, and its findings."""

OF_SEVERAL = {"fails": "fail", "rests on assumptions": "rest on assumptions", "passes": "pass"}
"""Verdicts as they are said of several limiters."""

MOST_NAMES = 12
"""Names listed before the rest is counted."""

_DESIGNATORS = re.compile(r"\S*[A-Z]\S*\d\S*")
"""Names of parts in front of an assumption, of a bank with a plus between them: one word with a letter and a number."""

_OF_PART = re.compile(r"(?<= property of )[^\s,]+")
_KEY = re.compile(r"(\\?\[.+?\\?\]) (.+)")
"""A table of the limits file and its key, as ``[limiter.Q10] carry``; Markdown escapes the brackets."""


def summary_line(board: Document) -> str:
    """Return the count of limiters, verdicts and findings in one sentence."""
    summary = board["summary"]
    counts = {word: summary[word.replace(" ", "_")] for word in VERDICTS}
    verdicts = [f"{count} {word if count == 1 else OF_SEVERAL.get(word, word)}" for word, count in counts.items() if count]
    found = counted(summary["limiters"], "limiter") if summary["limiters"] else "no limiter found"
    parts = [found + (f" ({', '.join(verdicts)})" if verdicts else "")]
    parts += [counted(summary[f"{level}s"], level) for level in LEVELS]
    if summary["waived"]:
        parts.append(f"{summary['waived']} waived")
    if summary["not_checked"]:
        parts.append(f"{summary['not_checked']} not checked")
    return ", ".join(parts)


def sections(board: Document) -> list[Section]:
    """Return limiters with their findings, the worst first; findings of no limiter stand under the id they name."""
    by_id: dict[str | None, list[Document]] = {}
    for finding in board["findings"]:
        by_id.setdefault(finding["limiter"], []).append(finding)
    known = {limiter["id"] for limiter in board["limiters"]}
    groups: list[Section] = [(limiter, limiter["id"], by_id.get(limiter["id"], [])) for limiter in board["limiters"]]
    groups += [(None, name, found) for name, found in by_id.items() if name not in known]
    ordered = [(limiter, name, sorted(found, key=_finding_rank)) for limiter, name, found in groups]
    return sorted(ordered, key=_section_rank)


def held_back(report: Document, gate: str, *, complete: bool = False) -> list[str]:
    """Return why the gate does not hold, in a few words each; an empty list where it holds.

    A waived finding does not count. ``complete`` lets what was not checked, and limiters that were not judged, count too.
    """
    levels = LEVELS[: LEVELS.index(gate) + 1] if gate in LEVELS else ()
    reasons = []
    for level in levels:
        count = sum(board["summary"][f"{level}s"] for board in boards_of(report))
        if count:
            reasons.append(counted(count, level))
    for key in ("not_checked", "not_judged") if complete else ():
        count = sum(board["summary"][key] for board in boards_of(report))
        if count:
            reasons.append(f"{count} {key.replace('_', ' ')}")
    return reasons


def place_of(row: Document) -> str:
    """Return ``file:line:column`` of a finding, a warning or an error, as far as it has them."""
    return ":".join(str(row[key]) for key in ("file", "line", "column") if row.get(key) is not None)


def waiver_of(finding: Document) -> str:
    """Return the reason a finding is waived for, and who says so."""
    return f"{finding['waived']} ({finding['waived_by']})" if finding["waived_by"] else str(finding["waived"])


def times(count: int) -> str:
    """Return how often a warning was met, where that is more than once."""
    return f" ({count} times)" if count > 1 else ""


def working_line(line: Document) -> str:
    """Return one line of a calculation: what, how much where it is a figure, and from what."""
    source = f" ({line['source']})" if line["source"] else ""
    value = f"{figure(line['value'], line['unit'])}, " if line["value"] is not None else ""
    return f"{line['quantity']}: {value}{line['formula']}{source}"


def listed(names: Sequence[str], most: int = MOST_NAMES) -> str:
    """Return names joined by commas, the rest of a long list counted."""
    return some_of(names, most)


def alike(ordered: Sequence[Section]) -> list[list[Section]]:
    """Gather limiters that have the same figures and the same findings on parts of their own, as like channels do."""
    groups: dict[str, list[Section]] = {}
    for place, section in enumerate(ordered):
        limiter, _, found = section
        key = str(place) if limiter is None or limiter["not_solved"] else _likeness(limiter, found)
        groups.setdefault(key, []).append(section)
    return list(groups.values())


def assumptions(board: Document) -> list[str]:
    """Return every assumption once, with the parts or limiters it touches behind it.

    Sentences that differ in the names of a limiter's own nets alone are one assumption, told with the first one's names.
    """
    unlike: set[str] = set()
    said: dict[str, str] = {}
    touched: dict[str, list[str]] = {}
    for text in board["assumed"]:
        said[text], touched[text] = text, []
    for limiter in board["limiters"]:
        parts = {part["id"] for part in limiter["parts"]}
        for text in limiter["assumed"]:
            name, colon, rest = text.partition(": ")
            of_part = bool(colon) and (name in parts or _DESIGNATORS.fullmatch(name) is not None)
            sentence = rest if of_part else text
            key = _without_nets(sentence, limiter)
            if said.setdefault(key, sentence) != sentence:
                unlike.add(key)
            touched.setdefault(key, []).append(name if of_part else limiter["id"])
    told = []
    for key, names in touched.items():
        first, *others = dict.fromkeys(names) if names else ("",)
        every = f"{first}, and on nets of their own {listed(others)}" if key in unlike else listed([first, *others])
        told.append(f"{said[key]} ({every})" if names else said[key])
    return told


def _without_nets(text: str, limiter: Document) -> str:
    nets = {net: role for role, net in limiter["nets"].items() if net is not None}
    return " ".join(f"<{nets[word]}>" if word in nets else word for word in text.split(" "))


def _likeness(limiter: Document, found: Sequence[Document]) -> str:
    figures = [limiter[key] for key in ("topology", "polarity", "verdict", "needs", "currents", "regulates", "loop", "step")]
    checks = [row["check"] for row in limiter["not_checked"]]
    findings = [
        [one["check"], one["level"], one["assumption"], one["waived"], [line["value"] for line in one["working"]]]
        for one in found
    ]
    return json.dumps([figures, checks, findings])


def remarks(board: Document) -> list[str]:
    """Return what was met while reading, and what is owed to waivers and part data."""
    read = []
    for warning in board["warnings"]:
        place = place_of({**warning, "file": board["netlist"]["file"]})
        read.append(f"{place}: {warning['message']}{times(warning['count'])}")
    return [*read, *board["remarks"]]


def from_memory(board: Document) -> list[str]:
    """Name the part types whose figures come from memory, with their parts and the figures."""
    types: dict[str, tuple[list[str], list[str]]] = {}
    for limiter in board["limiters"]:
        for part in limiter["parts"]:
            if part["from_memory"]:
                parts, figures = types.setdefault(part["part_number"] or part["id"], ([], []))
                parts.append(part["id"])
                figures += part["from_memory"]
    return [
        f"{number} ({listed(list(dict.fromkeys(parts)))}): {', '.join(dict.fromkeys(figures))}"
        for number, (parts, figures) in types.items()
    ]


def unchecked(rows: Sequence[Document]) -> list[str]:
    """Return what is needed and the checks that need it: each need once, the keys of one table together."""
    checks: dict[str, list[str]] = {}
    for row in rows:
        checks.setdefault(row["needs"], []).append(row["check"])
    told: dict[str, list[str]] = {}
    for need, names in _parts_together({need: ", ".join(dict.fromkeys(names)) for need, names in checks.items()}):
        key = _KEY.match(need)
        if key is not None:
            told.setdefault(key[1], []).append(f"{key[2]} ({names})")
        else:
            told.setdefault(f"{need} ({names})", [])
    return [f"{start} {'; '.join(keys)}".rstrip() for start, keys in told.items()]


def left_open(limiter: Document) -> list[Document]:
    """Return what was not checked of a limiter but for what kept it from being solved, which is told by itself."""
    return [row for row in limiter["not_checked"] if not limiter["not_solved"] or row["check"] != UNSOLVED]


def unsolved(limiter: Document) -> str:
    """Return why a limiter was not solved, to follow a word that says so: ``for want of ...`` or ``: ...``."""
    why: str = limiter["not_solved"]
    return f" {why}" if why.startswith(FOR_WANT_OF) else f": {why}"


def _parts_together(needs: Mapping[str, str]) -> Iterator[tuple[str, str]]:
    """Yield needs with their checks; those that differ only in the part whose property is needed are one."""
    alike: dict[tuple[str, str], list[str]] = {}
    for need, names in needs.items():
        part = _OF_PART.search(need)
        blank = need if part is None else f"{need[: part.start()]}\0{need[part.end() :]}"
        alike.setdefault((blank, names), []).append(part.group() if part is not None else "")
    for (blank, names), parts in alike.items():
        yield blank.replace("\0", ", ".join(parts)), names


def sentence(finding: Document) -> str:
    """Return a finding's message with a capital, unless it begins with the name of a part or a net."""
    said: str = finding["message"]
    names = (*finding["parts"], *finding["nets"], finding["limiter"] or "")
    return said if any(name and said.startswith(name) for name in names) else said[:1].upper() + said[1:]


def _finding_rank(finding: Document) -> tuple[bool, int]:
    return finding["waived"] is not None, LEVELS.index(finding["level"])


def _section_rank(section: Section) -> tuple[int, int, bool]:
    """Rank by verdict, then by the worst finding that counts; what does not even limit stands before what fails."""
    limiter, _, found = section
    level = min((LEVELS.index(finding["level"]) for finding in found if finding["waived"] is None), default=len(LEVELS))
    if limiter is not None:
        return VERDICTS.index(limiter["verdict"]), level, True
    return VERDICTS.index("fails" if level < LEVELS.index("note") else "passes"), level, False
