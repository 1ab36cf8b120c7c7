"""Widths, wrapping, tables and figures."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.report.figures import counted, figure, percent, triple, unit_for
from protlint.report.layout import fitting, painted, shortened, table, tail, width, wrapped


@pytest.mark.parametrize(("text", "columns"), [("abc", 3), ("電流", 4), ("e\u0301", 1), ("", 0), ("Ω", 1)])
def test_width_is_that_of_a_terminal(text: str, columns: int) -> None:
    assert width(text) == columns


@given(
    st.text(alphabet=st.sampled_from("ab 電\u0301"), max_size=200),
    st.integers(min_value=0, max_value=20),
    st.integers(min_value=30, max_value=80),
)
def test_wrapping_keeps_every_word_and_the_width(text: str, indent: int, columns: int) -> None:
    lines = wrapped(text, indent=indent, columns=columns)
    assert all(width(line) <= columns for line in lines)
    assert "".join("".join(lines).split()) == "".join(text.split())


def test_a_lead_stands_in_place_of_the_first_indent() -> None:
    assert wrapped("one two", indent=4, first="  - ", columns=8) == ["  - one", "    two"]


def test_tables_align_wide_characters() -> None:
    assert table([["a", "1"], ["電流", "22"]], indent=1) == [" a      1", " 電流  22"]
    assert table([]) == []


def test_shortened_text_says_that_it_is() -> None:
    assert shortened("abcdef", 6) == "abcdef"
    assert shortened("abcdefg", 6) == "abcd.."
    assert width(shortened("電" * 10, 7)) <= 7


def test_a_path_too_long_keeps_its_end() -> None:
    assert tail("CH2/Q10", 7) == "CH2/Q10"
    assert tail("LEFT/CH2/Q10", 8) == "..H2/Q10"


@pytest.mark.parametrize(
    ("names", "columns", "shown"),
    [
        (["Q1", "Q2", "Q3"], 10, "Q1, Q2, Q3"),
        (["Q1", "Q2", "Q3", "Q4"], 13, "Q1 and 3 more"),
        (["Q1", "Q2", "Q3", "Q4"], 16, "Q1, Q2, Q3, Q4"),
        (["LEFT/CH2/Q10", "Q2"], 15, "..10 and 1 more"),
        (["LEFT/CH2/Q10"], 6, "../Q10"),
    ],
)
def test_names_that_do_not_fit_are_counted(names: list[str], columns: int, shown: str) -> None:
    assert fitting(names, columns) == shown
    assert width(shown) <= columns


def test_paint_is_a_code_around_the_text_or_nothing() -> None:
    assert painted("x", "error", colour=True) == "\x1b[31mx\x1b[0m"
    assert painted("x", "error", colour=False) == "x"
    assert painted("x", "no such", colour=True) == "x"


@pytest.mark.parametrize(
    ("ends", "usual", "shown"),
    [
        ([0.349, 0.385], 0.367, "0.349 / 0.367 / 0.385"),
        ([0.98, 1.09], 1.034, "0.98 / 1.03 / 1.09"),
        ([9.5, 12.04], 10.6, "9.5 / 10.6 / 12.0"),
        ([0.0, 0.0], 0.0, "0.00 / 0.00 / 0.00"),
        (None, 1.2, "1.20"),
        (None, None, "-"),
    ],
)
def test_a_range_has_the_decimals_of_its_high_end(ends: list[float] | None, usual: float | None, shown: str) -> None:
    assert triple(ends, usual) == shown


@pytest.mark.parametrize(
    ("values", "unit"),
    [([0.367, 1.2], "A"), ([0.0994], "mA"), ([2.1e-5, None], "uA"), ([], "A"), ([0.0], "A"), ([1e-15], "pA")],
)
def test_a_column_has_one_unit(values: list[float | None], unit: str) -> None:
    name, scale = unit_for(values, "A")
    assert name == unit
    assert scale == {"A": 1.0, "mA": 1e-3, "uA": 1e-6, "pA": 1e-12}[unit]


def test_what_is_not_known_or_endless_is_a_dash() -> None:
    assert figure(None, "A") == figure(float("nan"), "A") == figure(float("inf"), "A") == "-"
    assert (percent(0.055), percent(-0.6)) == ("5.5 %", "-60 %")
    assert (counted(1, "error"), counted(0, "error")) == ("1 error", "0 errors")
