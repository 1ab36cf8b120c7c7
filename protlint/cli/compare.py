"""``protlint compare``: what a revision changed."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import click

from protlint.cli.options import PATH, as_date, named_files, reading_options, refuse_to_write_over
from protlint.cli.shell import CANNOT, colour_wanted, complain, say
from protlint.sources import InputError, UsageError, read_bytes, write_whole

EXAMPLES = """\b
Examples (`protlint demo bench` writes the files):
  protlint review bench/slipway-lamps.edf --limits bench/limits.toml --save before.json --gate never
  protlint compare before.json bench/slipway-lamps.edf --limits bench/limits.toml --gate new:warning

\b
A JSON report is what `protlint review --save before.json` wrote.
Exit code: 0 the gate holds, 1 it does not, 2 the work could not be done.
"""

LARGEST_REPORT = 500_000_000
"""Bytes; a report is twice its netlist at most, of which 250 MB are read."""

GATES = ("new:error", "new:warning", "new:note", "never")


@click.command(short_help="Show what a revision changed, limiter by limiter.", epilog=EXAMPLES)
@click.argument("before", type=PATH)
@click.argument("after", type=PATH)
@reading_options
@click.option("--waivers", metavar="FILE", type=PATH, help="Findings that were looked at and accepted.")
@click.option("--on", metavar="DATE", callback=as_date, help="Judge waivers as on this day.")
@click.option("--save", metavar="FILE.json", type=PATH, help="Save the comparison too.")
@click.option("--gate", type=click.Choice(GATES), default="new:error", show_default=True,
              help="The least level of a new finding that makes the exit code 1.")  # fmt: skip
def compare(before: str, after: str, save: str | None, gate: str, **reading: Any) -> int:
    """Compare two revisions, each a netlist, a JSON report, or a folder of netlists.

    Limiters are matched by structure: renumbered designators and renamed nets make no noise. Of several netlists, in
    folders or in a report on several, those whose files are called alike are compared.
    """
    targets = [save] if save is not None else []
    if save is not None and Path(save).suffix.lower() != ".json":
        raise UsageError("a comparison to save ends in .json", file=save)
    refuse_to_write_over(targets, (before, after, *named_files(reading)))
    from protlint import compare as comparing
    from protlint.cli.many import errors_of
    from protlint.report.compare_text import (
        comparison_document,
        held_back_by,
        rendered_comparison,
        rendered_comparison_json,
    )
    from protlint.report.shape import combined

    how = {name: reading.pop(name) for name in ("design", "encoding")}
    reports = [_report(path, reading, how) for path in (before, after)]
    several = any("boards" in report for report in reports)
    try:
        if several:
            reports = [report if "boards" in report else combined([report]) for report in reports]
        comparison = comparison_document((comparing.compare_together if several else comparing.compare)(*reports))
        text = rendered_comparison(comparison, colour=colour_wanted())
        unread = errors_of(comparison.get("not_compared", []))
    except (KeyError, TypeError, IndexError, AttributeError, ValueError):
        raise InputError("one of them is no report of this version: review it again", file=f"{before}, {after}") from None
    for target in targets:
        write_whole(target, rendered_comparison_json(comparison))
    reasons = held_back_by(comparison, gate)
    verdict = f"does not hold: {', '.join(reasons)}" if reasons else "holds"
    say(f"{text}\nThe gate ({gate}) {verdict}.\n")
    for line in unread:
        complain(line)
    return CANNOT if unread else int(bool(reasons))


def _report(path: str, files: dict[str, Any], reading: dict[str, Any]) -> dict[str, Any]:
    """Return a report: read from JSON, or made of a netlist or a folder of them."""
    if Path(path).suffix.lower() == ".json":
        return _read_report(path)
    from protlint.cli.many import reviewed

    return reviewed((path,), files, reading)


def _read_report(path: str) -> dict[str, Any]:
    content, name = read_bytes(path, limit=LARGEST_REPORT)
    try:
        report = json.loads(content)
    except json.JSONDecodeError as error:
        raise InputError(f"not JSON: {error.msg}", file=name, line=error.lineno, column=error.colno) from None
    except (UnicodeDecodeError, RecursionError):
        raise InputError("not JSON", file=name) from None
    if not isinstance(report, dict) or report.get("report") != 1:
        raise InputError("not a protlint report, version 1", file=name)
    return report
