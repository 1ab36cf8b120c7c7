"""``protlint review``: the main job."""

from __future__ import annotations

from datetime import date

import click

from protlint.cli.options import as_date, reading_options
from protlint.cli.shell import colour_wanted, say

EXAMPLES = """\b
Examples:
  protlint review board.edf
  protlint review board.edf --limits limits.toml --parts parts.toml
  protlint review board.edf --limits limits.toml --save review.json --gate warning

Exit code: 0 the gate holds, 1 it does not, 2 the work could not be done.
"""


@click.command(short_help="Review every limiter of a board and say what is wrong.", epilog=EXAMPLES)
@click.argument("netlist", nargs=-1, required=True)
@reading_options
@click.option("--waivers", metavar="FILE", help="Findings that were looked at and accepted.")
@click.option("--on", metavar="DATE", callback=as_date, help="Judge waivers as on this day.")
@click.option("--save", metavar="FILE", multiple=True, help="Save the report too; the ending says how. Repeatable.")
@click.option("--gate", type=click.Choice(("error", "warning", "note", "never")), default="error", show_default=True,
              help="The least level that makes the exit code 1.")  # fmt: skip
@click.option("--complete", is_flag=True, help="What was not checked closes the gate too.")
def review(
    netlist: tuple[str, ...],
    limits: str | None,
    parts: tuple[str, ...],
    parts_list: str | None,
    rules: tuple[str, ...],
    design: str | None,
    encoding: str | None,
    waivers: str | None,
    on: date | None,
    save: tuple[str, ...],
    gate: str,
    complete: bool,
) -> int:
    """Review every limiter of a board: what it does, what is wrong, what could not be checked.

    NETLIST is an EDIF 2 0 0 file; - reads standard input.
    """
    from protlint.report import faces

    faces.check_targets(save)
    from protlint import pipeline
    from protlint.report.document import document
    from protlint.report.gate import held_back
    from protlint.report.text import rendered_text

    report = document(
        pipeline.review(
            netlist[0],
            limits=limits,
            parts=parts,
            parts_list=parts_list,
            waivers=waivers,
            rules=rules,
            design=design,
            encoding=encoding,
        )
    )
    text = rendered_text(report, colour=colour_wanted())
    faces.save(report, save)
    reasons = held_back(report, gate, complete=complete)
    verdict = f"does not hold: {', '.join(reasons)}" if reasons else "holds"
    say(f"{text}\nThe gate ({gate}) {verdict}.\n")
    return 1 if reasons else 0
