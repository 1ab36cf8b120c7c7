"""Quantities as people write and read them; pint is the outside judge of units and dimensions."""

from __future__ import annotations

import math
import subprocess
import sys

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.quantities import DIMENSIONS, format_pair, format_quantity, read_any, read_quantity, read_range

REGISTRY = pint.UnitRegistry(cache_folder=None)
PREFIXES = {"f": -15, "p": -12, "n": -9, "u": -6, "µ": -6, "m": -3, "": 0, "k": 3, "M": 6, "G": 9, "T": 12}
PRINTED = {
    "voltage": "V", "current": "A", "resistance": "ohm", "power": "W", "time": "s", "capacitance": "F", "inductance": "H",
    "frequency": "Hz", "conductance": "S", "charge": "C", "temperature": "degC", "temperature rise": "K",
    "thermal resistance": "K/W", "fraction": "%",
}  # fmt: skip


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("24 V", "voltage", 24.0),
        ("24V", "voltage", 24.0),
        ("-15 V", "voltage", -15.0),
        ("−15 V", "voltage", -15.0),
        ("20 mA", "current", 0.02),
        ("8 ohm", "resistance", 8.0),
        ("4.7 kΩ", "resistance", 4700.0),
        ("4.7 k\u2126", "resistance", 4700.0),
        ("2.5 K/W", "thermal resistance", 2.5),
        ("2.5 °C/W", "thermal resistance", 2.5),
        ("-10 degC", "temperature", -10.0),
        ("20 K", "temperature rise", 20.0),
        ("1 %", "fraction", 0.01),
        ("100 ppm/K", "per kelvin", 1e-4),
        ("-2 mV/K", "voltage per kelvin", -0.002),
        ("5 mW/K", "thermal conductance", 0.005),
        ("100 nF", "capacitance", 1e-7),
        ("0.5 µs", "time", 5e-7),
        ("1e-3 A", "current", 0.001),
        ("continuous", "time", math.inf),
        ("dc", "time", math.inf),
    ],
)
def test_a_plain_quantity(text: str, dimension: str, value: float) -> None:
    assert read_quantity(text, dimension) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("2 V/ohm", "current", 2.0),
        ("300 K", "temperature", 26.85),
        ("14 degF", "temperature", -10.0),
        ("1 min", "time", 60.0),
        ("36 delta_degF", "temperature rise", 20.0),
        ("3 J/s", "power", 3.0),
        ("2 V*A", "power", 2.0),
        ("1 A/V", "conductance", 1.0),
    ],
)
def test_a_compound_unit_goes_to_pint(text: str, dimension: str, value: float) -> None:
    assert read_quantity(text, dimension) == pytest.approx(value, rel=1e-9)


@pytest.mark.parametrize(
    ("text", "dimension", "says"),
    [
        ("24", "voltage", "with its unit"),
        ("24 A", "voltage", '"A" is the unit of a current'),
        ("4k7", "resistance", "not known"),
        ("10K", "resistance", '"K" is the unit of a temperature difference'),
        ("27 C", "temperature", '"C" is the unit of a charge'),
        ("20 degC", "temperature rise", '"degC" is the unit of a temperature'),
        ("2,5 K/W", "thermal resistance", "decimal point"),
        ("1 furlong/", "power", "not known"),
        ("1 m", "current", "does not measure"),
        ("", "current", "expected a current"),
        ("lots", "current", "expected a current"),
        ("1e999 A", "current", "endless"),
        ("9**9**9 A", "current", "not known"),
        ("1 __import__('os')", "current", "not known"),
    ],
)
def test_a_wrong_unit_says_what_was_expected(text: str, dimension: str, says: str) -> None:
    with pytest.raises(ValueError, match="expected") as caught:
        read_quantity(text, dimension)
    assert says in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("text", "low", "usual", "high"),
    [
        ("24 V", 24.0, 24.0, 24.0),
        ("24 V 10 %", 21.6, 24.0, 26.4),
        ("24 V +-10 %", 21.6, 24.0, 26.4),
        ("24 V ±10%", 21.6, 24.0, 26.4),
        ("-15 V 5 %", -15.75, -15.0, -14.25),
    ],
)
def test_a_spread_around_a_quantity(text: str, low: float, usual: float, high: float) -> None:
    assert read_range(text, "voltage") == pytest.approx((low, usual, high))


def test_a_negative_spread_is_refused() -> None:
    with pytest.raises(ValueError, match="spread"):
        read_range("24 V -10 %", "voltage")


def test_a_threshold_takes_any_unit() -> None:
    assert read_any("80 %") == pytest.approx(0.8)
    assert read_any("0.3 V") == 0.3
    with pytest.raises(ValueError, match="unit"):
        read_any("0.3 smoots")


@pytest.mark.parametrize("dimension", sorted(DIMENSIONS))
def test_every_unit_agrees_with_pint(dimension: str) -> None:
    known = DIMENSIONS[dimension]
    compared = 0
    for symbol in known.units:
        for prefix in PREFIXES if symbol in known.prefixed else [""]:
            unit = f"{prefix}{symbol}".replace("degC/", "delta_degC/").replace("/degC", "/delta_degC").replace("Ω", "ohm")
            unit = (
                unit.replace("°C/", "delta_degC/")
                .replace("/°C", "/delta_degC")
                .replace("°C", "degC")
                .replace("%", "percent")
            )
            asked = REGISTRY.Quantity(3.0, REGISTRY.parse_units(unit)).to(known.pint_unit).magnitude
            assert read_quantity(f"3 {prefix}{symbol}", dimension) == pytest.approx(asked, rel=1e-12), f"{prefix}{symbol}"
            compared += 1
    assert compared == len(known.units) + (len(PREFIXES) - 1) * len(known.prefixed)


@pytest.mark.parametrize("dimension", sorted(DIMENSIONS))
def test_every_example_reads_in_its_own_dimension(dimension: str) -> None:
    assert math.isfinite(read_quantity(DIMENSIONS[dimension].example, dimension))


@pytest.mark.parametrize(
    ("value", "unit", "shown"),
    [
        (0.565, "W", "0.565 W"),
        (0.33, "ohm", "330 mohm"),
        (27.0, "degC", "27 degC"),
        (0.3669, "A", "0.367 A"),
        (0.0201, "A", "20.1 mA"),
        (4700.0, "ohm", "4.7 kohm"),
        (999.7, "ohm", "1 kohm"),
        (1e-7, "F", "100 nF"),
        (-0.002, "V", "-2 mV"),
        (0.0, "V", "0 V"),
        (-0.0, "V", "0 V"),
        (1234.5, "K/W", "1230 K/W"),
        (0.01, "%", "1 %"),
        (0.125, "%", "12.5 %"),
        (120.0, "", "120"),
        (math.inf, "s", "continuous"),
        (math.inf, "A", "infinite A"),
        (math.nan, "A", "not known"),
    ],
)
def test_quantities_for_people(value: float, unit: str, shown: str) -> None:
    assert format_quantity(value, unit) == shown


def test_more_figures_where_asked() -> None:
    assert format_quantity(0.366917, "A", digits=5) == "0.36692 A"


@pytest.mark.parametrize(
    ("one", "other", "shown"),
    [
        (0.2, 0.13, ("0.2 W", "0.13 W")),
        (0.13004, 0.13, ("0.13004 W", "0.13 W")),
        (0.13, 0.13, ("0.13 W", "0.13 W")),
        (0.13 + 1e-12, 0.13, ("0.13 W", "0.13 W")),
    ],
)
def test_two_quantities_held_against_each_other_can_be_told_apart(one: float, other: float, shown: tuple[str, str]) -> None:
    assert format_pair(one, other, "W") == shown


@given(value=st.floats(1e-14, 1e14) | st.floats(-1e14, -1e-14), dimension=st.sampled_from(sorted(PRINTED)))
def test_what_is_printed_reads_back_to_the_printed_figures(value: float, dimension: str) -> None:
    shown = format_quantity(value, PRINTED[dimension])
    assert read_quantity(shown, dimension) == pytest.approx(value, rel=0.0051)
    assert len(shown) < 32


@given(value=st.floats(1e-14, 1e14), dimension=st.sampled_from(sorted(PRINTED)))
def test_seventeen_figures_read_back_exactly(value: float, dimension: str) -> None:
    shown = format_quantity(value, PRINTED[dimension], digits=17)
    assert read_quantity(shown, dimension) == pytest.approx(value, rel=4e-16)


@given(text=st.text(max_size=30), dimension=st.sampled_from(sorted(DIMENSIONS)))
def test_any_text_is_a_quantity_or_one_clear_error(text: str, dimension: str) -> None:
    try:
        value = read_quantity(text, dimension)
    except ValueError as error:
        assert "expected" in str(error)
    else:
        assert not math.isnan(value)


def test_pint_stays_outside_until_a_compound_unit_asks_for_it() -> None:
    program = (
        "import sys\n"
        "from protlint.quantities import read_quantity, read_range, format_quantity\n"
        "read_range('24 V 10 %', 'voltage'); read_quantity('2.5 K/W', 'thermal resistance'); format_quantity(1.0, 'A')\n"
        "assert 'pint' not in sys.modules\n"
        "read_quantity('3 J/s', 'power')\n"
        "assert 'pint' in sys.modules\n"
    )
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0
