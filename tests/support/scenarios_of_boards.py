"""More figures just inside and just outside their thresholds: P-type twins, loops and time, and checks of whole boards."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import replace

from protlint.solve.loop import solve_loop
from protlint.solve.solution import Loop, Solution
from tests.checks.test_loop_and_timing import darlington, slow
from tests.checks.test_sets import CHANNEL, FIXED, HALVES, SHARED, USUAL
from tests.support.desk import limits, the_one
from tests.support.judged import Job, follower, sink, source
from tests.support.scenarios import DIODE, Scenario, both, greatest, solved

AMBIENTS_DEGC = (-10.0, 27.0, 70.0)


def crossing(figure: Callable[[float], float], low: float, high: float, at: float) -> float:
    """Return where a rising figure reaches a value, found by halving on a logarithmic scale."""
    for _ in range(25):
        middle = math.sqrt(low * high)
        low, high = (middle, high) if figure(middle) < at else (low, middle)
    return math.sqrt(low * high)


def p_type() -> Iterator[Scenario]:
    """The checks whose signs turn with the polarity, on a P-type source."""
    held, rows = solved(source()).high_short, solved(source()).currents
    least_A = min(row.carries_range_A[0] for row in rows if row.carries_range_A)
    most_A = max(row.most_range_A[1] for row in rows if row.most_range_A)
    yield both("carry-not-met", "P type", least_A, lambda one: source().stated(carry=f"{one} A"), outside_is_less=False)
    yield both("cap-exceeded", "P type", most_A, lambda one: source().stated(cap=f"{one} A"))
    weak = source().drawn(("R20 RES 820", "R20 RES 8k2"))
    gives_A = min(row.carries_range_A[0] for row in solved(weak).currents if row.carries_range_A)
    yield both("drive-insufficient", "P type", gives_A, lambda one: weak.stated(carry=f"{one} A"), outside_is_less=False)
    drop_V = greatest(solved(source().supplied()).unlimited, lambda point: abs(point.states["R21"].voltage_V))
    base_A = (drop_V - 0.8) / (2.2 + 150.0 + source().supplied().data["QSP1"]["model"]["RB"])
    yield both("base-stop-low", "P type", base_A, lambda one: source().supplied().rated("QSP1", ib=f"{one} A"))
    bare = (
        source()
        .supplied()
        .drawn(
            ("R22 RES 150 SNS STOP POWER:0.125W", ""), ("BASE STOP +15V", "BASE SNS +15V"), ("10n BASE STOP", "10n BASE SNS")
        )
    )
    yield Scenario("base-stop-absent", "P type", source().supplied(), bare.rated("QSP1", ib="1 A"), "warning")
    sense_W = greatest(held, lambda point: point.states["R21"].current_A ** 2 * 2.2)
    yield both(
        "sense-resistor-power", "P type", sense_W,
        lambda one: source().drawn(("+15V SNS POWER:1W", f"+15V SNS POWER:{one:.6f}W")),
    )  # fmt: skip
    shunt_A = greatest(held, lambda point: abs(point.states["Q21"].current_A))
    yield both("shunt-overloaded", "P type", shunt_A, lambda one: source().rated("QSP1", ic=f"{one} A"))
    yield both(
        "drive-unlimited", "P type", 2.0 * shunt_A, lambda one: source().rated("QSP1", ic=f"{one} A"), level="warning"
    )
    watts = [point.states["Q20"].power_W for point in held]
    sinks = min((150.0 - t) / w - 2.0 for t, w in zip(AMBIENTS_DEGC, watts, strict=True))
    yield both("pass-overheated", "P type", sinks, lambda one: source().stated(sink=f"{one} K/W"), outside_is_less=False)
    most_V = max(abs(one.states["Q20"].voltage_V) for points in solved(source()).high_locus for one in points)
    yield both("pass-outside-safe-area", "P type", most_V, lambda one: source().rated("QPP1", vceo=f"{one} V"))

    def pushed(volts: float) -> Job:
        board = (
            source().supplied().drawn(("BASE STOP +15V", "TAKE STOP +15V"), ("C21 CAP", "D1 DIODE QSD1 TAKE BASE\nC21 CAP"))
        )
        return board.knowing("QSD1", **DIODE).limited("drive", "PULL", high=f"{15.0 + volts} V")

    yield both("reverse-base-emitter", "P type", 6.0, pushed, outside_is_less=False)


def loops() -> Iterator[Scenario]:
    def damping(job: Job, farad: float) -> float:
        one = the_one(job.review())
        assert one.circuit is not None
        devices = [replace(each, model={"C": farad}) if each.name == "C30" else each for each in one.circuit.devices]
        loop = solve_loop(
            replace(one.circuit, devices=tuple(devices)), AMBIENTS_DEGC, short=one.solution.short, corners=False
        )
        assert isinstance(loop, Loop)
        assert loop.own_damping is not None
        return loop.own_damping

    def calmed(pico: float) -> Job:
        return darlington(f"C30 CAP {pico:.6f}p B1 OUT\n")

    def spoiled(pico: float) -> Job:
        return darlington(f"C30 CAP {pico:.6f}p STOP OUT\n")

    at = crossing(lambda pico: damping(calmed(1.0), pico * 1e-12), 0.1, 1e5, 0.42)
    yield both("loop-undamped", "damping 0.42", at, calmed, level="warning")
    yield Scenario("compensation-absent", "a capacitor", calmed(at), darlington(), "warning")
    at = crossing(lambda pico: -damping(spoiled(1.0), pico * 1e-12), 0.1, 1e5, -0.2)
    yield both("loop-undamped", "damping 0.2", at, spoiled, outside_is_less=False)
    rows = solved(sink()).currents
    least_A = min(row.carries_range_A[0] for row in rows if row.carries_range_A)
    yield both(
        "trips-on-peaks", "peak against what is carried", least_A,
        lambda one: sink().stated(carry=None, peak={"current": f"{one} A", "lasts": "10 s", "output": "2 V"}),
        outside_is_less=False,
    )  # fmt: skip
    late = slow(8.0)
    solution = solved(late)
    step, short = solution.step, solution.held_short
    assert step is not None and short is not None and step.delay_s and step.pass_energy_J
    pulse_A = step.pass_energy_J / (step.delay_s * abs(short.states["Q10"].voltage_V))
    left = 1.0 - 0.55 * (1.0 - (150.0 - 70.0) / (150.0 - 25.0))

    def flat(amperes: float) -> Job:
        curve = {"lasts": "50 us", "points": [["1 V", f"{amperes} A"], ["80 V", f"{amperes} A"]]}
        return late.knowing("QPN1", safe_area=[curve, *follower().data["QPN1"]["safe_area"]])

    yield both("trips-late", "second breakdown of a pulse", pulse_A / left, flat)


def boards() -> Iterator[Scenario]:
    holds_A = solved(follower()).currents[1].holds_A or 0.0
    yield both(
        "second-road", "a resistor's share", 1.05 * 24.0 / (0.05 * holds_A),
        lambda ohm: follower().stated(cap="5 A").drawn(("\nJ1 ", f"\nR90 RES {ohm:.6g} +24V OUT\nJ1 ")), level="warning",
    )  # fmt: skip
    unguarded = "J1 CONN - LAMP +24V\nJ2 CONN - CMD GND\nR1 RES 390 CMD BASE\nQ1 NPN QPN1 LAMP BASE SNS\n"
    tables = limits(supply={"+24V": "24 V", "GND": "0 V"}, drive={"CMD": {"low": "0 V", "high": "5 V"}})
    for what, needs, level in (("drop", {}, "note"), ("drop, with a cap", {"LAMP": {"cap": "0.5 A"}}, "warning")):
        yield both(
            "limiter-absent", what, 0.3**2 / 2.2,
            lambda one, needs=needs: Job(  # type: ignore[misc]
                f"{unguarded}R2 RES 2.2 SNS GND POWER:{one:.6f}W\n", {**tables, "limiter": needs}
            ),
            level=level, outside_is_less=False,
        )  # fmt: skip

    def halves(ohm: float) -> Job:
        drive = {name: {"low": "-24 V", "high": "24 V"} for name in ("DP", "DN")}
        exact = limits(board={"vbe_spread": "0 mV"}, supply=FIXED, drive=drive, limiter={"*": {"output": "0 V"}})
        return Job(HALVES.format(upper="1", lower=f"{ohm:.6g}"), exact)

    def apart(ohm: float) -> float:
        one, other = sorted(_usual_A(solution) for solution in _all(halves(ohm)))
        return other / one - 1.0

    at = crossing(apart, 1.05, 1.4, 0.15)
    yield both("halves-unequal", "15 %", at, halves, level="warning", outside_is_less=False)

    def channels(ohm: float) -> Job:
        rows = [CHANNEL.format(n=n, **{**USUAL, "sense": f"{ohm:.6g}" if n == 2 else "2.2"}) for n in (1, 2, 3)]
        drive = {f"CMD{n}": {"low": "0 V", "high": "5 V"} for n in (1, 2, 3)}
        needs = {"*": {"output": "2 V", "shorted_to": ["+12V"]}}
        return Job("J0 CONN - +12V GND\n" + "".join(rows), limits(supply=FIXED, drive=drive, limiter=needs))

    def less(ohm: float) -> float:
        odd, usual = sorted(_usual_A(solution) for solution in _all(channels(ohm)))[:2]
        return 1.0 - odd / usual

    at = crossing(less, 2.21, 2.5, 0.05)
    yield both("channels-unequal", "5 %", at, channels, level="warning", outside_is_less=False)

    def shared(spread_V: float, **needs: str) -> Job:
        drive = {"DRV": {"low": "0 V", "high": "24 V"}}
        tables = limits(
            board={"vbe_spread": f"{spread_V} V"}, supply=FIXED, drive=drive, limiter={"*": {"output": "12 V", **needs}}
        )
        return Job(SHARED.format(other="QPN1", ballast="0.47"), tables)

    point = solved(shared(0.03)).held_short
    assert point is not None
    drop_V = abs(point.states["R3"].voltage_V)
    yield both(
        "share-unsensed", "spread of V_BE, 10 % of the drop", 0.1 * drop_V, shared, level="warning", outside_is_less=False
    )
    high_A = max(row.holds_range_A[1] for row in solved(shared(0.03)).currents if row.holds_range_A)
    yield both("share-unsensed", "total against cap", high_A, lambda one: shared(0.03, cap=f"{one} A"))


def wiring() -> Iterator[Scenario]:
    """Each wiring fault on an N-type sink and on a P-type source, the same stage without it on the inside."""
    ways = {
        "collector-emitter-swapped": (("Q2 NPN QSN1 BASE STOP GND", "Q2 NPN QSN1 GND STOP BASE"),
                                      ("Q21 PNP QSP1 BASE STOP +15V", "Q21 PNP QSP1 +15V STOP BASE")),
        "base-emitter-swapped": (("Q2 NPN QSN1 BASE STOP GND", "Q2 NPN QSN1 BASE GND STOP"),
                                 ("Q21 PNP QSP1 BASE STOP +15V", "Q21 PNP QSP1 BASE +15V STOP")),
        "shunt-pins-exchanged": (("Q2 NPN QSN1 BASE STOP GND", "Q2 NPN QSN1 GND BASE STOP"),
                                 ("Q21 PNP QSP1 BASE STOP +15V", "Q21 PNP QSP1 +15V BASE STOP")),
        "shunt-pin-misplaced": (("Q2 NPN QSN1 BASE STOP GND", "Q2 NPN QSN1 BASE STOP STOP"),
                                ("Q21 PNP QSP1 BASE STOP +15V", "Q21 PNP QSP1 BASE STOP BASE")),
        "pass-pins-exchanged": (("LAMP BASE SNS", "SNS BASE LAMP"), ("OUT BASE SNS", "BASE OUT SNS")),
        "pass-polarity-wrong": (("NPN QPN1", "PNP QPP1"), ("PNP QPP1", "NPN QPN1")),
        "base-on-far-end": (("R3 RES 100 SNS STOP", "R3 RES 100 GND STOP"),
                            ("R22 RES 150 SNS STOP", "R22 RES 150 +15V STOP")),
        "shunt-polarity-wrong": (("Q2 NPN QSN1", "Q2 PNP QSP1"), ("Q21 PNP QSP1", "Q21 NPN QSN1")),
        "collector-not-on-the-drive": (("Q2 NPN QSN1 BASE STOP", "Q2 NPN QSN1 LAMP STOP"),
                                       ("Q21 PNP QSP1 BASE STOP", "Q21 PNP QSP1 OUT STOP")),
    }  # fmt: skip
    for fault, (n_type, p_type) in ways.items():
        for job, change, what in ((sink(), n_type, "N type"), (source(), p_type, "P type")):
            yield Scenario(fault, what, job, job.drawn(change), "error")
    bypassed = follower().drawn((" SNS OUT POWER:2W", " OUT OUT POWER:2W"), (" SNS", " OUT"))
    yield Scenario("sense-bypassed", "N type", follower(), bypassed, "error")
    p_bypassed = source().drawn(
        ("+15V SNS POWER", "+15V +15V POWER"), ("OUT BASE SNS", "OUT BASE +15V"), ("150 SNS", "150 +15V")
    )
    yield Scenario("sense-bypassed", "P type", source(), p_bypassed, "error")
    for job, shift in ((sink(), ("R3 RES 100 SNS STOP", "R3 RES 100 SNS_2 STOP")),
                       (source(), ("R22 RES 150 SNS STOP", "R22 RES 150 SNS_2 STOP"))):  # fmt: skip
        beside = replace(job, board=job.board + _beside(job.board))
        yield Scenario("wrong-device-sensed", "N type" if job == sink() else "P type", beside, beside.drawn(shift), "error")


def _beside(board: str) -> str:
    """Return a second stage like a board's, its parts and inner nets of other names."""
    outer = {"+12V", "+15V", "GND"}
    rows = [row.split() for row in board.splitlines() if row and not row.startswith("J2")]
    lines = []
    for designator, cell, value, *nets in rows:
        named = [net if net in outer or ":" in net else f"{net}_2" for net in nets]
        lines.append(" ".join([f"{designator[0]}9{designator[1:]}", cell, value, *named]))
    return "\n".join(lines) + "\n"


def _all(job: Job) -> list[Solution]:
    return [one.solution for one in job.review().limiters]


def _usual_A(solution: Solution) -> float:
    return solution.currents[1].holds_A or 0.0


GROUPS = (p_type, loops, boards, wiring)
