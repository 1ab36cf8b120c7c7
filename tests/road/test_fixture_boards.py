"""The boards in fixtures/: the clean one is clean; of the faulty one each planted fault is named and nothing else."""

from __future__ import annotations

import pytest

from protlint.pipeline import Review, review
from tests.support.paths import FIXTURES

PLANTED = {
    ("Q11", "base-stop-absent", "error"),
    ("Q21", "sense-resistor-power", "error"),
    ("Q31", "compensation-absent", "note"),
    ("Q41", "carry-not-met", "error"),
    ("Q51", "cap-exceeded", "error"),
}


def reviewed(folder: str, board: str) -> Review:
    here = FIXTURES / folder
    return review(here / board, limits=here / "limits.toml", parts=[here / "parts.toml"])


def test_the_clean_board_gives_no_warning_and_no_error() -> None:
    found = reviewed("clean", "pier-lamps.edf")
    assert {one.limiter.id: one.verdict for one in found.limiters} == {"Q11": "passes", "Q21": "passes", "Q31": "passes"}
    assert [one for one in found.findings if one.level != "note"] == []


def test_the_clean_board_leaves_nothing_unchecked() -> None:
    found = reviewed("clean", "pier-lamps.edf")
    assert {one.limiter.id: one.not_checked for one in found.limiters} == {"Q11": (), "Q21": (), "Q31": ()}
    assert found.not_checked == found.remarks == ()


def test_a_drive_that_nothing_bounds_gives_no_figures() -> None:
    """A stiff drive straight onto junctions: by their law any current, so none is told."""
    found = review(FIXTURES / "circuits" / "opamp-output-source-half.edf")
    (one,) = found.limiters
    assert (one.verdict, one.solution.currents, one.if_a_part_fails) == ("not judged", (), None)
    assert ("currents", "[drive.B14] current") in {(left.check, left.needs) for left in one.not_checked}
    assert [finding.check for finding in found.findings] == ["drive-unlimited"]


def test_every_planted_fault_is_named_and_nothing_else() -> None:
    found = reviewed("demo", "slipway-lamps.edf")
    assert {(one.limiter, one.check, one.level) for one in found.findings} == PLANTED


@pytest.mark.parametrize("finding", reviewed("demo", "slipway-lamps.edf").findings, ids=lambda finding: finding.check)
def test_every_finding_says_where_why_and_what_to_do(finding) -> None:  # type: ignore[no-untyped-def]
    assert finding.file is not None
    assert finding.line is not None
    assert finding.fingerprint.startswith(finding.check)
    assert finding.message
    assert finding.remedy or finding.level == "note"
