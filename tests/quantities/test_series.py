"""Preferred values against the rule and the lists of IEC 60063 (the lists from memory of the standard)."""

from __future__ import annotations

from decimal import ROUND_HALF_UP, Decimal, getcontext

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.quantities import preferred, read_value, within
from protlint.quantities.series import SERIES, hundredths

E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
E12 = (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)
E6 = (10, 15, 22, 33, 47, 68)
E96 = (
    100, 102, 105, 107, 110, 113, 115, 118, 121, 124, 127, 130, 133, 137, 140, 143, 147, 150, 154, 158, 162, 165, 169, 174,
    178, 182, 187, 191, 196, 200, 205, 210, 215, 221, 226, 232, 237, 243, 249, 255, 261, 267, 274, 280, 287, 294, 301, 309,
    316, 324, 332, 340, 348, 357, 365, 374, 383, 392, 402, 412, 422, 432, 442, 453, 464, 475, 487, 499, 511, 523, 536, 549,
    562, 576, 590, 604, 619, 634, 649, 665, 681, 698, 715, 732, 750, 768, 787, 806, 825, 845, 866, 887, 909, 931, 953, 976,
)  # fmt: skip


def _rule(count: int) -> list[int]:
    """round(10^(n/N), 2) in decimal arithmetic, in hundredths."""
    getcontext().prec = 40
    return [int((100 * Decimal(10) ** (Decimal(step) / count)).quantize(Decimal(1), ROUND_HALF_UP)) for step in range(count)]


@pytest.mark.parametrize("count", [48, 96])
def test_e48_and_e96_are_the_published_rule(count: int) -> None:
    assert list(hundredths(f"E{count}")) == _rule(count)


def test_e192_is_the_rule_with_its_one_exception() -> None:
    apart = [(one, two) for one, two in zip(hundredths("E192"), _rule(192), strict=True) if one != two]
    assert apart == [(920, 919)]


def test_e96_is_the_published_list() -> None:
    assert hundredths("E96") == E96


def test_the_historic_series_are_the_published_lists() -> None:
    assert hundredths("E24") == tuple(10 * value for value in E24)
    assert hundredths("E12") == tuple(10 * value for value in E12)
    assert hundredths("E6") == tuple(10 * value for value in E6)
    assert hundredths("E3") == (100, 220, 470)


def test_e24_leaves_the_rule_where_the_standard_says() -> None:
    rule = [round(10 ** (step / 24), 1) for step in range(24)]
    apart = [value / 10 for value, computed in zip(E24, rule, strict=True) if value / 10 != computed]
    assert apart == [2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 8.2]


@pytest.mark.parametrize(
    ("value", "series", "direction", "expected"),
    [
        (6.51, "E24", "nearest", 6.8),  # a ratio of 1.045 above, 1.050 below
        (6.51, "E24", "up", 6.8),
        (6.51, "E96", "down", 6.49),
        (0.47, "E24", "up", 0.47),
        (0.4700000000001, "E24", "up", 0.47),
        (9.5, "E24", "up", 10.0),
        (9.99, "E12", "up", 10.0),
        (1.0, "E24", "down", 1.0),
        (0.99, "E24", "down", 0.91),
        (4699.9, "E24", "nearest", 4700.0),
    ],
)
def test_the_preferred_value_beside(value: float, series: str, direction: str, expected: float) -> None:
    assert preferred(value, series, direction) == expected  # type: ignore[arg-type]


def test_every_value_of_a_window() -> None:
    assert within(1.0, 2.2) == (1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2)
    assert within(0.95, 1.05, "E96") == (0.953, 0.976, 1.0, 1.02, 1.05)
    assert within(1.01, 1.09) == ()
    assert within(5.0, 1.0) == ()


@given(value=st.floats(1e-6, 1e9), series=st.sampled_from(SERIES))
def test_up_and_down_enclose_and_nearest_is_one_of_them(value: float, series: str) -> None:
    below, above = preferred(value, series, "down"), preferred(value, series, "up")
    assert below <= value * (1 + 2e-9)
    assert above >= value * (1 - 2e-9)
    assert preferred(value, series) in (below, above)
    assert preferred(below, series, "up") == below
    assert within(below, above, series)[0] == below


@given(value=st.floats(1e-3, 9e8), series=st.sampled_from(["E24", "E96"]))
def test_a_preferred_value_is_the_float_a_schematic_gives(value: float, series: str) -> None:
    found = preferred(value, series)
    assert read_value(f"{found:.3g}".replace("e+0", "e+"), "resistance").value == found


@pytest.mark.parametrize("value", [0.0, -1.0, float("inf"), float("nan")])
def test_no_preferred_value_beside_nonsense(value: float) -> None:
    with pytest.raises(ValueError, match="above zero"):
        preferred(value)
    with pytest.raises(ValueError, match="above zero"):
        within(value, 1.0)


def test_an_unknown_series_is_refused() -> None:
    with pytest.raises(ValueError, match="E7"):
        preferred(1.0, "E7")
