"""The limits file: every key, what is assumed where it is silent, and every mistake at its place."""

from __future__ import annotations

import math
import subprocess
import sys
from dataclasses import fields
from pathlib import Path

import pytest

from protlint.limits import CheckSetting, DriveLimits, LimiterLimits, Limits, Peak, Range, driver_of, fits, needs_of
from protlint.limits_file import load_limits
from protlint.sources import FileError, InputError
from tests.support.paths import FIXTURES

FULL = FIXTURES / "limits" / "full.toml"
INVALID = sorted((FIXTURES / "limits" / "invalid").glob("*.toml"))


def test_the_board_its_supplies_and_its_drives() -> None:
    limits = load_limits(FULL)
    assert limits.ambient_degC == (-10.0, 27.0, 85.0)
    assert limits.resistor_tolerance == 0.02
    assert limits.vbe_spread_V == pytest.approx((0.08, 0.04))
    assert limits.derating == "ECSS-Q-ST-30-11C"
    assert limits.supplies_V["+24V"] == Range(21.0, 24.0, 27.0)
    assert limits.supplies_V["-15V"] == Range(pytest.approx(-15.75), -15.0, pytest.approx(-14.25))
    assert limits.drives["DRV"] == DriveLimits(
        low_V=Range(0.0, 0.0, 0.0),
        high_V=Range(pytest.approx(10.8), 12.0, pytest.approx(13.2)),
        resistance_ohm=47.0,
        current_A=0.02,
    )
    assert limits.drives["U1.6"].current_A is None
    assert limits.drivers["AMP1"] == DriveLimits(current_A=0.025, power_W=0.6, from_rails_V=1.5)
    assert limits.assumed == ()


def test_names_checks_and_pins() -> None:
    limits = load_limits(FULL)
    assert limits.attributes == {"value": ("NENNWERT", "Comment"), "power": ("P_RATED",)}
    assert limits.checks["base-stop-absent"] == CheckSetting(level="error")
    assert limits.checks["carry-not-met"] == CheckSetting(thresholds={"margin": 0.1})
    assert limits.pins["SOT23-X"] == {"1": "base", "2": "emitter", "3": "collector"}
    assert limits.pins["DUAL6"]["B2"] == "base.2"


def test_what_one_limiter_needs_is_gathered_in_file_order_above_the_defaults() -> None:
    limits = load_limits(FULL)
    needs = needs_of(limits, "Q10", "R11", "OUT")
    assert needs == LimiterLimits(
        carry_A=0.7,
        cap_A=1.2,
        output_V=12.0,
        short_s=2.0,
        shorted_to=("GND", "-15V"),
        sink_K_per_W=2.5,
        shunt_rise_K=20.0,
        pass_rise_K=60.0,
        load_ohm=8.0,
        load_current_A=0.3,
        load_cold_ohm=0.8,
        load_capacitance_F=470e-6,
        peak=Peak(current_A=1.5, lasts_s=0.02, output_V=10.0),
        checks={
            "base-stop-absent": CheckSetting(level="off"),
            "loop-undamped": CheckSetting(level="warning", thresholds={"least": 0.5}),
        },
    )
    assert needs_of(limits, "q11").carry_A == 0.5
    assert needs_of(limits, "Q99", "R40").regulate_A == 0.02
    assert needs_of(limits, "Q99").short_s == math.inf
    assert needs_of(limits, "Q99").carry_A is None


def test_every_field_of_a_limiter_is_reached_by_the_full_file() -> None:
    limits = load_limits(FULL)
    everything = needs_of(limits, "Q10", "R40", "OUT")
    assert [item.name for item in fields(LimiterLimits) if getattr(everything, item.name) in (None, (), {})] == []


@pytest.mark.parametrize(
    ("numbers", "power_W"),
    [
        (("amp7",), 1.0),  # the very number, wherever it stands
        (("AMP8",), 3.0),  # of two globs the later
        (("REG1",), 4.0),  # what is said of all
        ((None, "AMP8"), 3.0),
        (("REG1", "AMP7"), 4.0),
        ((None,), None),
    ],
)
def test_one_driver_table_counts(numbers: tuple[str | None, ...], power_W: float | None) -> None:
    drivers = {"AMP7": 1.0, "A*": 2.0, "AMP?": 3.0, "*": 4.0}
    found = driver_of(Limits(drivers={key: DriveLimits(power_W=value) for key, value in drivers.items()}), *numbers)
    assert (found and found.power_W) == power_W


def test_where_no_driver_table_fits_what_is_stated_of_any_drive_counts() -> None:
    any_drive = DriveLimits(current_A=0.01)
    limits = Limits(drives={"*": any_drive}, drivers={"AMP1": DriveLimits()})
    assert driver_of(limits, "REG1") is driver_of(limits, None) is any_drive
    assert driver_of(limits, "AMP1") == DriveLimits()


@pytest.mark.parametrize(
    ("pattern", "name", "expected"),
    [("Q10", "q10", True), ("Q1?", "Q10", True), ("Q1?", "Q100", False), ("OUT*", "out_A", True), ("D[3]", "D[3]", True)],
)
def test_names_and_globs(pattern: str, name: str, expected: bool) -> None:
    assert fits(pattern, name) is expected


def test_without_a_file_everything_is_at_its_default_and_said() -> None:
    assert load_limits(None).ambient_degC == Limits().ambient_degC
    assert len(load_limits(None).assumed) == 3


def test_what_a_file_leaves_out_is_assumed(tmp_path: Path) -> None:
    path = tmp_path / "limits.toml"
    path.write_text('[board]\nambient = ["0 degC", "25 degC", "60 degC"]\n')
    assumed = load_limits(path).assumed
    assert len(assumed) == 2
    assert not any("ambient" in sentence for sentence in assumed)
    path.write_text("")
    assert len(load_limits(path).assumed) == 3


def test_a_byte_order_mark_and_crlf_are_no_matter(tmp_path: Path) -> None:
    path = tmp_path / "limits.toml"
    path.write_bytes(b'\xef\xbb\xbf[supply]\r\n"+24V" = "24 V"\r\nGND = "0 A"\r\n')
    with pytest.raises(InputError) as caught:
        load_limits(path)
    assert (caught.value.line, caught.value.column) == (3, 1)


@pytest.mark.parametrize("path", INVALID, ids=lambda path: path.stem)
def test_each_mistake_is_one_clear_line_at_its_place(path: Path) -> None:
    expected = path.with_suffix(".expected").read_text(encoding="utf-8").strip()
    with pytest.raises(InputError) as caught:
        load_limits(path)
    assert caught.value.exit_code == 2
    assert expected in str(caught.value)
    assert "\n" not in str(caught.value)


def test_there_are_mistakes_to_test() -> None:
    assert len(INVALID) >= 28


def test_known_checks_and_thresholds_only_where_they_are_given(tmp_path: Path) -> None:
    path = tmp_path / "limits.toml"
    path.write_text('[checks]\nloop-undampd = "error"\n')
    assert load_limits(path).checks["loop-undampd"].level == "error"
    with pytest.raises(InputError, match='did you mean "loop-undamped"') as caught:
        load_limits(path, known_checks={"loop-undamped": ("least",)})
    assert (caught.value.line, caught.value.column) == (2, 1)
    path.write_text("[limiter.Q1]\nchecks = { loop-undamped = { leest = 0.2 } }\n")
    with pytest.raises(InputError, match='did you mean "least"') as caught:
        load_limits(path, known_checks={"loop-undamped": ("least",)})
    assert (caught.value.line, caught.value.column) == (2, 30)


def test_a_missing_file_and_a_folder(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="no such file"):
        load_limits(tmp_path / "none.toml")
    with pytest.raises(FileError, match="folder"):
        load_limits(tmp_path)


def test_a_file_without_compound_units_leaves_pint_alone() -> None:
    program = (
        f"import sys; from protlint.limits_file import load_limits; load_limits({str(FULL)!r}); "
        "sys.exit('pint' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0
