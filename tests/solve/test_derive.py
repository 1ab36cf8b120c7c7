"""Models from data-sheet figures: solved again, they show the figures they came from."""

from __future__ import annotations

import doctest
from dataclasses import replace

import numpy as np
import pytest

from protlint.partdata.book import load_book
from protlint.solve import derive as module
from protlint.solve.answers import solve
from protlint.solve.charges import NEEDS, Junction, depletion, missing_charges
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.dc import solve_lanes
from protlint.solve.derive import Derived, derive
from protlint.solve.lanes import Lanes, known_voltages
from protlint.solve.network import compile_network
from tests.support.by_hand import base_emitter_voltage
from tests.support.circuits import around, fixed

AT_25_DEGC = 298.15
EMPTY = Circuit((), {"GND": fixed(0.0)}, Drive("DRV", fixed(0.0), fixed(5.0)), "OUT", ("GND",), (), (), ())


def current(kind: str, model: dict[str, float], first_V: float, control_V: float) -> float:
    """Current into the first terminal with the last one at ground."""
    nodes = ("OUT", "DRV", "GND") if kind in ("npn", "nmos", "pnp", "pmos") else ("OUT", "GND")
    network = compile_network(around(Device("X", kind, nodes, model)))
    held = np.zeros((len(network.held), 1))
    known = known_voltages(held, np.array([first_V]), np.array([control_V]))
    return float(solve_lanes(network, Lanes(np.array([AT_25_DEGC]), known)).output_A[0])


def test_every_built_in_output_capacitance_comes_back_at_the_voltage_it_is_stated_at() -> None:
    """C_ob is that of the collector junction at its reverse voltage: the depletion law leads to C_J0 and back."""
    stated = {name: one for name, one in load_book().entries.items() if "cob" in one.ratings}
    assert len(stated) > 50
    for name, entry in stated.items():
        ratings = {key: figure.value for key, figure in entry.ratings.items()}
        model = derive(entry.kind, ratings, entry.model).model
        shape = (np.full((1, 1), value) for value in (model["CJC"], 0.75, 0.33, 0.5))
        _, capacitance_F = depletion(np.full((1, 1), -ratings["cob_at"]), Junction(*shape))
        assert capacitance_F[0, 0] == pytest.approx(ratings["cob"], rel=1e-9), name


def test_built_in_types_whose_loop_cannot_be_judged_are_those_whose_data_sheets_leave_out_a_capacitance() -> None:
    """What is missing is asked for by key; nothing stands in for it. From memory: the makers' sheets of these give none."""
    without = set()
    for entry in load_book().entries.values():
        if entry.kind.removesuffix("-darlington") not in NEEDS:
            continue
        ratings = {key: figure.value for key, figure in entry.ratings.items()}
        model = derive(entry.kind, ratings, entry.model).model
        device = Device("X", entry.kind.removesuffix("-darlington"), ("A", "B", "C"), model, part_number=entry.part_number)
        asked = missing_charges(replace(EMPTY, devices=(device,)))
        assert all(entry.part_number in one for one in asked)
        without |= {entry.part_number} if asked else set()
    assert without == {
        "BD135", "BD136", "BD137", "BD138", "BD139", "BD139-16", "BD140", "BD911", "BD912", "MJ2955", "MJE15030",
        "MJE2955T", "MJE3055T",
        "MJE15031", "MJE15032", "MJE15033", "MJE340", "MJE350", "TIP2955", "TIP29C", "TIP3055", "TIP30C", "TIP31C", "TIP32C",
        "TIP35C", "TIP36C", "TIP41C", "TIP42C",
    }  # fmt: skip


def test_a_bipolar_shows_the_base_emitter_voltage_and_the_gain_of_its_data_sheet() -> None:
    """BC547B data sheet: 0.66 V typical at 2 mA, hFE 200 to 450, 100 mA, f_T 300 MHz, C_ob 3.5 pF at 10 V."""
    ratings = {
        "vbe": 0.66,
        "vbe_at": 2e-3,
        "hfe_min": 200.0,
        "hfe_max": 450.0,
        "ic": 0.1,
        "ft": 3e8,
        "cob": 3.5e-12,
        "cob_at": 10.0,
    }
    found = derive("npn", ratings, {})
    assert current("npn", dict(found.model), 0.66, 0.66) == pytest.approx(2e-3, rel=0.03)
    assert found.hfe == (200.0, 450.0)
    assert found.model["BF"] == pytest.approx(300.0)
    assert found.model["TF"] == pytest.approx(0.53e-9, rel=0.01)
    assert found.model["CJC"] > 3.5e-12
    assert found.derived
    assert not found.assumed


def test_a_model_of_its_own_stays_as_it_is() -> None:
    model = {"IS": 1e-14, "BF": 250.0}
    found = derive("npn", {"vbe": 0.9, "vbe_at": 1.0, "hfe_min": 100.0, "hfe_max": 300.0}, model)
    assert found.model == model
    assert found.hfe == (100.0, 300.0)
    assert found.assumed == ()


def test_nothing_known_gives_a_wide_default_that_is_said_to_be_assumed() -> None:
    found = derive("npn", {}, {})
    assert found.vbe_spread_V == (0.10, 0.10)
    assert found.hfe == (50.0, 400.0)
    assert len(found.assumed) >= 3
    assert 0.55 < base_emitter_voltage(2e-3, found.model["IS"]) < 0.75
    for kind in ("pnp", "nmos", "pmos", "diode", "npn-darlington", "pnp-darlington"):
        assert derive(kind, {}, {}).assumed


def test_least_and_greatest_base_emitter_voltages_make_the_spread() -> None:
    """BC847 family: 0.58 V to 0.70 V at 2 mA."""
    found = derive("npn", {"vbe_min": 0.58, "vbe_max": 0.70, "vbe_at": 2e-3, "ic": 0.1}, {})
    assert found.vbe_spread_V == pytest.approx((0.06, 0.06))
    assert current("npn", dict(found.model), 0.64, 0.64) == pytest.approx(2e-3, rel=0.03)


@pytest.mark.parametrize("kind", ["nmos", "pmos"])
def test_a_mosfet_shows_threshold_transconductance_and_on_resistance(kind: str) -> None:
    """IRF540 data sheet: V_GS(th) 2 V to 4 V at 250 uA, g_fs 15 S typical at 17 A, R_DS(on) 0.047 ohm typical at 10 V."""
    ratings = {
        "vgs_th_min": 2.0,
        "vgs_th_max": 4.0,
        "vgs_th_at": 250e-6,
        "gfs": 15.0,
        "gfs_at": 17.0,
        "rds_on_typ": 0.047,
        "id": 28.0,
    }
    found = derive(kind, ratings, {})
    sign = 1.0 if kind == "nmos" else -1.0
    assert found.vbe_spread_V == pytest.approx((1.0, 1.0))
    below, above = (sign * current(kind, dict(found.model), sign * 10.0, sign * volts) for volts in (2.99, 3.01))
    assert below < 250e-6 < above
    on = current(kind, dict(found.model), sign * 0.1, sign * 10.0)
    assert sign * 0.1 / on == pytest.approx(0.047 if 1.0 / (found.model["KP"] * 7.0) < 0.047 else 0.02, rel=0.1)
    K_P = found.model["KP"]
    assert pytest.approx(15.0) == (2.0 * K_P * 17.0) ** 0.5


def test_a_mosfet_with_an_on_resistance_alone() -> None:
    found = derive("nmos", {"rds_on": 0.1, "vgs_th": 3.0}, {})
    assert 0.1 / current("nmos", dict(found.model), 0.1, 10.0) == pytest.approx(0.1, rel=0.05)


def test_a_diode_shows_its_forward_voltage() -> None:
    found = derive("diode", {"vf": 0.72, "vf_at": 5e-3, "if": 0.2}, {})
    assert current("diode", dict(found.model), 0.72, 0.0) == pytest.approx(5e-3, rel=1e-3)


def test_a_zener_shows_its_voltage_and_its_differential_resistance() -> None:
    """A 12 V zener of 10 ohm at 5 mA."""
    found = derive("zener", {"vz": 12.0, "vz_at": 5e-3, "zz": 10.0}, {})
    at, more = (-current("zener", dict(found.model), -volts, 0.0) for volts in (12.0, 12.01))
    assert at == pytest.approx(5e-3, rel=1e-2)
    assert 0.01 / (more - at) == pytest.approx(10.0, rel=0.1)
    assert "BV" not in derive("zener", {}, {}).model


def test_a_darlington_part_is_two_transistors_that_show_its_figures() -> None:
    """TIP122 data sheet: hFE 1000 at least at 3 A, V_BE 2.5 V at most at 3 A."""
    found = derive("npn-darlington", {"hfe_min": 1000.0, "ic": 5.0, "vbe": 1.6, "vbe_at": 3.0}, {})
    assert found.hfe is not None
    assert found.hfe[0] ** 2 == pytest.approx(1000.0)
    circuit = darlington(found)
    solution = solve(circuit, (25.0, 25.0, 25.0))
    point = solution.unlimited[1] if solution.unlimited else solution.held_short
    assert point is not None
    gain = point.output_A / point.drive_A
    assert gain == pytest.approx(found.model["BF"] ** 2, rel=0.6)


def darlington(found: Derived) -> Circuit:
    """A Darlington part as a sink that carries about 1 A."""
    devices = (
        Device("QD driver", "npn", ("OUT", "BASE", "MID"), found.driver_model),
        Device("QD", "npn", ("OUT", "MID", "SNS"), found.model),
        Device("RS", "resistor", ("SNS", "GND"), {"R": 0.1}),
    )
    return Circuit(
        devices=devices,
        held={"GND": fixed(0.0), "SUP": fixed(10.0)},
        drive=Drive("BASE", fixed(0.0), fixed(5.0), current_A=0.3e-3),
        output="OUT",
        shorts=("SUP",),
        shunt=(),
        pass_devices=("QD",),
        sense=("RS",),
    )


def test_the_examples_in_the_docstrings_hold() -> None:
    found = doctest.testmod(module)
    assert found.failed == 0
    assert found.attempted > 0
