"""What ``protlint rules`` shows: everything there is, and of each what, why, formula, figures and source."""

from __future__ import annotations

import re
import tomllib
from functools import cache

import pytest

from protlint import pipeline
from protlint.checks.catalogue import load_catalogue
from protlint.cli import commands
from protlint.cli.shell import run
from protlint.pipeline import Review
from protlint.report.figures import figure
from protlint.report.layout import COLUMNS, width
from protlint.report.rules_text import names_of, rendered_list, rendered_rule
from protlint.topology.language import load_rules
from tests.support.paths import FIXTURES

RULES, CATALOGUE = load_rules(), load_catalogue()
NAMES = names_of(RULES, CATALOGUE)


def words(text: str) -> str:
    return " ".join(text.split())


def test_the_list_names_everything() -> None:
    text = rendered_list(RULES, CATALOGUE)
    assert len(NAMES) > 10
    assert all(f"  {name}" in text for name in NAMES)
    assert max(width(line) for line in text.splitlines()) <= COLUMNS


@pytest.mark.parametrize("name", NAMES)
def test_each_is_shown_in_full(name: str) -> None:
    text = rendered_rule(name, RULES, CATALOGUE)
    assert max(width(line) for line in text.splitlines()) <= COLUMNS
    assert text.startswith(name)
    if name in CATALOGUE:
        row = CATALOGUE[name]
        for part in (row.why, row.formula, row.source, row.level, *row.thresholds):
            assert words(part) in words(text)
    for described in (RULES.topologies.get(name), RULES.faults.get(name)):
        if described is not None:
            for part in (described.says[1:], *described.cited, described.file):
                assert words(part) in words(text)
            assert all(line.strip() in text for line in described.drawing)


def test_a_fault_told_by_itself_speaks_of_parts_and_nets_not_of_placeholders() -> None:
    for fault in RULES.faults.values():
        assert "{" not in fault.says
        assert not re.search(r"\bthe (far|tap|take|near|load|mid|astray)\b|(the \w+) \2", fault.says), fault.says


@pytest.mark.parametrize("name", CATALOGUE)
def test_the_setting_shown_for_a_check_is_one_the_limits_file_takes(name: str) -> None:
    text = words(rendered_rule(name, RULES, CATALOGUE))
    setting = text.split("In the limits file: [checks] ")[1].replace(', or "off"', "")
    table = tomllib.loads(f"[checks]\n{setting}\n")["checks"][name]
    row = CATALOGUE[name]
    assert table == row.level or set(table) <= set(row.thresholds)


WITHOUT_FIGURES = {
    "collector-emitter-swapped", "base-emitter-swapped", "shunt-pins-exchanged", "shunt-pin-misplaced", "base-on-far-end",
    "shunt-polarity-wrong", "collector-not-on-the-drive", "wrong-device-sensed", "pass-pins-exchanged",
    "pass-polarity-wrong", "value-unreadable", "part-data-missing", "pins-unknown", "pin-on-two-nets",
    "designator-doubtful", "part-data-contradicts",
}  # fmt: skip
"""Checks of connections and texts: their working says what stands where, not how much."""


@pytest.mark.parametrize("check", ["base-stop-absent", "value-unreadable"])
def test_the_example_is_computed_there_and_then(check: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(commands, ["rules", check]) == 0
    finding = next(one for one in example(CATALOGUE[check].example).findings if one.check == check)
    assert words(finding.message) in words(capsys.readouterr().out)


@cache
def example(board: str) -> Review:
    """Return the review of an example board."""
    folder = FIXTURES / "examples"
    listed = folder / f"{board}.csv"
    return pipeline.review(
        folder / f"{board}.edf",
        limits=folder / f"{board}.toml",
        parts=folder / "parts.toml",
        parts_list=listed if listed.exists() else None,
    )


@pytest.mark.parametrize("check", CATALOGUE)
def test_every_check_shows_an_example_of_its_working_filled_in(
    check: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    board = CATALOGUE[check].example
    computed = example(board)  # once for all the checks that it is the example of
    monkeypatch.setattr(pipeline, "review", lambda path, **_: computed if path.stem == board else None)
    assert run(commands, ["rules", check]) == 0
    _, _, shown = words(capsys.readouterr().out).partition(f" example on {board}.edf, an invented board: ")
    finding = next(one for one in example(board).findings if one.check == check)
    assert shown.startswith(words(finding.message))
    assert finding.working
    for line in finding.working:
        value = f"{figure(line.value, line.unit)}, " if line.value is not None else ""
        assert words(f"{line.quantity}: {value}{line.formula}") in shown
    assert check in WITHOUT_FIGURES or any(line.value is not None for line in finding.working)
    assert words(finding.remedy or "") in shown
    assert finding.remedy or check == "compensation-absent"


@pytest.mark.parametrize("board", sorted({row.example for row in CATALOGUE.values()}))
def test_the_example_boards_state_what_their_limiters_need(board: str) -> None:
    """What is shown rests on what is stated, not on what was assumed; only unread.edf is there to lack things."""
    assert [one.check for one in example(board).findings if one.assumption] == []
