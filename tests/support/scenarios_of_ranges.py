"""Figures that only the stated range of a supply or drive puts outside: the same board with and without the range."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.solve.solution import Point
from tests.support.judged import Job, folding, follower, gated, sink, source
from tests.support.scenarios import DIODE, Scenario, both, greatest, solved


def ranged(check: str, what: str, job: Job, *, level: str = "error") -> Scenario:
    """Return the scenario of a board whose supplies' ranges alone put a figure outside."""
    return Scenario(check, f"stated range: {what}", job.supplied(), job, level)


def off_limiter() -> Iterator[Scenario]:
    """What is solved beside the held short: the shunt off, junctions driven backwards, the instant before the loop acts."""
    wide = {"low": "9 V", "usual": "10 V", "high": "11 V"}
    # the gate hangs at the drive's high end while the output is open
    yield both(
        "shunt-overloaded", "stated range: V_CEO", 11.0,
        lambda one: gated().limited("drive", "CMD", high=wide).rated("QSN1", vceo=f"{one} V"),
    )  # fmt: skip
    cut = source().drawn(("BASE STOP +15V", "TAKE STOP +15V"), ("C21 CAP", "D1 DIODE QSD1 TAKE BASE\nC21 CAP"))
    # the drive at 20 V above 15 V 5 %: at the low end 20 - 14.25 V stand across the junction, by Kirchhoff's voltage law
    pushed = cut.knowing("QSD1", **DIODE).limited("drive", "PULL", high="20 V")
    yield both("reverse-base-emitter", "stated range: V_EBO", 5.75, lambda one: pushed.rated("QPP1", vebo=f"{one} V"))
    yield ranged("reverse-base-emitter", "V_EBO", pushed.rated("QPP1", vebo="5.4 V"))
    # charged through the stage to the drive's high end, 25.2 V - 1.5 V, the output is left when the supplies go; that they
    # then stand at 0 V is assumed, so it is a warning, from 80 % of the rating
    charged = follower().stated(load_capacitance="470 uF", output=None).rated("QSN1", ib="10 A", ic="10 A", vebo="50 V")
    yield ranged("reverse-base-emitter", "an output held up", charged.rated("QPN1", vebo=f"{18.9 / 0.8} V"), level="warning")
    bare_A = greatest(solved(sink().supplied()).unlimited, lambda point: point.states["R2"].current_A)
    bound_A = (bare_A * 2.2 - 0.8) / (2.2 + 100.0 + 10.0)
    yield ranged("base-stop-low", "unlimited current", sink().rated("QSN1", ib=f"{2.005 * bound_A} A"), level="warning")
    gate = (24.0 / (1.0 + 0.05) - 0.8) / (1.0 + 1500.0 + 10.0)
    yield ranged(
        "base-stop-low",
        "of a MOSFET the supply over the loop",
        gated().rated("QSN1", ib=f"{2.02 * gate} A"),
        level="warning",
    )


def held() -> Iterator[Scenario]:
    """What the range of a supply does to heat that the corner of the most current does not: a slope lowers its limit."""
    sloping = folding().drawn(
        ("R63 RES 1k8 STOP GND POWER:0.5W", "R63 RES 22k STOP +20V POWER:0.5W\nR64 RES 330 STOP OUT POWER:0.25W")
    ).stated(cap=None, load=None, carry="0.1 A")  # fmt: skip
    assert solved(sloping).corners["high"]["+20V.V"] < 0.0

    def at_most(job: Job, ohm: float) -> float:
        return greatest(solved(job).high_short, lambda point: point.states["R63"].current_A ** 2 * ohm)

    # 22 kohm from a supply 5 % higher: about 1.05 squared times the power of the usual one
    usual_W = at_most(sloping.supplied(), 22e3)
    burning = sloping.drawn(("STOP +20V POWER:0.5W", f"STOP +20V POWER:{1.04 * usual_W:.6f}W"))
    yield ranged("resistor-power", "a preset's leg to a supply", burning)

    def pass_W(point: Point) -> float:
        return point.states["Q60"].power_W

    hot_W = max(greatest(points, pass_W) for points in solved(sloping.supplied()).high_locus[2:])
    sinks = (150.0 - 70.0) / hot_W - 2.0
    yield ranged("pass-overheated", "a slope", sloping.stated(sink=f"{0.995 * sinks} K/W"))
    most_V = max(
        greatest(points, lambda one: one.states["Q60"].voltage_V) for points in solved(sloping.supplied()).high_locus
    )
    yield ranged("pass-outside-safe-area", "a slope", sloping.rated("QPN1", vceo=f"{1.01 * most_V} V"))


def loads() -> Iterator[Scenario]:
    holds_A = solved(follower()).currents[1].holds_A or 0.0
    at_ohm = 24.0 / (0.05 * holds_A)
    fed = follower().stated(cap="5 A").drawn(("\nJ1 ", f"\nR90 RES {at_ohm * 1.02:.6g} +24V OUT\nJ1 "))
    yield ranged("second-road", "the supply behind a resistor", fed, level="warning")


GROUPS = (off_limiter, held, loads)
