"""The installed command, run as a user runs it."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

COMMAND = Path(sys.executable).with_name("protlint")
"""The console script of the environment that runs the tests."""


def protlint(
    *arguments: str, folder: Path, input: bytes | None = None, **variables: str
) -> subprocess.CompletedProcess[str]:
    """Run ``protlint`` in a folder and return what it wrote and its exit code."""
    script = [str(COMMAND)] if COMMAND.exists() else [sys.executable, "-m", "protlint"]
    done = subprocess.run(
        [*script, *arguments],
        capture_output=True,
        cwd=folder,
        input=input,
        timeout=300,
        check=False,
        env={**os.environ, **variables},
    )
    return subprocess.CompletedProcess(done.args, done.returncode, done.stdout.decode("utf-8"), done.stderr.decode("utf-8"))
