"""The value texts of schematics: IEC 60062 codes, trailing fields, foreign spellings, and what is refused."""

from __future__ import annotations

import math
import subprocess
import sys
from pathlib import Path
from typing import cast

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.quantities import Comma, ValueText, read_beside, read_value
from tests.support.paths import FIXTURES


def _lines(name: str) -> list[list[str]]:
    text = (FIXTURES / "values" / name).read_text(encoding="utf-8")
    return [line.split("\t") for line in text.splitlines() if not line.startswith("# ")]


def _rows(name: str, dimension: str) -> list[tuple[str, str, Comma, ValueText]]:
    rows = []
    for line in _lines(name):
        text, comma, value, tolerance, power, voltage, fitted, unreadable = line + [""] * (8 - len(line))
        numbers = (float(cell) if cell else None for cell in (value, tolerance, power, voltage))
        expected = ValueText(text, *numbers, fitted=fitted != "no", unreadable=unreadable or None)
        rows.append((dimension, text, cast(Comma, comma), expected))
    return rows


ROWS = _rows("resistances.tsv", "resistance") + _rows("capacitances.tsv", "capacitance")


@pytest.mark.parametrize(("dimension", "text", "comma", "expected"), ROWS, ids=lambda item: repr(item)[:40])
def test_a_value_text_says_what_it_says(dimension: str, text: str, comma: Comma, expected: ValueText) -> None:
    read = read_value(text, dimension, comma=comma)
    for name in ("value", "tolerance", "power_W", "voltage_V"):
        wanted = getattr(expected, name)
        got = getattr(read, name)
        assert got == (None if wanted is None else pytest.approx(wanted, rel=1e-12)), name
    assert read.fitted == expected.fitted
    assert read.unreadable == expected.unreadable


@pytest.mark.parametrize("row", _lines("others.tsv"), ids=lambda row: "-".join(row)[:40])
def test_inductances_and_zener_voltages(row: list[str]) -> None:
    dimension, text, comma, value, unreadable = row + [""] * (5 - len(row))
    read = read_value(text, dimension, comma=cast(Comma, comma))
    assert read.value == (pytest.approx(float(value), rel=1e-12) if value else None)
    assert read.unreadable == (unreadable or None)


def test_the_two_micro_signs_and_the_two_ohm_signs_are_one() -> None:
    assert (
        read_value("10\u00b5F", "capacitance").value == read_value("10\u03bcF", "capacitance").value == pytest.approx(1e-5)
    )
    assert read_value("47\u2126", "resistance").value == read_value("47\u03a9", "resistance").value == 47.0


@pytest.mark.parametrize(
    ("text", "value"),
    [("0,1", 0.1), ("4,7k", 4700.0), ("100,1%", 100.0), ("33,0402", None), ("1,000", None), ("2,200", None)],
)
def test_an_undecided_comma_is_read_only_where_one_meaning_makes_sense(text: str, value: float | None) -> None:
    read = read_value(text, "resistance")
    assert read.value == value
    assert (read.unreadable is None) == (value is not None)


LETTERS = {"R": 1.0, "K": 1e3, "M": 1e6, "G": 1e9, "L": 1e-3}
TOLERANCES = {"B": 0.001, "C": 0.0025, "D": 0.005, "F": 0.01, "G": 0.02, "J": 0.05, "K": 0.1, "M": 0.2}
"""IEC 60062: letters for multipliers and tolerances (the tolerance letters from memory of the standard)."""


@given(
    whole=st.integers(0, 999),
    part=st.integers(0, 99),
    letter=st.sampled_from(sorted(LETTERS)),
    tolerance=st.sampled_from(["", *sorted(TOLERANCES)]),
)
def test_an_iec_60062_code_reads_back(whole: int, part: int, letter: str, tolerance: str) -> None:
    read = read_value(f"{whole}{letter}{part:02d}{tolerance}", "resistance")
    assert read.value == pytest.approx((whole + part / 100) * LETTERS[letter], rel=1e-12)
    assert read.tolerance == TOLERANCES.get(tolerance)


@given(
    value=st.decimals("0.001", "999", places=3),
    prefix=st.sampled_from(["p", "n", "u", "µ", "мк"]),
    comma=st.booleans(),
)
def test_a_capacitance_reads_back_with_either_decimal_mark(value: object, prefix: str, comma: bool) -> None:
    scale = {"p": 1e-12, "n": 1e-9}.get(prefix, 1e-6)
    text = f"{value}{prefix}"
    read = read_value(text.replace(".", ",") if comma else text, "capacitance", comma="decimal" if comma else "field")
    assert read.value == pytest.approx(float(str(value)) * scale, rel=1e-12)


@given(
    text=st.text(alphabet="0123456789.,RkKMmunpµΩ%WVJF/+-±() ohmDNIкОм\u00a0\n", max_size=24),
    dimension=st.sampled_from(["resistance", "capacitance", "inductance", "voltage"]),
    comma=st.sampled_from([None, "decimal", "field"]),
)
def test_whatever_text_comes_there_is_a_value_or_a_reason(text: str, dimension: str, comma: Comma | None) -> None:
    read = read_value(text, dimension, comma=comma)
    assert read.text == text
    if read.value is None:
        assert read.unreadable or not read.fitted
    else:
        assert read.unreadable is None
        assert math.isfinite(read.value) and read.value >= 0.0


@given(text=st.text(max_size=40))
def test_any_unicode_is_survived(text: str) -> None:
    read = read_value(text, "resistance")
    assert read.unreadable if read.value is None and read.fitted else read.unreadable is None


def test_a_text_of_megabytes_is_no_value() -> None:
    assert read_value("9" * 5_000_000, "resistance").unreadable == "longer than any value"


@pytest.mark.parametrize(
    ("text", "kind", "number"),
    [
        ("1%", "tolerance", 0.01),
        ("±5 %", "tolerance", 0.05),
        ("J", "tolerance", 0.05),
        ("1/4W", "power", 0.25),
        ("0,25 W", "power", 0.25),
        ("500mW", "power", 0.5),
        ("63V", "voltage", 63.0),
        ("1kV", "voltage", 1000.0),
        ("5", "power", None),
    ],
)
def test_ratings_from_their_own_properties(text: str, kind: str, number: float | None) -> None:
    assert read_beside(text, kind) == (None if number is None else pytest.approx(number))


def test_no_value_text_ever_reaches_pint() -> None:
    program = (
        "import sys\n"
        "from protlint.quantities import read_value\n"
        "from pathlib import Path\n"
        f"for name in ('resistances', 'capacitances'):\n"
        f"    for line in Path({str(FIXTURES / 'values')!r}, name + '.tsv').read_text(encoding='utf-8').splitlines():\n"
        "        for dimension in ('resistance', 'capacitance', 'inductance', 'voltage'):\n"
        "            read_value(line.split(chr(9))[0], dimension)\n"
        "sys.exit('pint' in sys.modules)\n"
    )
    assert subprocess.run([sys.executable, "-c", program], cwd=Path(__file__).parent, check=False).returncode == 0
