"""Elimination along a pattern against numpy's dense solver, and the order that keeps it sparse."""

from __future__ import annotations

import random

import numpy as np
import pytest

from protlint.solve.elimination import eliminate, least_degree_order, pattern_of, product, scatter


@pytest.mark.parametrize("seed", range(8))
def test_elimination_agrees_with_a_dense_solver(seed: int) -> None:
    dice, lanes = random.Random(seed), 5
    nodes = [f"N{index}" for index in range(dice.randrange(1, 15))]
    pairs = [tuple(dice.choices(nodes, k=2)) for _ in range(2 * len(nodes))]
    order = least_degree_order(nodes, pairs)
    assert sorted(order) == sorted(nodes)
    pattern = pattern_of(order, pairs)
    place = {node: index for index, node in enumerate(order)}
    incidence = np.zeros((len(pairs) + len(nodes), len(nodes)))
    for branch, (one, other) in enumerate(pairs):
        incidence[branch, place[one]] += 1.0
        incidence[branch, place[other]] -= 1.0
    incidence[len(pairs) :] = np.eye(len(nodes))
    conductance = np.random.default_rng(seed).uniform(0.1, 10.0, (len(incidence), lanes))
    matrix = scatter(pattern, incidence, [(row, row) for row in range(len(incidence))]) @ conductance
    dense = np.einsum("bi,bl,bj->lij", incidence, conductance, incidence)
    right = np.random.default_rng(seed).uniform(-1.0, 1.0, (len(nodes), 2, lanes))
    expected = np.linalg.solve(dense, right.transpose(2, 0, 1)).transpose(1, 2, 0)
    assert np.allclose(eliminate(pattern, matrix.copy(), right[:, 0].copy()), expected[:, 0])
    assert np.allclose(eliminate(pattern, matrix.copy(), right.copy()), expected)


def test_a_star_is_eliminated_from_its_ends_without_fill() -> None:
    pairs = [("HUB", f"N{index}") for index in range(20)]
    order = least_degree_order(["HUB", *(f"N{index}" for index in range(20))], pairs)
    assert pattern_of(order, pairs).entries == 21 + 2 * 20


def test_a_product_in_blocks_is_the_product() -> None:
    dice = np.random.default_rng(0)
    matrix, lanes = dice.uniform(-1.0, 1.0, (70, 60)), dice.uniform(-1.0, 1.0, (60, 333))
    assert np.allclose(product(matrix, lanes), matrix @ lanes)
    assert product(np.zeros((3, 0)), np.zeros((0, 4))).shape == (3, 4)
