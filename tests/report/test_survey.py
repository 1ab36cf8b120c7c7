"""The survey and the limits file it begins: what it tells, and that the file reads back as what was known."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.limits import CheckSetting, DriveLimits, LimiterLimits, Limits, Peak, Range
from protlint.limits_file import load_limits
from protlint.netlist import read_netlist_bytes
from protlint.pipeline import Review, review_netlist, set_up
from protlint.quantities import read_quantity
from protlint.report.layout import COLUMNS, width
from protlint.report.skeleton import quantity, rendered_skeleton
from protlint.report.survey import survey
from protlint.report.survey_text import rendered_survey
from tests.report.test_text import ACTING
from tests.support.edif_text import Drawn, flat_netlist
from tests.support.sample_review import HOSTILE, PLAIN, sample_review

STATED = Limits(
    file="lamp.toml",
    ambient_degC=(-40.0, 25.0, 105.5),
    resistor_tolerance=0.05,
    vbe_spread_V=(0.08, 0.04),
    derating="ECSS-Q-ST-30-11C",
    supplies_V={"+24V": Range(21.6, 24.0, 26.4)},
    drives={"DRV": DriveLimits(Range(0.0, 0.0, 0.0), Range(11.0, 12.0, 13.0), resistance_ohm=47.0, current_A=0.02)},
    drivers={"AMP1": DriveLimits(power_W=0.5, from_rails_V=1.5)},
    limiters={
        "*": LimiterLimits(short_s=float("inf")),
        "Q10": LimiterLimits(
            carry_A=0.7,
            cap_A=1.2,
            output_V=12.0,
            short_s=0.02,
            shorted_to=("GND", "-5V"),
            sink_K_per_W=2.5,
            shunt_rise_K=20.0,
            load_capacitance_F=4.7e-4,
            peak=Peak(1.5, 0.02, 11.0),
            checks={"base-stop-absent": CheckSetting("error")},
        ),
    },
    attributes={"value": ("VALUE", "Comment")},
    checks={"base-stop-absent": CheckSetting("off"), "loop-undamped": CheckSetting("note", {"error": 0.3})},
    pins={"SOT23-X": {"1": "base", "2": "emitter"}},
)


def stated_review() -> Review:
    return replace(sample_review(), limits=STATED)


def loaded(folder: Path, text: str) -> Limits:
    path = folder / "limits.toml"
    path.write_text(text, encoding="utf-8")
    return load_limits(path)


def test_it_shows_what_was_read_and_how_each_limiter_is_held() -> None:
    text = rendered_survey(survey(sample_review()))
    for expected in (
        "from designator forms",
        "emitter-sensed",
        "+12V held at 12 V",
        "through 1 kohm, assumed",
        "also fits: two-transistor-sink",
        "no part data for QSN1",
        "a short ties the output to GND",
    ):
        assert expected in text


def test_figures_of_like_channels_are_told_once() -> None:
    facts = survey(sample_review())
    first = facts["limiters"][0]
    other = {**first, "id": "Q77", "held_short": {**first["held_short"], "output_A": first["held_short"]["output_A"]}}
    text = rendered_survey({**facts, "limiters": [first, other]})
    assert text.count("in the held short  current") == 1
    assert "held, driven and solved as Q10" in text
    unlike = {**other, "sensitivities": []}
    assert rendered_survey({**facts, "limiters": [first, unlike]}).count("in the held short  current") == 2


def test_a_large_board_is_told_by_what_its_parts_have_in_common() -> None:
    facts = survey(sample_review())
    rows = [{"of": f"CELL{number}", "parts": [f"X{number}_{part}" for part in range(6)]} for number in range(14)]
    types = [{"part_number": f"QT{number}", "parts": [f"Q{number}"]} for number in range(14)]
    volts = {"low": 5.0, "usual": 5.0, "high": 5.0, "known_from": "net name"}
    supplies = [{"net": net, **volts} for net in ("+5V", *(f"CARD{card}/+5V" for card in range(9)))]
    unknown = {"kind": rows, "pins": rows[:1], "part_data": types}
    plain = " ".join(rendered_survey({**facts, "unknown": unknown, "supplies": supplies}).split())
    assert "kind of the cell CELL0 not known: X0_0, X0_1, X0_2, X0_3 and 2 more - kind of the cell CELL1" in plain
    assert "kind of the cell CELL12, CELL13 not known" in plain
    assert "pin roles of CELL0 not known ([pins] in the limits file): X0_0" in plain
    assert "no part data for QT11 (--parts): Q11 - no part data for QT12, QT13" in plain
    assert "Supplies +5V 5 V by net name CARD0/+5V and 8 alike 5 V by net name" in plain


def test_types_that_limiters_use_come_first_of_those_without_data() -> None:
    review = sample_review()
    used = next(part.part_number for part in review.board.parts if part.id == "Q10")
    first = review.board.parts[0]
    other = replace(first, part=first.part._replace(id="D99"), kind="diode", part_number="QD1", entry=None)
    facts = survey(replace(review, board=replace(review.board, parts=(other, *review.board.parts))))
    assert [row["part_number"] for row in facts["unknown"]["part_data"]] == [used, "QD1"]


@pytest.mark.parametrize("name", HOSTILE)
def test_no_name_acts_in_survey_or_skeleton(name: str, tmp_path: Path) -> None:
    review = sample_review({**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)})
    text = rendered_survey(survey(review))
    assert max(width(line) for line in text.split("\n")) <= COLUMNS
    skeleton = rendered_skeleton(review)
    for shown in (text, skeleton):
        assert not ACTING.search(shown)
        assert not re.search(r"##|^\s*::", shown, re.MULTILINE)
    expected = name.replace("\ud800", "?")
    assert expected in loaded(tmp_path, skeleton).limiters


def test_the_skeleton_without_a_limits_file_states_nothing_that_was_assumed(tmp_path: Path) -> None:
    review = replace(sample_review(), limits=load_limits(None))
    read = loaded(tmp_path, rendered_skeleton(review))
    assert read.assumed == load_limits(None).assumed
    assert read.drives == {}
    assert read.supplies_V == {"+12V": Range(12.0, 12.0, 12.0), "GND": Range(0.0, 0.0, 0.0)}
    assert list(read.limiters) == ["Q10", "CH2/Q20", "Q30"]
    assert all(needs == LimiterLimits() for needs in read.limiters.values())


def test_what_was_stated_reads_back_unchanged(tmp_path: Path) -> None:
    read = loaded(tmp_path, rendered_skeleton(stated_review()))
    assert read.limiters["Q10"] == STATED.limiters["Q10"]
    assert read.limiters["*"] == STATED.limiters["*"]
    assert read.supplies_V["+24V"] == STATED.supplies_V["+24V"]
    for name in ("ambient_degC", "resistor_tolerance", "vbe_spread_V", "derating", "drives", "drivers", "attributes"):
        assert getattr(read, name) == getattr(STATED, name), name
    assert read.checks == STATED.checks
    assert read.pins == STATED.pins


@pytest.mark.parametrize("limits", [load_limits(None), STATED])
def test_a_survey_with_its_own_skeleton_writes_it_again(limits: Limits, tmp_path: Path) -> None:
    review = replace(sample_review(), limits=limits)
    first = rendered_skeleton(review)
    again = rendered_skeleton(replace(review, limits=loaded(tmp_path, first)))
    assert again == first


@given(st.floats(min_value=1e-12, max_value=1e9, allow_nan=False), st.sampled_from(["A", "V", "ohm", "F"]))
def test_a_written_quantity_reads_back_as_the_same_number(value: float, unit: str) -> None:
    dimension = {"A": "current", "V": "voltage", "ohm": "resistance", "F": "capacitance"}[unit]
    assert read_quantity(quantity(value, unit).strip('"'), dimension) == value


def test_properties_that_tell_nothing_are_named_and_asked_about(tmp_path: Path) -> None:
    parts = [Drawn(f"R{number}", "RES", (("1", "A"), ("2", "B")), more=(("NENNWERT", "4K7"),)) for number in range(2)]
    netlist = read_netlist_bytes(flat_netlist("own", parts, remark="invented").encode(), "own.edf")
    review = review_netlist(netlist, set_up())
    assert "other properties: NENNWERT (2)" in rendered_survey(survey(review))
    skeleton = rendered_skeleton(review)
    assert '\n# value = [""]\n' in skeleton
    filled = skeleton.replace("# [attributes]", "[attributes]").replace('# value = [""]', 'value = ["NENNWERT"]')
    assert loaded(tmp_path, filled).attributes == {"value": ("NENNWERT",)}
    answered = review_netlist(netlist, set_up(limits=tmp_path / "limits.toml"))
    assert [part.values.value for part in answered.board.parts] == [4700.0, 4700.0]
    assert '# value = [""]' not in rendered_skeleton(answered)


def test_the_first_line_tells_of_faults_too() -> None:
    fault = {"fault": "sense-bypassed", "spoils": "emitter-sensed", "parts": ["Q7"], "says": "both ends on one net"}
    text = rendered_survey({**survey(sample_review()), "faults": [fault, fault]})
    assert text.startswith("lamp.edf: 3 limiters found, 2 faults in the wiring; ")
