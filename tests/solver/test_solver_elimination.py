"""Block elimination against dense linear algebra (numpy.linalg)."""

import numpy as np
import pytest

from twofluid.solver import Elimination, StepRates, blocks
from twofluid.solver.blocks import DIAGONAL, FULL, UNIFORM
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


def dense_end(rates, count, state, step):
    """Solve the stage equations of one step mode by mode as one dense system; return the last stage."""
    end = np.empty((count, MODES))
    for mode in range(MODES):
        matrix = np.kron(np.eye(count), INVERSE_WEIGHTS)
        for (row, column), rate in rates.items():
            lane = np.broadcast_to(rate, (3, LANES))[:, step * MODES + mode]
            matrix[3 * row : 3 * row + 3, 3 * column : 3 * column + 3] -= np.diag(lane)
        stages = np.linalg.solve(matrix, np.kron(state[:, mode], STATE_LOAD)).reshape(count, 3)
        end[:, mode] = stages[:, -1]
    return end


def factored(count, rates):
    """Eliminate; returns the factors, and how to advance a plain state by them."""
    factors = Elimination(count, StepRates(rates)).factor(StepRates(rates), LANES, STEPS, MODES)
    return factors, lambda state, step: factors.advance([state], step)[0]


@pytest.mark.parametrize("density", [0.15, 0.4, 1.0])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_matches_a_dense_solve(density, seed):
    count = 7
    rates = random_rates(count, seed, density)
    state = np.random.default_rng(seed + 10).normal(size=(count, MODES))
    _, advance = factored(count, rates)
    for step in range(STEPS):
        expected = dense_end(rates, count, state, step)
        # Round-off of an elimination without pivoting: the random blocks are not graded.
        np.testing.assert_allclose(advance(state, step), expected, rtol=1e-7, atol=1e-9)


def test_unknowns_without_a_rate_of_their_own():
    rates = {(0, 2): np.full(LANES, 0.7), (2, 0): np.full(LANES, -0.3), (1, 2): np.full((3, LANES), 0.2)}
    state = np.ones((3, MODES))
    _, advance = factored(3, rates)
    np.testing.assert_allclose(advance(state, 1), dense_end(rates, 3, state, 1), rtol=1e-12)


def test_leaves_are_what_nothing_before_them_touches():
    # 0 and 1 act on 3 and are driven by it; 2 is touched by 0.
    rates = {(3, 0): np.full(LANES, 0.5), (0, 3): np.full(LANES, -0.4), (1, 1): np.full((3, LANES), -2.0)}
    rates |= {(3, 1): np.full(LANES, 0.1), (1, 3): np.full((3, LANES), 0.3), (2, 0): np.full(LANES, 1.0)}
    pivots = Elimination(4, StepRates(rates)).pivots
    assert [pivot.leaf for pivot in pivots] == [True, True, False, False]
    state = np.random.default_rng(4).normal(size=(4, MODES))
    _, advance = factored(4, rates)
    np.testing.assert_allclose(advance(state, 1), dense_end(rates, 4, state, 1), rtol=1e-12)


def test_a_group_is_one_piece_of_the_state():
    # 1 and 3 are made of the same kinds of block, but 2, a leaf, stands between them.
    rates = {(1, 0): np.full(LANES, 0.5), (3, 0): np.full(LANES, 0.3)}
    state = np.random.default_rng(4).normal(size=(4, MODES))
    factors, advance = factored(4, rates)
    np.testing.assert_allclose(advance(state, 1), dense_end(rates, 4, state, 1), rtol=1e-12)
    assert factors.groups == 2


def test_lanes_beyond_those_used_change_nothing():
    rates = random_rates(5, 2)
    state = np.random.default_rng(3).normal(size=(5, MODES))
    _, advance = factored(5, rates)
    padded = StepRates({entry: np.concatenate([rate, rate[..., -1:]], axis=-1) for entry, rate in rates.items()})
    factors = Elimination(5, padded).factor(padded, LANES + 1, STEPS, MODES)
    for step in range(STEPS):
        np.testing.assert_array_equal(factors.advance([state], step)[0], advance(state, step))


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
    results = [factored(7, twin_chains(shared))[1](state, 0) for shared in (True, False)]
    np.testing.assert_allclose(results[0], results[1], rtol=1e-10)


def different_chains():
    """Two chains like those of `twin_chains`, every rate of one of them another."""
    rates = twin_chains(shared=False)
    return {entry: rate * (1.0 + 0.1 * (1 in [index % 2 for index in entry])) for entry, rate in rates.items()}


def test_different_chains_are_substituted_together():
    state = np.random.default_rng(6).normal(size=(7, MODES))
    rates = different_chains()
    _, advance = factored(7, rates)
    for step in range(STEPS):
        np.testing.assert_allclose(advance(state, step), dense_end(rates, 7, state, step), rtol=1e-9)


def test_chains_made_of_the_same_kinds_of_block_are_substituted_together():
    systems = (twin_chains(True), different_chains())
    # The first pair are leaves; the second goes together, the last pair feeds one row, so it goes one by one.
    assert [factored(7, rates)[0].groups for rates in systems] == [4, 4]


def test_fill_in_is_symbolic():
    # An arrow pattern eliminated from its tip fills completely; eliminated last it fills nothing.
    entries = {(0, index) for index in range(4)} | {(index, 0) for index in range(4)}
    tip_first = {entry: np.zeros(LANES) for entry in entries}
    tip_last = {(3 - row, 3 - column): rate for (row, column), rate in tip_first.items()}
    assert [len(pivot.columns) for pivot in Elimination(4, StepRates(tip_first)).pivots] == [3, 2, 1, 0]
    assert [len(pivot.columns) for pivot in Elimination(4, StepRates(tip_last)).pivots] == [1, 1, 1, 0]


def random_block(kind, seed):
    """One block of some kind, and the same as full matrices computed another way."""
    block = np.random.default_rng(seed).normal(size=(*kind.value, LANES))
    return block, block if kind == FULL else np.eye(3)[:, :, None] * block


def as_full(block, kind):
    out = FULL.empty(LANES)
    blocks.write(block, (kind,), out)
    return out


KINDS = (UNIFORM, DIAGONAL, FULL)


@pytest.mark.parametrize("kind", KINDS)
def test_any_block_as_a_full_one(kind):
    block, full = random_block(kind, 3)
    np.testing.assert_allclose(as_full(block, kind), full, atol=1e-12)


def test_a_uniform_block_as_a_diagonal_one():
    out = DIAGONAL.empty(LANES)
    blocks.write(np.arange(float(LANES)), (UNIFORM,), out)
    np.testing.assert_array_equal(out, np.tile(np.arange(LANES), (3, 1)))


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
    out, start, last = FULL.empty(LANES), DIAGONAL.empty(LANES), DIAGONAL.empty(LANES)
    blocks.PivotInverse(LANES)(rate, (kind,), out)
    expected = np.linalg.inv(np.moveaxis(INVERSE_WEIGHTS[:, :, None] - full, 2, 0))
    np.testing.assert_allclose(np.moveaxis(out, 2, 0), expected, rtol=1e-8, atol=1e-10)
    blocks.start_alone(out, (FULL,), start)
    np.testing.assert_allclose(start.T, expected @ STATE_LOAD, rtol=1e-8, atol=1e-10)
    blocks.last_row(out, (FULL,), last)
    np.testing.assert_allclose(last.T, expected[:, 2], rtol=1e-8, atol=1e-10)
