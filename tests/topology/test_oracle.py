"""The search against an outside oracle: networkx VF2 (Cordella and others 2004) on random small boards.

Flat patterns with the counts of their paths fixed at 0, 1 and 2, without tests and without names that may coincide, are
plain labelled graphs: parts and nets are nodes, pins are edges. Both must find the same groups. Where the board has
supplies, the search by its own rule never walks over one: it owes the matches that hang together without them, and may
find others, but none that is not there.
"""

from __future__ import annotations

import random
from dataclasses import replace
from functools import cache
from itertools import pairwise

import networkx as nx
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from protlint.board.graph import Board
from protlint.topology.fitting import Fitter, plans_for
from protlint.topology.flatten import Pattern
from protlint.topology.index import RAIL, Index
from protlint.topology.language import load_rules
from protlint.topology.terms import ANY, PINS, Clause
from tests.support.boards import TERMINALS, board

Group = frozenset[tuple[str, frozenset[int]]]
FREE_NETS = [f"N{number}" for number in range(9)]
WITH_RAILS = [*FREE_NETS, "GND", "+12V", "GND", "+12V"]


@cache
def flat_patterns() -> list[Pattern]:
    """Return the patterns without repeated groups, bare of tests."""
    rules = load_rules()
    bare = []
    for pattern in (*rules.patterns, *rules.fault_patterns):
        if not pattern.again:
            clauses = tuple(replace(clause, when=(), under_ohm=None) for clause in pattern.clauses)
            bare.append(replace(pattern, clauses=clauses, where=(), unites=(), may=()))
    return bare


def with_fixed_counts(pattern: Pattern, chance: random.Random) -> Pattern:
    """Return the pattern with every path of 0, 1 or 2 elements, as far as its rule allows that."""
    clauses = []
    for clause in pattern.clauses:
        if clause.count is not None:
            length = chance.choice([count for count in (0, 1, 2) if clause.count[0] <= count <= clause.count[1]])
            clause = replace(clause, count=(length, length))
        clauses.append(clause)
    return replace(pattern, clauses=tuple(clauses))


def united(pattern: Pattern) -> dict[str, str]:
    """Return for every net name the one that stands for it where paths of no elements unite them."""
    same: dict[str, str] = {}

    def find(name: str) -> str:
        while same.setdefault(name, name) != name:
            name = same[name]
        return name

    for clause in pattern.clauses:
        for name in clause.nets():
            find(name)
        if clause.ends is not None and clause.count == (0, 0):
            same[find(clause.ends[0])] = find(clause.ends[1])
    return {name: find(name) for name in same}


def hops(clause: Clause, number: int) -> list[tuple[str, str]]:
    """Return the ends of every element of a clause, with private names for the nets between."""
    assert clause.ends is not None
    length = 1 if clause.count is None else clause.count[0]
    names = [clause.ends[0], *(f"between {number}.{place}" for place in range(length - 1)), clause.ends[1]]
    return list(pairwise(names))[:length]


def pattern_graph(pattern: Pattern) -> nx.Graph:
    names = united(pattern)
    graph = nx.Graph()
    for number, clause in enumerate(pattern.clauses):
        if clause.ends is None:
            node = ("part", number, 0)
            graph.add_node(node, kinds=clause.kinds, role=clause.role)
            for pin, net in clause.pins:
                if net != ANY:
                    _join(graph, node, names[net], pin)
            continue
        for place, pair in enumerate(hops(clause, number)):
            node = ("part", number, place)
            graph.add_node(node, kinds=clause.kinds, role=clause.role)
            pins = ("anode", "cathode") if clause.along else ("either end", "either end")
            pins = ("1", "2") if pair[0] == pair[1] else pins
            for net, pin in zip(pair, pins, strict=True):
                _join(graph, node, names.get(net, net), pin)
    return graph


def board_graph(made: Board) -> nx.Graph:
    graph = nx.Graph()
    for element in made.elements:
        node = ("part", element.index)
        graph.add_node(node, kind=element.kind)
        for role, net in element.terminals.items():
            _join(graph, node, net, role)
    return graph


def _join(graph: nx.Graph, node: object, net: object, pin: str) -> None:
    graph.add_node(("net", net))
    if graph.has_edge(node, ("net", net)):
        graph.edges[node, ("net", net)]["pins"].add(pin)
    else:
        graph.add_edge(node, ("net", net), pins={pin})


def found_by_vf2(made: Board, pattern: Pattern) -> tuple[set[Group], set[Group]]:
    """Return all groups, and those that hang together without the supplies."""
    index = Index(made)

    def same_node(on_board: dict[str, object], wanted: dict[str, object]) -> bool:
        kinds = wanted.get("kinds", (None,))  # a net has no kind
        return isinstance(kinds, tuple) and on_board.get("kind") in kinds

    def same_edge(on_board: dict[str, set[str]], wanted: dict[str, set[str]]) -> bool:
        return all(pin == "either end" or pin in on_board["pins"] for pin in wanted["pins"])

    wanted = pattern_graph(pattern)
    matcher = nx.algorithms.isomorphism.GraphMatcher(board_graph(made), wanted, node_match=same_node, edge_match=same_edge)
    groups, owed = set(), set()
    for mapping in matcher.subgraph_monomorphisms_iter():
        between = [node[1] for node, name in mapping.items() if node[0] == "net" and name[1].startswith("between")]
        if not all(index.is_open(net) for net in between):
            continue
        roles: dict[str, set[int]] = {}
        for node, name in mapping.items():
            if node[0] == "part":
                roles.setdefault(wanted.nodes[name]["role"], set()).add(node[1])
        group = frozenset((role, frozenset(elements)) for role, elements in roles.items())
        groups.add(group)
        if _hangs_together(mapping, wanted, index):
            owed.add(group)
    return groups, owed


def _hangs_together(mapping: dict[tuple[str, int], tuple[object, ...]], wanted: nx.Graph, index: Index) -> bool:
    """Tell whether the parts of a match stay connected when the supplies are taken away."""
    rails = [name for node, name in mapping.items() if node[0] == "net" and index.flag[node[1]] == RAIL]
    left = wanted.copy()
    left.remove_nodes_from(rails)
    return bool(nx.is_connected(left))


def found_by_search(made: Board, pattern: Pattern) -> set[Group]:
    groups = set()
    for match in Fitter(Index(made), [pattern], plans_for([pattern])).matches():
        filled = [(role, frozenset(elements)) for role, elements in match.elements.items() if elements]
        groups.add(frozenset(filled))
    return groups


@st.composite
def board_and_pattern(draw: st.DrawFn, nets: list[str]) -> tuple[str, Pattern]:
    """Draw a pattern with fixed counts and a board that holds it once, its nets chosen at random, among other parts."""
    chance = random.Random(draw(st.integers(0, 10**9)))
    pattern = with_fixed_counts(chance.choice(flat_patterns()), chance)
    names = united(pattern)
    place: dict[str, str] = {}

    def net(name: str) -> str:
        return place.setdefault(names.get(name, name), chance.choice(nets))

    rows = []
    for number, clause in enumerate(pattern.clauses):
        kind = chance.choice(clause.kinds)
        if clause.ends is None:
            joined = dict(clause.pins)
            pins = [net(joined[pin]) if joined.get(pin, ANY) != ANY else chance.choice(nets) for pin in TERMINALS[kind]]
            rows.append(f"{kind} P{number} {' '.join(pins)}")
            continue
        for at, (one, other) in enumerate(hops(clause, number)):
            turn = not clause.along and chance.random() < 0.5
            ends = (net(other), net(one)) if turn else (net(one), net(other))
            rows.append(f"{kind} P{number}x{at} {ends[0]} {ends[1]}" + (" =10" if kind == "resistor" else ""))
    for number in range(chance.randrange(9)):
        kind = chance.choice(["npn", "npn", "pnp", "nmos", "resistor", "resistor", "resistor", "diode", "capacitor"])
        pins = [chance.choice(nets) for _ in TERMINALS.get(kind, "12")]
        rows.append(f"{kind} X{number} {' '.join(pins)}" + (" =10" if kind == "resistor" else ""))
    chance.shuffle(rows)
    return "\n".join(rows), pattern


SETTINGS = settings(max_examples=250, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))


@SETTINGS
@given(board_and_pattern(FREE_NETS))
def test_the_same_groups_as_vf2(drawn: tuple[str, Pattern]) -> None:
    text, pattern = drawn
    made = board(text)
    found = found_by_search(made, pattern)
    assert found_by_vf2(made, pattern) == (found, found)


@SETTINGS
@given(board_and_pattern(WITH_RAILS))
def test_the_same_groups_on_boards_with_supplies(drawn: tuple[str, Pattern]) -> None:
    text, pattern = drawn
    made = board(text)
    there, owed = found_by_vf2(made, pattern)
    assert owed <= found_by_search(made, pattern) <= there


def test_the_oracle_is_asked_real_questions() -> None:
    """Most of the boards drawn hold the pattern they were drawn for, so an empty answer is no habit of either side."""
    hits = 0
    for seed in range(60):
        chance = random.Random(seed)
        pattern = with_fixed_counts(chance.choice(flat_patterns()), chance)
        names = united(pattern)
        rows = []
        for number, clause in enumerate(pattern.clauses):
            if clause.ends is None:
                joined = dict(clause.pins)
                pins = [
                    names[joined[pin]] if joined.get(pin, ANY) != ANY else f"any{number}"
                    for pin in TERMINALS[clause.kinds[0]]
                ]
                rows.append(f"{clause.kinds[0]} P{number} {' '.join(pins)}")
            else:
                for at, pair in enumerate(hops(clause, number)):
                    one, other = (names.get(name, name).replace(" ", "_") for name in pair)
                    rows.append(f"{clause.kinds[0]} P{number}x{at} {one} {other}")
                    rows.append(f"capacitor C{number}x{at} {other} ELSEWHERE")
        made = board("\n".join(rows))
        groups = found_by_search(made, pattern)
        assert found_by_vf2(made, pattern) == (groups, groups)
        hits += bool(groups)
    assert hits > 50
    assert set(PINS) >= {kind for pattern in flat_patterns() for clause in pattern.clauses for kind in clause.kinds}
