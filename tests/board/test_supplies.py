"""Which names state a voltage, and who is believed first."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.board.supplies import stated_voltage, supply_of
from protlint.limits import DriveLimits, LimiterLimits, Limits, Range


@pytest.mark.parametrize(
    ("name", "voltage_V"),
    [
        ("+12V", 12.0), ("-15V", -15.0), ("−15V", -15.0), ("3V3", 3.3), ("+3.3V", 3.3), ("+3,3V", 3.3), ("12V0", 12.0),
        ("1V8", 1.8), ("1P8V", 1.8), ("V24", 24.0), ("V+15", 15.0), ("V-15", -15.0), ("P12V", 12.0), ("N15V", -15.0),
        ("+24V_IN", 24.0), ("+5VA", 5.0), ("+5V_D", 5.0), ("12V_1", 12.0), ("+48VDC", 48.0), ("VCC_3V3", 3.3),
        ("VDD1V8", 1.8), ("USB_5V", 5.0), ("CH1/+12V", 12.0), ("+12v", 12.0), ("13V8", 13.8),
        ("GND", 0.0), ("AGND", 0.0), ("GNDA", 0.0), ("PGND", 0.0), ("GND1", 0.0), ("0V", 0.0), ("CH1/GND", 0.0),
    ],
)  # fmt: skip
def test_names_that_state_a_voltage(name: str, voltage_V: float) -> None:
    assert stated_voltage(name) == voltage_V


@pytest.mark.parametrize(
    "name",
    [
        "VCC", "VDD", "VSS", "VEE", "VBAT", "VIN", "VOUT", "V1", "V5", "+12", "N12", "NET12", "Q10", "OUT", "BASE",
        "5V_EN", "12V_SENSE", "3V3_PG", "+24V_OUT", "VOUT12V", "12VAC", "230VAC", "GND_SENSE", "GNDREF_BUF", "+12V2", "5V1",
        "VEE_5V", "PWR_GOOD", "D5V", "",
    ],
)  # fmt: skip
def test_names_that_state_none(name: str) -> None:
    assert stated_voltage(name) is None


def test_a_negative_nothing_is_nothing() -> None:
    assert str(stated_voltage("-0V")) == "0.0"


def test_the_limits_file_counts_before_the_name() -> None:
    limits = Limits(supplies_V={"+12v": Range(11.0, 12.5, 14.0), "VCC": Range(5.0, 5.0, 5.0)})
    supply = supply_of(["+12V"], limits)
    assert supply is not None
    assert (supply.voltage_V, supply.known_from) == (Range(11.0, 12.5, 14.0), "limits file")
    second = supply_of(["+5V", "VCC"], limits)
    assert second is not None
    assert second.known_from == "limits file"
    third = supply_of(["X", "-15V"], limits)
    assert third is not None
    assert (third.voltage_V, third.known_from) == (Range(-15.0, -15.0, -15.0), "net name")
    assert supply_of(["X"], limits) is None


def test_an_output_or_a_driven_net_is_no_supply_whatever_its_name() -> None:
    assert supply_of(["+12V"], Limits(limiters={"+12V": LimiterLimits(carry_A=1.0)})) is None
    assert supply_of(["+12V"], Limits(drives={"+12V": DriveLimits()})) is None
    assert supply_of(["+12V"], Limits(drives={"+12v": DriveLimits()})) is None
    assert supply_of(["+12V"], Limits(drives={"+12*": DriveLimits()})) is not None
    assert supply_of(["+12V"], Limits(limiters={"*": LimiterLimits(carry_A=1.0)})) is not None


@given(volts=st.integers(1, 999), sign=st.sampled_from(["+", "-", ""]))
def test_whole_volts(volts: int, sign: str) -> None:
    assert stated_voltage(f"{sign}{volts}V") == (-volts if sign == "-" else volts)


@given(name=st.text(max_size=20))
def test_any_name_is_survived(name: str) -> None:
    voltage_V = stated_voltage(name)
    assert voltage_V is None or abs(voltage_V) < 1000.0
