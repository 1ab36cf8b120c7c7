"""The same bytes under another Python: the newest on this machine, with libraries of its own."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

from tests.support.paths import FIXTURES, ROOT

DEMO = FIXTURES / "demo"
FACES = ("r.json", "r.sarif", "r.xml", "r.md")
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
LEAST = int(PROJECT["requires-python"].removeprefix(">=3."))


def another() -> str | None:
    """Return the newest other Python that protlint is for, from the path or, where pyenv keeps several, from there."""
    kept = Path(os.environ.get("PYENV_ROOT", Path.home() / ".pyenv")) / "versions"
    places = [shutil.which(f"python3.{minor}") for minor in range(LEAST, LEAST + 10)]
    places += [str(kept / name / "bin/python") for name in _versions(kept)]
    found: list[tuple[int, str]] = []
    for python in filter(None, places):
        asked = [python, "-c", "import sys, venv, ensurepip; print(*sys.version_info[:2])"]
        done = subprocess.run(asked, capture_output=True, text=True, check=False, timeout=60)
        version = re.fullmatch(r"3 (\d+)\n", done.stdout)
        if version is not None and int(version[1]) >= LEAST and int(version[1]) != sys.version_info.minor:
            found.append((int(version[1]), python))
    return max(found)[1] if found else None


def _versions(kept: Path) -> list[str]:
    names = [path.name for path in kept.iterdir()] if kept.is_dir() else []
    return sorted(name for name in names if (kept / name / "bin/python").exists())


@pytest.fixture(scope="module")
def other(tmp_path_factory: pytest.TempPathFactory) -> str:
    """Return another Python with the program's libraries; skip, loudly, where there is none."""
    python = another()
    if python is None:
        pytest.skip("SKIPPED: no other Python is at hand, so the bytes were compared with none")
    folder = tmp_path_factory.mktemp("other")
    subprocess.run([python, "-m", "venv", str(folder)], check=True, capture_output=True, timeout=300)
    install = [str(folder / "bin/python"), "-m", "pip", "install", "--quiet", *PROJECT["dependencies"]]
    done = subprocess.run(install, capture_output=True, text=True, check=False, timeout=300)
    if done.returncode:
        pytest.skip(f"SKIPPED: {python} gets no libraries here, so the bytes were compared with none: {done.stderr[-300:]}")
    return str(folder / "bin/python")


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


@pytest.mark.skipif(os.name != "posix", reason="SKIPPED: another Python is looked for where POSIX systems have it")
def test_the_same_bytes(other: str, tmp_path: Path) -> None:
    assert written(other, tmp_path / "other") == written(sys.executable, tmp_path / "ours")
