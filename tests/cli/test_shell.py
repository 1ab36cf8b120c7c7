"""The command line itself: what it loads, what it says when used wrongly, how it leaves."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path
from typing import Any, TextIO

import pytest

from protlint import pipeline
from protlint.cli import commands
from protlint.cli.many import ENDINGS
from protlint.cli.shell import TRACEBACK_VARIABLE, colour_wanted, run
from protlint.sources import FileError, InputError
from tests.support.paths import ROOT
from tests.support.sample_review import HOSTILE, sample_review

NAMES = sorted(commands.commands)

HEAVY = ("numpy", "networkx", "pint", "protlint.pipeline", "protlint.report.document")


@pytest.fixture
def reviewed(monkeypatch: pytest.MonkeyPatch) -> list[tuple[Any, Any]]:
    """Put the sample in the place of every review, and return the calls."""
    calls: list[tuple[Any, Any]] = []

    def review(*arguments: Any, **options: Any) -> pipeline.Review:
        calls.append((arguments, options))
        return sample_review(notes=2)

    monkeypatch.setattr(pipeline, "review", review)
    return calls


def protlint(*arguments: str, **options: Any) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "protlint", *arguments]
    return subprocess.run(command, capture_output=True, text=True, cwd=ROOT, timeout=60, check=False, **options)


@pytest.mark.parametrize("arguments", [["--help"], ["--version"], *([name, "--help"] for name in NAMES)])
def test_help_loads_click_and_little_else(arguments: list[str]) -> None:
    code = (
        "import sys, protlint.cli.shell as shell, protlint.cli as cli\n"
        f"code = shell.run(cli.commands, {arguments!r})\n"
        f"print('loaded', [name for name in {HEAVY!r} if name in sys.modules], code)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=ROOT, timeout=60, check=True)
    assert done.stdout.splitlines()[-1] == "loaded [] 0"


@pytest.mark.parametrize("name", NAMES)
def test_every_command_has_examples(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(commands, [name, "--help"]) == 0
    assert f"  protlint {name}" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("arguments", "nearest"),
    [
        (["revew", "x.edf"], "review"),
        (["surwey", "x.edf"], "survey"),
        (["review", "x.edf", "--limts", "y"], "--limits"),
        (["review", "x.edf", "--compleet"], "--complete"),
        (["review", "x.edf", "--gate", "eror"], "error"),
        (["rules", "emiter-sensed"], "emitter-sensed"),
        (["rules", "base-stop-abscent"], "base-stop-absent"),
        (["review"], "NETLIST"),
        (["review", "x.edf", "--on", "tomorrow"], "2027-06-30"),
        (["compare", "x.edf", "y.edf", "--gate", "error"], "new:error"),
    ],
)
def test_wrong_use_is_one_line_with_the_nearest_right_word(
    arguments: list[str], nearest: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(commands, arguments) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert len(shown.err.splitlines()) == 1
    assert nearest in shown.err


def test_no_command_shows_the_help_as_an_error(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(commands, []) == 2
    assert "Commands:" in capsys.readouterr().err


@pytest.mark.parametrize("target", ["x.pdf", "x", "absent/x.json"])
def test_what_cannot_be_saved_is_refused_before_any_work(
    target: str, reviewed: list[Any], capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(commands, ["review", "x.edf", "--save", target]) == 2
    assert reviewed == []
    assert capsys.readouterr().out == ""


@pytest.mark.parametrize(
    ("options", "code"),
    [
        ([], 1),
        (["--gate", "error"], 1),
        (["--gate", "note"], 1),
        (["--gate", "never"], 0),
        (["--gate", "never", "--complete"], 1),
    ],
)
def test_the_gate_decides_the_exit_code(
    options: list[str], code: int, reviewed: list[Any], capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(commands, ["review", "x.edf", *options]) == code
    last = capsys.readouterr().out.splitlines()[-1]
    assert last.startswith("The gate (") and ("does not hold" in last) == bool(code)


def test_options_reach_the_review(reviewed: list[Any], capsys: pytest.CaptureFixture[str]) -> None:
    options = "--limits l.toml --parts a.toml --parts b.toml --parts-list c.csv --waivers w.toml --rules r --on 2027-01-02"
    run(commands, ["review", "-", *options.split(), "--design", "D", "--encoding", "cp1252"])
    ((arguments, given),) = reviewed
    assert arguments == ("-",)
    on = given.pop("on")
    assert on.isoformat() == "2027-01-02"
    assert given == {
        "limits": "l.toml",
        "parts": ("a.toml", "b.toml"),
        "parts_list": "c.csv",
        "waivers": "w.toml",
        "rules": ("r",),
        "design": "D",
        "encoding": "cp1252",
    }


def test_the_day_that_waivers_are_judged_by_reaches_a_comparison(
    reviewed: list[Any], capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(commands, ["compare", "a.edf", "b.edf", "--waivers", "w.toml", "--on", "2027-01-02"]) == 0
    assert [(arguments, given["on"].isoformat()) for arguments, given in reviewed] == [
        (("a.edf",), "2027-01-02"),
        (("b.edf",), "2027-01-02"),
    ]


def test_faces_are_saved_beside_the_text(reviewed: list[Any], tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    names = ("a.json", "a.sarif", "a.xml", "a.md")
    saves = [option for name in names for option in ("--save", str(tmp_path / name))]
    run(commands, ["review", "x.edf", *saves, "--save", f"{tmp_path}/issues/"])
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted([*names, "issues"])
    assert json.loads((tmp_path / "a.json").read_text(encoding="utf-8"))["report"] == 1
    assert "Q10 fails" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("error", "shown"),
    [
        (InputError("not EDIF", file="x.edf", line=3, column=9), "x.edf:3:9: not EDIF"),
        (FileError("no such file", file="x.edf"), "x.edf: no such file"),
        (KeyboardInterrupt(), "interrupted"),
        (MemoryError(), "the input needs more memory than there is (MemoryError)"),
        (RecursionError(), "the input needs more memory than there is (RecursionError)"),
    ],
)
def test_whatever_goes_wrong_is_one_line_and_exit_2(
    error: BaseException, shown: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def failing(*_: Any, **__: Any) -> None:
        raise error

    monkeypatch.setattr(pipeline, "review", failing)
    assert run(commands, ["review", "x.edf"]) == 2
    captured = capsys.readouterr()
    assert (captured.out, captured.err.strip()) == ("", shown)


def test_a_fault_of_our_own_says_so_and_shows_its_trace_on_demand(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def failing(*_: Any, **__: Any) -> None:
        raise ZeroDivisionError("by zero")

    monkeypatch.setattr(pipeline, "review", failing)
    monkeypatch.delenv(TRACEBACK_VARIABLE, raising=False)
    assert run(commands, ["review", "x.edf"]) == 2
    (line,) = capsys.readouterr().err.splitlines()
    assert "ZeroDivisionError: by zero" in line
    monkeypatch.setenv(TRACEBACK_VARIABLE, "1")
    assert run(commands, ["review", "x.edf"]) == 2
    assert "Traceback" in capsys.readouterr().err


@pytest.mark.parametrize("name", HOSTILE)
def test_an_error_that_quotes_a_name_does_not_act(
    name: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def failing(*_: Any, **__: Any) -> None:
        raise InputError(f"the value of {name} cannot be read".replace("\n", " "), file="x.edf")

    monkeypatch.setattr(pipeline, "review", failing)
    assert run(commands, ["review", "x.edf"]) == 2
    shown = capsys.readouterr().err
    assert not set(shown) & set("\x1b\x00\x9b\u202e\ud800")
    assert not any(line.lstrip().startswith("::") or "##" in line for line in shown.splitlines())


def rules_into(stream: TextIO) -> subprocess.CompletedProcess[str]:
    """Run a command whose standard output goes into a stream."""
    command = [sys.executable, "-m", "protlint", "rules"]
    return subprocess.run(command, stdout=stream, stderr=subprocess.PIPE, text=True, cwd=ROOT, timeout=60, check=False)


def test_a_closed_pipe_is_no_error() -> None:
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "w") as stream:
        done = rules_into(stream)
    assert (done.returncode, done.stderr) == (0, "")


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this machine has no /dev/full to write to")
def test_a_full_disk_is_one_clear_error() -> None:
    with Path("/dev/full").open("w") as stream:
        done = rules_into(stream)
    assert done.returncode == 2
    (line,) = done.stderr.splitlines()
    assert line.startswith("<standard output>: cannot be written")


def test_output_that_an_encoding_lacks_is_escaped() -> None:
    done = protlint("rules", "Ω", env={**os.environ, "PYTHONIOENCODING": "ascii"})
    assert done.returncode == 2
    assert "\\u03a9" in done.stderr


@pytest.mark.parametrize(
    ("variables", "terminal", "wanted"),
    [({}, True, True), ({}, False, False), ({"NO_COLOR": "1"}, True, False), ({"TERM": "dumb"}, True, False)],
)
def test_colour_is_for_terminals(
    variables: dict[str, str], terminal: bool, wanted: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    for name in ("NO_COLOR", "TERM"):
        monkeypatch.delenv(name, raising=False)
    for name, value in variables.items():
        monkeypatch.setenv(name, value)
    monkeypatch.setattr(sys.stdout, "isatty", lambda: terminal, raising=False)
    assert colour_wanted() == wanted


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_completion_as_the_help_documents_it(shell: str) -> None:
    assert f"_PROTLINT_COMPLETE={shell}_source protlint" in protlint("--help").stdout
    script = protlint(env={**os.environ, "_PROTLINT_COMPLETE": f"{shell}_source"}) if shell != "bash" else None
    assert script is None or "protlint" in script.stdout
    words = (
        {"COMP_WORDS": "protlint re", "COMP_CWORD": "1"}
        if shell != "fish"
        else {"COMP_WORDS": "protlint re", "COMP_CWORD": "re"}
    )
    offered = protlint(env={**os.environ, "_PROTLINT_COMPLETE": f"{shell}_complete", **words})
    assert "review" in offered.stdout


def test_completion_knows_the_names_of_rules_options_and_levels() -> None:
    for words, offered in (
        ("rules base-stop-a", "base-stop-absent"),
        ("review --comp", "--complete"),
        ("review --gate e", "error"),
    ):
        count = str(len(words.split()))
        asked = {"_PROTLINT_COMPLETE": "bash_complete", "COMP_WORDS": f"protlint {words}", "COMP_CWORD": count}
        assert protlint(env={**os.environ, **asked}).stdout == f"plain,{offered}\n"


def test_the_commit_hook_names_a_command_and_the_files_it_is_for() -> None:
    text = (ROOT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8")
    entries = dict(re.findall(r"^(?:- |  )(\w+): (.*)$", text, re.MULTILINE))
    program, command = entries["entry"].split()
    assert (program, command in commands.commands) == ("protlint", True)
    pattern = re.compile(entries["files"].strip("'"))
    assert all(pattern.search(f"hardware/board{ending}") for ending in ENDINGS)
    assert not pattern.search("hardware/board.edf.txt")
