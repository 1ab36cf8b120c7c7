"""The figures of every limiter on every board of fixtures/ belong together, and so they do with values moved over decades.

What holds for any limiter, whatever its circuit: most is at least what it carries and holds, the unlimited current at least
what it holds (but for what the shunt itself gives the output), every range has its nominal figure in it, nothing is negative
or no number; and a limiter with a bipolar shunt holds less the warmer it gets.
"""

from __future__ import annotations

import math
import os
import random
from collections.abc import Iterator
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from protlint.board.graph import build_board
from protlint.limits import Range, needs_of
from protlint.limits_file import load_limits
from protlint.netlist import read_netlist
from protlint.partdata.book import load_book
from protlint.solve import locus
from protlint.solve.answers import solve
from protlint.solve.bench import build_bench
from protlint.solve.circuit import Circuit, Device
from protlint.solve.corners import axes_of
from protlint.solve.memo import Memo, canonical
from protlint.solve.network import compile_network
from protlint.solve.solution import Currents, Point, Solution
from protlint.solve.stage import KELVIN, run_stage, sweep_stage
from protlint.topology.language import load_rules
from protlint.topology.match import find_limiters
from tests.support.paths import FIXTURES

AMBIENTS = (-10.0, 27.0, 85.0)
CLOSE = 1e-4
"""What the steps of Newton's method and of the locus leave open."""
UNBOUNDED_A = 1e3
VARIED = int(os.environ.get("PROTLINT_SAMPLED", "1"))
"""How many times each circuit's values are moved."""
CLIFF = 2e-3
"""Where a foldback locks out in some corners, the divider's current is left, and a corner beside the cliff may be missed."""

Solved = tuple[str, Circuit, Solution]


def boards() -> Iterator[tuple[Path, Path | None, list[Path]]]:
    for path in sorted((FIXTURES / "circuits").glob("*.edf")):
        yield path, None, []
    yield FIXTURES / "family" / "quayside-outputs.edf", None, []
    for folder in ("demo", "channels", "clean"):
        (path,) = (FIXTURES / folder).glob("*.edf")
        yield path, FIXTURES / folder / "limits.toml", [FIXTURES / folder / "parts.toml"]


@cache
def circuits() -> tuple[tuple[str, Circuit], ...]:
    """Every circuit that can be made of a limiter in fixtures/, equal ones once, with the board it is on."""
    found: dict[object, tuple[str, Circuit]] = {}
    rules = load_rules()
    for path, limits_file, parts in boards():
        limits = load_limits(limits_file)
        board = build_board(read_netlist(path), limits=limits, book=load_book(parts))
        for limiter in find_limiters(board, rules).limiters:
            needs = needs_of(limits, limiter.id, *limiter.roles.get("sense", ()))
            circuit = build_bench(board, limiter, limits=limits, needs=needs).circuit
            if circuit is not None:
                found.setdefault(canonical(circuit, ())[0], (f"{path.stem} {limiter.id}", circuit))
    return tuple(found.values())


@cache
def solved() -> tuple[Solved, ...]:
    memo = Memo()
    return tuple((name, circuit, solve(circuit, AMBIENTS, memo=memo)) for name, circuit in circuits())


def bounded(solution: Solution) -> bool:
    """Tell whether the drive is bounded: elsewhere no figure means anything, and none is told."""
    return all(
        abs(current_A) < UNBOUNDED_A
        for point in (*solution.high_short, *solution.unlimited)
        for current_A in (point.drive_A, *(state.current_A for state in point.states.values()))
    )


def at_least(more: float | None, less: float | None) -> bool:
    return more is None or less is None or more >= less * (1.0 - CLOSE) - 1e-9


def past_the_sense_A(circuit: Circuit, point: Point) -> float:
    """What the shunt's emitter gives or takes, past the sense resistance: with the shunt taken out it is not there."""
    return sum(abs(state.current_A) + abs(state.control_A) for name, state in point.states.items() if name in circuit.shunt)


def disagreements(circuit: Circuit, solution: Solution) -> Iterator[str]:
    """Yield what does not agree in a solution's figures."""
    for row, shorted in zip(solution.currents, solution.high_short, strict=False):
        at = f"at {row.ambient_degC:g} degC"
        figures = {name: getattr(row, f"{name}_A") for name in ("begins", "holds", "carries", "most", "unlimited")}
        for name, value in figures.items():
            if value is not None and not (math.isfinite(value) and value >= -1e-9):
                yield f"{name} is {value} {at}"
        beside_A = max(past_the_sense_A(circuit, point) for point in (shorted, solution.held_short or shorted))
        for more, less, by in (("most", "carries", 0.0), ("most", "holds", 0.0), ("unlimited", "holds", beside_A)):
            if not at_least(figures[more] and figures[more] + by, figures[less]):
                yield f"{more} {figures[more]} is below {less} {figures[less]} {at}"
        if row.begins_A is not None and row.holds_A is not None and not circuit.latch and row.begins_A > 1.02 * row.holds_A:
            yield f"begins {row.begins_A} is above holds {row.holds_A} {at}"
        yield from _of_ranges(row, at)


def _of_ranges(row: Currents, at: str) -> Iterator[str]:
    ranges = {name: getattr(row, f"{name}_range_A") for name in ("begins", "holds", "carries", "most")}
    for name, ends in ranges.items():
        value = getattr(row, f"{name}_A")
        if (value is None) != (ends is None):
            yield f"{name} {value} has the range {ends} {at}"
        elif ends is not None and not (at_least(value, ends[0]) and at_least(ends[1], value)):
            yield f"{name} {value} lies outside {ends} {at}"
    for less in ("carries", "holds"):
        most, other = ranges["most"], ranges[less]
        if most is not None and other is not None and not (at_least(most[0], other[0]) and at_least(most[1], other[1])):
            yield f"the range of most {most} lies below that of {less} {other} {at}"


def test_the_figures_of_every_limiter_agree() -> None:
    wrong = {name: found for name, circuit, one in solved() if bounded(one) and (found := list(disagreements(circuit, one)))}
    assert wrong == {}
    assert sum(one.not_solved is None and bounded(one) for _, _, one in solved()) > 50


def test_a_bipolar_shunt_holds_less_the_warmer_it_gets() -> None:
    """V_BE falls by about 2 mV/K: wherever the limiter, and not the drive, gives the current its limit at every ambient."""
    compared = 0
    for name, circuit, one in solved():
        shunts = [device for device in circuit.devices if device.name in circuit.shunt]
        limits = all(row.limited_by_short == "limiter" for row in one.currents)
        mostly = all((row.unlimited_A or 0.0) > 2.0 * (row.holds_A or 0.0) for row in one.currents)
        if bounded(one) and limits and mostly and not circuit.latch and all(one.kind in ("npn", "pnp") for one in shunts):
            held = [row.holds_A or 0.0 for row in one.currents]
            # a shunt that the drive overruns gives the output the drive's current, which grows as it is warmed
            if held and (one.currents[1].shunt_A or 0.0) < 0.02 * held[1]:
                assert held == sorted(held, reverse=True), name
                compared += 1
    assert compared > 10


def test_a_seeded_sample_of_corners_lies_within_the_range_of_holds() -> None:
    rng = np.random.default_rng(20)
    for name, circuit, one in solved():
        if one.not_solved is not None or not bounded(one) or circuit.latch or one.currents[1].holds_range_A is None:
            continue
        stage, sweep = sweep_stage(compile_network(circuit), one.short or "", AMBIENTS, 1, drives=2)
        corner = rng.uniform(-1.0, 1.0, (len(stage.axes), 64))
        corner[:, ::2] = np.sign(corner[:, ::2])
        start = sweep.full_drive(0).operating.inner[:, [1]]
        sample = run_stage(stage, np.full(64, AMBIENTS[1] + KELVIN), corner=corner, start=start).output_A
        low_A, high_A = one.currents[1].holds_range_A
        assert low_A * (1.0 - (CLIFF if circuit.ground_leg else CLOSE)) <= np.nanmin(sample), name
        assert np.nanmax(sample) <= high_A * (1.0 + CLOSE), name


def moved(circuit: Circuit, rng: random.Random) -> Circuit:
    """Return a circuit with its values moved: resistances over three decades, devices over two, gains over one."""
    decades = rng.choice((0.3, 1.0, 3.0))

    def other(device: Device) -> Device:
        model = dict(device.model)
        if device.kind == "resistor" and rng.random() < 0.7:
            model["R"] *= 10.0 ** rng.uniform(-decades, decades)
        for name in ("IS", "KP"):
            if name in model and device.kind != "resistor" and rng.random() < 0.4:
                model[name] *= 10.0 ** rng.uniform(-2.0, 2.0)
        hfe = device.hfe
        if hfe is not None and "BF" in model and rng.random() < 0.4:
            factor = 10.0 ** rng.uniform(-0.5, 0.5)
            model["BF"], hfe = max(model["BF"] * factor, 1.0), (max(hfe[0] * factor, 1.0), max(hfe[1] * factor, 1.0))
        return replace(device, model=model, hfe=hfe)

    drive = circuit.drive
    if rng.random() < 0.4:
        drive = replace(drive, current_A=10.0 ** rng.uniform(-4.0, 0.0))
    elif rng.random() < 0.5:
        drive = replace(drive, resistance_ohm=10.0 ** rng.uniform(0.0, 5.0))
    return replace(circuit, devices=tuple(map(other, circuit.devices)), drive=drive)


def test_the_figures_agree_with_values_moved_over_decades() -> None:
    """Solved, or refused with a reason; never a figure that cannot be."""
    rng, wrong, told = random.Random(20260421), {}, 0
    for place, (name, circuit) in enumerate(circuits()):
        for turn in range(VARIED if not circuit.latch and (place % 2 or VARIED > 1) else 0):
            other = moved(circuit, rng)
            one = solve(other, AMBIENTS)
            assert one.not_solved or one.currents
            if one.not_solved is None and bounded(one):
                told += 1
                found = list(disagreements(other, one))
                if found:
                    wrong[f"{name} {turn}"] = found
    assert wrong == {}
    assert told > 15 * VARIED


def circuit_of(board: str, limiter: str) -> Circuit:
    return next(circuit for name, circuit in circuits() if name == f"{board} {limiter}")


def test_a_stage_that_its_drive_does_not_control_is_refused_with_the_key() -> None:
    """The gates without their pull-up: with the drive off nothing discharges them, and both its ends give the same."""
    whole = circuit_of("quayside-outputs", "M1101")
    hanging = replace(whole, devices=tuple(device for device in whole.devices if device.name != "R1108"))
    assert solve(whole, AMBIENTS).not_solved is None
    reason = solve(hanging, AMBIENTS).not_solved
    assert reason is not None
    assert "the drive at ON_11 does not control the stage" in reason
    assert "[drive.ON_11] low and high" in reason


def test_a_drive_of_a_supply_moves_with_that_supply() -> None:
    """The feed is the supply itself: one thing with one spread, and a range no wider than that."""
    circuit = next(one for _, one in circuits() if one.drive.high_follows is not None and one.drive.high_follows in one.held)
    supply = circuit.drive.high_follows or ""
    usual_V = circuit.held[supply].usual
    wide = Range(0.9 * usual_V, usual_V, 1.1 * usual_V)
    spread = replace(circuit, held={**circuit.held, supply: wide}, drive=replace(circuit.drive, high_V=wide))
    of_nets = {(axis.device, axis.parameter) for axis in axes_of(compile_network(spread)) if axis.place in ("held", "drive")}
    assert of_nets == {(supply, "V")}
    together = solve(spread, AMBIENTS).currents[1].holds_range_A
    apart = solve(replace(spread, drive=replace(spread.drive, high_follows=None)), AMBIENTS).currents[1].holds_range_A
    assert together is not None
    assert apart is not None
    assert apart[0] <= together[0] < together[1] <= apart[1]


def test_points_of_the_locus_that_were_not_found_are_told(monkeypatch: pytest.MonkeyPatch) -> None:
    circuit = circuit_of("sink-npn", "Q1")
    whole = solve(circuit, AMBIENTS)
    run_at = locus.run_at

    def with_a_gap(stage, conditions, output_V, start):  # type: ignore[no-untyped-def]
        run = run_at(stage, conditions, output_V, start)
        if output_V is None:
            return run
        gap = (output_V > 3.0) & (output_V < 6.0)
        return replace(run, output_A=np.where(gap, np.nan, run.output_A))

    monkeypatch.setattr(locus, "run_at", with_a_gap)
    gapped = solve(circuit, AMBIENTS)
    assert not [said for check, said in whole.not_checked if check == "most"]
    told = [said for check, said in gapped.not_checked if check == "most"]
    assert len(told) == 3
    assert "no operating point was found with the output from 3." in told[0]
