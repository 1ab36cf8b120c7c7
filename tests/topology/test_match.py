"""Matching end to end on small boards: what is found, how it is named, what settles a dispute."""

from __future__ import annotations

from functools import cache

import pytest

from protlint.board.graph import Board
from protlint.topology.language import Rules, load_rules
from protlint.topology.limiter import Found, Limiter
from protlint.topology.match import find_limiters
from tests.support.boards import board


@cache
def own_rules() -> Rules:
    return load_rules()


def found_on(text: str) -> tuple[Board, Found]:
    made = board(text)
    return made, find_limiters(made, own_rules())


def only(text: str) -> tuple[Limiter, dict[str, str | None]]:
    """Return the one limiter of a board, and its nets by name."""
    made, found = found_on(text)
    (limiter,) = found.limiters
    return limiter, {role: None if net is None else made.nets[net].name for role, net in limiter.nets.items()}


def roles(limiter: Limiter) -> dict[str, tuple[str, ...]]:
    return {role: parts for role, parts in limiter.roles.items() if parts}


SINK = """
npn Q1 OUT BASE SNS
resistor R1 DRV BASE =1000
resistor R2 SNS GND =2
resistor R3 SNS BS =1000
npn Q2 BASE BS GND
connector J1 1=OUT 2=+12V
ic U1 OUT=DRV VCC=+12V GND=GND
"""


def swapped(text: str) -> str:
    """Return the description with every polarity turned round."""
    pairs = (("npn", "pnp"), ("nmos", "pmos"))
    for one, other in pairs:
        text = text.replace(f"{one}-", "\0-").replace(f"{one} ", "\0 ")
        text = text.replace(f"{other}-", f"{one}-").replace(f"{other} ", f"{one} ").replace("\0", other)
    return text.replace("+12V", "\0").replace("-12V", "+12V").replace("\0", "-12V")


@pytest.mark.parametrize("text, polarity", [(SINK, "n"), (swapped(SINK), "p")])
def test_a_sink_of_either_polarity(text: str, polarity: str) -> None:
    limiter, nets = only(text)
    assert (limiter.id, limiter.topology, limiter.polarity) == ("Q1", "emitter-sensed", polarity)
    assert roles(limiter) == {
        "pass": ("Q1",), "sense": ("R2",), "shunt": ("Q2",), "base_stop": ("R3",), "drive": ("R1",),
    }  # fmt: skip
    assert nets == {"drive": "BASE", "feed": "DRV", "sense": "SNS", "far": "GND", "output": "OUT"}


FOLLOWER = """
npn Q10 +12V B N
resistor R10 DRV B =1000
resistor R11 N OUT =1
npn Q11 B N OUT
connector J1 1=OUT 2=GND
"""


@pytest.mark.parametrize("text", [FOLLOWER, swapped(FOLLOWER)])
def test_a_follower_puts_its_output_behind_the_sense_resistor(text: str) -> None:
    limiter, nets = only(text)
    assert limiter.roles["base_stop"] == ()
    assert nets == {"drive": "B", "feed": "DRV", "sense": "N", "far": "OUT", "output": "OUT"}


def test_a_fuse_is_crossed_and_the_nets_stay_those_of_the_parts() -> None:
    limiter, nets = only(FOLLOWER.replace("npn Q10 +12V B N", "npn Q10 +12V B E\nfuse F1 E N"))
    assert limiter.roles["pass"] == ("Q10",)
    assert nets["sense"] == "N"


def test_links_banks_and_chains_do_not_hide_it() -> None:
    text = SINK.replace("resistor R2 SNS GND =2", "resistor R2 SNS X =2\nresistor R4 X GND2 =1\nresistor R5 X GND2 =1")
    limiter, _ = only(text + "link NT1 GND GND2")
    assert limiter.roles["sense"] == ("R2", "R4", "R5")
