"""Thermal ratings against each other, with the contradictions that real data sheets print."""

from __future__ import annotations

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.partdata.identities import careful
from protlint.partdata.ratings import RATINGS, Figure
from protlint.quantities import DIMENSIONS


def _ratings(**values: float) -> dict[str, Figure]:
    return {name: Figure(value, "a sheet") for name, value in values.items()}


def test_the_mjl3281a_prints_three_figures_of_which_two_agree() -> None:
    """MJL3281A data sheet: 200 W, 150 degC, 0.625 K/W and 1.43 W/K (which is 0.699 K/W)."""
    ratings, contradictions = careful(_ratings(power_case=200.0, tj_max=150.0, rth_jc=0.625, slope_case=1.43))
    assert ratings["rth_jc"].value == pytest.approx(1.0 / 1.43)
    assert ratings["power_case"].value == pytest.approx(125.0 * 1.43)
    assert [one.ratings for one in contradictions] == [("rth_jc", "slope_case", "power_case")]


def test_a_second_source_2n3904_prints_a_slope_of_another_package() -> None:
    """A second maker's 2N3904 data sheet: 2.8 mW/K beside 200 K/W (which is 5 mW/K)."""
    ratings, contradictions = careful(_ratings(power=0.625, tj_max=150.0, rth_ja=200.0, slope=0.0028))
    assert ratings["rth_ja"].value == pytest.approx(1.0 / 0.0028)
    assert ratings["power"].value == pytest.approx(0.35)
    assert len(contradictions) == 1


def test_the_2n3055_agrees_with_itself() -> None:
    """2N3055 data sheet: 115 W, 0.657 W/K, 1.52 K/W, 200 degC."""
    stated = _ratings(power_case=115.0, tj_max=200.0, rth_jc=1.52, slope_case=0.657)
    assert careful(stated) == (stated, ())


def test_a_missing_resistance_is_worked_out_and_says_how() -> None:
    """IRFP240 data sheet: 150 W, 1.2 W/K, 150 degC, no thermal resistance."""
    ratings, contradictions = careful(_ratings(power_case=150.0, tj_max=150.0, slope_case=1.2))
    assert ratings["rth_jc"].value == pytest.approx(0.8333, rel=1e-3)
    assert ratings["rth_jc"].source == "1 / slope_case; a sheet"
    assert contradictions == ()


def test_power_at_another_case_temperature() -> None:
    """MIL-PRF-19500/379 (2N3792): 85.7 W at 100 degC case, 200 degC, 1.1 K/W."""
    ratings, contradictions = careful(_ratings(power_case=85.7, power_case_at=100.0, tj_max=200.0, rth_jc=1.1))
    assert ratings["rth_jc"].value == pytest.approx(100.0 / 85.7)
    assert len(contradictions) == 1


@pytest.mark.parametrize(
    ("stated", "expected"),
    [
        ({"power": 115.0, "tj_max": 200.0}, {"power_case": 115.0, "rth_jc": 175.0 / 115.0}),
        ({"power": 1.5, "tj_max": 150.0, "rth_jc": 83.3}, {"power_case": 1.5, "rth_jc": 83.3}),
        ({"power": 0.625, "tj_max": 150.0}, {"power": 0.625, "rth_ja": 200.0}),
        ({"power": 0.625, "tj_max": 150.0, "rth_jc": 83.3}, {"power": 0.625, "rth_ja": 200.0, "rth_jc": 83.3}),
    ],
)
def test_power_is_taken_where_it_can_hold(stated: dict[str, float], expected: dict[str, float]) -> None:
    ratings, contradictions = careful(_ratings(**stated))
    found = {name: figure.value for name, figure in ratings.items() if name != "tj_max"}
    assert found == {name: pytest.approx(value) for name, value in expected.items()}
    assert contradictions == ()


@given(
    power=st.floats(0.1, 300.0),
    tj_max=st.floats(100.0, 200.0),
    resistance=st.floats(0.2, 1000.0),
    slope=st.floats(0.001, 5.0),
)
def test_what_is_kept_is_never_hotter_than_any_of_the_stated_figures(
    power: float, tj_max: float, resistance: float, slope: float
) -> None:
    stated = _ratings(power_case=power, tj_max=tj_max, rth_jc=resistance, slope_case=slope)
    ratings, contradictions = careful(stated)
    for value in (resistance, 1.0 / slope, (tj_max - 25.0) / power):
        assert ratings["rth_jc"].value * 1.0301 >= value
    assert ratings["power_case"].value <= power * 1.0001
    again, none_left = careful({name: figure for name, figure in ratings.items() if name != "slope_case"})
    assert none_left == () or not contradictions
    assert again["rth_jc"].value == pytest.approx(ratings["rth_jc"].value)


def test_the_formulas_have_the_dimension_of_a_thermal_resistance() -> None:
    registry = pint.UnitRegistry(cache_folder=None)

    def unit(name: str) -> pint.Quantity[float]:
        return registry.Quantity(1.0, DIMENSIONS[RATINGS[name].dimension].pint_unit.replace("degC", "kelvin"))

    wanted = unit("rth_jc").dimensionality
    assert (1.0 / unit("slope_case")).dimensionality == wanted
    assert ((unit("tj_max") - unit("power_case_at")) / unit("power_case")).dimensionality == wanted
