"""What belongs on a limiter's bench: the walk from its parts ends at every net whose drive is stated."""

from __future__ import annotations

import pytest

from protlint.limits import DriveLimits, Limits
from protlint.solve.surroundings import survey_surroundings
from protlint.topology.language import load_rules
from protlint.topology.match import find_limiters
from tests.support.boards import board

HALVES = """
npn Q1 +35V UP E1
resistor R1 E1 SPK =0.22
npn Q2 UP E1 SPK
pnp Q3 -35V DOWN E3
resistor R3 E3 SPK =0.22
pnp Q4 DOWN E3 SPK
npn Q5 UP MID DOWN
resistor R5 UP MID =2200
resistor R6 MID DOWN =680
pnp Q7 UP IN V7
resistor R7 +35V V7 =33
npn Q8 DOWN CS V8
resistor R8 V8 -35V =68
resistor R9 CS GND =10000
"""
"""The halves of an output stage, the bias multiplier Q5 between their drives, the amplifier Q7, the current sink Q8."""


def bench_of(pass_device: str, *driven: str) -> set[str]:
    limits = Limits(drives={net: DriveLimits() for net in driven})
    made = board(HALVES, limits=limits)
    (limiter,) = [one for one in find_limiters(made, load_rules()).limiters if one.id == pass_device]
    around = survey_surroundings(made, limiter)
    return {made.parts[index].id for element in around.elements for index in made.elements[element].parts}


@pytest.mark.parametrize(("pass_device", "own"), [("Q1", {"Q1", "R1", "Q2"}), ("Q3", {"Q3", "R3", "Q4"})])
def test_what_stands_behind_the_other_half_s_stated_drive_stays_out(pass_device: str, own: set[str]) -> None:
    """Each half is driven at its own net; what stands behind either drive is told by the ``[drive]`` entries."""
    assert bench_of(pass_device, "UP", "DOWN") == own | {"Q5", "R5", "R6"}


def test_without_such_an_entry_the_walk_goes_on_through_the_multiplier() -> None:
    assert {"Q1", "Q5", "Q3", "Q8"} <= bench_of("Q1", "UP")
    assert {"Q1", "Q5", "Q7", "Q3", "Q8"} <= bench_of("Q1", "IN")
