"""Load lines against the locus, and how the output comes up into a capacitance."""

from __future__ import annotations

import math

import pytest

from protlint.checks.load import Line, load_A_at, meets_at_V, start_up
from protlint.limits import LimiterLimits
from tests.support.desk import found, the_one, unchecked
from tests.support.judged import folding, follower

# 15 V, 1 A at the knee, 0.4 A into a short, V_BE 0.6 V: the foldback law I(V) = (V_BE + (1 - k) V) / (k R_S)
V_BE, K, R_S = 0.6, 0.94, 1.5957
WORKING_V = 15.0
FOLDBACK = Line((0.0, WORKING_V), (V_BE / (K * R_S), (V_BE + (1.0 - K) * WORKING_V) / (K * R_S)))


def test_the_foldback_line_is_the_published_one() -> None:
    # closed form of the divider-preset foldback limiter (Motorola HB206; the design form's numbers, derived)
    assert FOLDBACK.current_A == pytest.approx((0.4, 1.0), rel=1e-3)
    assert FOLDBACK.at_A(7.5) == pytest.approx(0.7, rel=1e-3)


@pytest.mark.parametrize(
    ("needs", "stuck"),
    [
        (LimiterLimits(load_ohm=16.0), False),  # 0.94 A at 15 V: below the line everywhere
        (LimiterLimits(load_ohm=10.0), True),  # 1.5 A at 15 V: meets the line on its way
        (LimiterLimits(load_current_A=0.39), False),  # a constant current has to be below the short's
        (LimiterLimits(load_current_A=0.41), True),
        (LimiterLimits(load_ohm=30.0, load_current_A=0.3), False),
        (LimiterLimits(load_ohm=20.0, load_current_A=0.5), True),
        (LimiterLimits(load_ohm=15.02), False),
        (LimiterLimits(load_ohm=15.02, load_cold_ohm=1.5), True),  # a lamp takes 1 A (V / 15 V)^0.55, more below 15 V
        (LimiterLimits(load_ohm=40.0, load_cold_ohm=4.0), False),
    ],
)
def test_a_load_locks_out_where_its_line_meets_the_locus(needs: LimiterLimits, stuck: bool) -> None:
    # condition for a foldback supply to start (derived): the load takes less than the limiter gives, all the way up
    assert (meets_at_V(FOLDBACK, needs, WORKING_V) is not None) is stuck


def test_a_lamp_takes_its_hot_current_at_work_and_is_cold_below() -> None:
    lamp = LimiterLimits(load_ohm=16.0, load_cold_ohm=1.5)
    assert load_A_at(lamp, WORKING_V, WORKING_V) == pytest.approx(15.0 / 16.0)
    assert load_A_at(lamp, 0.01, WORKING_V) == pytest.approx(0.01 / 1.5)
    assert load_A_at(lamp, 7.5, WORKING_V) == pytest.approx(15.0 / 16.0 * 0.5**0.55)


def test_where_a_resistance_meets_the_line() -> None:
    # V / R = (V_BE + (1 - k) V) / (k R_S)
    ohm = 10.0
    at_V = V_BE / (K * R_S / ohm - (1.0 - K))
    assert meets_at_V(FOLDBACK, LimiterLimits(load_ohm=ohm), WORKING_V) == pytest.approx(at_V, abs=WORKING_V / 150.0)


def test_start_up_into_a_capacitor_takes_the_time_of_the_closed_form() -> None:
    # t = C k R_S / (1 - k) ln(I_K / I_SC) (derived from t = C dV / I)
    needs = LimiterLimits(load_capacitance_F=4700e-6)
    up = start_up(FOLDBACK, needs, WORKING_V, [(0.0, 20.0), (WORKING_V, 5.0)])
    assert up.starts
    assert up.lasts_s == pytest.approx(4700e-6 * K * R_S / (1.0 - K) * math.log(2.5), rel=1e-3)
    # what the supply gives is C V V_in; half of C V^2 is in the capacitor, the rest in the pass device
    assert up.pass_energy_J == pytest.approx(4700e-6 * WORKING_V * (20.0 - 0.5 * WORKING_V), rel=1e-3)
    assert up.pass_peak_W == pytest.approx(max((20.0 - v) * FOLDBACK.at_A(v) for v in (0.0, 3.33, 5.0, 7.5)), rel=0.02)


def test_a_plain_limit_charges_in_a_straight_line() -> None:
    # a textbook exercise: 500 uF and 1 A reach 10 V in 5 ms
    up = start_up(Line((0.0, 20.0), (1.0, 1.0)), LimiterLimits(load_capacitance_F=500e-6), 10.0, [(0.0, 20.0), (20.0, 0.0)])
    assert up.lasts_s == pytest.approx(5e-3)


def test_a_load_that_locks_out_does_not_start() -> None:
    needs = LimiterLimits(load_capacitance_F=1e-3, load_current_A=0.5)
    assert start_up(FOLDBACK, needs, WORKING_V, [(0.0, 20.0), (15.0, 5.0)]).starts is False


def test_the_review_says_how_the_output_comes_up() -> None:
    up = the_one(follower().stated(load_capacitance="470 uF").review()).start_up
    assert up is not None
    assert up.starts
    assert up.lasts_s == pytest.approx(470e-6 * 12.0 / 0.6, rel=0.1)
    assert the_one(follower().stated(load_capacitance=None).review()).start_up is None


def test_a_load_that_is_not_stated_is_asked_for_and_only_of_a_limit_that_follows_the_output() -> None:
    asked = {key for check, key in unchecked(folding().stated(load=None).review()) if check == "foldback-locks-out"}
    assert asked == {"[limiter.Q60] load"}
    asked = {key for check, key in unchecked(folding().stated(output=None).review()) if check == "foldback-locks-out"}
    assert asked == {"[limiter.Q60] output"}
    assert not [check for check, _ in unchecked(follower().review()) if check == "foldback-locks-out"]


def test_starting_counts_for_a_short_that_is_cut_off_sooner() -> None:
    # 20 ms of short are borne; 220 ms of charging are not
    job = follower().supplied().stated(short="20 ms", sink="4 K/W", load_capacitance="10 mF", output="12 V")
    job = job.knowing("QPN1", transient=[{"lasts": "20 ms", "impedance": "0.5 K/W"}, {"lasts": "1 s", "impedance": "8 K/W"}])
    job = job.rated("QPN1", rth_jc="8 K/W", power_case=None)
    (one,) = found(job.review(), "pass-overheated")
    assert "charge" in one.message
