"""How fast limiters are found, against networkx VF2 on the same board in the same run, and how time grows with the board.

Nothing is asserted on a clock, and runs are small by default. ``PROTLINT_BENCH_PARTS=10000`` measures the ratio the project
promises (100 times ``GraphMatcher.subgraph_monomorphisms_iter`` for one pattern; VF2 is stopped where it has taken longer
than that, so the ratio is then a lower bound), ``PROTLINT_BENCH_LINE=200000`` that time grows in line with the board.
15 % of all pins are on ground and 10 % on two other supplies. Times are of the processor.
"""

from __future__ import annotations

import math
import os
import signal
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from types import FrameType

import networkx as nx

from protlint.board.graph import Board
from protlint.netlist.forms import no_collection
from protlint.topology.fitting import Fitter, plans_for
from protlint.topology.flatten import Pattern
from protlint.topology.index import Index
from protlint.topology.language import Rules, load_rules
from protlint.topology.match import find_limiters
from tests.support.crowd import crowd
from tests.support.stopwatch import seconds

PARTS = int(os.environ.get("PROTLINT_BENCH_PARTS", "1000"))
LARGEST = int(os.environ.get("PROTLINT_BENCH_LINE", "4000"))
PROMISED = 100
LIMITERS = 8


def sink_pattern() -> Pattern:
    """The emitter-sensed NPN sink with one base stop, bare of tests: a plain labelled graph of four parts."""
    pattern = next(one for one in load_rules().patterns if one.rule == "emitter-sensed" and one.labels == ("one", "single"))
    counts = {"steering": (0, 0), "others.base-stop": (0, 0), "base-stop": (1, 1)}
    clauses = tuple(
        replace(clause, count=counts.get(clause.role, clause.count), when=(), under_ohm=None) for clause in pattern.clauses
    )
    return replace(pattern, clauses=clauses, where=(), unites=(), may=())


def sink_graph() -> nx.Graph:
    pins = {
        ("npn", "pass"): {"take": "base", "near": "emitter", "load": "collector"},
        ("npn", "shunt"): {"take": "collector", "tap": "base", "far": "emitter"},
        ("resistor", "sense"): {"near": "", "far": ""},
        ("resistor", "stop"): {"near": "", "tap": ""},
    }
    graph = nx.Graph()
    for (kind, name), joined in pins.items():
        graph.add_node(name, kind=kind)
        for net, pin in joined.items():
            graph.add_node(f"net {net}", kind="net")
            graph.add_edge(name, f"net {net}", pins={pin} if pin else set())
    return graph


def board_graph(board: Board) -> nx.Graph:
    graph = nx.Graph()
    graph.add_nodes_from((("net", net.index) for net in board.nets), kind="net")
    for element in board.elements:
        graph.add_node(element.index, kind=element.kind)
        for pin, net in element.terminals.items():
            known = graph.get_edge_data(element.index, ("net", net))
            graph.add_edge(element.index, ("net", net), pins={pin} | (known["pins"] if known else set()))
    return graph


class OutOfTime(Exception):
    """VF2 took longer than it was given."""


@contextmanager
def at_most(limit_s: float) -> Iterator[None]:
    """Stop what runs inside after so much processor time."""

    def stop(number: int, frame: FrameType | None) -> None:
        raise OutOfTime

    before = signal.signal(signal.SIGPROF, stop)
    signal.setitimer(signal.ITIMER_PROF, limit_s)
    try:
        yield
    finally:
        signal.setitimer(signal.ITIMER_PROF, 0.0)
        signal.signal(signal.SIGPROF, before)


def test_one_pattern_against_vf2(show: Callable[[Sequence[str]], None]) -> None:
    board = crowd(PARTS, limiters=LIMITERS)
    pattern = sink_pattern()
    plans = plans_for([pattern])

    def ours() -> set[frozenset[int]]:
        return {frozenset(match.own) for match in Fitter(Index(board), [pattern], plans).matches()}

    our_s = seconds(ours)
    whole, part = board_graph(board), sink_graph()
    matcher = nx.algorithms.isomorphism.GraphMatcher(
        whole,
        part,
        node_match=lambda there, wanted: there["kind"] == wanted["kind"],
        edge_match=lambda there, wanted: wanted["pins"] <= there["pins"],
    )
    started = time.process_time()
    finished = True
    theirs = set()
    try:
        with at_most(max(1.5 * PROMISED * our_s, 2.0)):
            for mapping in matcher.subgraph_monomorphisms_iter():
                theirs.add(frozenset(node for node in mapping if isinstance(node, int)))
    except OutOfTime:
        finished = False
    their_s = time.process_time() - started
    found = ours()
    assert len(found) >= LIMITERS
    assert theirs == found if finished else theirs <= found
    bound = "" if finished else "more than "
    show(
        [
            f"{PARTS} parts, one pattern: {our_s * 1e3:.1f} ms, VF2 {bound}{their_s:.2f} s",
            f"          that is {bound}{their_s / our_s:.0f} times as fast",
        ]
    )


def test_all_rules_and_how_time_grows(show: Callable[[Sequence[str]], None]) -> None:
    rules = load_rules()
    sizes = [size for size in (1000, 2000, 5000, 10_000, 20_000, 50_000, 100_000, 200_000) if size <= max(LARGEST, 2000)]
    lines, points = [], []
    for size in sizes:
        board = crowd(size, limiters=LIMITERS)
        with no_collection():
            first_s = seconds(lambda board=board: find_limiters(board, rules), times=1)
            again_s = seconds(lambda board=board: find_limiters(board, rules), times=1 if size > 50_000 else 2)
        wanted = {f"QP{number}" for number in range(1, LIMITERS + 1)}
        assert wanted <= _ids(board, rules)
        points.append((math.log(size), math.log(again_s)))
        lines.append(
            f"{size:>8} parts, all rules: {first_s * 1e3:>7.0f} ms with the plan made, {again_s * 1e3:>7.0f} ms again, "
            f"{again_s / size * 1e6:.1f} us a part"
        )
    mean_x, mean_y = (sum(values) / len(points) for values in zip(*points, strict=True))
    slope = sum((x - mean_x) * (y - mean_y) for x, y in points) / sum((x - mean_x) ** 2 for x, _ in points)
    lines.append(f"         time grows as parts to the power of {slope:.2f}")
    show(lines)


def _ids(board: Board, rules: Rules) -> set[str]:
    return {limiter.id for limiter in find_limiters(board, rules).limiters}
