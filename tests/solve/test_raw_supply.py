"""A raw supply that no name tells, behind a rectifier, with catch diodes at the output as the handbooks of series regulators
draw them (common practice): what the limits file is asked for, with and without it."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from protlint.netlist import read_netlist_bytes
from protlint.pipeline import Review, review_netlist, set_up
from protlint.report.skeleton import rendered_skeleton
from protlint.solve.surroundings import survey_surroundings
from protlint.topology.language import load_rules
from protlint.topology.match import find_limiters
from tests.support.boards import board
from tests.support.edif_text import Drawn, flat_netlist


def two(cell: str, designator: str, first: str, second: str, value: str = "") -> Drawn:
    ends = ("A", "K") if cell == "DIODE" else ("1", "2")
    return Drawn(designator, cell, ((ends[0], first), (ends[1], second)), value)


def regulator(channel: int, sign: int, *, foldback: bool) -> list[Drawn]:
    """Return a series regulator with rectifier and two catch diodes; ``sign`` is -1 for the negative one."""
    kind = "NPN" if sign > 0 else "PNP"
    raw, out, drive, near, tap = (f"{name}{channel}" for name in ("VUNREG", "OUT", "DRV", "NEAR", "TAP"))

    def transistor(designator: str, collector: str, base: str, emitter: str) -> Drawn:
        return Drawn(designator, kind, (("C", collector), ("B", base), ("E", emitter)))

    def diode(designator: str, anode: str, cathode: str) -> Drawn:
        return two("DIODE", designator, *((anode, cathode) if sign > 0 else (cathode, anode)))

    n = 100 * channel
    parts = [
        transistor(f"Q{n + 1}", raw, drive, near),
        two("RES", f"R{n + 1}", near, out, "1"),
        transistor(f"Q{n + 2}", drive, tap if foldback else near, out),
        two("RES", f"R{n + 2}", f"CMD{channel}", drive, "220"),
        diode(f"D{n + 5}", out, raw),
        diode(f"D{n + 6}", "GND", out),
        diode(f"D{n + 1}", f"AC{channel}", raw),
        diode(f"D{n + 2}", "GND", f"AC{channel}"),
        Drawn(f"J{channel}", "CONN", (("1", f"AC{channel}"), ("2", f"CMD{channel}"), ("3", "GND"))),
        Drawn(f"J{channel + 10}", "CONN", (("1", out), ("2", "GND"))),
    ]
    if foldback:
        parts += [two("RES", f"R{n + 3}", near, tap, "1K"), two("RES", f"R{n + 4}", tap, "GND", "10K")]
    return parts


def reviewed(sign: int, *, foldback: bool, limits: Path | None = None) -> Review:
    parts = [part for channel in (1, 2) for part in regulator(channel, sign, foldback=foldback)]
    netlist = read_netlist_bytes(flat_netlist("bench_supply", parts, remark="invented").encode(), "bench.edf")
    return review_netlist(netlist, set_up(limits=limits))


@pytest.mark.parametrize("sign", [1, -1])
@pytest.mark.parametrize("foldback", [True, False])
def test_an_unnamed_raw_supply_is_asked_for_and_its_blank_offered(sign: int, foldback: bool, tmp_path: Path) -> None:
    review = reviewed(sign, foldback=foldback)
    assert [item.limiter.id for item in review.limiters] == ["Q101", "Q201"]
    for channel, item in enumerate(review.limiters, 1):
        assert item.circuit is None
        assert [one.needs for one in item.bench.missing] == [f"[supply] VUNREG{channel}"]
        assert not any(
            "0 V to 0 V" in text for text in (*item.bench.nets.values(), *(said for _, said in item.bench.assumed))
        )
    skeleton = rendered_skeleton(review)
    blanks = re.findall(r'^# (VUNREG\d) = " V"$', skeleton, re.MULTILINE)
    assert blanks == ["VUNREG1", "VUNREG2"]
    path = tmp_path / "limits.toml"
    path.write_text(
        re.sub(r'^# (VUNREG\d) = " V"$', rf'\1 = "{24 * sign} V"', skeleton, flags=re.MULTILINE), encoding="utf-8"
    )
    for item in (answered := reviewed(sign, foldback=foldback, limits=path)).limiters:
        assert item.bench.missing == () and item.solution.not_solved is None
        assert item.circuit is not None and item.circuit.shorts == ("GND",)
    assert "VUNREG1 = " in rendered_skeleton(answered) and "# VUNREG1" not in rendered_skeleton(answered)


FOLLOWER = """
npn Q1 RAW DRV NEAR
resistor R1 NEAR OUT =2
npn Q2 DRV NEAR OUT
resistor R2 CMD DRV =220
diode D5 OUT RAW
diode D6 GND OUT
connector J1 1=OUT 2=GND 3=CMD
"""


def lead_of(more: str) -> list[str]:
    made = board(FOLLOWER + more)
    (limiter,) = find_limiters(made, load_rules()).limiters
    path = survey_surroundings(made, limiter).power_path
    return [made.parts[part].id for index in path for part in made.elements[index].parts]


@pytest.mark.parametrize(
    ("more", "lead"),
    [
        ("diode D1 +24V RAW", ["D1"]),
        ("fuse F1 +24V RAW", ["F1"]),
        ("inductor L1 +24V RAW =1e-5", ["L1"]),
        ("resistor R9 +24V RAW =1", ["R9"]),
        ("diode D1 +24V A\nfuse F1 A B\nresistor R9 B RAW =0.1", ["D1", "F1", "R9"]),
        ("diode D1 RAW +24V", []),  # it would carry current to that supply only
        ("diode D1 GND RAW", []),  # a catch diode
        ("diode D1 AC RAW\ndiode D2 GND AC", []),  # a rectifier
        ("resistor R9 +24V RAW =1000", []),  # a bleeder, a pilot lamp
        ("diode D1 +12V RAW\nic U1 IN=RAW OUT=+12V GND=GND", []),  # the catch diode of a regulator
        ("npn Q9 RAW X E\nresistor R9 E +12V =1\ndiode D1 +12V RAW", []),  # that of another pass device
        ("resistor R9 OUT A =1\nfuse F1 A +12V", []),  # only through the output
    ],
)
def test_the_power_side_is_found_behind_what_carries_its_current(more: str, lead: list[str]) -> None:
    assert sorted(lead_of(more)) == lead
