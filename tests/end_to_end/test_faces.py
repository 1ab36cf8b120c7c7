"""Every face through the installed command: the demo, the examples of the help texts, gates, waivers, many boards.

Where only the answer to a command line matters it is given to the command inside this process, which starts sooner.
"""

from __future__ import annotations

import json
import re
import shlex
import shutil
import subprocess
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest
from jsonschema import Draft202012Validator
from sarif_kit.validate import validation_errors

from protlint.cli import commands
from protlint.cli.shell import run
from tests.support.command import protlint
from tests.support.lamps import lamp_limits, lamp_netlist
from tests.support.paths import FIXTURES, ROOT
from tests.support.sample_review import HOSTILE

BOARD = "bench/lamps.edf"
DEMO = "bench/slipway-lamps.edf"
FILES = ("--limits", "bench/limits.toml", "--parts", "bench/parts.toml")
FACES = ("r.json", "r.sarif", "r.xml", "r.md")
SAVES = [option for face in FACES for option in ("--save", face)]


@pytest.fixture
def bench(tmp_path: Path) -> Path:
    """Return a folder with a board of one limiter, its limits file and part data in ``bench/``."""
    (tmp_path / "bench").mkdir()
    (tmp_path / BOARD).write_text(lamp_netlist(), encoding="utf-8")
    (tmp_path / "bench" / "limits.toml").write_text(lamp_limits(), encoding="utf-8")
    shutil.copy(FIXTURES / "demo" / "parts.toml", tmp_path / "bench")
    return tmp_path


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, subprocess.CompletedProcess[str]]:
    """Return a folder with the demo board reviewed and saved in every face, and what the review said."""
    folder = tmp_path_factory.mktemp("demo")
    assert protlint("demo", "bench", folder=folder).returncode == 0
    return folder, protlint("review", DEMO, *FILES, *SAVES, "--save", "issues/", folder=folder, PYTHONHASHSEED="0")


def report_in(path: Path) -> Any:
    return json.loads(path.read_text(encoding="utf-8"))


def answered(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, str, str]:
    """Return the exit code of a command line, and what it wrote to standard output and standard error."""
    capsys.readouterr()
    code = run(commands, list(arguments))
    return code, *capsys.readouterr()


def examples() -> list[str]:
    """Return the example commands of every help text, continued lines joined, in the order of the commands."""
    found = []
    for name in ("demo", "waive", "survey", "rules", "review", "compare"):
        text = (commands.commands[name].epilog or "").replace("\\\n", " ")
        found += [line.strip() for line in text.splitlines() if line.strip().startswith("protlint ")]
    return found


def test_the_examples_of_every_help_text_work(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """The board of one limiter stands in for the demo board, for speed, once the example that names a finding has run."""
    monkeypatch.chdir(tmp_path)
    lines = examples()
    assert {line.split()[1] for line in lines} == set(commands.commands)
    for line in lines:
        code, out, err = answered(capsys, *shlex.split(line)[1:])
        assert code in (0, 1), f"{line}: {err}"
        assert err == "", line
        assert out
        if line.startswith("protlint waive "):
            (tmp_path / DEMO).write_text(lamp_netlist(), encoding="utf-8")


def test_the_demo_says_what_to_run_and_that_works(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    _, said, _ = answered(capsys, "demo", "bench")
    lines = [line.strip() for line in said.splitlines() if line.startswith("  protlint ")]
    assert len(lines) == 3
    assert "invented" in said
    codes = {line.split()[1]: answered(capsys, *shlex.split(line)[1:])[0] for line in lines}
    assert codes == {"survey": 0, "review": 1, "rules": 0}


def test_the_demo_writes_over_nothing(tmp_path: Path) -> None:
    kept = tmp_path / "bench" / "limits.toml"
    kept.parent.mkdir()
    kept.write_text("# mine\n", encoding="utf-8")
    done = protlint("demo", "bench", folder=tmp_path)
    assert (done.returncode, kept.read_text(encoding="utf-8")) == (2, "# mine\n")
    assert re.fullmatch(r"bench/limits.toml: .*\n", done.stderr)


def test_every_face_of_the_demo_is_valid_and_says_the_same(
    demo: tuple[Path, subprocess.CompletedProcess[str]],
) -> None:
    bench, done = demo
    assert (done.returncode, done.stderr) == (1, "")
    report = report_in(bench / "r.json")
    schema = json.loads((ROOT / "protlint/report/review-1.schema.json").read_text(encoding="utf-8"))
    assert [error.message for error in Draft202012Validator(schema).iter_errors(report)] == []
    names = sorted(finding["fingerprint"] for finding in report["findings"])
    assert len(set(names)) == len(names) > 3
    log = report_in(bench / "r.sarif")
    assert validation_errors(log) == []
    assert sorted(result["partialFingerprints"]["protlint/v1"] for result in log["runs"][0]["results"]) == names
    assert sorted(path.stem for path in (bench / "issues").iterdir()) == names
    suites = ElementTree.fromstring((bench / "r.xml").read_bytes())
    errors = [finding for finding in report["findings"] if finding["level"] in ("error", "warning")]
    assert int(suites.get("failures", "0")) == len({(one["limiter"], one["check"]) for one in errors})
    for text in (done.stdout, (bench / "r.md").read_text(encoding="utf-8")):
        assert all(name in text.replace("\n          ", " ") for name in names)


def test_the_same_input_gives_the_same_bytes(demo: tuple[Path, subprocess.CompletedProcess[str]]) -> None:
    folder, first = demo
    before = {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()}
    again = protlint("review", DEMO, *FILES, *SAVES, "--save", "issues/", folder=folder, PYTHONHASHSEED="1")
    assert again.stdout == first.stdout
    assert {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()} == before
    assert not any(str(folder).encode() in content for content in before.values())


def test_a_board_elsewhere_gives_the_same_report_under_its_bare_name(
    bench: Path, tmp_path_factory: pytest.TempPathFactory
) -> None:
    other = tmp_path_factory.mktemp("elsewhere")
    for folder, target in ((bench / "bench", "a.json"), (other, "b.json")):
        files = [str(bench / file) if file.startswith("bench") else file for file in FILES]
        protlint("review", str(bench / BOARD), *files, "--save", str(bench / target), folder=folder)
    inside, outside = report_in(bench / "a.json"), report_in(bench / "b.json")
    assert inside["netlist"]["file"] == outside["netlist"]["file"] == "lamps.edf"
    assert inside == outside


def test_standard_input_is_read(bench: Path) -> None:
    content = (bench / BOARD).read_bytes()
    done = protlint("review", "-", *FILES, "--save", "in.json", folder=bench, input=content)
    assert done.returncode == 1
    protlint("review", BOARD, *FILES, "--save", "file.json", folder=bench)
    piped, read = report_in(bench / "in.json"), report_in(bench / "file.json")
    assert [one["currents"] for one in piped["limiters"]] == [one["currents"] for one in read["limiters"]]
    assert [one["fingerprint"] for one in piped["findings"]] == [one["fingerprint"] for one in read["findings"]]


def test_a_waiver_keeps_the_finding_and_opens_the_gate(
    bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(bench)
    assert answered(capsys, "review", BOARD, *FILES, "--save", "r.json")[::2] == (1, "")
    errors = [one["fingerprint"] for one in report_in(bench / "r.json")["findings"] if one["level"] == "error"]
    for name in errors:
        done = protlint("waive", BOARD, name, "--reason", "seen on the bench", "--by", "A. R.", "--until", "2099-01-01",
                        *FILES, folder=bench)  # fmt: skip
        assert done.returncode == 0, done.stderr
    options = ("--waivers", "waivers.toml", "--save", "r.json")
    assert answered(capsys, "review", BOARD, *FILES, *options, "--on", "2098-12-31")[0] == 0
    report = report_in(bench / "r.json")
    assert sorted(one["fingerprint"] for one in report["findings"] if one["waived"] == "seen on the bench") == sorted(errors)
    assert answered(capsys, "review", BOARD, *FILES, *options, "--on", "2099-01-02")[0] == 1
    assert len(report_in(bench / "r.json")["remarks"]) == len(errors)
    code, _, err = answered(capsys, "waive", BOARD, errors[0], "--reason", "x", "--by", "y", *FILES)
    assert (code, "already waived" in err) == (2, True)
    again = ("waive", BOARD, errors[0], "--reason", "x", "--by", "y", *FILES)
    code, _, err = answered(capsys, *again, "--board", "other.edf")
    assert (code, "--board other.edf is not the end of this file's name" in err) == (2, True)
    assert answered(capsys, *again, "--board", BOARD)[0] == 0  # another waiver: it speaks of one board only
    assert (bench / "waivers.toml").read_text(encoding="utf-8").count(f'board = "{BOARD}"') == 1
    code, _, err = answered(capsys, "waive", BOARD, errors[0][:-1], "--reason", "x", "--by", "y", *FILES)
    assert (code, f"did you mean {errors[0]}?" in err) == (2, True)


def test_boards_together_lose_none_and_an_unreadable_one_makes_exit_2(bench: Path) -> None:
    (bench / "bench" / "second.edf").write_text(lamp_netlist(sense="22R"), encoding="utf-8")
    for name in ("third", "fourth"):
        (bench / "bench" / f"{name}.edf").write_text(lamp_netlist(sense="10R"), encoding="utf-8")
    (bench / "bench" / "broken.edf").write_text("(edif broken", encoding="utf-8")
    done = protlint("review", "bench", *FILES, *SAVES, "--gate", "never", folder=bench)
    assert done.returncode == 2
    (line,) = done.stderr.splitlines()
    assert line.startswith("bench/broken.edf:1:")
    report = report_in(bench / "r.json")
    files = [f"bench/{name}.edf" for name in ("fourth", "lamps", "second", "third")]
    assert [board["netlist"]["file"] for board in report["boards"]] == files
    assert [one["file"] for one in report["unread"]] == ["bench/broken.edf"]
    assert validation_errors(report_in(bench / "r.sarif")) == []
    alone = protlint("review", BOARD, *FILES, "--save", "alone.json", folder=bench)
    assert report_in(bench / "alone.json") == report["boards"][1]
    assert alone.stdout.splitlines()[0] in done.stdout.splitlines()


def test_where_no_board_can_be_read_nothing_is_written(bench: Path) -> None:
    for name in ("a.edf", "b.edf"):
        (bench / name).write_text("", encoding="utf-8")
    (bench / "r.json").write_text("as it was", encoding="utf-8")
    done = protlint("review", "a.edf", "b.edf", "--save", "r.json", folder=bench)
    assert done.returncode == 2
    assert len(done.stderr.splitlines()) == 2
    assert (bench / "r.json").read_text(encoding="utf-8") == "as it was"


def test_a_revision_is_compared(bench: Path) -> None:
    names = {name: f"X{name}" for name in ("Q1", "Q1L", "R1S", "R1D", "BASE1", "SNS1", "LAMP1")}
    (bench / "renumbered.edf").write_text(lamp_netlist(names=names), encoding="utf-8")
    done = protlint("compare", BOARD, "renumbered.edf", *FILES, "--save", "c.json", folder=bench)
    assert (done.returncode, done.stderr) == (0, "")
    comparison = report_in(bench / "c.json")
    assert (comparison["limiters"]["changed"], comparison["findings"]["new"]) == ([], [])
    (bench / "worse.edf").write_text(lamp_netlist(sense="22R", names=names), encoding="utf-8")
    done = protlint("compare", BOARD, "worse.edf", *FILES, "--save", "c.json", folder=bench)
    assert done.returncode == 1
    (change,) = report_in(bench / "c.json")["limiters"]["changed"]
    assert [(part["role"], part["before"]["value"], part["after"]["value"]) for part in change["parts"]] == [
        ("sense", 2.2, 22.0)
    ]
    assert "carry-not-met" in {one["check"] for one in report_in(bench / "c.json")["findings"]["new"]}


def test_folders_of_boards_are_compared_board_by_board(
    bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(bench)
    for folder, boards in {"old": {"a": "2R2", "b": "10R"}, "new": {"a": "22R", "b": "10R", "c": "10R"}}.items():
        (bench / folder).mkdir()
        for name, sense in boards.items():
            text = lamp_netlist(sense=sense).replace("(design LAMPS", f"(design {name}")
            (bench / folder / f"{name}.edf").write_text(text, encoding="utf-8")
        assert answered(capsys, "review", folder, *FILES, "--save", f"{folder}.json", "--gate", "never")[0] == 0
    code, out, err = answered(capsys, "compare", "old", "new", *FILES, "--save", "c.json")
    assert (code, err) == (1, "")
    assert "Unchanged: new/b.edf" in out
    saved = (bench / "c.json").read_bytes()
    assert answered(capsys, "compare", "old.json", "new.json", "--save", "c.json") == (code, out, err)
    assert (bench / "c.json").read_bytes() == saved
    added = next(one for one in report_in(bench / "c.json")["boards"] if one["before"] is None)
    assert added["after"]["file"] == "new/c.edf"
    (bench / "new" / "b.edf").write_text("(edif broken", encoding="utf-8")
    code, out, err = answered(capsys, "compare", "old.json", "new", *FILES, "--gate", "never")
    assert (code, "Not compared" in out, err.startswith("new/b.edf:1:")) == (2, True, True)
    assert "b.edf, removed" not in out


@pytest.mark.parametrize(
    "arguments",
    [
        ("review", BOARD, "--limits", "in.md", "--save", "in.md"),
        ("review", BOARD, "--parts-list", "in.md", "--save", "./bench/../in.md"),
        ("review", "in.json", "--save", "in.json"),
        ("compare", "in.json", BOARD, "--save", "in.json"),
        ("compare", "in.json", BOARD, "--save", "link.json"),
    ],
)
def test_what_is_read_is_not_written_over(
    arguments: tuple[str, ...], bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(bench)
    for name in ("in.md", "in.json"):
        (bench / name).write_text("as it was", encoding="utf-8")
    (bench / "link.json").symlink_to("in.json")
    code, out, err = answered(capsys, *arguments)
    assert (code, out, err) == (2, "", f"{arguments[-1]}: this file is read: save under another name\n")
    assert {(bench / name).read_text(encoding="utf-8") for name in ("in.md", "in.json")} == {"as it was"}


BAD = {
    "empty": b"",
    "not EDIF": b"hello",
    "another version": b"(edif x (edifVersion 4 0 0) (edifLevel 0) (keywordMap (keywordLevel 0)))",
    "unbalanced": b"(edif x (edifVersion 2 0 0)",
    "unterminated": b'(edif x (edifVersion 2 0 0) (comment "x',
    "parentheses": b"(" * 200_000,
    "binary": bytes(range(256)) * 40,
}


@pytest.mark.parametrize("name", BAD)
def test_a_bad_netlist_is_one_clear_line_and_nothing_is_written(
    name: str, bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(bench)
    (bench / "bad.edf").write_bytes(BAD[name])
    (bench / "r.json").write_text("as it was", encoding="utf-8")
    code, out, err = answered(capsys, "review", "bad.edf", "--save", "r.json")
    assert (code, out) == (2, "")
    (line,) = err.splitlines()
    assert line.startswith("bad.edf:")
    assert (bench / "r.json").read_text(encoding="utf-8") == "as it was"


def test_the_installed_command_says_the_same_of_a_bad_netlist(bench: Path) -> None:
    (bench / "bad.edf").write_bytes(BAD["parentheses"])
    done = protlint("review", "bad.edf", folder=bench)
    assert (done.returncode, done.stdout) == (2, "")
    assert re.fullmatch(r"bad\.edf:\d+:\d+: .*\n", done.stderr)


@pytest.mark.parametrize(
    ("arguments", "place"),
    [
        (("review", "absent.edf"), "absent.edf: "),
        (("survey", "bench"), "bench: "),
        (("review", BOARD, "--limits", "absent.toml"), "absent.toml: "),
        (("review", BOARD, "--limits", "unknown-key.toml"), "unknown-key.toml:2:1: "),
        (("review", BOARD, "--limits", "wrong-unit.toml"), "wrong-unit.toml:2:"),
        (("review", BOARD, "--waivers", "unknown-key.toml"), "unknown-key.toml:1:"),
        (("review", BOARD, "--encoding", "no-such"), ""),
        (("review", ""), "a netlist without a name"),
        (("compare", "list.json", BOARD), "list.json: "),
        (("compare", "half.json", BOARD), "half.json:1:"),
        (("compare", "thin.json", BOARD), ""),
        (("compare", "boards.json", BOARD), ""),
        (("compare", "unread.json", BOARD), ""),
        (("rules", "--rules", "absent"), "absent: "),
    ],
)
def test_other_bad_input_is_one_clear_line(
    arguments: tuple[str, ...],
    place: str,
    bench: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(bench)
    texts = {
        "unknown-key.toml": '[board]\nambiend = ["-10 degC", "27 degC", "85 degC"]\n',
        "wrong-unit.toml": '[limiter.Q11]\ncarry = "0.7 V"\n',
        "list.json": "[]",
        "half.json": '{"report": 1,',
        "thin.json": '{"report": 1}',
        "boards.json": '{"report": 1, "boards": [[]]}',
        "unread.json": '{"report": 1, "boards": [], "unread": [{"file": "x.edf"}]}',
    }
    for file, text in texts.items():
        (bench / file).write_text(text, encoding="utf-8")
    code, out, err = answered(capsys, *arguments)
    assert (code, out) == (2, "")
    (line,) = err.splitlines()
    assert line.startswith(place)
    assert "Traceback" not in line


def test_hostile_names_in_a_netlist_act_in_no_face(bench: Path) -> None:
    hostile = [name for name in HOSTILE if "\ud800" not in name and "\0" not in name]
    names = {
        f"{kind}{number}{behind}": name + f"{kind}{number}{behind}"
        for number, name in enumerate(hostile, 1)
        for kind, behind in (("Q", ""), ("Q", "L"), ("R", "S"), ("LAMP", ""), ("BASE", ""), ("CMD", ""))
    }
    (bench / BOARD).write_text(lamp_netlist(len(hostile), names=names), encoding="utf-8")
    done = protlint("review", BOARD, "--parts", "bench/parts.toml", *SAVES, "--save", "issues/", folder=bench)
    assert (done.returncode, done.stderr) == (0, "")
    survey = protlint("survey", BOARD, "--save", "limits.toml", folder=bench)
    assert (survey.returncode, survey.stderr) == (0, "")
    again = protlint("survey", BOARD, "--limits", "limits.toml", "--save", "again.toml", folder=bench)
    assert (again.returncode, again.stderr) == (0, "")
    assert (bench / "again.toml").read_bytes() == (bench / "limits.toml").read_bytes()
    texts = [path.read_text(encoding="utf-8") for path in (*(bench / face for face in FACES), bench / "limits.toml")]
    texts += [path.read_text(encoding="utf-8") for path in (bench / "issues").iterdir()]
    assert len(texts) > 6
    for text in (done.stdout, survey.stdout, *texts):
        assert not re.search("[\x00-\x09\x0b-\x1f\x7f-\x9f\u200b-\u200f\u2028-\u202e\u2066-\u2069]", text)
        assert not re.search(r"^\s*::|##\w", text, re.MULTILINE)
    assert not any("</script>" in text for text in texts[:4])
    assert validation_errors(report_in(bench / "r.sarif")) == []
    ElementTree.fromstring((bench / "r.xml").read_bytes())
    found = {limiter["id"] for limiter in report_in(bench / "r.json")["limiters"]}
    assert found == {names[f"Q{number}"] for number in range(1, len(hostile) + 1)}


def test_a_board_of_two_hundred_limiters_is_readable_in_every_face(bench: Path) -> None:
    (bench / BOARD).write_text(lamp_netlist(200), encoding="utf-8")
    (bench / "bench" / "limits.toml").write_text(lamp_limits(200), encoding="utf-8")
    done = protlint("review", BOARD, *FILES, *SAVES, folder=bench)
    assert (done.returncode, done.stderr) == (1, "")
    report = report_in(bench / "r.json")
    assert report["summary"]["limiters"] == 200
    assert all(finding["fingerprint"] in done.stdout for finding in report["findings"])
    assert len(done.stdout.splitlines()) < 400
    assert len((bench / "r.md").read_text(encoding="utf-8")) <= 60_000
    assert validation_errors(report_in(bench / "r.sarif")) == []
