"""Several netlists: how they are gathered, what they go by, and how the work on them ends."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import time
from pathlib import Path

import pytest

from protlint.cli.many import called, cores, netlists_of
from protlint.sources import FileError
from tests.support.command import COMMAND, protlint
from tests.support.lamps import lamp_netlist


def test_netlists_are_gathered_from_folders_in_a_stable_order(tmp_path: Path) -> None:
    for name in ("b/two.EDF", "b/one.edif", "a.edn", "b/notes.txt", ".hidden/x.edf"):
        path = tmp_path / name
        path.parent.mkdir(exist_ok=True)
        path.write_text("", encoding="utf-8")
    paths, together = netlists_of([str(tmp_path), str(tmp_path / "a.edn")])
    assert [Path(path).relative_to(tmp_path).as_posix() for path in paths] == ["a.edn", "b/one.edif", "b/two.EDF"]
    assert together
    assert netlists_of(["x.edf", "./x.edf", "x.edf"]) == (["x.edf"], True)
    assert netlists_of(["x.edf"]) == (["x.edf"], False)
    assert netlists_of(["-"]) == (["-"], False)
    with pytest.raises(FileError):
        netlists_of([_empty(tmp_path)])


@pytest.mark.skipif(os.name != "posix", reason="SKIPPED: no links and no pipes here")
def test_a_link_that_leads_nowhere_is_told_and_pipes_are_read(tmp_path: Path) -> None:
    (tmp_path / "b").mkdir()
    (tmp_path / "b" / "gone.edf").symlink_to("nowhere.edf")
    (tmp_path / "b" / "round.edf").symlink_to("round.edf")
    (tmp_path / "b" / "up.edf").symlink_to("..")
    (tmp_path / "board.txt").write_text(lamp_netlist(), encoding="utf-8")
    line = f"{COMMAND} review b {' '.join(['<(cat board.txt)'] * 5)} --save r.json --gate never"
    done = subprocess.run(["bash", "-c", line], cwd=tmp_path, capture_output=True, text=True, timeout=300, check=False)
    assert done.returncode == 2
    assert done.stderr.splitlines()[0] == "b/gone.edf: no such file"
    assert done.stderr.splitlines()[1].startswith("b/round.edf: cannot be read (")
    assert len(done.stderr.splitlines()) == 2
    assert len(json.loads((tmp_path / "r.json").read_text(encoding="utf-8"))["boards"]) == 5


def _empty(folder: Path) -> str:
    (folder / "empty").mkdir()
    return str(folder / "empty")


def test_netlists_of_one_name_outside_the_working_folder_are_told_apart(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    paths = ["lamp.edf", "left/lamp.edf", "../left/lamp.edf", "../right/lamp.edf", "../other.edf"]
    names = ["lamp.edf", "left/lamp.edf", f"{tmp_path.name}/left/lamp.edf", "right/lamp.edf", "other.edf"]
    assert called(paths) == dict(zip(paths, names, strict=True))


def started(folder: Path) -> subprocess.Popen[bytes]:
    """Start a review of many boards in a session of its own, as a terminal would: interrupts are not ignored."""
    for number in range(24):
        (folder / f"b{number}.edf").write_text(lamp_netlist(sense=f"{number + 1}R"), encoding="utf-8")
    return subprocess.Popen(
        [str(COMMAND), "review", ".", "--save", "r.json"],
        cwd=folder,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        start_new_session=True,
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )


def left_over(session: int) -> list[str]:
    done = subprocess.run(["ps", "-o", "args=", "-g", str(session)], capture_output=True, text=True, check=False)
    return done.stdout.splitlines()


@pytest.mark.skipif(os.name != "posix" or shutil.which("ps") is None, reason="SKIPPED: no ps to look for processes with")
@pytest.mark.parametrize("how", [signal.SIGINT, signal.SIGTERM])
def test_an_end_from_outside_leaves_no_file_no_trace_and_no_process(how: signal.Signals, tmp_path: Path) -> None:
    """An interrupt comes to every process of a terminal's group, an order to end to the first one alone."""
    process = started(tmp_path)
    patience = time.monotonic() + 10.0
    while len(left_over(process.pid)) < 3 and time.monotonic() < patience:
        time.sleep(0.05)
    if how == signal.SIGINT:
        os.killpg(process.pid, how)
    else:
        process.send_signal(how)
    _, said = process.communicate(timeout=60)
    assert said.decode().split() == (["interrupted"] if how == signal.SIGINT else [])
    assert process.returncode == (2 if how == signal.SIGINT else 128 + how)
    assert not (tmp_path / "r.json").exists()
    patience = time.monotonic() + 60.0
    while left_over(process.pid) and time.monotonic() < patience:
        time.sleep(0.1)
    assert left_over(process.pid) == []


ENDED_FROM_OUTSIDE = """
import os, signal, sys

def end(event, arguments):
    if event == "open" and str(arguments[0]).endswith(("b3.edf", "b7.edf")):
        os.kill(os.getpid(), signal.SIGKILL)

sys.addaudithook(end)
"""
"""A ``sitecustomize`` that ends every process that opens one of two netlists, as a system short of memory would."""


@pytest.mark.skipif(
    os.name != "posix" or cores() == 1, reason="SKIPPED: no workers here, or no signal that ends one at once"
)
def test_a_netlist_that_ends_its_worker_is_the_only_one_lost(tmp_path: Path) -> None:
    for number in range(9):
        (tmp_path / f"b{number}.edf").write_text(lamp_netlist(sense=f"{number + 1}R"), encoding="utf-8")
    (tmp_path / "site").mkdir()
    (tmp_path / "site" / "sitecustomize.py").write_text(ENDED_FROM_OUTSIDE, encoding="utf-8")
    done = protlint("review", ".", "--save", "r.json", folder=tmp_path, PYTHONPATH=str(tmp_path / "site"))
    assert done.returncode == 2
    said = "its review ended abruptly twice, perhaps for want of memory"
    assert done.stderr.splitlines() == [f"{name}: {said}" for name in ("b3.edf", "b7.edf")]
    report = json.loads((tmp_path / "r.json").read_text(encoding="utf-8"))
    assert [board["netlist"]["file"] for board in report["boards"]] == [f"b{number}.edf" for number in (0, 1, 2, 4, 5, 6, 8)]
    assert [error["file"] for error in report["unread"]] == ["b3.edf", "b7.edf"]
