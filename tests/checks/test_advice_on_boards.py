"""Advice on drawn circuits holds through the whole road: the remedy's words, drawn into the netlist, cure it."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import pytest

from protlint.findings import Finding
from protlint.pipeline import Review, review
from protlint.quantities import preferred
from protlint.solve import advice as advice_module
from protlint.solve.advice import AIM, BASE_EMITTER, COLLECTOR_BASE, DRIVE_FAR, places
from protlint.solve.circuit import Circuit, Device
from tests.support.circuit_files import Files, plain, write_files
from tests.support.dynamics import moving_shape

WORDS = re.compile(r"(?:take (\S+) out)?(?: and )?(?:fit (\S+) (\S*)F .*\((\S+) to (\S+)\))?: damping")
SCALE = {"p": 1e-12, "n": 1e-9, "u": 1e-6}
RINGING = [
    ("compound", 0),
    ("nmos follower", 2),
    ("foldback", 3),
    ("slope", 4),
    ("parallel", 0),
]
AT_EACH_PLACE = [
    ("foldback", 2, COLLECTOR_BASE),
    ("darlington", 0, DRIVE_FAR),
    ("foldback", 2, BASE_EMITTER),
]


def files_of(circuit: Circuit, folder: Path) -> Files:
    folder.mkdir(exist_ok=True)
    return write_files(circuit, folder)


def reviewed(circuit: Circuit, folder: Path) -> Review:
    files = files_of(circuit, folder)
    return review(files.netlist, limits=files.limits, parts=[files.parts])


def ringing(found: Review) -> Finding | None:
    return next((one for one in found.findings if one.check == "loop-undamped"), None)


def worst_damping(found: Review) -> float:
    (limiter,) = found.limiters
    loop = limiter.solution.loop
    assert loop is not None
    assert loop.worst_damping is not None
    return loop.worst_damping


def drawn_in(circuit: Circuit, remedy: str, *, smaller: bool = False) -> Circuit:
    """The circuit with what a remedy says done, or with the next smaller E6 value than it says."""
    told = WORDS.match(remedy)
    assert told is not None, remedy
    out, value, prefix, first, second = told.groups()
    devices = [one for one in circuit.devices if one.name != out]
    if value is not None:
        farad = float(value) * SCALE[prefix]
        farad = preferred(0.99 * farad, "E6", "down") if smaller else farad
        devices.append(Device("C77", "capacitor", (first, second), {"C": farad}))
    return replace(circuit, devices=tuple(devices))


def hold_the_advice(circuit: Circuit, folder: Path) -> str:
    """Apply the remedy and the next smaller value; return the remedy."""
    before = reviewed(circuit, folder / "before")
    finding = ringing(before)
    assert finding is not None
    assert finding.remedy is not None
    assert "the delay goes from" in finding.remedy or "and still no delay" in finding.remedy
    after = reviewed(drawn_in(circuit, finding.remedy), folder / "after")
    assert ringing(after) is None
    known = {(one.check, one.parts) for one in before.findings}
    assert [one.message for one in after.findings if (one.check, one.parts) not in known] == []
    assert worst_damping(after) >= AIM
    assert worst_damping(reviewed(drawn_in(circuit, finding.remedy, smaller=True), folder / "less")) < AIM
    return finding.remedy


@pytest.mark.parametrize(("shape", "seed"), RINGING)
def test_the_remedy_cures_the_board_and_the_next_smaller_value_does_not(shape: str, seed: int, tmp_path: Path) -> None:
    hold_the_advice(plain(moving_shape(shape, seed)), tmp_path)


@pytest.mark.parametrize(("shape", "seed", "place"), AT_EACH_PLACE)
def test_it_does_at_each_of_the_usual_places(
    shape: str, seed: int, place: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where the other places are taken, the smallest value at this one is advised."""
    monkeypatch.setattr(advice_module, "places", lambda circuit: {place: places(circuit)[place]})
    remedy = hold_the_advice(plain(moving_shape(shape, seed)), tmp_path)
    assert ("far end" if place == DRIVE_FAR else place) in remedy


def fragile(circuit: Circuit, folder: Path, lasts: str = "100 us") -> Review:
    """The review with a pass device that bears next to nothing for as long as a slowed limiter takes, or for longer."""
    files = files_of(circuit, folder)
    parts = files.parts.read_text().replace("[TYPE_Q1.ratings]\n", '[TYPE_Q1.ratings]\ntj_max = "150 degC"\n')
    area = f'[[TYPE_Q1.safe_area]]\nlasts = "{lasts}"\npoints = [["1 V", "8 A"], ["80 V", "1 mA"]]\n'
    files.parts.write_text(parts + area)
    return review(files.netlist, limits=files.limits, parts=[files.parts])


def test_a_place_that_makes_the_limiter_too_late_is_passed_over(tmp_path: Path) -> None:
    circuit = plain(moving_shape("foldback", 2))
    usual = ringing(reviewed(circuit, tmp_path / "usual"))
    careful = ringing(fragile(circuit, tmp_path / "careful"))
    assert usual is not None
    assert careful is not None
    assert usual.remedy is not None
    assert careful.remedy is not None
    assert "from collector to base" in usual.remedy
    slowed = fragile(drawn_in(circuit, usual.remedy), tmp_path / "slowed")
    assert "trips-late" in {one.check for one in slowed.findings}
    assert "far end" in careful.remedy
    cured = fragile(drawn_in(circuit, careful.remedy), tmp_path / "cured")
    assert not {"trips-late", "loop-undamped"} & {one.check for one in cured.findings}


def test_a_place_is_passed_over_too_where_only_a_curve_for_a_longer_time_is_known(tmp_path: Path) -> None:
    """It convicts nobody; but what is advised has to be cleared."""
    careful = ringing(fragile(plain(moving_shape("foldback", 2)), tmp_path, "dc"))
    assert careful is not None
    assert careful.remedy is not None
    assert "far end" in careful.remedy


def test_where_every_place_makes_it_too_late_that_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    only = {COLLECTOR_BASE}
    monkeypatch.setattr(
        advice_module, "places", lambda circuit: {name: ends for name, ends in places(circuit).items() if name in only}
    )
    finding = ringing(fragile(plain(moving_shape("foldback", 2)), tmp_path))
    assert finding is not None
    assert finding.remedy is not None
    assert "; then also trips-late: fit a device as Q1 whose safe area" in finding.remedy
