"""Which ``[drive]`` entry is asked for where a stage is fed straight from a rail: the one that makes it judged.

The stage is of the common form of an audio output (common practice): a driver and an output device a half, limiters with a
leg to ground, a bias multiplier between their drives, a voltage amplifier on the one rail and a current sink on the other.
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from protlint.netlist import read_netlist_bytes
from protlint.pipeline import Review, ReviewedLimiter, review_netlist, set_up
from protlint.report.skeleton import rendered_skeleton
from tests.support.edif_text import Drawn, flat_netlist

TRANSISTORS = """
NPN Q10 +45V B1 E1
NPN Q11 +45V VN B1
NPN Q2 VN S1 SPK
PNP Q20 -45V B2 E2
PNP Q21 -45V VP B2
PNP Q4 VP S2 SPK
NPN Q5 VN MID VP
PNP Q7 VN IN V7
NPN Q8 VP CS V8
"""
"""Collector, base, emitter."""

TWO_ENDS = """
RES R1 E1 SPK 0R22
RES R3 E2 SPK 0R22
RES R10 B1 SPK 100
RES R13 B2 SPK 100
RES R11 E1 S1 100
RES R12 S1 GND 1K
RES R14 E2 S2 100
RES R15 S2 GND 1K
RES R5 VN MID 2K2
RES R6 MID VP 680
RES R7 +45V V7 33
RES R8 V8 -45V 68
RES R9 CS GND 4K7
DIODE D1 CS D12
DIODE D2 D12 -45V
"""

DRIVE_OF = {"Q10": "VN", "Q20": "VP"}


def reviewed(*, turned: bool, limits: Path | None = None) -> Review:
    """Return the review of the stage, or ``turned`` of its mirror image, whose voltage amplifier is on the other rail."""
    mirror = {"NPN": "PNP", "PNP": "NPN", "+45V": "-45V", "-45V": "+45V"} if turned else {}
    parts = [Drawn("J1", "CONN", tuple((str(pin), net) for pin, net in enumerate(("SPK", "GND", "+45V", "-45V"), 1)))]
    for row in TRANSISTORS.split("\n")[1:-1]:
        kind, designator, *nets = (mirror.get(word, word) for word in row.split())
        parts.append(Drawn(designator, kind, tuple(zip("CBE", nets, strict=True))))
    for row in TWO_ENDS.split("\n")[1:-1]:
        kind, designator, first, last, *value = (mirror.get(word, word) for word in row.split())
        ends = "12" if kind == "RES" else "KA" if turned else "AK"
        parts.append(Drawn(designator, kind, ((ends[0], first), (ends[1], last)), *value))
    netlist = read_netlist_bytes(flat_netlist("audio", parts, remark="invented").encode(), "audio.edf")
    return review_netlist(netlist, set_up(limits=limits))


def unsolved(review: Review) -> list[ReviewedLimiter]:
    return [item for item in review.limiters if item.solution.not_solved is not None]


@pytest.mark.parametrize("turned", [False, True])
def test_the_entry_a_message_names_is_the_one_that_makes_the_stage_judged(turned: bool, tmp_path: Path) -> None:
    review = reviewed(turned=turned)
    assert {item.limiter.id for item in review.limiters} == set(DRIVE_OF)
    (item,) = unsolved(review)
    net, reason = DRIVE_OF[item.limiter.id], item.solution.not_solved or ""
    assert "cannot turn the pass device on" in reason
    assert re.findall(r"\[drive\.[^]]*\]", reason) == [f"[drive.{net}]"]
    skeleton = rendered_skeleton(review)
    blanks = re.findall(r"^# \[drive\.(.*)\]", skeleton, re.MULTILINE)
    assert blanks == [net]
    filled = skeleton.replace(f"# [drive.{net}]", f"[drive.{net}]")
    for key, value in (("low", "-44 V"), ("high", "44 V"), ("current", "20 mA")):
        filled = re.sub(rf'^# {key} = " [VA]"', f'{key} = "{value}"', filled, count=1, flags=re.MULTILINE)
    path = tmp_path / "limits.toml"
    path.write_text(filled, encoding="utf-8")
    answered = reviewed(turned=turned, limits=path)
    assert unsolved(answered) == []
    assert "# [drive." not in rendered_skeleton(answered)
