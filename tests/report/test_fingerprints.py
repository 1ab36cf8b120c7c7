"""A finding's name outlives a re-export and never stands twice in a report."""

from __future__ import annotations

from dataclasses import replace

from protlint.findings import Finding, fingerprint, identifying_parts, stamp_fingerprints

FINDING = Finding(check="base-stop-absent", limiter="Q10", parts=("Q11", "R11"), message="as found")
LIMITER = ("Q10", "R11", "Q11")


def test_lines_nets_figures_and_order_do_not_matter() -> None:
    other = replace(FINDING, parts=("r11", "q11"), line=99, column=2, nets=("N2",), message="0.7 A", remedy="100 ohm")
    assert fingerprint(other, ("Q11", "Q10", "R11")) == fingerprint(FINDING, LIMITER)


def test_check_parts_limiter_and_subject_matter() -> None:
    names = {
        fingerprint(FINDING, LIMITER),
        fingerprint(replace(FINDING, check="base-stop-low"), LIMITER),
        fingerprint(replace(FINDING, parts=("Q11",)), LIMITER),
        fingerprint(replace(FINDING, subject="carry"), LIMITER),
        fingerprint(FINDING, ("Q20", "R21", "Q21")),
    }
    assert len(names) == 5


def test_a_repeated_name_is_counted_on() -> None:
    stamped = stamp_fingerprints([FINDING, FINDING, FINDING], {"Q10": LIMITER})
    first = fingerprint(FINDING, LIMITER)
    assert [finding.fingerprint for finding in stamped] == [first, f"{first}-2", f"{first}-3"]


def test_what_is_added_to_mend_a_finding_does_not_rename_the_others() -> None:
    before = {"pass": ("Q10",), "sense": ("R11",), "shunt": ("Q11",), "compensation": ()}
    assert identifying_parts(before) == identifying_parts({**before, "compensation": ("C1",), "base_stop": ("R12",)})


def test_any_text_can_be_named() -> None:
    assert fingerprint(replace(FINDING, parts=("\ud800\x1b",))).startswith("base-stop-absent-")
