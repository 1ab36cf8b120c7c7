"""Whatever is in a netlist, the whole road ends in a review or in one clear error: odd files, and damaged boards."""

from __future__ import annotations

import os
import random
from pathlib import Path

import pytest

from protlint.pipeline import review
from protlint.report.survey import survey
from protlint.report.survey_text import rendered_survey
from protlint.sources import ProtlintError
from tests.support.damage import cut_up, rearranged
from tests.support.paths import FIXTURES

ODD = sorted((FIXTURES / "netlist" / "valid").glob("*.edf"))
BOARDS = sorted((FIXTURES / "circuits").glob("*.edf"))
DAMAGED = int(os.environ.get("PROTLINT_DAMAGED_BOARDS", "40"))
"""How many damaged boards to review."""


@pytest.mark.parametrize("path", ODD, ids=lambda path: path.stem)
def test_an_odd_file_is_surveyed(path: Path) -> None:
    text = rendered_survey(survey(review(path)))
    assert "How it was read" in text
    assert max(map(len, text.splitlines())) <= 80


def test_a_damaged_board_is_reviewed_or_refused(tmp_path: Path) -> None:
    chance = random.Random(20260504)
    damaged = tmp_path / "damaged.edf"
    reviewed = limiters = 0
    for number in range(DAMAGED):
        damage = cut_up if number % 4 == 0 else rearranged
        damaged.write_bytes(damage(chance.choice(BOARDS).read_bytes(), chance))
        try:
            found = review(damaged)
        except ProtlintError as error:
            assert "\n" not in str(error)
        else:
            reviewed += 1
            limiters += len(found.limiters)
            rendered_survey(survey(found))
    print(f"\n{DAMAGED} damaged boards: {reviewed} reviewed with {limiters} limiters, {DAMAGED - reviewed} refused")
    assert 0 < reviewed < DAMAGED
    assert limiters > 0
