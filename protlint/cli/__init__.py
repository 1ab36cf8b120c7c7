"""The command line: parse, call the pipeline, print. No electronics here.

Only click is imported at the top of these modules; everything else is loaded by the command that needs it.
"""

from __future__ import annotations

import click

from protlint import __version__
from protlint.cli.compare import compare
from protlint.cli.demo import demo
from protlint.cli.review import review
from protlint.cli.rules import rules
from protlint.cli.shell import CANNOT, NearestGroup, complain, run
from protlint.cli.survey import survey
from protlint.cli.waive import waive

EPILOG = """`protlint COMMAND --help` shows a command's options with examples. A good start: protlint demo bench

\b
Completion of commands and options, in the start-up file of a shell:
  bash  eval "$(_PROTLINT_COMPLETE=bash_source protlint)"
  zsh   eval "$(_PROTLINT_COMPLETE=zsh_source protlint)"
  fish  _PROTLINT_COMPLETE=fish_source protlint | source
"""


@click.group(
    cls=NearestGroup,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog=EPILOG,
)
@click.version_option(__version__, prog_name="protlint", message="%(prog)s %(version)s")
@click.pass_context
def commands(context: click.Context) -> int:
    """Find every protective current limiter in an EDIF 2 0 0 netlist, solve it, and say what is wrong with it.

    A review aid for qualified people: a limiter is no fuse; local codes and licensed practice decide.
    """
    if context.invoked_subcommand is not None:
        return 0
    complain(context.get_help())
    return CANNOT


for command in (review, survey, rules, demo, waive, compare):
    commands.add_command(command)


def main() -> None:
    """Run the command line and leave with its exit code: 0 the gate holds, 1 it does not, 2 the work could not be done."""
    raise SystemExit(run(commands))
