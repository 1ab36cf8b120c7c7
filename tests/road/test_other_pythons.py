"""The same bytes under every other Python on this machine that has the program's libraries."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tests.support.paths import FIXTURES, ROOT

LIBRARIES = "import click, networkx, numpy, pint, sexpdata; print('all there')"
DEMO = FIXTURES / "demo"
FACES = ("r.json", "r.sarif", "r.xml", "r.md")


def usable(python: str) -> bool:
    if python == f"python{sys.version_info.major}.{sys.version_info.minor}" or shutil.which(python) is None:
        return False
    done = subprocess.run([python, "-c", LIBRARIES], capture_output=True, text=True, check=False, timeout=60)
    return done.stdout.strip() == "all there"


def written(python: str, folder: Path) -> dict[str, bytes]:
    """Return what a review of the demo board writes and says."""
    folder.mkdir()
    for path in DEMO.iterdir():
        shutil.copy(path, folder)
    saves = [option for face in FACES for option in ("--save", face)]
    command = [python, "-m", "protlint", "review", "slipway-lamps.edf", "--limits", "limits.toml", "--parts", "parts.toml"]
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONDONTWRITEBYTECODE": "1"}
    done = subprocess.run([*command, *saves], cwd=folder, env=environment, capture_output=True, check=False, timeout=300)
    assert done.returncode == 1, done.stderr
    return {"said": done.stdout, **{face: (folder / face).read_bytes() for face in FACES}}


def test_the_same_bytes(tmp_path: Path) -> None:
    others = [python for python in ("python3.11", "python3.12", "python3.13", "python3.14") if usable(python)]
    if not others:
        pytest.skip("SKIPPED: no other Python with the program's libraries is at hand, so the bytes were compared with none")
    ours = written(sys.executable, tmp_path / "ours")
    for python in others:
        assert written(python, tmp_path / python) == ours, python
