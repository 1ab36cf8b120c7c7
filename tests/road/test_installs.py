"""A wheel in an empty folder and the tests' own installation find protlint's rules, part data and demo board."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from protlint.sources import data_folder
from tests.support.paths import ROOT


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build the wheel from a copy of the checkout; skip, loudly, where the build tools cannot be had."""
    folder = tmp_path_factory.mktemp("wheel")
    kept = ("protlint", "rules", "fixtures/demo", "fixtures/examples", "README.md", "pyproject.toml")
    for name in kept:
        source, target = ROOT / name, folder / "source" / name
        target.parent.mkdir(parents=True, exist_ok=True)
        if source.is_dir():
            shutil.copytree(source, target, ignore=shutil.ignore_patterns("__pycache__"))
        else:
            shutil.copy(source, target)
    build = [sys.executable, "-m", "pip", "wheel", "-q", "--no-deps", "-w", str(folder), str(folder / "source")]
    done = subprocess.run(build, capture_output=True, text=True, check=False, timeout=300)
    if done.returncode:
        pytest.skip(f"SKIPPED: no wheel could be built here (is there a package index?): {done.stderr[-300:]}")
    return next(folder.glob("*.whl"))


def test_a_wheel_in_an_empty_folder_works(wheel: Path, tmp_path: Path) -> None:
    site, empty = tmp_path / "site", tmp_path / "empty"
    empty.mkdir()
    with zipfile.ZipFile(wheel) as packed:
        packed.extractall(site)
    environment = {**os.environ, "PYTHONPATH": str(site)}

    def run(*arguments: str) -> subprocess.CompletedProcess[str]:
        command = [sys.executable, "-m", "protlint", *arguments]
        return subprocess.run(command, cwd=empty, env=environment, capture_output=True, text=True, check=False, timeout=300)

    where = [sys.executable, "-c", "import protlint; print(protlint.__file__)"]
    loaded = subprocess.run(where, cwd=empty, env=environment, capture_output=True, text=True, check=True)
    assert loaded.stdout.startswith(str(site))
    assert run("demo", "bench").returncode == 0
    board = sorted((empty / "bench").glob("*.edf"))[0]
    reviewed = run(
        "review", str(board), "--limits", "bench/limits.toml", "--parts", "bench/parts.toml", "--save", "review.json"
    )
    assert reviewed.returncode == 1, reviewed.stderr
    assert (empty / "review.json").exists()
    assert "emitter-sensed" in run("rules").stdout
    assert "on worn-sink.edf" in run("rules", "base-stop-low").stdout


def test_the_installation_under_test_reads_the_checkouts_own_rules() -> None:
    assert data_folder("rules") == ROOT / "rules"
    assert data_folder("demo", "fixtures/demo") == ROOT / "fixtures/demo"
