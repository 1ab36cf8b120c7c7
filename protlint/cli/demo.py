"""``protlint demo``: a small board with faults, to try everything on."""

from __future__ import annotations

import shlex
from pathlib import Path

import click

from protlint.cli.options import PATH
from protlint.cli.shell import say
from protlint.sources import FileError, UsageError, data_folder, shown_name, write_whole

EXAMPLES = """\b
Example:
  protlint demo bench
"""


@click.command(short_help="Write a small faulty board to try everything on.", epilog=EXAMPLES)
@click.argument("folder", type=PATH)
def demo(folder: str) -> int:
    """Write a small board with faults, its limits file and part data into FOLDER, and say what to run next.

    The board is invented. No file that is there already is written over.
    """
    source = data_folder("demo", "fixtures/demo")
    target = Path(folder)
    files = sorted(path for path in source.iterdir() if path.is_file() and not path.name.startswith("."))
    for path in files:
        if (target / path.name).exists():
            raise UsageError("this file is there already; it is not written over", file=shown_name(target / path.name))
    try:
        target.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise FileError(f"cannot be written ({error.strerror})", file=shown_name(folder)) from None
    for path in files:
        write_whole(target / path.name, path.read_bytes().decode("utf-8"))
    say(_what_next(target, [path.name for path in files]))
    return 0


def _what_next(target: Path, names: list[str]) -> str:
    """Name the commands that fit the files written, in the order a newcomer would run them."""
    shown = shlex.quote(target.as_posix())
    board = next((name for name in names if name.endswith((".edf", ".edif", ".edn"))), "")
    options = "".join(
        f" --{option} {shown}/{name}"
        for option, word in (("limits", "limits"), ("parts", "parts"))
        for name in names
        if name.endswith(".toml") and word in name
    )
    return (
        f"Written to {shown}: {', '.join(names)}\n"
        "The board is invented. Run next:\n"
        f"  protlint survey {shown}/{board}\n"
        f"  protlint review {shown}/{board}{options}\n"
        "  protlint rules\n"
    )
