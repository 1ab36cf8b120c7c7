"""What rests on figures from memory is said by verdict, in every face, of a verdict that passes too."""

from __future__ import annotations

import json
from typing import Any

from protlint.checks.catalogue import load_catalogue
from protlint.partdata.ratings import DYNAMIC_FIGURES, RATINGS, STATIC_FIGURES
from protlint.report.document import document
from protlint.report.issues import rendered_issues
from protlint.report.junit import rendered_junit
from protlint.report.markdown import rendered_markdown
from protlint.report.memory import CURRENTS, on_memory, resting
from protlint.report.sarif import rendered_sarif
from protlint.report.shape import Document
from protlint.report.text import rendered_text
from protlint.topology.limiter import ROLES
from tests.support.judged import Job, sink


def remembered(job: Job, part_number: str, **ratings: Any) -> Job:
    """Return a job with ratings of a type from memory."""
    figures = {name: {"value": value, "source": "memory"} for name, value in ratings.items()}
    return job.rated(part_number, **figures)


def on(job: Job) -> Document:
    return document(job.review())


SOUND = remembered(sink(), "QPN1", rth_jc="2 K/W")
HOT = remembered(sink().stated(sink="40 K/W"), "QPN1", rth_jc="2 K/W")


def test_a_sound_limiter_on_published_figures_says_nothing_of_memory() -> None:
    report = on(sink())
    assert on_memory(report["limiters"][0]) == {}
    assert "memory" not in rendered_text(report)


def test_what_passes_on_memory_says_so_with_the_checks_and_the_figures() -> None:
    report = on(SOUND)
    (limiter,) = report["limiters"]
    assert (limiter["verdict"], limiter["parts"][0]["from_memory"]) == ("passes", ["rth_jc"])
    assert on_memory(limiter) == dict.fromkeys(("pass-overheated", "pass-outside-safe-area"), "rth_jc of Q1")
    assert resting(limiter) == ["pass-overheated, pass-outside-safe-area: rth_jc of Q1"]
    text = rendered_text(report)
    assert "Q1 passes, on figures from memory: carries" in text
    assert "- pass-overheated, pass-outside-safe-area: rth_jc of Q1" in text
    assert "| passes, on figures from memory |" in rendered_markdown(report)
    assert "pass-overheated, pass-outside-safe-area: rth\\_jc of Q1" in rendered_markdown(report)
    assert rendered_junit(report).count("<system-out>from memory: rth_jc of Q1</system-out>") == 2
    notes = json.loads(rendered_sarif(report))["runs"][0]["invocations"][0]["toolExecutionNotifications"]
    assert any("pass-overheated, pass-outside-safe-area: rth_jc of Q1" in note["message"]["text"] for note in notes)


def test_a_finding_on_memory_says_so_in_its_working_and_in_every_face() -> None:
    report = on(HOT)
    (finding,) = [one for one in report["findings"] if one["check"] == "pass-overheated"]
    assert finding["working"][-1]["formula"] == "rth_jc of Q1"
    assert finding["working"][-1]["source"] == "memory"
    assert "from memory: rth_jc of Q1" in rendered_text(report)
    for face in (rendered_markdown, rendered_junit, lambda one: "".join(rendered_issues(one).values())):
        assert "of Q1 (memory)" in face(report)
    results = json.loads(rendered_sarif(report))["runs"][0]["results"]
    (result,) = [one for one in results if one["ruleId"] == "pass-overheated"]
    assert result["properties"]["working"][-1]["source"] == "memory"


def test_a_model_from_memory_stands_behind_all_that_follows_from_the_currents() -> None:
    job = sink().stated(carry="0.4 A", cap=None)
    report = on(job.knowing("QSN1", model={**job.data["QSN1"]["model"], "source": "memory"}))
    assert on_memory(report["limiters"][0]) == {CURRENTS: "model of Q2"}
    (finding,) = [one for one in report["findings"] if one["check"] == "carry-not-met"]
    assert finding["working"][-1]["formula"] == "model of Q2"


def test_the_figures_that_the_catalogue_names_are_figures_of_part_data() -> None:
    names = {*RATINGS, "model", "safe_area", "transient"}
    assert set(STATIC_FIGURES) | set(DYNAMIC_FIGURES) <= names
    for row in load_catalogue().values():
        assert set(row.figures) <= set(ROLES)
        assert {name for figures in row.figures.values() for name in figures} <= names


def test_a_derating_standard_from_memory_is_told_whatever_the_verdicts() -> None:
    remarks = sink().board_of(derating="ECSS-Q-ST-30-11C").review().remarks
    assert any("ECSS-Q-ST-30-11C, from memory" in text for text in remarks)


def test_a_check_is_said_to_rest_only_on_parts_it_is_about() -> None:
    """A base stop that is there cannot be absent, and a diode in the preset is no resistor."""
    report = on(remembered(sink(), "QSN1", ib="40 mA"))
    assert on_memory(report["limiters"][0]) == dict.fromkeys(("base-stop-low", "reverse-base-emitter"), "ib of Q2")
    (limiter,) = on(sink())["limiters"]
    diode = {**limiter["parts"][0], "id": "D1", "kind": "diode", "from_memory": ["power"]}
    limiter = {**limiter, "parts": [*limiter["parts"], diode], "roles": {**limiter["roles"], "preset": ["D1"]}}
    assert on_memory(limiter) == {}
