"""Wiring faults as findings: each names its shunt and what to change, and its cure, applied to the netlist, leaves a sound
limiter and no fault in a second review."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from dataclasses import replace
from functools import cache
from typing import Any

import pytest

from protlint.checks.wiring import WIRING_FAULTS
from protlint.findings import Finding
from protlint.limits import CheckSetting, LimiterLimits
from protlint.netlist import read_netlist
from protlint.netlist.model import Netlist
from protlint.pipeline import Desk, Review, review_netlist, set_up
from tests.support import edits
from tests.support.desk import found, limits, reviewed
from tests.support.paths import FIXTURES

CIRCUITS = (
    "sink-npn", "current-source-20mA", "mosfet-low-side", "darlington-two-devices", "foldback-npn", "current-sink-20mA",
)  # fmt: skip
"""A few that differ much; tests/topology spoils every circuit there is."""


@cache
def bare_desk() -> Desk:
    return set_up()


@cache
def sound(circuit: str) -> tuple[Netlist, dict[str, Any]]:
    path = FIXTURES / "circuits" / f"{circuit}.edf"
    (limiter,) = tomllib.loads(path.with_suffix(".toml").read_text(encoding="utf-8"))["limiter"]
    return read_netlist(path), limiter


def spoiled(circuit: str) -> Iterator[tuple[str, Netlist]]:
    """Yield (fault, the circuit with that fault drawn into it)."""
    netlist, limiter = sound(circuit)
    roles, nets = limiter["roles"], limiter["nets"]
    shunt, near, far = roles["shunt"][0], nets["sense"], nets["far"]
    yield "collector-emitter-swapped", edits.exchanged(netlist, (shunt, "collector"), (shunt, "emitter"))
    rotated = edits.exchanged(netlist, (shunt, "collector"), (shunt, "base"))
    yield "shunt-pins-exchanged", edits.exchanged(rotated, (shunt, "base"), (shunt, "emitter"))
    yield "shunt-pin-misplaced", edits.moved(netlist, shunt, "emitter", nets["drive"])
    carrier = roles["pass"][0]
    ends = ("drain", "source") if carrier.startswith("M") else ("collector", "emitter")
    yield "pass-pins-exchanged", edits.exchanged(netlist, *((carrier, end) for end in ends))
    if is_supply(far):
        yield "pass-polarity-wrong", edits.other_polarity(netlist, carrier)
    if roles.get("base_stop"):
        yield "base-on-far-end", edits.moved(netlist, shunt, "emitter", near)
        yield "collector-not-on-the-drive", edits.exchanged(netlist, (shunt, "collector"), (shunt, "base"))
    if is_supply(far):
        yield "base-emitter-swapped", edits.exchanged(netlist, (shunt, "base"), (shunt, "emitter"))
    yield "shunt-polarity-wrong", edits.other_polarity(netlist, shunt)
    supplies = [net.name for net in netlist.nets if is_supply(net.name) and net.name not in (far, "GND")]
    if supplies:
        yield "collector-not-on-the-drive", edits.moved(netlist, shunt, "collector", supplies[0])
    if len(roles["sense"]) == 1:
        yield "sense-bypassed", edits.with_link(netlist, near, far)
        part, pin = at_the_near_end(netlist, limiter)
        yield "base-on-far-end", edits.moved(netlist, part, pin, far)
        if is_supply(far):
            both = edits.twice(netlist, is_supply)
            yield "wrong-device-sensed", edits.moved(both, f"A/{part}", pin, f"B/{near}")
            yield "wrong-device-sensed", edits.moved(both, f"A/{shunt}", "collector", f"B/{nets['drive']}")


def at_the_near_end(netlist: Netlist, limiter: dict[str, Any]) -> tuple[str, str]:
    """Return the connection that brings the sensed drop to the shunt: a resistor's end, or the base itself."""
    roles, near = limiter["roles"], limiter["nets"]["sense"]
    resistors = [part for part in (*roles.get("base_stop", ()), *roles.get("preset", ())) if part.startswith("R")]
    ends = [(part, end) for part in resistors for end in "12" if edits.net_of(netlist, part, end) == near]
    return ends[0] if ends else (roles["shunt"][0], "base")


def is_supply(name: str) -> bool:
    return name == "GND" or name[0] in "+-"


CASES = [(circuit, fault, netlist) for circuit in CIRCUITS for fault, netlist in spoiled(circuit)]
NAMES = [f"{circuit} {fault} {number}" for number, (circuit, fault, _) in enumerate(CASES)]


def wiring(found: Review) -> list[Finding]:
    return [finding for finding in found.findings if finding.check in WIRING_FAULTS]


def cured(found: Review, netlist: Netlist) -> Netlist:
    """Return the netlist with every change made that the faults ask for."""
    for fault in found.found.faults:
        for one, other in fault.exchange:
            netlist = edits.exchanged(netlist, one, other)
        for (part, role), net in fault.moves:
            netlist = edits.moved(netlist, part, role, found.board.nets[net].name)
        for part, _ in fault.replaces:
            netlist = edits.other_polarity(netlist, part)
        netlist = edits.without(netlist, fault.links)
    return netlist


@pytest.mark.parametrize("circuit, fault, netlist", CASES, ids=NAMES)
def test_a_fault_is_told_with_its_cure_and_the_cure_holds(circuit: str, fault: str, netlist: Netlist) -> None:
    _, limiter = sound(circuit)
    copy = "A/" if fault == "wrong-device-sensed" else ""
    found = review_netlist(netlist, bare_desk())
    (finding,) = wiring(found)
    assert (finding.check, finding.level, finding.assumption) == (fault, "error", False)
    assert finding.parts[0] == copy + limiter["roles"]["shunt"][0]
    assert finding.line is not None
    (match,) = found.found.faults
    assert finding.remedy is not None
    for connection in (*(one for pair in match.exchange for one in pair), *(one for one, _ in match.moves)):
        assert ".".join(connection) in finding.remedy
    for part in (*(one for one, _ in match.replaces), *match.links):
        assert part in finding.remedy
    again = review_netlist(cured(found, netlist), bare_desk())
    assert wiring(again) == []
    shunts = {one.limiter.roles["shunt"]: one.limiter.topology for one in again.limiters}
    assert shunts[(finding.parts[0],)] == limiter["topology"]


def test_each_fault_is_drawn_and_each_has_a_row_in_the_catalogue() -> None:
    assert {fault for _, fault, _ in CASES} == set(WIRING_FAULTS)
    rows = bare_desk().catalogue
    assert {rows[fault].level for fault in WIRING_FAULTS} == {"error"}


def test_where_no_link_shorts_the_sense_resistor_the_remedy_says_what_goes_with_which_end() -> None:
    netlist, limiter = sound("sink-npn")
    near, far = limiter["nets"]["sense"], limiter["nets"]["far"]
    ends = [(part.id, pin.name) for part in netlist.parts for pin in part.pins if netlist.nets[pin.net].name == near]
    for part, pin in ends:
        netlist = edits.moved(netlist, part, pin, far)
    (finding,) = wiring(review_netlist(netlist, bare_desk()))
    assert finding.check == "sense-bypassed"
    assert finding.remedy is not None
    for part in ("Q1", "R2", "R3"):
        assert part in finding.remedy


def test_a_limits_file_sets_the_level_by_the_pass_device() -> None:
    netlist = dict(spoiled("sink-npn"))["collector-emitter-swapped"]
    desk = bare_desk()
    set_off = LimiterLimits(checks={"collector-emitter-swapped": CheckSetting(level="off")})
    limits = replace(desk.limits, limiters={"Q1": set_off})
    assert wiring(review_netlist(netlist, replace(desk, limits=limits))) == []


SINK = """
J{n}1 CONN - LAMP{n} +24V
J{n}2 CONN - CMD{n} GND
R{n}1 RES 390 CMD{n} BASE{n}
Q{n}1 NPN QPN1 LAMP{n} BASE{n} GND
Q{n}2 NPN QSN1 BASE{n} STOP{n} GND
R{n}3 RES 100 GND STOP{n}
R{n}2 RES 2.2 GND GND POWER:1W
"""
SUPPLIES = {"+24V": "24 V", "GND": "0 V"}


def bypassed(board: str) -> list[Finding]:
    return found(reviewed(board, limits(supply=SUPPLIES)), "sense-bypassed")


@pytest.mark.parametrize("order", ["12", "21", "interleaved"])
def test_stages_on_one_ground_are_each_told_of_a_resistor_of_their_own(order: str) -> None:
    one, two = (SINK.format(n=n).splitlines() for n in ("12" if order == "interleaved" else order))
    lines = [line for pair in zip(one, two, strict=True) for line in pair] if order == "interleaved" else one + two
    told = {finding.parts[:2] for finding in bypassed("\n".join(lines))}
    assert told == {("Q12", "R12"), ("Q22", "R22")}


LONE = """
J1 CONN - LAMP +24V
J2 CONN - CMD GND
R1 RES 390 CMD BASE
Q1 NPN QPN1 LAMP BASE GND
R2 RES 2.2 GND GND POWER:1W
"""


@pytest.mark.parametrize(
    "change, told",
    [
        (("", ""), True),
        (("R2 RES 2.2 GND GND", "R2 RES 220 GND GND"), False),
        (("NPN QPN1", "NPN QSN1"), False),
        (("R2 RES 2.2 GND GND", "R2 RES 2.2 CMD CMD"), False),
    ],
    ids=["told", "too large", "small transistor", "elsewhere"],
)
def test_a_small_resistor_shorted_beside_a_power_device_is_a_note(change: tuple[str, str], told: bool) -> None:
    findings = bypassed(LONE.replace(*change))
    assert [(one.level, one.parts) for one in findings] == ([("note", ("R2", "Q1"))] if told else [])


def test_a_link_across_a_lone_sense_resistor_is_named() -> None:
    board = LONE.replace("BASE GND", "BASE SNS").replace("2.2 GND GND", "2.2 SNS GND") + "R9 RES 0 SNS GND\n"
    (finding,) = bypassed(board)
    assert finding.remedy == "take out R9, which shorts R2"
    assert bypassed(board.replace("R9 RES 0 SNS GND\n", "")) == []


@pytest.mark.parametrize(
    "pin, where, meanwhile",
    [
        ("base", "drive", "as drawn the drive is clamped, whatever the current of Q1"),
        ("base", "output", "as drawn it answers to the voltage there, and nothing limits the current of Q1"),
        ("emitter", "drive", "as drawn nothing limits the current of Q1"),
    ],
)
def test_a_pin_astray_says_what_the_board_does_meanwhile(pin: str, where: str, meanwhile: str) -> None:
    netlist, limiter = sound("sink-npn")
    (finding,) = wiring(review_netlist(edits.moved(netlist, "Q2", pin, limiter["nets"][where]), bare_desk()))
    assert finding.check == "shunt-pin-misplaced"
    assert finding.message.endswith(meanwhile)


WIDLAR = """
J1 CONN - LAMP +24V
R1 RES 2k2 +24V REF
Q2 NPN QSN1 REF REF GND
Q1 NPN QPN1 LAMP REF SNS
R2 RES 2.2 SNS GND POWER:1W
"""
FED_MIRROR = """
J1 CONN - LAMP CMD
Q1 NPN QPN1 +24V CMD B
R2 RES 47 B GND POWER:1W
Q2 NPN QSN1 B B GND
Q3 NPN QSN1 LAMP B GND
"""
TURNED_OFF = """
J1 CONN - LAMP OFF
J2 CONN - CMD +24V
R1 RES 390 CMD BASE
Q1 NPN QPN1 LAMP BASE SNS
R2 RES 2.2 SNS GND POWER:1W
R3 RES 10k OFF B
Q2 NPN QSN1 BASE B GND
"""


@pytest.mark.parametrize(
    "board", [WIDLAR, FED_MIRROR, TURNED_OFF], ids=["Widlar mirror", "fed mirror", "turn-off transistor"]
)
def test_what_a_shunt_with_a_pin_astray_may_be_mistaken_for_is_no_wiring_fault(board: str) -> None:
    assert wiring(reviewed(board, limits(supply=SUPPLIES))) == []
