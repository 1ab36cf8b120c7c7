"""A small piece of a board as a board of its own, where parts can be tried out otherwise than they stand."""

from __future__ import annotations

from collections.abc import Iterable, Set
from dataclasses import dataclass, replace

from protlint.board.graph import Board, Element
from protlint.topology.index import CROWDED
from protlint.topology.limiter import Limiter

REACH = 3
"""How many nets a piece reaches on from its core: as far as any topology's parts lie from its transistors."""

MOST = 150
"""A piece of more elements than this grows no further."""


@dataclass(frozen=True, slots=True)
class Excerpt:
    """A piece of a board: ``elements`` and ``nets`` hold, by index on the piece, the indices on the whole board.

    ``crowded`` is, where the piece had to end before its reach, the most crowded net it grew over, by index on the whole
    board.
    """

    board: Board
    elements: tuple[int, ...]
    nets: tuple[int, ...]
    crowded: int | None = None

    @property
    def key(self) -> tuple[object, ...]:
        """What makes two pieces equal: kinds, values and joins of their elements, and the voltages of their supplies."""
        held = tuple(net.supply.voltage_V if net.supply is not None else None for net in self.board.nets)
        return held, tuple((one.kind, one.value, tuple(one.terminals.items())) for one in self.board.elements)

    def with_element(self, element: Element) -> Board:
        """Return the piece as a board on which one element is another."""
        elements = list(self.board.elements)
        elements[element.index] = element
        return _board(self.board, elements)

    def on_whole_board(self, limiter: Limiter) -> Limiter:
        """Return a limiter found on the piece, its elements and nets by their indices on the whole board."""
        return replace(
            limiter,
            elements={role: tuple(self.elements[one] for one in ones) for role, ones in limiter.elements.items()},
            nets={name: None if net is None else self.nets[net] for name, net in limiter.nets.items()},
            bound={name: self.nets[net] for name, net in limiter.bound.items()},
        )


def excerpt(board: Board, core: Iterable[int]) -> Excerpt:
    """Return what surrounds some elements: what is reached from them without walking over supplies or crowded nets."""
    chosen = set(core)
    edge = {net for one in chosen for net in board.elements[one].terminals.values()}
    seen = set(edge)
    walked: list[int] = []
    crowded: int | None = None
    for left in reversed(range(REACH)):
        onward: set[int] = set()
        for net in sorted(edge):
            if is_rail(board, net):
                continue
            walked.append(net)
            for element, _ in board.elements_at[net]:
                chosen.add(element)
                onward |= set(board.elements[element].terminals.values()) - seen
            seen |= onward
        edge = onward
        if len(chosen) > MOST:
            if left and any(_leads_on(board, net, chosen) for net in edge):
                crowded = max(walked, key=lambda net: (len(board.elements_at[net]), -net))
            break
    elements = tuple(sorted(chosen))
    joined = {net for one in elements for net in board.elements[one].terminals.values()}
    nets = tuple(sorted(joined | {net.index for net in board.supplies}))
    number = {net: index for index, net in enumerate(nets)}
    small = replace(board, nets=tuple(replace(board.nets[net], index=index) for index, net in enumerate(nets)))
    made = []
    for index, whole in enumerate(board.elements[one] for one in elements):
        made.append(replace(whole, index=index, terminals={role: number[net] for role, net in whole.terminals.items()}))
    return Excerpt(_board(small, made), elements, nets, crowded)


def is_rail(board: Board, net: int) -> bool:
    """Tell whether a net is a supply, or as crowded as one."""
    return board.nets[net].supply is not None or len(board.elements_at[net]) > CROWDED


def _leads_on(board: Board, net: int, chosen: Set[int]) -> bool:
    return not is_rail(board, net) and any(element not in chosen for element, _ in board.elements_at[net])


def _board(board: Board, elements: list[Element]) -> Board:
    at: list[list[tuple[int, str]]] = [[] for _ in board.nets]
    for element in elements:
        for role, net in element.terminals.items():
            at[net].append((element.index, role))
    return replace(board, elements=tuple(elements), elements_at=tuple(map(tuple, at)))
