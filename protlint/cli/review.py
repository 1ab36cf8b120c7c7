"""``protlint review``: the main job."""

from __future__ import annotations

from typing import Any

import click

from protlint.cli.options import PATH, as_date, named_files, reading_options, refuse_to_write_over
from protlint.cli.shell import CANNOT, colour_wanted, complain, say

EXAMPLES = """\b
Examples (`protlint demo bench` writes the files):
  protlint review bench/slipway-lamps.edf --limits bench/limits.toml --parts bench/parts.toml
  protlint review bench/slipway-lamps.edf --save review.json --save review.sarif --gate warning
  protlint review bench --save issues/ --gate never

\b
Exit code: 0 the gate holds, 1 it does not, 2 the work could not be done.
"""


@click.command(short_help="Review every limiter of a board and say what is wrong.", epilog=EXAMPLES)
@click.argument("netlist", nargs=-1, required=True, type=PATH)
@reading_options
@click.option("--waivers", metavar="FILE", type=PATH, help="Findings that were looked at and accepted.")
@click.option("--on", metavar="DATE", callback=as_date, help="Judge waivers as on this day.")
@click.option(
    "--save",
    metavar="FILE",
    type=PATH,
    multiple=True,
    help="Save it as .json .sarif .xml or .md, or as texts in a folder/. Repeatable.",
)
@click.option("--gate", type=click.Choice(("error", "warning", "note", "never")), default="error", show_default=True,
              help="The least level that makes the exit code 1.")  # fmt: skip
@click.option("--complete", is_flag=True, help="What was not checked closes the gate too.")
def review(netlist: tuple[str, ...], save: tuple[str, ...], gate: str, complete: bool, **files: Any) -> int:
    """Review every limiter of a board: what it does, what is wrong, what could not be checked.

    NETLIST is an EDIF 2 0 0 file; - reads standard input. Several netlists, and folders of them, are reviewed on all
    cores and make one report; one that cannot be read does not lose the others.
    """
    from protlint.report import faces

    faces.check_targets(save)
    refuse_to_write_over(save, (*netlist, *named_files(files)))
    from protlint.cli.many import errors_of, reviewed
    from protlint.report.digest import held_back
    from protlint.report.text import rendered_text

    reading = {name: files.pop(name) for name in ("design", "encoding")}
    report = reviewed(netlist, files, reading)
    unread = report.get("unread", [])
    text = rendered_text(report, colour=colour_wanted())
    if len(unread) < report["summary"].get("boards", 1):
        faces.save(report, save)
    reasons = held_back(report, gate, complete=complete)
    verdict = f"does not hold: {', '.join(reasons)}" if reasons else "holds"
    say(f"{text}\nThe gate ({gate}) {verdict}.\n")
    for line in errors_of(unread):
        complain(line)
    return CANNOT if unread else int(bool(reasons))
