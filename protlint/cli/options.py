"""Options that several commands take, in the same words."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping
from datetime import date
from typing import Any

import click

from protlint.sources import UsageError

Command = Callable[..., Any]

PATH = click.Path(allow_dash=True)
"""A file's name as it is written; whether it is there, its reader tells. The type lets shells complete it."""


def reading_options(command: Command) -> Command:
    """Add the options that say how a netlist is read and what is known besides it."""
    for option in reversed(
        (
            click.option("--limits", metavar="FILE", type=PATH, help="Supplies, drive, and what each limiter must carry."),
            click.option("--parts", metavar="FILE", type=PATH, multiple=True, help="Part data of your own. Repeatable."),
            click.option("--parts-list", metavar="CSV", type=PATH, help="Values and part numbers by designator."),
            click.option("--rules", metavar="FOLDER", type=PATH, multiple=True, help="Rule files of your own. Repeatable."),
            click.option("--design", metavar="NAME", help="Which design of the file, where it holds several."),
            click.option("--encoding", metavar="NAME", help="How the file's text is coded (else UTF-8, else cp1252)."),
        )
    ):
        command = option(command)
    return command


def as_date(_context: click.Context, _option: click.Parameter, text: str | None) -> date | None:
    """Return the date an option gives, as click's callbacks do."""
    if text is None:
        return None
    try:
        return date.fromisoformat(text)
    except ValueError:
        raise click.BadParameter(f"{text!r} is no date: write it as 2027-06-30") from None


FILES = ("limits", "parts", "parts_list", "waivers")
"""The options that name files to be read, as commands are given them."""


def named_files(options: Mapping[str, Any]) -> list[str]:
    """Return the files that options name."""
    given = [options.get(name) for name in FILES]
    return [file for one in given if one for file in ([one] if isinstance(one, str) else one)]


def refuse_to_write_over(targets: Iterable[str], inputs: Iterable[str]) -> None:
    """Refuse to save over what is read.

    Raises
    ------
    UsageError : a file to save is one of the inputs, be it by another name.
    """
    read = {os.path.realpath(file) for file in inputs}
    for target in targets:
        if os.path.realpath(target) in read:
            raise UsageError("this file is read: save under another name", file=target)
