"""What README.md and DEVELOPERS.md say is so: blocks that load and run, options and files that are there."""

from __future__ import annotations

import re
import textwrap
from dataclasses import replace
from pathlib import Path

import pytest

from protlint.checks.catalogue import load_catalogue
from protlint.checks.derating import STANDARDS
from protlint.cli import commands
from protlint.findings import Finding
from protlint.limits_file import load_limits
from protlint.partdata.book import load_book
from protlint.report.document import document
from protlint.report.faces import FACES
from protlint.report.shape import combined
from protlint.waivers import load_waivers
from tests.support.lamps import lamp_limits, lamp_netlist
from tests.support.paths import ROOT
from tests.support.sample_review import sample_review

README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def block(heading: str) -> str:
    """Return the first indented block below a heading."""
    lines = README.split(f"## {heading}\n")[1].splitlines()
    first = next(place for place, line in enumerate(lines) if line.startswith("    "))
    last = next(
        (place for place, line in enumerate(lines[first:], first) if line and not line.startswith("    ")), len(lines)
    )
    return textwrap.dedent("\n".join(lines[first:last])) + "\n"


def test_it_opens_with_the_job_then_two_commands_that_need_only_python() -> None:
    title, job, *_ = README.split("\n\n")
    assert title == "# protlint"
    assert job.startswith("protlint reviews ")
    review, tests = (line for line in README.split("## Your own board")[0].splitlines() if line.startswith("    "))
    for command in (review, tests):
        assert command.strip().startswith("python3 -m venv .venv && .venv/bin/pip install --quiet ")
    assert all((ROOT / path).exists() for path in re.findall(r"fixtures/\S+", review))
    assert tests.endswith(".venv/bin/python -m pytest -q -n auto --dist loadfile")


def test_the_gate_runs_the_test_command_of_the_readme() -> None:
    gate = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "README.md" in gate
    first = next(line for line in README.splitlines() if "pytest" in line)
    assert first.strip().endswith("-m pytest -q -n auto --dist loadfile")


def test_the_limits_file_shown_is_one(tmp_path: Path) -> None:
    path = tmp_path / "limits.toml"
    path.write_text(block("The limits file"), encoding="utf-8")
    known = {name: row.thresholds.keys() for name, row in load_catalogue().items()}
    limits = load_limits(path, known_checks=known)
    assert limits.limiters["Q10"].carry_A == 0.7
    assert limits.assumed == ()
    assert all(f'"{name}"' in README for name in STANDARDS)


def test_the_part_data_shown_is_part_data(tmp_path: Path) -> None:
    path = tmp_path / "parts.toml"
    path.write_text(block("Part data"), encoding="utf-8")
    entry = load_book([path]).find("QSN1")
    assert entry is not None
    assert (entry.kind, entry.ratings["vceo"].value, entry.model["BF"]) == ("npn", 40.0, 200)


def test_the_waiver_shown_is_one(tmp_path: Path) -> None:
    path = tmp_path / "waivers.toml"
    text = README.split("by hand more can be said:\n")[1].split("\n\n`protlint compare")[0]
    path.write_text(textwrap.dedent(text), encoding="utf-8")
    (waiver,) = load_waivers(path).entries
    finding = Finding("base-stop-absent", "Q10", ("Q11",), "said", file="hardware/board.edf")
    assert waiver.covers(finding)
    assert not waiver.covers(replace(finding, file="hardware/other.edf"))


def test_the_python_shown_runs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "board.edf").write_text(lamp_netlist(sense="22R"), encoding="utf-8")
    (tmp_path / "limits.toml").write_text(lamp_limits(), encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    exec(compile(block("From Python"), "README.md", "exec"), {})
    assert any(line.split()[:2] == ["warning", "carry-not-met"] for line in capsys.readouterr().out.splitlines())


def test_every_option_and_command_named_is_there() -> None:
    options = {option for command in commands.commands.values() for parameter in command.params for option in parameter.opts}
    text = "\n".join(line for line in README.splitlines() if "pip install" not in line)
    assert set(re.findall(r"(?<![\w-])--[a-z][a-z-]+", text)) <= options | {"--help"}
    assert set(re.findall(r"`protlint ([a-z]+)", README + DEVELOPERS)) <= set(commands.commands)
    endings = re.findall(r"^\| `(\.[a-z]+)` \|", README, re.MULTILINE)
    assert endings == list(FACES)


def test_every_key_of_the_json_report_named_is_there() -> None:
    paragraph = README.split("The JSON report holds,")[1].split("\n\n")[0]
    report = document(sample_review())
    combination = combined([report])
    known = {*report, *report["limiters"][0], *report["findings"][0], *combination}
    named = set(re.findall(r"`(\w+)`", paragraph))
    assert len(named) > 15
    assert named <= known


def test_every_file_named_to_developers_is_there() -> None:
    named = {name for name in re.findall(r"`([\w/.-]+(?:\.py|\.toml|\.md|/))`", DEVELOPERS) if not name.startswith(".venv")}
    assert len(named) > 20
    for name in named:
        places = [ROOT / name, ROOT / "protlint" / name, *(ROOT / "protlint").glob(f"*/{name}"), *ROOT.glob(f"rules/{name}")]
        assert any(path.exists() for path in places), name
