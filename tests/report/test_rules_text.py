"""What ``protlint rules`` shows: everything there is, and of each what, why, formula, figures and source."""

from __future__ import annotations

import re
import tomllib

import pytest

from protlint.checks.catalogue import load_catalogue
from protlint.report.layout import COLUMNS, width
from protlint.report.rules_text import names_of, rendered_example, rendered_list, rendered_rule
from protlint.topology.language import load_rules
from tests.support.sample_review import sample_review

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


def test_an_example_shows_the_working_filled_in() -> None:
    text = rendered_example(sample_review().findings[0])
    assert "carries: 0.282 A, 0.482 V / (R11 = 1 ohm)" in words(text)
    assert "invented" in text
