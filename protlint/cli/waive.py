"""``protlint waive``: accept a finding, with a reason and a name."""

from __future__ import annotations

import difflib
import shlex
from datetime import date
from typing import Any

import click

from protlint.cli.options import PATH, as_date, reading_options
from protlint.cli.shell import say
from protlint.sources import UsageError, shown_name

EXAMPLES = """\b
Example (`protlint demo bench` writes the files):
  protlint waive bench/slipway-lamps.edf carry-not-met-06991bc01d11 \\
    --limits bench/limits.toml --parts bench/parts.toml \\
    --reason "the lamps are 2 W types" --by "A. Reviewer"
"""


@click.command(short_help="Accept a finding, with a reason and a name.", epilog=EXAMPLES)
@click.argument("netlist", type=PATH)
@click.argument("fingerprint")
@click.option("--reason", required=True, help="Why the finding is accepted.")
@click.option("--by", required=True, help="Who accepts it.")
@click.option("--until", metavar="DATE", callback=as_date, help="The last day on which it is accepted.")
@click.option("--board", metavar="PATH", help="For boards whose file's name ends so, where one file serves several.")
@click.option("--waivers", metavar="FILE", type=PATH, default="waivers.toml", show_default=True, help="The file to add to.")
@reading_options
def waive(
    netlist: str, fingerprint: str, reason: str, by: str, until: date | None, board: str | None, waivers: str, **reading: Any
) -> int:
    """Add a waiver for the finding FINGERPRINT of NETLIST; what stands in the waivers file stays as it is.

    The board is reviewed with the options given, so that only a finding that is there can be waived.
    """
    for name, text in (("--reason", reason), ("--by", by)):
        if not text.strip():
            raise click.UsageError(f"{name} is empty")
    from protlint import pipeline
    from protlint.waivers import Waiver, add_waiver

    review = pipeline.review(netlist, **reading)
    names = [finding.fingerprint for finding in review.findings]
    if fingerprint not in names:
        near = difflib.get_close_matches(fingerprint.lower(), names, n=1)
        hint = f"; did you mean {near[0]}?" if near else "; `protlint review` ends each finding with what it is called"
        raise UsageError(f"no finding of this board is called {fingerprint}{hint}", file=review.board.netlist.file)
    waiver = Waiver(reason=reason, by=by, fingerprint=fingerprint, board=board, until=until)
    if not any(waiver.covers(finding) for finding in review.findings):
        raise UsageError(f"--board {board} is not the end of this file's name", file=review.board.netlist.file)
    add_waiver(waivers, waiver)
    say(f"Added to {shown_name(waivers)}: {fingerprint}\nReview with --waivers {shlex.quote(waivers)} from now on.\n")
    return 0
