"""Junction temperatures against published figures, the transient bound, and derating by name."""

from __future__ import annotations

import math

import pytest

from protlint.checks.derating import STANDARDS, derated, junction_limit_degC, share_of
from protlint.checks.thermal import Heating, Junction, junction, made_for_a_sink, published_transients, transient
from protlint.partdata.book import Figure, PartEntry, SafeArea, TransientPoint
from tests.support.desk import case_of
from tests.support.judged import Job, sink

SETTLES_S, HOLDS_S = 0.05, 1.0
SWITCH = """
J1 CONN - CMD LOAD
J2 CONN - +12V GND
R2 RES 1k CMD BASE POWER:0.25W
Q1 NPN 2N3904 LOAD BASE SNS
R1 RES 14 SNS GND POWER:0.25W
Q2 NPN 2N3904 BASE SNS GND
"""


def switch() -> Job:
    """A switch with a limit of two 2N3904, +12 V, 5 V drive (a published example; protlint's own part data)."""
    drive = {"CMD": {"low": "0 V", "high": "5 V"}}
    needs = {"output": "1 V", "shorted_to": ["+12V"]}
    return Job(SWITCH, {**sink().tables, "drive": drive, "limiter": {"*": needs}}, {})


def judged(job: Job, heat: Heating, part: str = "Q1") -> Junction:
    answer = junction(case_of(job.review()), part, heat, settles_s=SETTLES_S, case_holds_s=HOLDS_S)
    assert isinstance(answer, Junction), answer
    return answer


def test_the_switch_takes_the_published_power_in_the_short() -> None:
    # "Current limited switch": R1 = 14 ohm for 50 mA at a V_BE of 0.7 V, 11.3 V * 50 mA = 0.565 W in Q1 with the load
    # shorted; the solved V_BE is 0.65 V
    point = case_of(switch().review()).solution.held_short
    assert point is not None
    assert point.states["Q1"].current_A == pytest.approx(0.050 * 0.65 / 0.7, rel=0.02)
    assert point.states["Q1"].power_W == pytest.approx(0.565 * 0.65 / 0.7, rel=0.02)


def test_two_hundred_kelvin_a_watt_make_138_degrees_of_the_published_power() -> None:
    # 2N3904 data sheet: R_JA 200 K/W, T_J 150 degC: 0.565 W gives 138 degC at 25 degC and is too much above 37 degC
    assert judged(switch(), Heating(0.565, 0.565, 25.0)).degC == pytest.approx(138.0)
    assert not judged(switch(), Heating(0.565, 0.565, 36.9)).too_hot
    assert judged(switch(), Heating(0.565, 0.565, 37.1)).too_hot


def test_a_derated_junction_fails_the_switch_at_room_temperature() -> None:
    job = switch().board_of(derating="ECSS-Q-ST-30-11C")
    assert junction_limit_degC("ECSS-Q-ST-30-11C", 150.0) == 110.0
    assert judged(job, Heating(0.565, 0.565, 25.0)).too_hot


def test_no_more_than_the_rated_power_is_taken_in_the_cold() -> None:
    # P(T) = min(P_D, (T_J - T) / R): 0.625 W up to 25 degC
    assert judged(switch(), Heating(0.63, 0.63, -40.0)).too_hot
    assert judged(switch(), Heating(0.62, 0.62, -40.0)).degC < 100.0


def test_a_sink_is_shared() -> None:
    one = judged(sink(), Heating(10.0, 20.0, 40.0, sink_K_per_W=1.5))
    assert one.from_degC == pytest.approx(40.0 + 20.0 * 1.5)
    assert one.degC == pytest.approx(70.0 + 10.0 * 2.0)
    assert one.allowed_W == pytest.approx((150.0 - 70.0) / 2.0)


@pytest.mark.parametrize(
    ("to_case", "to_air", "sink_wanted"),
    [(83.3, 200.0, False), (10.0, 100.0, True), (1.92, 62.5, True), (None, 357.0, False), (0.7, None, True)],
)
def test_packages_made_for_a_sink_are_known_by_their_resistances(
    to_case: float | None, to_air: float | None, sink_wanted: bool
) -> None:
    # TO-92, TO-126, TO-220, SOT-23, TO-3: thermal resistances of 2N3904, BD139, TIP41C, MMBT5551, MJ15003 data sheets
    figures = [None if value is None else Figure(value, "data sheet") for value in (to_case, to_air)]
    assert made_for_a_sink(*figures) is sink_wanted


def entry(**tables: object) -> PartEntry:
    ratings = {"rth_jc": Figure(2.0, "sheet"), "tj_max": Figure(150.0, "sheet")}
    return PartEntry("QX", "npn", ratings=ratings, **tables)  # type: ignore[arg-type]


def test_without_published_figures_the_root_of_time_bounds_the_impedance() -> None:
    for lasts_s in (1e-4, 1e-3, 1e-2):
        bound = transient(entry(), lasts_s, SETTLES_S)
        assert bound is not None
        assert bound.assumed
        assert bound.K_per_W == pytest.approx(2.0 * math.sqrt(lasts_s / SETTLES_S))
    at_rest = transient(entry(), 1.0, SETTLES_S)
    assert at_rest is not None
    assert (at_rest.K_per_W, at_rest.assumed) == (2.0, False)


def test_published_impedances_are_read_between_and_bounded_beyond() -> None:
    known = entry(transient=(TransientPoint(1e-3, 0.2, "sheet"), TransientPoint(0.1, 1.0, "sheet")))
    between = transient(known, 1e-2, SETTLES_S)
    assert between is not None
    assert between.K_per_W == pytest.approx(math.sqrt(0.2 * 1.0))  # half way on a logarithmic scale
    assert not between.assumed
    before, after = transient(known, 1e-5, SETTLES_S), transient(known, 0.16, SETTLES_S)
    assert before is not None
    assert before.K_per_W == 0.2  # no more than later
    assert after is not None
    assert after.K_per_W == pytest.approx(1.0 * math.sqrt(1.6))


def test_a_pulsed_safe_area_implies_an_impedance() -> None:
    # (T_J,max - 25 degC) / (V I): what a makers' curve of constant power says of that time
    curves = (SafeArea(0.01, ((10.0, 20.0), (40.0, 5.0), (80.0, 1.0)), "sheet"), SafeArea(math.inf, ((10.0, 5.0),), "sheet"))
    assert published_transients(entry(safe_area=curves)) == [(0.01, pytest.approx(125.0 / 200.0), "sheet")]


def test_a_short_begins_where_carrying_left_the_junction() -> None:
    job = sink().knowing("QPN1", transient=[{"lasts": "10 ms", "impedance": "0.5 K/W"}])
    heat = Heating(20.0, 20.0, 40.0, 0.01, sink_K_per_W=8.0, before_W=2.0, before_shared_W=2.0)
    # case 40 + 16, junction before 4 K above it of which 3 K are still there, then 0.5 K/W
    assert judged(job, heat).degC == pytest.approx(40.0 + 16.0 + 2.0 * (2.0 - 0.5) + 20.0 * 0.5)


def test_no_derating_leaves_every_rating_whole() -> None:
    for kind in ("npn", "nmos", "diode", "resistor", "connector"):
        for quantity in ("voltage", "current", "power"):
            assert share_of("none", kind, quantity) == 1.0
    assert derated("none", "npn", "power", "sheet") == "sheet"
    assert junction_limit_degC("none", 175.0) == 175.0


@pytest.mark.parametrize("name", sorted(set(STANDARDS) - {"none"}))
def test_a_standard_says_that_its_figures_are_from_memory(name: str) -> None:
    assert "memory" in derated(name, "npn", "power", "sheet")
    assert all(0.0 < share <= 1.0 for share in STANDARDS[name].shares.values())


def test_the_standards_figures() -> None:
    # ECSS-Q-ST-30-11C and NASA EEE-INST-002, both from memory
    assert [share_of("ECSS-Q-ST-30-11C", "npn", one) for one in ("voltage", "current", "power")] == [0.75, 0.75, 0.65]
    assert [share_of("EEE-INST-002", "nmos", one) for one in ("voltage", "current", "power")] == [0.75, 0.75, 0.60]
    assert [share_of("ECSS-Q-ST-30-11C", "resistor", one) for one in ("power", "voltage")] == [0.50, 0.80]
    assert junction_limit_degC("EEE-INST-002", 150.0) == pytest.approx(120.0)
    assert junction_limit_degC("ECSS-Q-ST-30-11C", 125.0) == pytest.approx(85.0)
