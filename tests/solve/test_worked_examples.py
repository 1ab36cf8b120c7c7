"""Worked examples of books and data sheets, solved as circuits; ideal parts where the book uses them."""

from __future__ import annotations

import doctest

import pytest

from protlint.limits import Range
from protlint.partdata.book import load_book
from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.solution import Solution
from tests.support import by_hand
from tests.support.circuits import fixed
from tests.support.ideal import AT_25_MV_DEGC, ideal_bipolar, ideal_follower, resistor, with_saturation_current


def solved(circuit: Circuit, ambient_degC: float = 27.0) -> Solution:
    solution = solve(circuit, (ambient_degC, ambient_degC, ambient_degC))
    assert solution.not_solved is None
    return solution


def holds_A(circuit: Circuit, ambient_degC: float = 27.0) -> float:
    holds = solved(circuit, ambient_degC).currents[1].holds_A
    assert holds is not None
    return holds


def sensed_A(circuit: Circuit, ambient_degC: float = 27.0) -> float:
    """The current through the sense resistance at the held short: a book's limit; the output gets the drive too."""
    held = solved(circuit, ambient_degC).held_short
    assert held is not None
    return abs(held.states["RS"].current_A)


def carries_A(circuit: Circuit) -> float:
    carries = solved(circuit).currents[1].carries_A
    assert carries is not None
    return carries


def test_class_ab_stage_that_gives_up_its_bias_at_100_ma() -> None:
    """Sedra and Smith, *Microelectronic Circuits*, problem D12.43: I_S 1e-14 A takes 2 mA at 100 mA with 6.51 ohm; at 75 mA
    it takes 2.99 uA."""
    shunt = with_saturation_current(1e-14, ambient_degC=AT_25_MV_DEGC)
    assert by_hand.base_emitter_voltage(2e-3, 1e-14, temperature_K=AT_25_MV_DEGC + 273.15) == pytest.approx(0.6505, abs=1e-4)
    assert sensed_A(ideal_follower(shunt, 6.51, 2e-3), AT_25_MV_DEGC) == pytest.approx(0.1, rel=2e-3)
    # the drive that leaves 2.99 uA to the shunt beside the pass device's base current at 75 mA
    circuit = ideal_follower(shunt, 6.51, 2.99e-6 + 0.075 / 1e5)
    assert holds_A(circuit, AT_25_MV_DEGC) == pytest.approx(0.075, rel=2e-3)
    assert 6.51 * sensed_A(circuit, AT_25_MV_DEGC) == pytest.approx(0.488, abs=1e-3)


def test_class_ab_stage_that_gives_up_its_bias_at_150_ma() -> None:
    """Sedra and Smith, companion item to D12.43, from memory: 4.3 ohm; 0.3 uA and 430 mV at 100 mA."""
    shunt = with_saturation_current(1e-14, ambient_degC=AT_25_MV_DEGC)
    circuit = ideal_follower(shunt, 4.34, 2e-3)
    assert sensed_A(circuit, AT_25_MV_DEGC) == pytest.approx(0.15, rel=2e-3)
    held = solved(ideal_follower(shunt, 4.34, 0.34e-6 + 0.1 / 1e5), AT_25_MV_DEGC).held_short
    assert held is not None
    assert held.states["RS"].current_A == pytest.approx(0.1, rel=2e-3)
    assert held.states["RS"].voltage_V == pytest.approx(0.434, rel=2e-3)


@pytest.mark.parametrize(("sense_ohm", "limit_A"), [(27.0, 20.2e-3), (54.0, 10.1e-3)])
def test_sink_limit_of_the_741(sense_ohm: float, limit_A: float) -> None:
    """Sedra and Smith, *Microelectronic Circuits*, solution to problem 13.66: V_BE 0.534 V and 0.545 V, 27 ohm limits at
    20.2 mA, twice the resistance at 10 mA. The 19 uA of the input stage and 50 kohm from memory."""
    input_stage_A = 19e-6
    temperature_K = AT_25_MV_DEGC + 273.15
    mirror_V = by_hand.base_emitter_voltage(input_stage_A, 1e-14, temperature_K=temperature_K)
    assert mirror_V == pytest.approx(0.534, abs=5e-4)
    shunt_A = input_stage_A + mirror_V / 50e3
    assert by_hand.base_emitter_voltage(shunt_A, 1e-14, temperature_K=temperature_K) == pytest.approx(0.545, abs=5e-4)
    shunt = with_saturation_current(1e-14, ambient_degC=AT_25_MV_DEGC)
    circuit = ideal_follower(shunt, sense_ohm, shunt_A + limit_A / 1e5, supply_V=15.0)
    assert sensed_A(circuit, AT_25_MV_DEGC) == pytest.approx(limit_A, rel=3e-3)


def test_series_regulator_of_one_ohm() -> None:
    """US Army TC 9-62 (23 June 2005), para 4-131: 1 ohm and 0.6 V limit at 0.6 A."""
    assert holds_A(ideal_follower(ideal_bipolar(0.6, 1e-3), 1.0, 1e-3)) == pytest.approx(0.6, rel=2e-3)


@pytest.mark.parametrize(("V_BE", "limit_A"), [(0.5, 0.25), (0.6, 0.3), (0.7, 0.35)])
def test_two_ohm_as_people_reckon_it(V_BE: float, limit_A: float) -> None:
    """Common practice of the trade, no publication: 2 ohm and 0.6 V are taken as 300 mA; 0.5 V to 0.7 V cover the spread."""
    assert sensed_A(ideal_follower(ideal_bipolar(V_BE, 1e-3), 2.0, 1e-3)) == pytest.approx(limit_A, rel=2e-3)


def test_almost_any_small_transistor_serves_as_the_shunt_at_12_volt() -> None:
    """Common practice of the trade, no publication; what it has to bear of 12 V through 1 kohm follows from Ohm's law."""
    small = [entry for entry in load_book().entries.values() if entry.kind in ("npn", "pnp") and "power" in entry.ratings]
    serving = [entry for entry in small if entry.ratings["vceo"].value >= 12.0 and entry.ratings["ic"].value >= 0.012]
    assert len(small) > 20
    assert len(serving) >= 0.9 * len(small)


def test_operational_amplifier_regulator_in_and_out_of_its_limit() -> None:
    """Bogart, *Electronic Devices and Circuits*, example 17-13: 25 V, V_BE 0.7 V, 1.4 ohm limits at 0.5 A; 100 ohm takes
    0.25 A at 25 V, 10 ohm is held to 0.5 A at 5 V."""
    shunt = ideal_bipolar(0.7, 1e-3)
    assert holds_A(ideal_follower(shunt, 1.4, 1e-3)) == pytest.approx(0.5, rel=2e-3)
    assert carries_A(ideal_follower(shunt, 1.4, 1e-3, output_V=5.0)) == pytest.approx(0.5, rel=2e-3)
    at_25_V = solved(ideal_follower(shunt, 1.4, 1e-3, output_V=25.0)).currents[1]
    assert at_25_V.carries_A is not None and at_25_V.carries_A > 0.25


def test_switch_with_limit() -> None:
    """A switch of two 2N3904 (published application sheet): 14 ohm, V_BE 0.7 V, 1 kohm from 5 V, 12 V load supply: 50 mA,
    and 0.565 W in the pass device with the load shorted."""
    devices = (
        Device("Q1", "npn", ("OUT", "BASE", "SNS"), {"IS": 6.7e-15, "BF": 30.0}),
        resistor("R2", "DRV", "BASE", 1e3),
        resistor("R1", "SNS", "GND", 14.0),
        Device("Q2", "npn", ("BASE", "SNS", "GND"), ideal_bipolar(0.7, 2e-3)),
    )
    circuit = Circuit(
        devices=devices,
        held={"GND": fixed(0.0), "LOAD": fixed(12.0)},
        drive=Drive("DRV", fixed(0.0), fixed(5.0)),
        output="OUT",
        shorts=("LOAD",),
        shunt=("Q2",),
        pass_devices=("Q1",),
        sense=("R1",),
        output_reach_V=(0.0, 12.0),
    )
    held = solved(circuit).held_short
    assert held is not None
    assert held.output_A == pytest.approx(0.050, rel=0.04)
    assert held.states["Q1"].power_W == pytest.approx(0.565, rel=0.04)


def test_lm723_limits_65_ma_with_10_ohm() -> None:
    """LM723 data sheet, electrical characteristics: R_SC 10 ohm, V_OUT 0 V, 65 mA typical (0.65 V)."""
    assert sensed_A(ideal_follower(ideal_bipolar(0.65, 1e-3), 10.0, 1e-3)) == pytest.approx(0.065, rel=2e-3)


@pytest.mark.parametrize(
    ("output_V", "knee_A", "short_A", "k", "sense_ohm"),
    [(15.0, 1.0, 0.4, 0.94, 1.5957), (12.0, 2.0, 0.5, 0.85, 1.4118), (5.0, 1.0, 0.5, 0.88, 1.3636)],
)
def test_foldback_designs(output_V: float, knee_A: float, short_A: float, k: float, sense_ohm: float) -> None:
    """The law of the LM723 data sheet (ST), table of foldback formulas, with V_SENSE 0.6 V: knee and short as designed."""
    assert by_hand.foldback_design(0.6, output_V, knee_A, short_A) == pytest.approx((k, sense_ohm), abs=1e-4)
    lower = 1e3
    upper = lower * (1.0 / k - 1.0)
    for at_V, limit_A in ((0.0, short_A), (output_V, knee_A)):
        assert by_hand.foldback_limit(0.6, sense_ohm, upper, lower, at_V) == pytest.approx(limit_A, rel=1e-3)
        more = (resistor("R1", "SNS", "B", upper), resistor("R2", "B", "GND", lower))
        shunt = ideal_bipolar(0.6, 1e-4)
        circuit = ideal_follower(
            shunt, sense_ohm, 1e-4 + limit_A / 1e5, supply_V=output_V + 10.0, base="B", more=more, output_V=at_V
        )
        assert carries_A(circuit) == pytest.approx(limit_A, rel=2e-3)


def test_divider_preset() -> None:
    """(V_BE / R_S)(1 + R_1 / R_2) + I_B R_1 / R_S, the node equation at the shunt's base: 0.22 ohm, 220 ohm, 220 ohm and
    0.62 V give 5.64 A, 20 uA of base current 0.02 A more."""
    assert by_hand.preset_limit(0.62, 0.22, 220.0, 220.0) == pytest.approx(5.64, abs=5e-3)
    assert by_hand.preset_limit(0.62, 0.22, 220.0, 220.0, I_B=20e-6) == pytest.approx(5.66, abs=5e-3)
    more = (resistor("R1", "SNS", "B", 220.0), resistor("R2", "B", "OUT", 220.0))
    for gain, limit_A in ((1e5, 5.636), (100.0, 5.656)):
        shunt = ideal_bipolar(0.62, 2e-3, B_F=gain)
        circuit = ideal_follower(shunt, 0.22, 2e-3 + 5.65 / 1e5, base="B", more=more, output_V=0.0)
        assert carries_A(circuit) == pytest.approx(limit_A, rel=2e-3)


def test_slope_limiter() -> None:
    """V_BE (G_1 + G_2 + G_3) = I R_S (G_1 + G_2) + V_CE G_2, the node equation at the shunt's base: 0.22 ohm, 220 ohm,
    10 kohm, 270 ohm, 0.62 V give 5.07 A at V_CE 0, 0.173 A at 50 V, none at 51.8 V, and 65.5 W at most, at 25.9 V."""
    parts = (0.62, 0.22, 220.0, 10e3, 270.0)
    assert by_hand.slope_limit(*parts, 0.0) == pytest.approx(5.07, abs=5e-3)
    assert by_hand.slope_limit(*parts, 50.0) == pytest.approx(0.173, abs=1e-3)
    assert by_hand.slope_limit(*parts, 51.8) == pytest.approx(0.0, abs=5e-3)
    power_W, at_V = by_hand.slope_greatest_power(*parts)
    assert (power_W, at_V) == pytest.approx((65.5, 25.9), rel=2e-3)
    assert by_hand.slope_limit(*parts, at_V) * at_V == pytest.approx(power_W, rel=1e-9)
    supply_V = 60.0
    more = (resistor("R1", "SNS", "B", 220.0), resistor("R2", "SUP", "B", 10e3), resistor("R3", "B", "OUT", 270.0))
    for V_CE in (10.0, 25.9, 50.0):
        limit_A = by_hand.slope_limit(*parts, V_CE)
        shunt = ideal_bipolar(0.62, 1e-3)
        # the output stands below the sense resistance's upper end by its drop
        output_V = supply_V - V_CE - limit_A * 0.22
        circuit = ideal_follower(
            shunt, 0.22, 1e-3 + limit_A / 1e5, supply_V=supply_V, base="B", more=more, output_V=output_V
        )
        held = solved(circuit).at_carry
        assert held is not None
        # the output also gets what the divider's third leg carries
        assert held.states["RS"].current_A == pytest.approx(limit_A, rel=4e-3)


def test_booster_of_a_three_terminal_regulator() -> None:
    """*Fundamentals of Electronics: Book 4*, problem 14.24: LM7805 with a booster for 5 A from 10 V, beta 100, the regulator
    about 1 A, V_BE 0.7 V: R 0.729 ohm, R_SC 0.175 ohm with 2.8 W, about 40 W in the shorted booster. The same law in NEC
    G12702E, section 4.2: I_1(max) = V_BE2 / R2."""
    base_ohm, sense_ohm = 0.7 / (1.0 - 4.0 / 100.0), 0.7 / 4.0
    assert (base_ohm, sense_ohm) == pytest.approx((0.729, 0.175), abs=1e-3)
    devices = (
        Device("Q1", "pnp", ("OUT", "BASE", "SNS"), ideal_bipolar(0.7, 4.0, B_F=100.0)),
        resistor("R", "IN", "BASE", base_ohm),
        resistor("RSC", "IN", "SNS", sense_ohm),
        Device("Q2", "pnp", ("BASE", "SNS", "IN"), ideal_bipolar(0.7, 0.5)),
    )
    circuit = Circuit(
        devices=devices,
        held={"GND": fixed(0.0), "IN": fixed(10.0)},
        drive=Drive("BASE", fixed(0.0), fixed(10.0), current_A=2.46),
        output="OUT",
        shorts=("GND",),
        shunt=("Q2",),
        pass_devices=("Q1",),
        sense=("RSC",),
        output_reach_V=(0.0, 10.0),
    )
    held = solved(circuit).held_short
    assert held is not None
    assert held.output_A == pytest.approx(4.0, rel=0.01)
    assert held.states["RSC"].power_W == pytest.approx(2.8, rel=0.02)
    assert held.states["Q1"].power_W == pytest.approx(40.0, rel=0.08)


@pytest.mark.parametrize(("V_BE", "limit_A", "ohm", "power_W"), [(0.58, 0.32, 1.81, 0.186), (0.6, 0.02, 30.0, 0.012)])
def test_current_sources_by_the_rule_of_v_be_over_r(V_BE: float, limit_A: float, ohm: float, power_W: float) -> None:
    """LED regulators of two transistors (published hobby designs): 320 mA from 0.58 V and 1.81 ohm, 20 mA from 30 ohm."""
    held = solved(ideal_follower(ideal_bipolar(V_BE, 1e-4), ohm, 1e-4 + limit_A / 1e5)).held_short
    assert held is not None
    assert held.states["RS"].current_A == pytest.approx(limit_A, rel=5e-3)
    assert held.states["RS"].power_W == pytest.approx(power_W, rel=0.01)


def bench_reading_circuit(gain: float) -> Circuit:
    """12 V, 1 kohm drive, 2 ohm, 1 kohm base resistor, types of the power of a TO-220 and of a TO-92 transistor."""
    small = {"IS": 1.4e-14, "BF": 200.0, "VAF": 80.0, "IKF": 0.3, "RB": 10.0, "RE": 0.2, "XTB": 1.5}
    power = {"IS": 1e-12, "BF": gain, "VAF": 100.0, "IKF": 8.0, "RB": 2.0, "RE": 0.02, "XTB": 1.5}
    devices = (
        Device("Q1", "npn", ("OUT", "BASE", "SNS"), power, hfe=(0.7 * gain, 1.4 * gain), vbe_spread_V=(0.04, 0.04)),
        Device("R1", "resistor", ("DRV", "BASE"), {"R": 1e3}, tolerance=0.05),
        Device("R2", "resistor", ("SNS", "GND"), {"R": 2.0}, tolerance=0.05),
        Device("R3", "resistor", ("SNS", "BS"), {"R": 1e3}, tolerance=0.05),
        Device("Q2", "npn", ("BASE", "BS", "GND"), small, hfe=(100.0, 300.0), vbe_spread_V=(0.04, 0.04)),
    )
    return Circuit(
        devices=devices,
        held={"GND": fixed(0.0), "+12V": Range(11.8, 12.0, 12.2)},
        drive=Drive("DRV", fixed(0.0), Range(11.8, 12.0, 12.2)),
        output="OUT",
        shorts=("+12V",),
        shunt=("Q2",),
        pass_devices=("Q1",),
        sense=("R2",),
        output_reach_V=(0.0, 12.2),
    )


def test_bench_reading_of_a_sink_lies_within_the_printed_ranges() -> None:
    """A bench measurement (common practice of the trade, no publication): began near 300 mA, stood at 371 mA at full drive,
    about 1.4 A with the shunt lifted, which fixes the gain of the pass device."""
    low, high = 50.0, 1000.0
    for _ in range(40):
        gain = (low * high) ** 0.5
        unlimited = solved(bench_reading_circuit(gain), 25.0).currents[1].unlimited_A
        assert unlimited is not None
        low, high = (gain, high) if unlimited < 1.4 else (low, gain)
        if abs(unlimited - 1.4) < 1e-3:
            break
    currents = solved(bench_reading_circuit(gain), 25.0).currents[1]
    assert currents.unlimited_A == pytest.approx(1.4, rel=1e-2)
    assert currents.begins_range_A is not None and currents.holds_range_A is not None
    assert currents.begins_range_A[0] < 0.300 < currents.begins_range_A[1]
    assert currents.holds_range_A[0] < 0.371 < currents.holds_range_A[1]
    assert currents.begins_A == pytest.approx(0.300, rel=0.1)
    assert currents.holds_A == pytest.approx(0.371, rel=0.1)


def test_the_closed_forms_give_what_their_examples_say() -> None:
    found = doctest.testmod(by_hand)
    assert found.failed == 0
    assert found.attempted > 0
