"""The board put together: links gone, banks and chains merged, what does and does not break them."""

from __future__ import annotations

import math

import pytest

from protlint.board.assemble import assemble
from protlint.board.graph import Board, Element, SeenPart
from protlint.limits import DriveLimits, Limits
from protlint.netlist.model import Part, Pin
from tests.support.boards import board, netlist, supply_of


def resistors(made: Board) -> list[Element]:
    return [element for element in made.elements if element.kind == "resistor"]


def names(made: Board, element: Element) -> list[str]:
    return [made.parts[index].id for index in element.parts]


def shown(made: Board, tree: object) -> object:
    if isinstance(tree, tuple):
        return tree[0], [shown(made, child) for child in tree[1]]
    return made.parts[tree].id  # type: ignore[index]


def test_a_bank_acts_as_one_and_keeps_its_parts() -> None:
    made = board("resistor R1 A B =1\nresistor R2 B A =1\nresistor R3 A B =2\nconnector J1 1=A 2=B")
    (bank,) = resistors(made)
    assert bank.value == pytest.approx(0.4)
    assert shown(made, bank.tree) == ("bank", ["R1", "R2", "R3"])


def test_a_chain_acts_as_one_from_end_to_end() -> None:
    made = board("resistor R3 Y B =3\nresistor R1 A X =1\nresistor R2 X Y =2\nconnector J1 1=A 2=B")
    (chain,) = resistors(made)
    assert chain.value == 6.0
    assert shown(made, chain.tree) == ("chain", ["R3", "R2", "R1"])
    assert names(made, chain) == ["R3", "R1", "R2"]
    assert [made.nets[chain.terminals[end]].name for end in "12"] == ["B", "A"]


def test_banks_and_chains_merge_to_a_fixed_point() -> None:
    made = board("resistor R1 A X =2\nresistor R2 A X =2\nresistor R3 X B =1\nresistor R4 A B =2\nconnector J1 1=A 2=B")
    (one,) = resistors(made)
    assert one.value == pytest.approx(1.0)
    assert shown(made, one.tree) == ("bank", [("chain", [("bank", ["R1", "R2"]), "R3"]), "R4"])


@pytest.mark.parametrize(
    "other",
    ["capacitor C1 X GND", "connector J1 1=X", "ic U1 IN=X", "npn Q1 C X E", "fuse F1 X Z", "resistor R9 X Q =5"],
)
def test_what_hangs_on_the_joint_breaks_a_chain(other: str) -> None:
    made = board(f"resistor R1 A X =1\nresistor R2 X B =1\n{other}")
    assert all(len(element.parts) == 1 for element in resistors(made))


@pytest.mark.parametrize(
    "other", ["", "connector TP3 1=X", "unknown TP_4 1=X", "capacitor C1 X GND unfitted", "resistor R9 X Q =5 unfitted"]
)
def test_test_points_and_parts_not_fitted_do_not(other: str) -> None:
    made = board(f"resistor R1 A X =1\nresistor R2 X B =1\n{other}")
    assert [len(element.parts) for element in resistors(made)] == [2]


def test_a_supply_or_a_net_the_limits_file_speaks_of_breaks_a_chain() -> None:
    text = "resistor R1 A {0} =1\nresistor R2 {0} B =1"
    assert len(resistors(board(text.format("+5V")))) == 2
    spoken = Limits(drives={"DRV": DriveLimits()})
    assert len(resistors(board(text.format("DRV"), limits=spoken))) == 2
    assert len(resistors(board(text.format("DRV")))) == 1


def test_an_unknown_value_leaves_the_merged_one_unknown() -> None:
    made = board("resistor R1 A B =1\nresistor R2 A B")
    assert [element.value for element in resistors(made)] == [None]


def test_links_unite_nets_and_are_in_no_element() -> None:
    made = board(
        "resistor R1 A B =1\nlink NT1 B GND C\nresistor R2 C D =0\nresistor R3 D E =0 unfitted\n"
        "resistor R4 E A =4\nconnector J1 1=A"
    )
    assert [net.names for net in made.nets] == [("A",), ("GND", "B", "C", "D"), ("E",)]
    assert [names(made, element) for element in made.elements] == [["R1"], ["R4"], ["J1"]]
    assert made.nets[1].supply is not None


def test_a_link_between_two_supplies_is_said() -> None:
    made = board("link R1 +12V +5V")
    assert len(made.nets) == 1 and made.nets[0].supply is not None
    assert any("R1" in sentence for sentence in made.assumed)


def test_a_tab_on_the_same_net_is_harmless() -> None:
    made = board("npn Q1 OUT DRV SNS collector=OUT")
    (one,) = made.elements
    nets = {role: made.nets[net].name for role, net in one.terminals.items()}
    assert nets == {"collector": "OUT", "base": "DRV", "emitter": "SNS"}
    assert made.nets[0].pins == ((0, "collector"),)


def test_one_role_on_two_nets_keeps_both_nets() -> None:
    made = board("npn Q1 OUT DRV SNS collector=TAB")
    assert sorted(made.parts[0].roles) == ["base", "collector", "collector (pin 4)", "emitter"]


def test_a_shorted_resistor_keeps_its_element() -> None:
    made = board("resistor R1 A B =2\nlink R2 A B")
    (one,) = resistors(made)
    assert one.terminals["1"] == one.terminals["2"]


def test_a_long_chain_and_a_long_ladder_take_their_time_but_end() -> None:
    rungs = 3000
    chain = "\n".join(f"resistor R{n} N{n} N{n + 1} =1" for n in range(rungs))
    assert resistors(board(chain))[0].value == rungs
    ladder = "\n".join(f"resistor RS{n} N{n} N{n + 1} =1\nresistor RP{n} N{n + 1} GND =1" for n in range(rungs))
    made = board(ladder)
    assert sum(len(element.parts) for element in resistors(made)) == 2 * rungs


def test_a_net_of_many_links_has_all_their_names() -> None:
    links = 20_000
    made = board("\n".join(f"link W{n} N{n} N{n + 1}" for n in range(links)))
    assert [len(net.names) for net in made.nets] == [links + 1]


def test_the_graph_has_one_edge_a_pin() -> None:
    made = board("npn Q1 OUT DRV GND\nresistor R1 DRV OUT =1")
    graph = made.graph()
    assert sorted(graph[("part", "Q1")][("net", "DRV")]) == ["base"]
    assert graph.number_of_edges() == 5
    assert graph.nodes[("part", "R1")]["kind"] == "resistor"


def test_a_ladder_resistance_is_right() -> None:
    """A ladder of 1 ohm in series and 1 ohm across tends to the golden ratio (continued fraction of ones)."""
    text = "\n".join(f"resistor RS{n} N{n} N{n + 1} =1\nresistor RP{n} N{n + 1} B =1" for n in range(15))
    (one,) = resistors(board(f"{text}\nconnector J1 1=N0 2=B"))
    assert one.value == pytest.approx((1 + math.sqrt(5)) / 2, rel=1e-6)


def test_a_package_of_two_devices_is_two_elements() -> None:
    pins = tuple(Pin(name, None, net) for net, name in enumerate(("C1", "B1", "E1", "C2", "B2")))
    pins += (Pin("E2", None, 2),)
    dual = Part("Q1", "Q1", "DUAL", "LIB", {}, pins, 1, 1)
    sections = tuple({"collector": (at,), "base": (at + 1,), "emitter": (at + 2,)} for at in (0, 3))
    seen = [SeenPart("npn", {}, sections=sections)]
    nets = {name: at for at, name in enumerate("ABCDE")}
    made = assemble(netlist([dual], nets), seen, limits=Limits(), supply_of=supply_of)
    assert [element.terminals for element in made.elements] == [
        {"collector": 0, "base": 1, "emitter": 2}, {"collector": 3, "base": 4, "emitter": 2},
    ]  # fmt: skip
    assert made.elements_at[2] == ((0, "emitter"), (1, "emitter"))
    assert made.nets[2].pins == ((0, "E1"), (0, "E2"))
