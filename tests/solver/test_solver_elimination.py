"""Block elimination against dense linear algebra (numpy.linalg)."""

import numpy as np
import pytest

from twofluid.solver import Elimination
from twofluid.solver.blocks import add, as_full, inverse, multiply, pivot
from twofluid.solver.collocation import INVERSE_WEIGHTS, STATE_LOAD

STEPS, MODES = 2, 3
LANES = STEPS * MODES


def random_rates(count, seed, density=1.0, uniform=0.3):
    """Random step times rate for a random pattern of entries, some the same at all stages."""
    draw = np.random.default_rng(seed)
    rates = {}
    for entry in np.ndindex(count, count):
        if entry[0] == entry[1] or draw.random() < density:
            rates[entry] = draw.normal(size=(LANES,) if draw.random() < uniform else (3, LANES))
    return rates


def dense_stages(rates, count, state, step):
    """Solve the stage equations of one step mode by mode as one dense system."""
    stages = np.empty((count, 3, MODES))
    for mode in range(MODES):
        matrix = np.kron(np.eye(count), INVERSE_WEIGHTS)
        for (row, column), rate in rates.items():
            lane = np.broadcast_to(rate, (3, LANES))[:, step * MODES + mode]
            matrix[3 * row : 3 * row + 3, 3 * column : 3 * column + 3] -= np.diag(lane)
        stages[:, :, mode] = np.linalg.solve(matrix, np.kron(state[:, mode], STATE_LOAD)).reshape(count, 3)
    return stages


@pytest.mark.parametrize("density", [0.15, 0.4, 1.0])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_matches_a_dense_solve(density, seed):
    count = 7
    rates = random_rates(count, seed, density)
    state = np.random.default_rng(seed + 10).normal(size=(count, MODES))
    factors = Elimination(count, rates).factor(rates, STEPS)
    for step in range(STEPS):
        expected = dense_stages(rates, count, state, step)
        # Round-off of an elimination without pivoting: the random blocks are not graded.
        np.testing.assert_allclose(factors.advance(state, step), expected, rtol=1e-7, atol=1e-9)


def test_unknowns_without_a_rate_of_their_own():
    rates = {(0, 2): np.full(LANES, 0.7), (2, 0): np.full(LANES, -0.3), (1, 2): np.full((3, LANES), 0.2)}
    state = np.ones((3, MODES))
    factors = Elimination(3, rates).factor(rates, STEPS)
    np.testing.assert_allclose(factors.advance(state, 1), dense_stages(rates, 3, state, 1), rtol=1e-12)


def twin_chains(shared):
    """Two equal chains feeding one last unknown; their rates the same arrays or equal copies."""
    draw = np.random.default_rng(5)
    own, down, up = (draw.normal(size=(3, LANES)) for _ in range(3))
    take = (lambda rate: rate) if shared else np.copy
    rates = {(6, 6): draw.normal(size=(3, LANES))}
    for level in range(3):
        for chain in range(2):
            here, there = 2 * level + chain, 2 * level + 2 + chain
            target = there if level < 2 else 6
            rates[here, here], rates[here, target] = take(own), take(down)
            rates[target, here] = take(up)
    return rates


def test_shared_chains_give_what_separate_ones_give():
    state = np.random.default_rng(6).normal(size=(7, MODES))
    results = []
    for shared in (True, False):
        rates = twin_chains(shared)
        factors = Elimination(7, rates).factor(rates, STEPS)
        results.append(factors.advance(state, 0))
    np.testing.assert_allclose(results[0], results[1], rtol=1e-10)


def test_shared_chains_are_substituted_together():
    groups = {}
    for shared in (True, False):
        rates = twin_chains(shared)
        groups[shared] = Elimination(7, rates).factor(rates, STEPS).groups
    assert groups == {True: 5, False: 7}  # the last pair feeds one row, so it goes one by one


def test_fill_in_is_symbolic():
    # An arrow pattern eliminated from its tip fills completely; eliminated last it fills nothing.
    tip_first = {(0, index) for index in range(4)} | {(index, 0) for index in range(4)}
    tip_last = {(3 - row, 3 - column) for row, column in tip_first}
    assert [len(pivot.columns) for pivot in Elimination(4, tip_first).pivots] == [3, 2, 1, 0]
    assert [len(pivot.columns) for pivot in Elimination(4, tip_last).pivots] == [1, 1, 1, 0]


@pytest.mark.parametrize("left_kind", [1, 2, 3])
@pytest.mark.parametrize("right_kind", [1, 2, 3])
def test_block_algebra_of_every_kind(left_kind, right_kind):
    draw = np.random.default_rng(7)
    shape = {1: (LANES,), 2: (3, LANES), 3: (3, 3, LANES)}
    left, right = draw.normal(size=shape[left_kind]), draw.normal(size=shape[right_kind])
    full_left, full_right = as_full(left), as_full(right)
    product = np.einsum("ikl,kjl->ijl", full_left, full_right)
    np.testing.assert_allclose(as_full(multiply(left, right)), product, rtol=1e-12)
    np.testing.assert_allclose(as_full(add(left, right)), full_left + full_right, rtol=1e-12)


@pytest.mark.parametrize("kind", [1, 2, 3])
def test_pivot_and_inverse(kind):
    rate = np.random.default_rng(8).normal(size={1: (LANES,), 2: (3, LANES), 3: (3, 3, LANES)}[kind])
    block = INVERSE_WEIGHTS[:, :, None] - as_full(rate)
    np.testing.assert_allclose(pivot(rate), block, rtol=1e-13)
    expected = np.linalg.inv(np.moveaxis(block, 2, 0))
    np.testing.assert_allclose(np.moveaxis(inverse(block), 2, 0), expected, rtol=1e-9)
