"""What every command shares: one way out for text, one for errors, and the exit codes."""

from __future__ import annotations

import contextlib
import difflib
import os
import sys
import traceback
from collections.abc import Sequence
from pathlib import Path
from typing import TextIO

import click

from protlint.sources import FileError, ProtlintError

CANNOT = 2
"""The exit code where the work could not be done."""

TRACEBACK_VARIABLE = "PROTLINT_TRACEBACK"


class NearestGroup(click.Group):
    """A group that answers a mistyped command with the nearest right one."""

    def resolve_command(self, ctx: click.Context, args: list[str]) -> tuple[str | None, click.Command | None, list[str]]:
        """Return the command named first; see :meth:`click.Group.resolve_command`."""
        name = args[0] if args else ""
        if name and not name.startswith("-") and self.get_command(ctx, name) is None:
            known = self.list_commands(ctx)
            near = difflib.get_close_matches(name, known, n=1, cutoff=0.5)
            hint = f"did you mean {near[0]}?" if near else f"the commands are {', '.join(known)}"
            raise click.UsageError(f"no command is called {name!r}: {hint}", ctx)
        return super().resolve_command(ctx, args)


def run(commands: click.Command, arguments: Sequence[str] | None = None) -> int:
    """Run a command and return the exit code; whatever goes wrong becomes one line on standard error."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    try:
        code = commands.main(arguments, prog_name="protlint", standalone_mode=False)
        return code if isinstance(code, int) else 0
    except ProtlintError as error:
        complain(str(error))
        return error.exit_code
    except click.ClickException as error:
        complain(_usage(error))
    except (click.Abort, KeyboardInterrupt):
        complain("interrupted")
    except (MemoryError, RecursionError) as error:
        complain(f"the input needs more memory than there is ({type(error).__name__})")
    except Exception as error:
        complain(_fault(error))
    return CANNOT


def say(text: str) -> None:
    """Write text to standard output; a reader who has seen enough and closed the pipe is no error.

    Raises
    ------
    FileError : standard output takes no more, as on a full disk.
    """
    try:
        _write(sys.stdout, text)
    except BrokenPipeError:
        _silence(sys.stdout)
    except OSError as error:
        _silence(sys.stdout)
        raise FileError(f"cannot be written ({error.strerror})", file="<standard output>") from None


def complain(text: str) -> None:
    """Write an error to standard error, one line each, with whatever it quotes made harmless."""
    from protlint.report.safe import brief, terminal

    lines = "".join(terminal(brief(line)) + "\n" for line in text.split("\n"))
    try:
        _write(sys.stderr, lines)
    except OSError:
        _silence(sys.stderr)


def colour_wanted() -> bool:
    """Tell whether standard output is a terminal that takes colour; ``NO_COLOR`` (no-color.org) says no."""
    return bool(sys.stdout and sys.stdout.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb")


def _usage(error: click.ClickException) -> str:
    context = getattr(error, "ctx", None)
    path = context.command_path if context else "protlint"
    message = error.format_message()
    return f"{path}: {message[:1].lower()}{message[1:].rstrip('.')} ({path} --help shows what there is)"


def _fault(error: Exception) -> str:
    if os.environ.get(TRACEBACK_VARIABLE):
        return "".join(traceback.format_exception(error)).rstrip("\n")
    frames = traceback.extract_tb(error.__traceback__)
    place = f" at {Path(frames[-1].filename).name}:{frames[-1].lineno}" if frames else ""
    kind = type(error).__name__
    return f"protlint: a fault of its own ({kind}: {error}){place}; {TRACEBACK_VARIABLE}=1 shows the whole trace"


def _write(stream: TextIO | None, text: str) -> None:
    if stream is not None:
        stream.write(text)
        stream.flush()


def _silence(stream: TextIO) -> None:
    """Let what is still buffered, and what Python flushes at its end, go nowhere."""
    with contextlib.suppress(OSError, ValueError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())
