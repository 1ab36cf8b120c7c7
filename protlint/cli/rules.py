"""``protlint rules``: what protlint knows, and why."""

from __future__ import annotations

import difflib
from typing import TYPE_CHECKING

import click

from protlint.cli.options import PATH
from protlint.cli.shell import colour_wanted, say

if TYPE_CHECKING:
    from protlint.checks.catalogue import CheckRow

EXAMPLES = """\b
Examples:
  protlint rules
  protlint rules emitter-sensed
  protlint rules base-stop-absent
"""


def _beginning_with(_context: click.Context, _argument: click.Parameter, begun: str) -> list[str]:
    """Return the names that complete one that was begun, as click asks for them."""
    from protlint.checks.catalogue import load_catalogue
    from protlint.report.rules_text import names_of
    from protlint.topology.language import load_rules

    return [name for name in names_of(load_rules(), load_catalogue()) if name.startswith(begun)]


@click.command(short_help="List the topologies, faults and checks, or show one in full.", epilog=EXAMPLES)
@click.argument("name", required=False, shell_complete=_beginning_with)
@click.option("--rules", "folders", metavar="FOLDER", type=PATH, multiple=True, help="Rule files of your own. Repeatable.")
def rules(name: str | None, folders: tuple[str, ...]) -> int:
    """List the topologies, faults and checks, or show NAME in full: what, why, formula, thresholds, source.

    A check is shown with an example of its working, computed on a small board that comes with protlint.
    """
    from protlint.checks.catalogue import load_catalogue
    from protlint.report.rules_text import names_of, rendered_list, rendered_rule
    from protlint.topology.language import load_rules

    known, catalogue = load_rules(folders), load_catalogue()
    if name is None:
        say(rendered_list(known, catalogue, colour=colour_wanted()))
        return 0
    names = names_of(known, catalogue)
    if name not in names:
        near = difflib.get_close_matches(name, names, n=1, cutoff=0.5)
        hint = f"did you mean {near[0]}?" if near else "`protlint rules` lists them all"
        raise click.UsageError(f"no topology, fault or check is called {name!r}: {hint}")
    say(
        rendered_rule(name, known, catalogue, colour=colour_wanted())
        + (_example(catalogue[name]) if name in catalogue else "")
    )
    return 0


def _example(row: CheckRow) -> str:
    """Return what a check says of its example board, which is reviewed for it."""
    from protlint import pipeline
    from protlint.report.rules_text import rendered_example
    from protlint.sources import data_folder

    folder = data_folder("examples", "fixtures/examples")
    listed = folder / f"{row.example}.csv"
    review = pipeline.review(
        folder / f"{row.example}.edf",
        limits=folder / f"{row.example}.toml",
        parts=folder / "parts.toml",
        parts_list=listed if listed.exists() else None,
    )
    return "\n" + rendered_example(row, next(finding for finding in review.findings if finding.check == row.name))
