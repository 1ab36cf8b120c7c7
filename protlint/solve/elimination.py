"""Gaussian elimination of one sparse pattern for many lanes at once.

The nodal matrices of all lanes share one structure. It is worked out once: nodes in the order of least degree (H. M.
Markowitz, "The elimination form of the inverse", Management Science 3, 1957, for symmetric patterns), and of the matrix only
the entries that are or become other than zero, as rows of an array (entries, lanes). Nodal matrices bear elimination along
the diagonal, without exchanges; a lane that does not comes out as infinite or NaN and is caught where it is used.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from protlint.solve.devices import Array, IntArray

_LARGEST_PRODUCT = 200_000
"""Multiplications in one block of a product."""


@dataclass(frozen=True, slots=True)
class Pivot:
    """One step: the row of the diagonal entry, the nodes eliminated later that it touches (others,), the rows of its entries
    towards and from them (slices of as many), and of the entries between them (others, others)."""

    diagonal: int
    others: IntArray
    towards: slice
    below: slice
    between: IntArray


@dataclass(frozen=True, slots=True)
class Pattern:
    """The structure of a nodal matrix: how many entries, the pivots in order, and the row of every entry (i, j)."""

    entries: int
    pivots: tuple[Pivot, ...]
    row: dict[tuple[int, int], int]

    @property
    def diagonal(self) -> list[int]:
        """The rows of the diagonal entries."""
        return [pivot.diagonal for pivot in self.pivots]


def least_degree_order(nodes: Sequence[str], together: Iterable[Iterable[str]]) -> tuple[str, ...]:
    """Return nodes in an order of elimination with little fill; ``together`` are groups of nodes that one device joins."""
    beside = _adjacency(nodes, together)
    order: list[str] = []
    left = list(nodes)
    while left:
        chosen = min(left, key=lambda node: len(beside[node]))
        left.remove(chosen)
        order.append(chosen)
        for other in beside[chosen]:
            beside[other] |= beside[chosen] - {other}
            beside[other].discard(chosen)
    return tuple(order)


def pattern_of(order: Sequence[str], together: Iterable[Iterable[str]]) -> Pattern:
    """Return the structure of a matrix whose nodes are eliminated in an order."""
    beside = _adjacency(order, together)
    place = {node: index for index, node in enumerate(order)}
    row: dict[tuple[int, int], int] = {}
    later_of: list[list[int]] = []
    for index, node in enumerate(order):
        later = sorted(place[other] for other in beside[node] if place[other] > index)
        for other in (order[one] for one in later):
            beside[other] |= {order[one] for one in later if order[one] != other}
        row[index, index] = len(row)
        row |= {(index, one): len(row) + step for step, one in enumerate(later)}
        row |= {(one, index): len(row) + step for step, one in enumerate(later)}
        later_of.append(later)
    pivots = []
    for index, later in enumerate(later_of):
        first, count = row[index, index] + 1, len(later)
        between = np.array([[row[one, other] for other in later] for one in later], dtype=np.intp).reshape(count, count)
        towards, below = slice(first, first + count), slice(first + count, first + 2 * count)
        pivots.append(Pivot(first - 1, np.array(later, dtype=np.intp), towards, below, between))
    return Pattern(len(row), tuple(pivots), row)


def eliminate(pattern: Pattern, matrix: Array, right: Array) -> Array:
    """Solve for right sides (nodes, lanes) or (nodes, sides, lanes); ``matrix`` (entries, lanes). Both are overwritten."""
    sides = right.ndim == 3
    for k, pivot in enumerate(pattern.pivots):
        if not len(pivot.others):
            continue
        factor = matrix[pivot.below] / matrix[pivot.diagonal]
        matrix[pivot.between] -= factor[:, None] * matrix[pivot.towards]
        right[pivot.others] -= (factor[:, None] if sides else factor) * right[k]
    for k in range(len(pattern.pivots) - 1, -1, -1):
        pivot = pattern.pivots[k]
        if len(pivot.others):
            towards = matrix[pivot.towards]
            right[k] -= ((towards[:, None] if sides else towards) * right[pivot.others]).sum(axis=0)
        right[k] /= matrix[pivot.diagonal]
    return right


def product(matrix: Array, lanes: Array) -> Array:
    """Return a small matrix times many lanes (columns, lanes), in blocks.

    A linear-algebra library splits larger products among threads, which for matrices this small costs more than it gains.
    """
    width = lanes.shape[1]
    block = max(1, _LARGEST_PRODUCT // max(matrix.size, 1))
    if width <= block:
        whole: Array = matrix @ lanes
        return whole
    result = np.empty((len(matrix), width))
    for first in range(0, width, block):
        result[:, first : first + block] = matrix @ lanes[:, first : first + block]
    return result


def scatter(pattern: Pattern, incidence: Array, pairs: Sequence[tuple[int, int]]) -> Array:
    """Return the matrix (entries, pairs) that adds conductances between pairs of branches, (row, column) of an incidence
    matrix (branches, nodes), into the entries."""
    result = np.zeros((pattern.entries, len(pairs)))
    ends = [[(node, sign) for node, sign in enumerate(branch) if sign] for branch in incidence.tolist()]
    for column, (one, other) in enumerate(pairs):
        for i, of_one in ends[one]:
            for j, of_other in ends[other]:
                result[pattern.row[i, j], column] += of_one * of_other
    return result


def _adjacency(nodes: Sequence[str], together: Iterable[Iterable[str]]) -> dict[str, set[str]]:
    beside: dict[str, set[str]] = {node: set() for node in nodes}
    for group in together:
        members = {node for node in group if node in beside}
        for node in members:
            beside[node] |= members - {node}
    return beside
