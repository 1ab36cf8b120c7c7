"""Missing data never silences a check: what it found, or passed, is then found otherwise or stands under not checked."""

from __future__ import annotations

from functools import cache

import pytest

from protlint.checks.table import CHECKS
from protlint.pipeline import Review
from tests.support.desk import found, unchecked
from tests.support.judged import SOUND, Job, follower, sink
from tests.support.scenarios import DIODE

SPOILED = (
    sink()
    .drawn(("SNS GND POWER:1W", "SNS GND POWER:0.1W"), ("R3 RES 100", "R3 RES 10"))
    .stated(sink="40 K/W", cap="0.3 A", carry="0.3 A")
    .limited("drive", "CMD", low="-12 V")
    .rated("QPN1", ic="0.2 A")
    .rated("QSN1", ic="7 mA", rth_ja="20000 K/W", power=None, vceo="1 V", ib="1 mA")
)
"""A board with about everything wrong."""

TABLES = [(part, table) for part in ("QSN1", "QPN1") for table in ("ratings", "model", "safe_area", None)]
RATINGS = [(part, name) for part in ("QSN1", "QPN1") for name in SPOILED.data[part]["ratings"]]


@cache
def before() -> Review:
    return SPOILED.review()


def without(job: Job, part: str, table: str | None) -> Job:
    """Return the job without one table of a part, or without the part's data altogether."""
    if table is not None:
        return job.knowing(part, **{table: None})
    return Job(job.board, job.tables, {name: entry for name, entry in job.data.items() if name != part})


def test_the_spoiled_board_is_spoiled() -> None:
    checks = {one.check for one in found(before())}
    assert checks >= {
        "base-stop-low", "cap-exceeded", "carry-not-met", "drive-unlimited", "pass-outside-safe-area", "pass-overheated",
        "reverse-base-emitter", "sense-resistor-power", "shunt-overloaded",
    }  # fmt: skip


@pytest.mark.parametrize(("part", "table"), TABLES)
def test_a_table_dropped_turns_findings_into_entries_never_into_silence(part: str, table: str | None) -> None:
    if table is not None and table not in SPOILED.data[part]:
        pytest.skip(f"{part} has no {table}")
    after = without(SPOILED, part, table).review()
    still = {one.check for one in after.findings} | {check for check, _ in unchecked(after)}
    silent = {one.check for one in found(before())} - still
    # of a part that nobody knows the gain is taken so low that the drive is short of it, not the limiter
    assert silent <= ({"carry-not-met"} if "drive-insufficient" in still else set())


@pytest.mark.parametrize(("part", "name"), RATINGS)
def test_a_rating_dropped_is_named_by_its_key(part: str, name: str) -> None:
    after = SPOILED.rated(part, **{name: None}).review()
    gone = {(one.check, one.parts) for one in found(before())} - {(one.check, one.parts) for one in found(after)}
    for check, _ in gone:
        keys = [needs for other, needs in unchecked(after) if other == check]
        assert any(f"{part}.ratings.{name}" in needs for needs in keys), (check, keys)


@pytest.mark.parametrize("name", SOUND)
def test_without_part_data_every_check_that_needs_some_says_so(name: str) -> None:
    job = SOUND[name]()
    review = Job(job.board, job.tables, {"QSD1": DIODE}).review()
    assert {one.check for one in review.findings} >= {"part-data-missing"}
    entries = {check for check, _ in unchecked(review)}
    assert entries >= {"pass-overheated", "pass-outside-safe-area", "shunt-overloaded", "base-stop-low"}
    assert all(one.level != "error" for one in review.findings)


def test_a_sink_that_is_not_stated_is_asked_for_where_it_decides() -> None:
    assert ("pass-overheated", "[limiter.Q1] sink") in unchecked(sink().stated(sink=None).review())
    cool = (
        sink()
        .drawn(("R2 RES 2.2", "R2 RES 22"), ("SNS GND POWER:1W", "SNS GND POWER:0.25W"))
        .stated(carry="20 mA", sink=None)
    )
    assert not [key for check, key in unchecked(cool.review()) if check == "pass-overheated"]
    hot = follower().stated(sink=None).rated("QPN1", rth_jc="8 K/W", power_case=None).review()
    assert [one.level for one in found(hot, "pass-overheated")] == ["error"]


def test_without_limits_nothing_is_an_error_that_rests_on_an_assumption() -> None:
    review = Job(SPOILED.board, {"supply": SPOILED.tables["supply"]}, SPOILED.data).review()
    resting = [one for one in review.findings if one.assumption]
    assert resting
    assert all(one.level != "error" for one in resting)
    assert {one.verdict for one in review.limiters} <= {"rests on assumptions", "fails"}


def test_every_check_of_a_limiter_is_in_the_catalogue() -> None:
    from protlint.checks.catalogue import load_catalogue

    assert set(CHECKS) <= set(load_catalogue())
