"""``protlint compare``: what a revision changed."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import click

from protlint.cli.options import PATH, as_date, reading_options
from protlint.cli.shell import colour_wanted, say
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
    """Compare two revisions, each a netlist or a JSON report.

    Limiters are matched by structure: renumbered designators and renamed nets make no noise.
    """
    if save is not None and Path(save).suffix.lower() != ".json":
        raise UsageError("a comparison to save ends in .json", file=save)
    from protlint import compare as comparing
    from protlint.report.compare_text import (
        comparison_document,
        held_back_by,
        rendered_comparison,
        rendered_comparison_json,
    )

    reports = [_report(path, reading) for path in (before, after)]
    try:
        comparison = comparison_document(comparing.compare(*reports))
    except (KeyError, TypeError, IndexError, AttributeError, ValueError):
        raise InputError("one of them is no report of this version: review it again", file=f"{before}, {after}") from None
    text = rendered_comparison(comparison, colour=colour_wanted())
    if save is not None:
        write_whole(save, rendered_comparison_json(comparison))
    reasons = held_back_by(comparison, gate)
    verdict = f"does not hold: {', '.join(reasons)}" if reasons else "holds"
    say(f"{text}\nThe gate ({gate}) {verdict}.\n")
    return int(bool(reasons))


def _report(path: str, reading: dict[str, Any]) -> dict[str, Any]:
    """Return a report: read from JSON, or made of a netlist.

    Raises
    ------
    InputError : it is JSON, but not a report of a single netlist.
    """
    if Path(path).suffix.lower() == ".json":
        return _read_report(path)
    from protlint import pipeline
    from protlint.report.document import document

    return document(pipeline.review(path, **reading))


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
    if "boards" in report:
        raise InputError("a report of several netlists; compare their single reports", file=name)
    return report
