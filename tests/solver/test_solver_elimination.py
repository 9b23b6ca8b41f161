"""Block elimination against dense linear algebra (numpy.linalg)."""

import numpy as np
import pytest

from twofluid.solver import Elimination, blocks
from twofluid.solver.blocks import DIAGONAL, FULL, SPECTRAL, UNIFORM
from twofluid.solver.collocation import EIGENVALUES, INVERSE_WEIGHTS, PROJECTORS, STATE_LOAD, WEIGHTS

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


def different_chains():
    """Two chains like those of `twin_chains`, every rate of one of them another."""
    rates = twin_chains(shared=False)
    return {entry: rate * (1.0 + 0.1 * (1 in [index % 2 for index in entry])) for entry, rate in rates.items()}


def test_different_chains_are_substituted_together():
    state = np.random.default_rng(6).normal(size=(7, MODES))
    rates = different_chains()
    factors = Elimination(7, rates).factor(rates, STEPS)
    for step in range(STEPS):
        np.testing.assert_allclose(factors.advance(state, step), dense_stages(rates, 7, state, step), rtol=1e-9)


def test_chains_made_of_the_same_kinds_of_block_are_substituted_together():
    unlike = different_chains()
    unlike[1, 1] = unlike[1, 1][0]  # the same at all stages, while its twin's is not: the first pair falls apart
    systems = (twin_chains(True), different_chains(), unlike)
    groups = [Elimination(7, rates).factor(rates, STEPS).groups for rates in systems]
    assert groups == [5, 5, 6]  # the last pair feeds one row, so it goes one by one


def test_fill_in_is_symbolic():
    # An arrow pattern eliminated from its tip fills completely; eliminated last it fills nothing.
    entries = {(0, index) for index in range(4)} | {(index, 0) for index in range(4)}
    tip_first = {entry: np.zeros(LANES) for entry in entries}
    tip_last = {(3 - row, 3 - column): rate for (row, column), rate in tip_first.items()}
    assert [len(pivot.columns) for pivot in Elimination(4, tip_first).pivots] == [3, 2, 1, 0]
    assert [len(pivot.columns) for pivot in Elimination(4, tip_last).pivots] == [1, 1, 1, 0]


def random_block(kind, seed):
    """One block of some kind, and the same as full matrices computed another way."""
    draw = np.random.default_rng(seed)
    shape, number = kind.value
    block = draw.normal(size=(*shape, LANES)).astype(number)
    if kind == SPECTRAL:
        block[1] += 1j * draw.normal(size=LANES)
        full = np.einsum("nij,nl->ijl", PROJECTORS, block).real
    elif kind == FULL:
        full = block
    else:
        full = np.eye(3)[:, :, None] * block
    return block, full


def as_full(block, kind):
    out = FULL.empty(LANES)
    blocks.write_full(block, kind, out)
    return out


KINDS = (UNIFORM, SPECTRAL, DIAGONAL, FULL)


@pytest.mark.parametrize("kind", KINDS)
def test_any_block_as_a_full_one(kind):
    block, full = random_block(kind, 3)
    np.testing.assert_allclose(as_full(block, kind), full, atol=1e-12)


@pytest.mark.parametrize("first_kind", KINDS)
@pytest.mark.parametrize("second_kind", KINDS)
@pytest.mark.parametrize("name", ["add", "multiply"])
def test_block_algebra_of_every_kind(first_kind, second_kind, name):
    (first, full_first), (second, full_second) = random_block(first_kind, 7), random_block(second_kind, 8)
    kind = blocks.combined(first_kind, second_kind)
    out = kind.empty(LANES)
    getattr(blocks, name)(first, second, (first_kind, second_kind), out)
    expected = full_first + full_second if name == "add" else np.einsum("ikl,kjl->ijl", full_first, full_second)
    np.testing.assert_allclose(as_full(out, kind), expected, atol=1e-12)


@pytest.mark.parametrize("first_kind", KINDS)
@pytest.mark.parametrize("second_kind", KINDS)
def test_sum_in_place(first_kind, second_kind):
    kinds = first_kind, second_kind
    for place, kind in enumerate(kinds):
        if kind == blocks.combined(*kinds):
            operands = [random_block(first_kind, 7), random_block(second_kind, 8)]
            blocks.add(operands[0][0], operands[1][0], kinds, operands[place][0])
            expected = random_block(first_kind, 7)[1] + random_block(second_kind, 8)[1]
            np.testing.assert_allclose(as_full(operands[place][0], kind), expected, atol=1e-12)


@pytest.mark.parametrize("kind", KINDS)
def test_inverse_of_a_pivot(kind):
    rate, full = random_block(kind, 9)
    result = SPECTRAL if kind in (UNIFORM, SPECTRAL) else FULL
    out = result.empty(LANES)
    blocks.invert_pivot(rate, (kind,), out)
    expected = np.linalg.inv(np.moveaxis(INVERSE_WEIGHTS[:, :, None] - full, 2, 0))
    np.testing.assert_allclose(np.moveaxis(as_full(out, result), 2, 0), expected, rtol=1e-8, atol=1e-10)


def test_eigenbasis_gives_functions_of_the_matrix():
    np.testing.assert_allclose(np.einsum("n,nij->ij", EIGENVALUES, PROJECTORS).real, INVERSE_WEIGHTS, atol=1e-12)
    np.testing.assert_allclose(np.einsum("n,nij->ij", 1 / EIGENVALUES, PROJECTORS).real, WEIGHTS, atol=1e-12)
