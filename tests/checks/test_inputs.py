"""Values, pins and part data: what keeps a limiter from being judged is named, with its part."""

from __future__ import annotations

from pathlib import Path

import pytest

from protlint import pipeline
from tests.support.desk import found, the_one, unchecked
from tests.support.judged import Job, follower, sink
from tests.support.paths import FIXTURES


def test_an_unreadable_value_is_quoted_and_the_limiter_not_judged() -> None:
    review = sink().drawn(("R2 RES 2.2", "R2 RES 2.2.2")).review()
    (one,) = found(review, "value-unreadable")
    assert one.parts == ("R2",)
    assert '"2.2.2"' in one.message
    assert the_one(review).verdict in ("fails", "not judged")


@pytest.mark.parametrize("text", ["tbd", "-"])
def test_currents_do_without_a_capacitor_s_value_and_loop_and_delay_do_not(text: str) -> None:
    known, unread = sink().review(), sink().drawn(("C1 CAP 10n", f"C1 CAP {text}")).review()
    (one,) = found(unread, "value-unreadable")
    assert (one.parts, one.level) == (("C1",), "warning")
    assert the_one(unread).solution.currents == the_one(known).solution.currents
    assert the_one(unread).verdict == "passes"
    asked = {(check, needs) for check, needs in unchecked(unread) if needs == "the value of C1"}
    assert {check for check, _ in asked} == {"loop-undamped", "trips-late"}
    assert the_one(unread).solution.loop is None


def test_a_capacitor_at_the_output_whose_value_cannot_be_read_is_not_taken_as_none_in_silence() -> None:
    job = follower().drawn(("C11 CAP", "C12 CAP tbd OUT GND\nC11 CAP"))
    review = job.stated(peak={"current": "2 A", "lasts": "1 ms"}).review()
    (one,) = found(review, "value-unreadable")
    assert (one.parts, one.level) == (("C12",), "warning")
    asked = {(check, needs) for check, needs in unchecked(review) if needs == "the value of C12"}
    assert {check for check, _ in asked} == {"loop-undamped", "trips-on-peaks"}
    assert the_one(review).solution.loop is not None


def test_a_value_elsewhere_on_the_board_is_nobodys_business() -> None:
    review = sink().drawn(("C1 CAP", "R9 RES ??? +12V LED\nC1 CAP")).review()
    assert not found(review, "value-unreadable")


def test_a_transistor_on_the_bench_with_unknown_pins_is_named() -> None:
    # a level shifter between command and drive whose pins have numbers only
    board = sink().drawn(
        ("R1 RES 390 CMD BASE", "R1 RES 390 COL BASE"), ("Q1 NPN", "Q5 PNP QSP1 1=COL 2=CB 3=+12V\nR5 RES 1k CMD CB\nQ1 NPN")
    )
    review = board.review()
    (one,) = found(review, "pins-unknown")
    assert one.parts == ("Q5",)
    assert "QSP1" in (one.remedy or "")
    known = board.limited("pins", "QSP1", **{"1": "collector", "2": "base", "3": "emitter"}).review()
    assert not found(known, "pins-unknown")


def test_a_limiter_that_hides_behind_unknown_pins_is_suspected() -> None:
    numbered = sink().drawn(("LAMP BASE SNS\n", "1=LAMP 2=BASE 3=SNS\n")).review()
    assert numbered.limiters == ()
    (one,) = found(numbered, "pins-unknown")
    assert one.parts == ("Q1", "Q2")
    known = sink().drawn(("LAMP BASE SNS\n", "1=LAMP 2=BASE 3=SNS\n"))
    known = known.limited("pins", "QPN1", **{"1": "collector", "2": "base", "3": "emitter"})
    assert not found(known.review(), "pins-unknown")
    assert len(known.review().limiters) == 1


def test_a_part_in_no_part_data_is_a_note_and_its_figures_an_assumption() -> None:
    review = sink().drawn(("NPN QPN1", "NPN QXX9")).stated(cap="0.3 A").review()
    (note,) = [one for one in review.findings if one.check == "part-data-missing"]
    assert (note.level, note.parts) == ("note", ("Q1",))
    assert all(one.level != "error" for one in found(review))
    assert ("pass-overheated", "QXX9.ratings.tj_max") in unchecked(review)


def test_a_parts_list_that_says_otherwise_is_named_with_its_line() -> None:
    listed = Job(sink().board, sink().tables, listed="Designator,Value,Power\nR1,390,\nR2,2R7,0.5W\nR99,1k,\n")
    parts = [(one.parts, one.level) for one in found(listed.review(), "part-data-contradicts")]
    assert parts == [(("R2",), "warning"), (("R2",), "warning")]
    assert all("parts.csv:3" in one.message for one in found(listed.review(), "part-data-contradicts"))


def test_a_parts_list_about_parts_that_no_limiter_needs_is_left_alone() -> None:
    board = sink().drawn(("C1 CAP", "R9 RES 1k +12V LED\nC1 CAP"))
    listed = Job(board.board, board.tables, listed="Designator,Value\nR9,2k2\n")
    assert not found(listed.review(), "part-data-contradicts")


def test_thermal_figures_that_contradict_each_other_are_a_note() -> None:
    review = sink().rated("QPN1", slope_case="0.4 W/K").review()
    (one,) = [one for one in review.findings if one.check == "part-data-contradicts"]
    assert (one.level, one.parts) == ("note", ("Q1",))
    assert one.working


@pytest.mark.parametrize(("numbers", "told"), [("312", (("Q11",), ("Q21",))), ("123", ())])
def test_a_symbol_with_the_pin_numbers_of_another_package_is_told(
    tmp_path: Path, numbers: str, told: tuple[tuple[str, ...], ...]
) -> None:
    """Pads go by number: the symbol's names C B E are right for the limiter, and the board exchanges them all the same."""
    text = (FIXTURES / "clean" / "pier-lamps.edf").read_text(encoding="utf-8")
    for name, number in zip("CBE", numbers, strict=True):
        text = text.replace(f"(port {name})", f'(port {name} (designator "{number}"))')
    board, data = tmp_path / "board.edf", tmp_path / "parts.toml"
    board.write_text(text, encoding="utf-8")
    known = (FIXTURES / "clean" / "parts.toml").read_text(encoding="utf-8")
    pins = 'pins = { 1 = "collector", 2 = "base", 3 = "emitter" }\npins_source = "memory"\n'
    data.write_text(known.replace("[PHN60]\n", f"[PHN60]\n{pins}"), encoding="utf-8")
    doubts = found(pipeline.review(board, parts=data), "part-data-contradicts")
    assert tuple(sorted(one.parts for one in doubts)) == told
    assert all(one.level == "note" and len(one.working) == 3 for one in doubts)
    limits = tmp_path / "limits.toml"
    limits.write_text('[pins.PHN60]\nC = "collector"\nB = "base"\nE = "emitter"\n', encoding="utf-8")
    assert not found(pipeline.review(board, parts=data, limits=limits), "part-data-contradicts")


def test_a_thyristor_that_no_data_knows_is_told_by_what_is_missing_not_by_its_pins() -> None:
    """A kind without usual figures: nothing is said to be taken in their place."""
    review = sink().drawn(("Q2 NPN QSN1 BASE STOP GND", "Q2 SCR XYZ9 A=BASE G=STOP K=GND")).review()
    (finding,) = found(review, "part-data-missing")
    assert finding.message.endswith("is in no part data: no figure of it is known")
    assert not found(review, "pins-unknown")
    assert any("XYZ9.ratings.igt" in needs for _, needs in unchecked(review))


def test_a_transistor_that_nobody_can_place_is_not_passed_in_silence() -> None:
    """A pass device beyond the reach of its shunt (a driver lies between), numbered; a shunt of no known kind, numbered."""
    apart = sink().drawn(("LAMP BASE SNS\n", "1=LAMP 2=MID 3=SNS\n"), ("R1 RES", "Q6 NPN QPN1 C=LAMP B=BASE E=MID\nR1 RES"))
    (one,) = apart.review().not_checked
    assert (one.needs, one.check) == ("[pins.QPN1]", "whether a limiter is at Q1")
    named = apart.limited("pins", "QPN1", **{"1": "collector", "2": "base", "3": "emitter"}).review()
    assert named.not_checked == ()


@pytest.mark.parametrize(
    ("trimmer", "needs"),
    [
        ("RV3 POT - 1=SNS 2=STOP 3=GND", "resistors drawn in place of RV3: its setting is not known"),
        ("RT3 NTC - 1=SNS 2=STOP", "resistors drawn in place of RT3: its resistance is not constant"),
        ("ZZ3 ZZ9 - 1=SNS 2=STOP", "[ZZ9] kind, in a file for --parts"),
    ],
)
def test_a_limiter_whose_preset_has_a_part_of_no_known_kind_is_not_passed_in_silence(trimmer: str, needs: str) -> None:
    review = sink().drawn(("R3 RES 100 SNS STOP POWER:0.125W", trimmer)).review()
    assert not review.limiters
    assert [(one.check, one.needs) for one in review.not_checked] == [("whether a limiter is at Q1, Q2", needs)]


def test_a_part_of_no_known_kind_elsewhere_hides_no_limiter() -> None:
    review = sink().drawn(("C1 CAP", "RV3 POT - 1=STOP 2=GND 3=GND\nC1 CAP")).review()
    assert the_one(review).limiter.id == "Q1"
    assert review.not_checked == ()


UNREAD = FIXTURES / "examples" / "unread.edf"


def doubted(tmp_path: Path, *changes: tuple[str, str]) -> list[tuple[str, str | None, tuple[str, ...]]]:
    """The check, level and parts of what is said of designators on the board unread, its text changed."""
    text = UNREAD.read_text(encoding="utf-8")
    for old, new in changes:
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    netlist = tmp_path / "board.edf"
    netlist.write_text(text, encoding="utf-8")
    found = pipeline.review(netlist, limits=UNREAD.with_suffix(".toml"), parts=UNREAD.with_name("parts.toml")).findings
    return [(one.message, one.level, one.parts) for one in found if one.check == "designator-doubtful"]


def test_a_part_that_nobody_has_numbered_is_a_note(tmp_path: Path) -> None:
    ((message, level, parts),) = doubted(tmp_path)
    assert (level, parts) == ("note", ("C?",))
    assert "has no designator" in message
    assert doubted(tmp_path, ('(rename C1 "C?")', "C1")) == []


def test_a_designator_that_two_parts_of_a_limiter_share_is_a_warning(tmp_path: Path) -> None:
    """Its stop and its capacitor; one of the limiter with one elsewhere; two elsewhere are nobody's business."""
    numbered = ('(rename C1 "C?")', '(rename C1 "R3")')
    ((message, level, parts),) = doubted(tmp_path, numbered)
    assert (level, parts) == ("warning", ("R3#1", "R3#2"))
    assert message.startswith("R3 is the designator of 2 different parts")
    elsewhere = ("(instance J3\n", '(instance (rename J3 "R3")\n')
    ((_, level, parts),) = doubted(tmp_path, ('(rename C1 "C?")', "C1"), elsewhere)
    assert (level, parts) == ("warning", ("R3#1", "R3#2"))
    assert doubted(tmp_path, ('(rename C1 "C?")', "C1"), ("(instance J3\n", '(instance (rename J3 "J1")\n')) == []
