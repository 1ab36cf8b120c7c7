"""For every check a figure just inside its threshold and one just outside, worked out by hand from the solved currents."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

from protlint.netlist.model import DuplicateDesignator, PinOnTwoNets
from protlint.solve.solution import Point, Solution
from tests.support.desk import the_one
from tests.support.judged import Job, folding, follower, gated, sink, source

CLOSE = 0.005
"""How near to its threshold a figure is set."""


@dataclass(frozen=True)
class Scenario:
    """A check, what is changed, the job on each side of the threshold, and the level that the outer one gives."""

    check: str
    what: str
    inside: Job
    outside: Job
    level: str

    def __str__(self) -> str:
        return f"{self.check}: {self.what}"


def solved(job: Job) -> Solution:
    """Return the solution of a job's only limiter."""
    return the_one(job.review()).solution


def greatest(points: tuple[Point, ...], figure: Callable[[Point], float]) -> float:
    return max(figure(point) for point in points)


def both(
    check: str, what: str, at: float, set_to: Callable[[float], Job], *, level: str = "error", outside_is_less: bool = True
) -> Scenario:
    """Return the scenario of a figure set just above and just below its threshold."""
    less, more = set_to(at * (1.0 - CLOSE)), set_to(at * (1.0 + CLOSE))
    inner, outer = (more, less) if outside_is_less else (less, more)
    return Scenario(check, what, inner, outer, level)


def currents() -> Iterator[Scenario]:
    rows = solved(sink()).currents
    least_A = min(row.carries_range_A[0] for row in rows if row.carries_range_A)
    most_A = max(row.most_range_A[1] for row in rows if row.most_range_A)
    yield both("carry-not-met", "carry", least_A, lambda one: sink().stated(carry=f"{one} A"), outside_is_less=False)
    yield both("cap-exceeded", "cap", most_A, lambda one: sink().stated(cap=f"{one} A"))
    weak = sink().drawn(("R1 RES 390", "R1 RES 2k2"))
    gives_A = min(row.carries_range_A[0] for row in solved(weak).currents if row.carries_range_A)
    yield both("drive-insufficient", "carry", gives_A, lambda one: weak.stated(carry=f"{one} A"), outside_is_less=False)


def plain() -> Job:
    """The sink with its supply stated without a range, so that figures as drawn are those of the checks."""
    return sink().supplied()


def base_stops() -> Iterator[Scenario]:
    bare = plain().drawn(
        ("R3 RES 100 SNS STOP POWER:0.125W", ""), ("BASE STOP GND", "BASE SNS GND"), ("10n BASE STOP", "10n BASE SNS")
    )
    yield Scenario("base-stop-absent", "base stop", plain(), bare.rated("QSN1", ib="150 mA"), "warning")
    drop_V = greatest(solved(bare).unlimited, lambda point: point.states["R2"].voltage_V)
    yield both(
        "base-stop-absent",
        "base current rating",
        (drop_V - 0.8) / (2.2 + 10.0),
        lambda one: bare.rated("QSN1", ib=f"{one} A"),
    )
    drop_V = greatest(solved(plain()).unlimited, lambda point: point.states["R2"].voltage_V)
    base_A = (drop_V - 0.8) / (2.2 + 100.0 + 10.0)
    for share, level in ((0.5, "warning"), (1.0, "error")):
        yield both(
            "base-stop-low", f"base current rating, {level}", base_A / share,
            lambda one: plain().rated("QSN1", ib=f"{one} A"), level=level,
        )  # fmt: skip
    at_12_V = (12.0 / (1.0 + 0.05) - 0.8) / (1.0 + 560.0 + 10.0)
    on_12_V = gated().supplied().drawn(("+24V", "+12V"), ("R42 RES 1k5", "R42 RES 560")).stated(shorted_to=["+12V"])
    yield both(
        "base-stop-low", "of a MOSFET the supply over the loop's resistance", 2.0 * at_12_V,
        lambda one: on_12_V.rated("QSN1", ib=f"{one} A"), level="warning",
    )  # fmt: skip
    yield Scenario(
        "base-stop-high",
        "base stop",
        gated().supplied().drawn(("1k5", "1k8")),
        gated().supplied().drawn(("1k5", "2k0")),
        "warning",
    )


def resistors() -> Iterator[Scenario]:
    held = solved(sink()).high_short
    sense_W = greatest(held, lambda point: point.states["R2"].current_A ** 2 * 2.2)
    drive_W = greatest(held, lambda point: point.states["R1"].current_A ** 2 * 390.0)
    for share, level in ((0.8, "warning"), (1.0, "error")):
        yield both(
            "sense-resistor-power", f"rating, {level}", sense_W / share,
            lambda one: sink().drawn(("SNS GND POWER:1W", f"SNS GND POWER:{one:.6f}W")), level=level,
        )  # fmt: skip
        yield both(
            "resistor-power", f"rating of the drive resistor, {level}", drive_W / share,
            lambda one: sink().drawn(("BASE POWER:0.25W", f"BASE POWER:{one:.6f}W")), level=level,
        )  # fmt: skip
    volts = greatest(solved(source()).high_short, lambda point: abs(point.states["R20"].current_A) * 820.0)
    yield both(
        "resistor-power", "element voltage", volts / 0.8,
        lambda one: source().drawn(("VOLTAGE:200V", f"VOLTAGE:{one:.5f}V")), level="warning",
    )  # fmt: skip
    hot = sink().board_of(ambient=["-10 degC", "27 degC", "100 degC"], derating="ECSS-Q-ST-30-11C").stated(carry="0.1 A")
    shares = (0.5, 0.5, 0.5 * (155.0 - 100.0) / (155.0 - 70.0))
    needed_W = max(
        point.states["R2"].current_A ** 2 * 2.2 / share for point, share in zip(solved(hot).high_short, shares, strict=True)
    )
    yield both(
        "sense-resistor-power", "derated by a standard and by temperature", needed_W,
        lambda one: hot.drawn(("SNS GND POWER:1W", f"SNS GND POWER:{one:.6f}W")),
    )  # fmt: skip


def shunts() -> Iterator[Scenario]:
    held = solved(sink()).high_short
    shunt_A = greatest(held, lambda point: abs(point.states["Q2"].current_A))
    yield both(
        "drive-unlimited", "half the shunt's current rating", 2.0 * shunt_A,
        lambda one: sink().rated("QSN1", ic=f"{one} A"), level="warning",
    )  # fmt: skip
    yield both("shunt-overloaded", "current rating", shunt_A, lambda one: sink().rated("QSN1", ic=f"{one} A"))
    per_W = min(
        (150.0 - ambient) / point.states["Q2"].power_W for ambient, point in zip((-10.0, 27.0, 70.0), held, strict=True)
    )
    hot = [lambda one: sink().rated("QSN1", rth_ja=f"{one} K/W", power=None)] * 2
    yield both("shunt-overloaded", "junction to free air", per_W, hot[0], outside_is_less=False)
    yield both("drive-unlimited", "the shunt's power", per_W, hot[1], outside_is_less=False)
    # the gate hangs at the drive's 10 V while the output is open: the shunt off has all of it
    yield both("shunt-overloaded", "V_CEO", 10.0, lambda one: gated().rated("QSN1", vceo=f"{one} V"))
    point = max(solved(follower()).high_short, key=lambda one: (25.2 - one.drive_V) * one.drive_A)
    driver_W = (25.2 - point.drive_V) * point.drive_A
    yield both(
        "driver-overloaded", "power of the IC", driver_W,
        lambda one: follower().limited("driver", "OPX1", power=f"{one} W"),
    )  # fmt: skip


def reverse() -> Iterator[Scenario]:
    def pulled(volts: float) -> Job:
        # a diode in the shunt's collector, so that nothing but the base-emitter junction faces the drive below ground
        board = sink().drawn(("BASE STOP GND", "TAKE STOP GND"), ("C1 CAP", "D1 DIODE QSD1 BASE TAKE\nC1 CAP"))
        return board.knowing("QSD1", **DIODE).limited("drive", "CMD", low=f"{-volts} V")

    for share, level in ((0.8, "warning"), (1.0, "error")):
        yield both("reverse-base-emitter", f"V_EBO, {level}", 6.0 * share, pulled, level=level, outside_is_less=False)
    bare = sink().limited("drive", "CMD", low="-12 V")
    held_A = 11.3 / (390.0 + 100.0)
    inner, outer = bare.rated("QSN1", ib=f"{held_A * 1.2} A"), bare.rated("QSN1", ib="5 mA")
    yield Scenario("reverse-base-emitter", "the shunt's collector junction", inner, outer, "error")
    charged = follower().stated(load_capacitance="470 uF")
    returned = charged.drawn(("C11 CAP", "D11 DIODE QSD1 OUT +24V\nD12 DIODE QSD1 OUT BASE\nC11 CAP")).knowing(
        "QSD1", **DIODE
    )
    yield Scenario("reverse-base-emitter", "output held up by a capacitor", returned, charged, "warning")


DIODE = {
    "kind": "diode", "source": "invented data sheet",
    "ratings": {"vr": "100 V", "if": "0.3 A", "power": "0.3 W", "rth_ja": "400 K/W", "tj_max": "150 degC"},
    "model": {"IS": 2e-9, "N": 1.8, "RS": 0.5},
}  # fmt: skip


def passes() -> Iterator[Scenario]:
    held = solved(sink()).high_short
    watts = [point.states["Q1"].power_W for point in held]
    sinks = min((150.0 - t) / w - 2.0 for t, w in zip((-10.0, 27.0, 70.0), watts, strict=True))
    yield both("pass-overheated", "sink", sinks, lambda one: sink().stated(sink=f"{one} K/W"), outside_is_less=False)
    brief = sink().stated(short="10 ms").rated("QPN1", rth_ja=None)
    known = [{"lasts": "1 ms", "impedance": "0.2 K/W"}, {"lasts": "10 ms", "impedance": "0.5 K/W"}]
    before_W = the_one(brief.review()).solution.at_carry.states["Q1"].power_W  # type: ignore[union-attr]
    start = max(0.5 * w + t for t, w in zip((-10.0, 27.0, 70.0), watts, strict=True)) + before_W * (8.0 + 2.0 - 0.5)
    yield both(
        "pass-overheated", "published impedance, 10 ms", start,
        lambda one: brief.knowing("QPN1", transient=known).rated("QPN1", tj_max=f"{one} degC", power_case=None),
    )  # fmt: skip
    case = 70.0 + 8.0 * watts[-1]
    point = held[-1].states["Q1"]
    volts = point.voltage_V
    left = 1.0 - 0.55 * (case - 25.0) / 125.0
    corners = [["0.1 V", "20 A"], [f"{volts} V", "{} A"], [f"{volts * 1.5} V", "{} A"]]

    def with_curve(one: float) -> Job:
        rows = [[volt, amp.format(one if place == 1 else one / 3.0)] for place, (volt, amp) in enumerate(corners)]
        rows[0][1] = f"{one * volts * 2.2 / 0.1 * 0.1:.6f} A"
        rows[0][0] = "1 V"
        return sink().knowing("QPN1", safe_area=[{"lasts": "dc", "points": rows}])

    yield both("pass-outside-safe-area", "second breakdown, case hot", point.current_A / left, with_curve)
    most_A = greatest(held, lambda one: one.states["Q1"].current_A)
    yield both("pass-outside-safe-area", "current rating", most_A, lambda one: sink().rated("QPN1", ic=f"{one} A"))
    most_V = max(one.states["Q1"].voltage_V for points in solved(sink()).high_locus for one in points)
    yield both("pass-outside-safe-area", "V_CEO", most_V, lambda one: sink().rated("QPN1", vceo=f"{one} V"))
    assert math.isfinite(most_V)


def loads() -> Iterator[Scenario]:
    rows = solved(folding()).currents
    least_A = min(row.holds_range_A[0] for row in rows if row.holds_range_A)
    yield both(
        "foldback-locks-out", "constant current against the short's", least_A,
        lambda one: folding().stated(load=None, load_current=f"{one} A"), outside_is_less=False,
    )  # fmt: skip
    held = folding().stated(carry="0.5 A")
    yield Scenario(
        "foldback-locks-out", "lamp, hot 13 ohm", held.stated(load="16 ohm", load_cold="1.5 ohm"),
        held.stated(load="8 ohm", load_cold="0.8 ohm"), "error",
    )  # fmt: skip


def inputs() -> Iterator[Scenario]:
    yield Scenario("value-unreadable", "value", sink(), sink().drawn(("R2 RES 2.2", "R2 RES two")), "error")
    unknown = sink().drawn(("NPN QPN1", "NPN QXX9"))
    yield Scenario("part-data-missing", "type", sink(), unknown, "note")
    numbered = sink().drawn(
        ("R1 RES 390 CMD BASE", "R1 RES 390 COL BASE"), ("Q1 NPN", "Q5 PNP QSP1 1=COL 2=CB 3=+12V\nR5 RES 1k CMD CB\nQ1 NPN")
    )
    named = numbered.limited("pins", "QSP1", **{"1": "collector", "2": "base", "3": "emitter"})
    yield Scenario("pins-unknown", "pin roles of a level shifter", named, numbered, "error")
    hidden = sink().drawn(("LAMP BASE SNS\n", "1=LAMP 2=BASE 3=SNS\n"))
    yield Scenario("pins-unknown", "pin roles of the pass device", sink(), hidden, "warning")
    listed = sink()
    agreed = Job(listed.board, listed.tables, listed.data, "Designator,Value\nR2,2R2\nR1,390\n")
    differs = Job(listed.board, listed.tables, listed.data, "Designator,Value\nR2,2R7\nR1,390\n")
    yield Scenario("part-data-contradicts", "parts list", agreed, differs, "warning")
    yield both(
        "part-data-contradicts", "1 / slope against R_JC, three in a hundred for rounding", 1.03 * 0.5,
        lambda one: sink().rated("QPN1", slope_case=f"{1.0 / (2.0 * one / 0.5)} W/K"), level="note", outside_is_less=False,
    )  # fmt: skip
    elsewhere = PinOnTwoNets(0, "1", (0, 1), 3, 1)
    own = PinOnTwoNets(4, "1", (0, 1), 3, 1)
    yield Scenario(
        "pin-on-two-nets", "whose pin", Job(sink().board, sink().tables, twice=(elsewhere,)),
        Job(sink().board, sink().tables, twice=(own,)), "warning",
    )  # fmt: skip
    plugs, plug_and_stop = (
        Job(sink().board, sink().tables, alike=(DuplicateDesignator("J1", parts),)) for parts in ((0, 1), (0, 5))
    )
    yield Scenario("designator-doubtful", "whose designator", plugs, plug_and_stop, "warning")


GROUPS = (currents, base_stops, resistors, shunts, reverse, passes, loads, inputs)
