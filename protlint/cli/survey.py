"""``protlint survey``: what was found on a board and what is missing."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from protlint.cli.options import PATH, reading_options
from protlint.cli.shell import colour_wanted, say
from protlint.sources import UsageError, shown_name, write_whole

EXAMPLES = """\b
Examples (`protlint demo bench` writes the files):
  protlint survey bench/slipway-lamps.edf
  protlint survey bench/slipway-lamps.edf --parts bench/parts.toml --save limits.toml
"""


@click.command(short_help="Show what was read and found, and what is missing.", epilog=EXAMPLES)
@click.argument("netlist", type=PATH)
@reading_options
@click.option("--save", metavar="LIMITS.toml", type=PATH, help="Begin a limits file, with blanks for what is not known.")
def survey(netlist: str, save: str | None, **reading: Any) -> int:
    """Show what was read of a board, each limiter found on it, and what is missing.

    NETLIST is an EDIF 2 0 0 file; - reads standard input.
    """
    _refuse(save)
    from protlint import pipeline
    from protlint.report.skeleton import rendered_skeleton
    from protlint.report.survey import survey as surveyed
    from protlint.report.survey_text import rendered_survey

    review = pipeline.review(netlist, **reading)
    text = rendered_survey(surveyed(review), colour=colour_wanted())
    if save is not None:
        write_whole(save, rendered_skeleton(review))
        text += f"\nA limits file was begun in {shown_name(save)}.\n"
    say(text)
    return 0


def _refuse(save: str | None) -> None:
    """Refuse a file that is no limits file, and one that stands: a designer may have filled it in."""
    if save is None:
        return
    if Path(save).suffix.lower() != ".toml":
        raise UsageError("a limits file to save ends in .toml", file=save)
    if Path(save).exists():
        raise UsageError("this file is there already; it is not written over", file=save)
