"""What a short ties the output to: the supply that a load on the board hangs on, be it a string of parts."""

from __future__ import annotations

import pytest

from protlint.limits import LimiterLimits, Limits
from protlint.solve.bench import build_bench
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
