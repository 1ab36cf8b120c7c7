"""What a short ties the output to, and what the ends of a drive move with."""

from __future__ import annotations

import numpy as np
import pytest

from protlint.limits import DriveLimits, LimiterLimits, Limits, Range
from protlint.solve.bench import build_bench
from protlint.solve.corners import axes_of, held_voltages
from protlint.solve.network import compile_network
from protlint.topology.language import load_rules
from protlint.topology.match import find_limiters
from tests.support.boards import board

SINK = """
npn Q1 OUT DRV NEAR
resistor R1 NEAR GND =2
npn Q2 DRV NEAR GND
resistor R2 CMD DRV =220
connector J1 1=CMD 2=+24V 3=+48V
"""


@pytest.mark.parametrize(
    ("load", "shorted_to", "assumed"),
    [
        ("resistor R9 +24V OUT =50", "+24V", False),
        ("diode D1 +24V A\ndiode D2 A B\ndiode D3 B OUT", "+24V", False),
        ("resistor R8 +24V A =1000\nresistor R9 A OUT =1000\nic U1 IN=A", "+48V", True),
        ("", "+48V", True),
    ],
)
def test_the_short_is_to_what_the_load_hangs_on(load: str, shorted_to: str, assumed: bool) -> None:
    """A divider whose middle goes elsewhere is no load; without a load the farthest supply is taken, and that is said."""
    made = board(SINK + load)
    (limiter,) = find_limiters(made, load_rules()).limiters
    bench = build_bench(made, limiter, limits=Limits(), needs=LimiterLimits())
    assert bench.circuit is not None and bench.circuit.shorts == (shorted_to,)
    assert ("short" in [subject for subject, _ in bench.assumed]) is assumed


FOLLOWER = """
npn Q1 +24V DRV NEAR
resistor R1 NEAR OUT =2
npn Q2 DRV NEAR OUT
resistor R2 CMD DRV =220
ic U1 OUT=CMD V+=+24V V-=-5V
connector J1 1=OUT 2=GND 3=+24V 4=-5V
"""


def test_an_end_of_the_drive_moves_with_the_rail_it_stays_short_of() -> None:
    """The rail is one thing with one spread: the drive's high end is 1.5 V under it wherever it is. The negative rail is at
    no part of the limiter, so the low end has the spread of its own; an end that is stated moves with nothing."""
    supplies = {"+24V": Range(22.0, 24.0, 27.0), "-5V": Range(-5.5, -5.0, -4.5), "GND": Range(0.0, 0.0, 0.0)}
    for entry, moving in (
        (DriveLimits(from_rails_V=1.5), {("+24V", "V"), ("CMD", "low_V")}),
        (DriveLimits(from_rails_V=1.5, high_V=Range(9.0, 10.0, 11.0)), {("+24V", "V"), ("CMD", "low_V"), ("CMD", "high_V")}),
    ):
        limits = Limits(supplies_V=supplies, drives={"CMD": entry})
        made = board(FOLLOWER, limits=limits)
        (limiter,) = find_limiters(made, load_rules()).limiters
        circuit = build_bench(made, limiter, limits=limits, needs=LimiterLimits()).circuit
        assert circuit is not None
        network = compile_network(circuit)
        axes = [axis for axis in axes_of(network) if axis.place in ("held", "drive")]
        assert {(axis.device, axis.parameter) for axis in axes} == moving
        place = [axis.device for axis in axes].index("+24V")
        corner = np.zeros((len(axes), 3))
        corner[place] = [-1.0, 0.0, 1.0]
        _, ends_V = held_voltages(network, axes, corner)
        assert ends_V[1] == pytest.approx([10.0] * 3 if entry.high_V else [20.5, 22.5, 25.5])
        assert ends_V[0] == pytest.approx([-3.5] * 3)


@pytest.mark.parametrize(
    ("bias", "asked", "net"),
    [
        ("RAW", "[supply] RAW: behind its lead it feeds the drive as well", "RAW"),
        ("GND", "[drive.DRV]: nothing on the board is seen to drive it", "DRV"),  # not the rail that turns nothing on
        ("AHEAD", "[drive.AHEAD]: nothing on the board is seen to drive it", "AHEAD"),
        ("+24V", None, None),
    ],
)
def test_the_net_that_is_asked_about_is_one_whose_entry_helps(bias: str, asked: str | None, net: str | None) -> None:
    text = f"""
        npn Q1 RAW DRV NEAR
        resistor R1 NEAR OUT =2
        npn Q2 DRV NEAR OUT
        resistor R2 {bias} DRV =2200
        fuse F1 +24V RAW
        connector J1 1=OUT 2=GND
        """

    def missing(limits: Limits) -> list[tuple[str, str | None]]:
        made = board(text, limits=limits)
        (limiter,) = find_limiters(made, load_rules()).limiters
        return [(one.needs, one.net) for one in build_bench(made, limiter, limits=limits, needs=LimiterLimits()).missing]

    assert missing(Limits()) == ([] if asked is None else [(asked, net)])
    if asked is not None and net is not None:
        volts = Range(24.0, 24.0, 24.0)
        is_supply = asked.startswith("[supply]")
        stated = {"supplies_V": {net: volts}} if is_supply else {"drives": {net: DriveLimits(high_V=volts)}}
        assert missing(Limits(**stated)) == []  # type: ignore[arg-type]
