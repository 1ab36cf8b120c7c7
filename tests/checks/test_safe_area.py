"""Safe operating areas: between corners, below and beyond them, hot, and for a time."""

from __future__ import annotations

import math

import pytest

from protlint.checks.safe_area import allowed, breakdown_share, curve_for, on_curve_A, thermal_share
from protlint.partdata.book import SafeArea, load_book
from tests.support.desk import found, unchecked
from tests.support.judged import follower, sink

# MJ15003 data sheet: second breakdown 5 A at 50 V, 1 A at 100 V, for 1 s
MJ15003 = ((50.0, 5.0), (100.0, 1.0))


def test_corners_are_joined_by_straight_lines_on_logarithmic_scales() -> None:
    assert on_curve_A(MJ15003, 50.0) == 5.0
    assert on_curve_A(MJ15003, math.sqrt(50.0 * 100.0)) == pytest.approx(math.sqrt(5.0))
    assert on_curve_A(MJ15003, 49.9) is None
    assert on_curve_A(MJ15003, 100.1) is None


def test_below_the_first_corner_the_curves_power_bounds() -> None:
    # MJ15003: 5 A at 50 V are its 250 W; at 25 V the same power allows 10 A
    bound = allowed(MJ15003, 25.0, thermal_left=1.0, breakdown_left=1.0)
    assert (bound.current_A, bound.by) == (pytest.approx(10.0), "power")


def test_beyond_the_last_corner_no_more_than_there_is_known() -> None:
    bound = allowed(MJ15003, 120.0, thermal_left=1.0, breakdown_left=1.0)
    assert (bound.current_A, bound.by) == (1.0, "what is left at the curve's last corner")


def test_heat_takes_the_thermal_bound_faster_than_second_breakdown() -> None:
    # T_C 112.5 degC of 200: half the power is left (data sheets' derating curve), more of the second-breakdown bound
    assert thermal_share(112.5, 200.0) == 0.5
    assert breakdown_share(112.5, 200.0, 0.45) == pytest.approx(1.0 - 0.55 * 0.5)
    assert (thermal_share(-10.0, 150.0), thermal_share(150.0, 150.0)) == (1.0, 0.0)
    at_50_V = allowed(MJ15003, 50.0, thermal_left=0.5, breakdown_left=0.725)
    assert (at_50_V.current_A, at_50_V.by) == (pytest.approx(2.5), "power")
    at_100_V = allowed(MJ15003, 100.0, thermal_left=0.5, breakdown_left=0.725)
    assert (at_100_V.current_A, at_100_V.by) == (pytest.approx(0.725), "second breakdown")


def test_the_curve_for_a_time_is_the_shortest_that_lasts_as_long() -> None:
    curves = [SafeArea(lasts, ((1.0, 1.0),), "sheet") for lasts in (0.001, 0.01, math.inf)]
    assert curve_for(curves, 0.0005, 0.5) is curves[0]
    assert curve_for(curves, 0.002, 0.5) is curves[1]
    assert curve_for(curves, 0.1, 0.5) is curves[2]
    assert curve_for(curves[:2], 0.1, 0.5) is None


def test_a_test_of_a_second_counts_for_ever() -> None:
    # 2N3055 data sheet: 2.87 A at 40 V for 1 s are its dc power, 115 W
    entry = load_book().find("2N3055")
    assert entry is not None
    curve = curve_for(entry.safe_area, math.inf, 0.5)
    assert curve is not None
    volts, amperes = curve.points[0]
    assert volts * amperes == pytest.approx(entry.ratings["power_case"].value, rel=0.01)


def test_the_worst_place_of_the_locus_counts_not_only_the_short() -> None:
    # a corner that only a raised output meets: the pass device has 6 V there, 12 V in the short
    points = [["1 V", "8 A"], ["5.5 V", "0.2 A"], ["6.5 V", "0.2 A"], ["8 V", "0.2 A"], ["40 V", "0.2 A"]]
    steep = sink().knowing("QPN1", safe_area=[{"lasts": "dc", "points": points}]).stated(carry=None, sink="0.5 K/W")
    (one,) = found(steep.review(), "pass-outside-safe-area")
    assert "V" in one.message
    assert one.level == "error"


def test_a_careful_line_warns_and_is_marked() -> None:
    # inside with the milder derating of second breakdown, outside with the thermal one
    job = sink().stated(sink="16 K/W", carry=None)
    held = job.review().limiters[0].solution.high_short
    case = 70.0 + 16.0 * held[-1].states["Q1"].power_W
    volts, amperes = held[-1].states["Q1"].voltage_V, held[-1].states["Q1"].current_A
    between = amperes / math.sqrt(thermal_share(case, 150.0) * breakdown_share(case, 150.0, 0.45))
    points = [["0.5 V", f"{between * volts * 100.0} A"], [f"{volts * 0.99} V", f"{between} A"], ["40 V", "0.05 A"]]
    review = job.knowing("QPN1", safe_area=[{"lasts": "dc", "points": points}]).review()
    (one,) = found(review, "pass-outside-safe-area")
    assert (one.level, one.assumption) == ("warning", True)


def test_what_no_curve_covers_is_asked_for() -> None:
    short = [["1 V", "8 A"], ["10 V", "8 A"]]
    review = follower().knowing("QPN1", safe_area=[{"lasts": "dc", "points": short}]).review()
    assert ("pass-outside-safe-area", "QPN1.safe_area up to 24.4 V") in unchecked(review)
    brief = sink().stated(short="20 ms").knowing("QPN1", safe_area=[{"lasts": "1 ms", "points": short}]).review()
    assert ("pass-outside-safe-area", "QPN1.safe_area that lasts 20 ms") in unchecked(brief)


def test_a_curve_for_a_much_longer_time_clears_a_brief_short_but_does_not_convict() -> None:
    """A dc curve, which counts from 0.5 s on; shorts of a fiftieth and of an eighth of that. Makers draw a decade apart."""
    tight, wide = ([["1 V", f"{amperes} A"], ["40 V", f"{amperes} A"]] for amperes in (0.05, 5.0))
    for short, points, convicted, asked in (
        ("10 ms", tight, False, True), ("60 ms", tight, True, False), ("10 ms", wide, False, False),
    ):  # fmt: skip
        job = sink().stated(short=short).knowing("QPN1", safe_area=[{"lasts": "dc", "points": points}])
        review = job.review()
        assert bool(found(review, "pass-outside-safe-area")) is convicted, short
        assert (("pass-outside-safe-area", f"QPN1.safe_area that lasts {short}") in unchecked(review)) is asked, short
