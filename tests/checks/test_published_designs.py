"""Boards built to published design rules come out clean; solved figures stand beside published ones."""

from __future__ import annotations

import pytest

from protlint.checks.heat import Load, Rating
from protlint.partdata.book import Figure, load_book
from tests.support.desk import case_of, found, the_one
from tests.support.judged import Job, gated, sink
from tests.support.published import six_limiters


def test_six_limiters_to_published_rules_give_no_warning_and_no_error() -> None:
    review = six_limiters().review()
    assert len(review.limiters) == 6
    assert [(one.limiter, one.check, one.message) for one in found(review)] == []
    assert {one.limiter.id: one.verdict for one in review.limiters} == dict.fromkeys(
        ("Q11", "Q21", "Q31", "Q41", "Q51", "Q61"), "passes"
    )


def test_the_published_rules_give_about_the_published_currents() -> None:
    holds = {one.limiter.id: one.solution.currents[1].holds_A for one in six_limiters().review().limiters}
    # R = 0.6 V / I: 2.7 ohm for 220 mA, 30 ohm for 20 mA; an LED sink of 1.8 ohm for 320 mA at its V_BE of 0.56 to 0.58 V
    assert holds["Q11"] == pytest.approx(0.6 / 2.7, rel=0.25)
    assert holds["Q61"] == pytest.approx(0.020, rel=0.1)
    assert holds["Q31"] == pytest.approx(0.320, rel=0.15)


def test_the_led_sinks_resistor_takes_the_published_power() -> None:
    # LED sink: 1.81 ohm at 320 mA is 0.186 W; 0.75 ohm by the rule I = 0.5 V / R at 700 mA is 0.35 W, to be rated twice that
    assert Load("", 27.0, 0.320, 1.81).power_W == pytest.approx(0.186, abs=1e-3)
    assert Load("", 27.0, 0.700, 0.714).power_W == pytest.approx(0.350, abs=1e-3)
    case = case_of(gated().drawn(("R41 RES 1 ", "R41 RES 1.8 ")).stated(carry="0.2 A").review())
    held = case.solution.held_short
    assert held is not None
    assert held.states["R41"].power_W == pytest.approx(held.states["R41"].current_A ** 2 * 1.8)


@pytest.mark.parametrize(("ambient", "share"), [(25.0, 1.0), (70.0, 1.0), (112.5, 0.5), (155.0, 0.0), (170.0, 0.0)])
def test_chip_resistors_derate_in_a_straight_line(ambient: float, share: float) -> None:
    # Yageo chip resistor data sheet: full power to 70 degC, none at 155 degC
    assert Rating(Figure(0.0625, "sheet"), 70.0, 155.0).at_W(ambient) == pytest.approx(0.0625 * share)


def test_chip_sizes_have_the_published_ratings_and_are_found_by_footprint() -> None:
    # Yageo chip resistor catalogue: 0402 is 1/16 W and 50 V, 1206 is 1/4 W and 200 V
    book = load_book()
    for size, watts, volts in (("0402", 0.0625, 50.0), ("0603", 0.1, 50.0), ("1206", 0.25, 200.0)):
        entry = book.find_size("resistor", f"R{size}")
        assert entry is not None
        assert (entry.ratings["power"].value, entry.ratings["voltage_max"].value) == (watts, volts)
    small = sink().drawn(("SNS GND POWER:1W", "SNS GND FOOTPRINT:R0603"))
    assert [one.parts for one in found(small.review(), "sense-resistor-power")] == [("R2",)]


def test_the_worst_point_of_a_slope_is_where_the_closed_form_puts_it() -> None:
    # V-I limiter, R_S 0.22, R1 220, R2 10k, R3 270: greatest dissipation at V_CE = V_BE (G1 + G2 + G3) / (2 G2),
    # (V_BE (G1 + G2 + G3))^2 / (4 R_S (G1 + G2) G2) of it (derived from the node equation at the shunt's base)
    board = """
    J1 CONN - OUT GND
    J2 CONN - +50V DRV
    R1 RES 470 DRV B POWER:5W VOLTAGE:200V
    Q1 NPN QPN1 +50V B S
    R2 RES 0.22 S OUT POWER:10W
    R3 RES 220 S T POWER:0.5W
    R4 RES 10k T +50V POWER:0.5W
    R5 RES 270 T OUT POWER:0.5W
    Q2 NPN QSN1 B T OUT
    """
    tables = sink().tables | {
        "supply": {"+50V": "50 V", "GND": "0 V"},
        "drive": {"DRV": {"low": "0 V", "high": "60 V"}},
        "limiter": {"*": {"sink": "0.1 K/W", "output": "20 V"}},
    }
    job = Job(board, tables)
    # a shunt that takes hardly any base current, as the closed form has it
    job = job.knowing("QSN1", model={**job.data["QSN1"]["model"], "BF": 5e4, "ISE": 0.0}).rated(
        "QSN1", hfe_min=None, hfe_max=None
    )
    solution = the_one(job.review()).solution
    worst = solution.worst_point
    assert worst is not None
    V_BE = worst.states["Q2"].control_V
    G1, G2, G3 = 1 / 220, 1 / 10e3, 1 / 270
    at_V = V_BE * (G1 + G2 + G3) / (2 * G2)
    watts = (V_BE * (G1 + G2 + G3)) ** 2 / (4 * 0.22 * (G1 + G2) * G2)
    assert worst.states["Q1"].voltage_V + worst.states["R2"].voltage_V == pytest.approx(
        at_V, rel=0.15
    )  # a flat top: V_BE falls a little with the drive
    assert (worst.states["Q1"].power_W + worst.states["R2"].power_W) == pytest.approx(watts, rel=0.03)
    # with the sheet's 0.62 V the closed form gives 65.5 W at 25.9 V
    assert pytest.approx(25.9, rel=2e-3) == 0.62 * (G1 + G2 + G3) / (2 * G2)
    assert pytest.approx(65.5, rel=2e-3) == (0.62 * (G1 + G2 + G3)) ** 2 / (4 * 0.22 * (G1 + G2) * G2)
