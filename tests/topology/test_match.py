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


def test_complementary_halves_are_a_pair_and_like_channels_a_set() -> None:
    halves = FOLLOWER + swapped(FOLLOWER).replace("Q1", "Q2").replace("R1", "R2").replace(" B", " BP").replace(" N", " NP")
    _, found = found_on(halves.replace("DRV", "VAS").replace("connector J1 1=OUT 2=GND", ""))
    assert [(one.id, one.polarity) for one in found.limiters] == [("Q10", "n"), ("Q20", "p")]
    assert found.pairs == (("Q10", "Q20"),)
    assert found.sets == ()
    channels = "".join(
        SINK.replace("Q", f"Q{n}").replace("R", f"R{n}").replace("OUT", f"OUT{n}").replace("BASE", f"BASE{n}")
        .replace("SNS", f"SNS{n}").replace(" BS", f" BS{n}").replace("J1", f"J{n}").replace("U1", f"U{n}")
        for n in (1, 2, 3)
    ).replace("R32 SNS3 GND =2", "R32 SNS3 GND =3")  # fmt: skip
    assert found_on(channels)[1].sets == (("Q11", "Q21", "Q31"),)


def test_a_second_shunt_at_one_pass_device_is_a_limiter_of_its_own_name() -> None:
    _, found = found_on(SINK + "resistor R4 SNS BS2 =470\nnpn Q3 BASE BS2 GND")
    assert [one.id for one in found.limiters] == ["Q1", "Q1 (Q3)"]
    assert [one.roles["base_stop"] for one in found.limiters] == [("R3",), ("R4",)]


PLACES = {
    "capacitor C1 BS GND": "base to emitter of the shunt",
    "capacitor C1 BS BASE": "collector to base of the shunt",
    "capacitor C1 BASE GND": "drive to far end",
    "capacitor C1 BASE +12V": "drive to a supply",
    "capacitor C1 BS +12V": "base of the shunt to a supply",
    "capacitor C1 BS Z\nresistor R9 Z BASE": "collector to base of the shunt",
    "capacitor C1 Z BASE\nresistor R9 Z BS": "collector to base of the shunt",
    "resistor R9 BASE Z\ncapacitor C1 Z GND": "drive to far end",
}


@pytest.mark.parametrize("part", PLACES)
def test_compensation_is_named_with_its_place(part: str) -> None:
    limiter, _ = only(SINK + part)
    assert set(limiter.roles["compensation"]) == ({"C1", "R9"} if "R9" in part else {"C1"})
    assert limiter.places["C1"] == PLACES[part]


def test_ground_counts_as_ground_where_the_far_end_is_the_output() -> None:
    limiter, _ = only(FOLLOWER + "capacitor C1 B GND\ncapacitor C2 B OUT\ncapacitor C3 OUT GND")
    assert limiter.roles["compensation"] == ("C1", "C2")
    assert limiter.places == {"C1": "drive to ground", "C2": "drive to far end"}


def test_what_else_fits_is_told() -> None:
    text = FOLLOWER.replace("npn Q11 B N OUT", "npn Q11 B K OUT\nresistor R12 N K =100\nresistor R13 K GND =1000")
    limiter, _ = only(text + "resistor R14 K OUT =1000")
    assert limiter.topology == "foldback"
    assert limiter.also_matched == ("preset-divider",)
    assert limiter.roles["preset"] == ("R12", "R13", "R14")


@pytest.mark.parametrize(
    "spoiled",
    [
        SINK.replace("npn Q2 BASE BS GND", "npn Q2 BASE BS GND unfitted"),
        SINK.replace("resistor R2 SNS GND =2", "resistor R2 SNS GND =2 unfitted"),
        SINK.replace("resistor R2 SNS GND =2", "resistor R2 SNS GND =4700"),
        SINK.replace("npn Q2 BASE BS GND", "npn Q2 FAULT BS GND"),
        SINK.replace("npn Q2 BASE BS GND", "pnp Q2 BASE BS GND"),
        SINK + "capacitor C9 BS INPUT\nconnector J9 1=INPUT",
    ],
)
def test_what_is_no_limiter_is_not_found(spoiled: str) -> None:
    assert found_on(spoiled)[1].limiters == ()


def test_an_unreadable_sense_value_does_not_hide_a_limiter() -> None:
    limiter, _ = only(SINK.replace("resistor R2 SNS GND =2", "resistor R2 SNS GND"))
    assert limiter.roles["sense"] == ("R2",)


def test_an_unnamed_rail_with_hundreds_of_parts_hides_nothing() -> None:
    crowd = "\n".join(
        f"resistor RX{n} VBULK NX{n} =10\nnpn QX{n} NX{n} NB{n} VBULK\nresistor RY{n} NB{n} VBULK" for n in range(99)
    )
    limiter, nets = only(SINK.replace("GND", "VBULK").replace("+12V", "VBULK2") + crowd)
    assert (limiter.id, nets["far"]) == ("Q1", "VBULK")


def test_the_order_of_the_file_changes_nothing_but_order() -> None:
    lines = SINK.strip().splitlines()
    for turn in range(1, len(lines)):
        limiter, nets = only("\n".join(lines[turn:] + lines[:turn]))
        assert limiter.roles == only(SINK)[0].roles
        assert nets == only(SINK)[1]


def test_a_device_with_a_shunt_of_its_own_is_not_left_unsensed() -> None:
    text = """
    npn Q1 +12V B E1
    npn Q2 +12V B E2
    npn Q3 +12V B E3
    resistor R1 E1 OUT =0.2
    resistor R2 E2 OUT =0.2
    resistor R3 E3 OUT =0.2
    npn Q4 B E1 OUT
    npn Q5 B E2 OUT
    connector J1 1=OUT 2=GND
    """
    made, found = found_on(text)
    assert [(one.id, one.roles["shunt"]) for one in found.limiters] == [("Q1", ("Q4",)), ("Q2", ("Q5",))]
    for one in found.limiters:
        assert [made.parts[made.elements[at].parts[0]].id for at in one.elements["pass.unsensed"]] == ["Q3"]


def test_a_shunt_behind_a_follower_that_drives_the_stage_is_a_fault() -> None:
    text = """
    npn Q1 +12V DRV M1
    npn Q2 +12V M1 M2
    npn Q3 +12V M2 E
    resistor R1 E OUT =0.2
    npn Q4 M1 E OUT
    ic U1 OUT=DRV VCC=+12V GND=GND
    connector J1 1=OUT 2=GND
    """
    made, found = found_on(text)
    assert found.limiters == ()
    (fault,) = found.faults
    assert (fault.fault, fault.group.roles["shunt"]) == ("collector-not-on-the-drive", ("Q4",))
    assert [(part, made.nets[net].name) for part, net in fault.moves] == [(("Q4", "collector"), "DRV")]
