"""The rules and checks as text: a list of all, and one in full."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict
from typing import TYPE_CHECKING

from protlint.checks.catalogue import CheckRow
from protlint.findings import Finding
from protlint.report.digest import working_line
from protlint.report.figures import figure
from protlint.report.layout import painted, width, wrapped
from protlint.report.safe import terminal

if TYPE_CHECKING:
    from protlint.topology.language import Described, Rules

NAME_COLUMN = 30


def names_of(rules: Rules, catalogue: Mapping[str, CheckRow]) -> list[str]:
    """Return everything that can be shown: topologies, faults, checks."""
    return list(dict.fromkeys([*rules.topologies, *rules.faults, *catalogue]))


def rendered_list(rules: Rules, catalogue: Mapping[str, CheckRow], *, colour: bool = False) -> str:
    """Return the list of topologies, faults and checks, a line or two each."""
    lines: list[str] = []
    for title, described in (("Topologies", rules.topologies), ("Faults", rules.faults)):
        if described:
            lines += [painted(title, "heading", colour=colour)]
            lines += [line for one in described.values() for line in _entry(one.name, one.says)]
            lines += [""]
    checks = [row for row in catalogue.values() if row.name not in rules.faults]
    lines += [painted("Checks", "heading", colour=colour)]
    lines += [line for row in checks for line in _entry(row.name, f"{row.level}: {row.says}")]
    lines += ["", *wrapped("`protlint rules NAME` shows one in full.")]
    return "\n".join(lines) + "\n"


def rendered_rule(name: str, rules: Rules, catalogue: Mapping[str, CheckRow], *, colour: bool = False) -> str:
    """Return a topology, a fault or a check in full; a fault that is a check as well is shown as both."""
    blocks: list[list[str]] = []
    for kind, known in (("topology", rules.topologies), ("fault", rules.faults)):
        if name in known:
            blocks.append(_described(known[name], kind, colour))
    if name in catalogue:
        blocks.append(_check(catalogue[name], colour))
    return "\n\n".join("\n".join(block) for block in blocks) + "\n"


def rendered_example(row: CheckRow, finding: Finding) -> str:
    """Return what a check said of its example board, with its working filled in."""
    lines = _fact("example", f"on {row.example}.edf, an invented board: {finding.message}")
    for line in finding.working:
        lines += wrapped(terminal(working_line(asdict(line))), indent=16, first=" " * 14)
    if finding.remedy:
        lines += wrapped(f"remedy: {terminal(finding.remedy)}", indent=16, first=" " * 14)
    return "\n".join(lines) + "\n"


def _entry(name: str, says: str) -> list[str]:
    """Return a name with what it says beside it, or below it where the name is long."""
    shown = terminal(name)
    if width(shown) > NAME_COLUMN - 4:
        return [*wrapped(shown, indent=4, first="  "), *wrapped(terminal(says), indent=NAME_COLUMN)]
    return wrapped(terminal(says), indent=NAME_COLUMN, first=f"  {shown:<{NAME_COLUMN - 2}}")


def _described(one: Described, kind: str, colour: bool) -> list[str]:
    lines = [painted(f"{terminal(one.name)}, a {kind}", "heading", colour=colour), ""]
    lines += wrapped(_sentence(one.says), indent=2, first="  ")
    if one.drawing:
        lines += ["", *(f"    {terminal(line)}".rstrip() for line in one.drawing)]
    facts = (
        ("used in", one.used),
        ("both ways", "NPN or N-channel, and PNP or P-channel as its mirror" if one.both_polarities else ""),
        ("spoils" if kind == "fault" else "builds on", ", ".join(one.builds_on)),
        ("published", "; ".join(one.cited)),
        ("rule file", one.file),
    )
    lines += [""]
    for title, text in facts:
        lines += _fact(title, text) if text else []
    if one.clauses:
        lines += ["", "  parts and joins"]
        for clause in one.clauses:
            shown = terminal(clause)
            indent = 4 + width(shown) - width(shown.lstrip())
            lines += wrapped(shown, indent=indent + 2, first=" " * indent)
    return lines


def _check(row: CheckRow, colour: bool) -> list[str]:
    lines = [painted(f"{row.name}, a check", "heading", colour=colour), ""]
    lines += wrapped(_sentence(row.says), indent=2, first="  ")
    lines += [""]
    for title, text in (("level", row.level), ("why", row.why), ("formula", row.formula)):
        lines += _fact(title, text)
    for name, limit in row.thresholds.items():
        lines += _fact("threshold", f"{name} = {figure(limit.value, limit.unit)}: {limit.says}")
    lines += _fact("source", row.source)
    for role, figures in row.figures.items():
        lines += _fact("part data", f"{', '.join(figures)} of the {role.replace('_', ' ')}")
    lines += ["", *wrapped(f"In the limits file: [checks] {row.name} = {_example(row)}", indent=4, first="  ")]
    return lines


def _example(row: CheckRow) -> str:
    """Show how the check is set: its level, or a threshold where it has one."""
    for name, limit in row.thresholds.items():
        value = figure(limit.value, limit.unit)
        return f"{{ {name} = {value if not limit.unit else chr(34) + value + chr(34)} }}"
    return f'"{row.level}", or "off"'


def _fact(title: str, text: str) -> list[str]:
    return wrapped(terminal(text), indent=14, first=f"  {title:<12}")


def _sentence(text: str) -> str:
    return terminal(text[:1].upper() + text[1:].rstrip(".") + ".")
