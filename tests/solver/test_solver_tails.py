"""Tails in the coordinates of their eigenvectors, against dense linear algebra (numpy.linalg, scipy.linalg)."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.linalg import expm

from twofluid.solver import Elimination, StepRates, Tail, TailRates, integrate, rate_matrix
from twofluid.solver.collocation import INVERSE_WEIGHTS, STATE_LOAD

STEPS, MODES, CORE = 2, 3, 3
LANES = STEPS * MODES


def chain(length, rows, sources, sink, absorption=0.3):
    """A chain of moments, absorbed towards its end."""
    place = np.arange(1.0, length + 1.0)
    matrix = np.diag(-absorption * (place / length) ** 2)
    matrix += np.diag(place[1:] / (2 * place[1:] + 1), -1) - np.diag(place[1:] / (2 * place[1:] - 1), 1)
    first = (place == 1.0).astype(float)
    return Tail(tuple(rows), matrix, 0.4 * first, -0.6 * first, sources, sink)


class System:
    """Three unknowns with full rates, and tails on two of them.

    Rates are constant in time, so that every stage of a step has the same; `stages` gives each its own factor.
    """

    def __init__(self, tails, stages=(1.0, 1.0, 1.0), shared=False, modes=MODES):
        draw = np.random.default_rng(1)
        self.tails = tails
        self.unknowns = [f"y{row}" for row in range(CORE + sum(len(tail.rows) for tail in tails))]
        self._core = draw.normal(size=(CORE, CORE, modes)) - np.eye(CORE)[:, :, None]
        paces, dampings = draw.uniform(0.5, 3.0, (2, len(tails), modes))
        if shared:
            paces[:], dampings[:] = paces[0], dampings[0]
        self._paces, self._dampings = paces, dampings
        self._stages, self._shared = np.array(stages)[:, None], shared

    def step_rates(self, modes, time, step):
        factor = self._stages * step
        entries = {(row, column): self._core[row, column, modes] * factor for row, column in np.ndindex(CORE, CORE)}
        rates = [
            TailRates(pace[modes] * factor, damping[modes] * factor)
            for pace, damping in zip(self._paces, self._dampings, strict=True)
        ]
        return StepRates(entries, [rates[0]] * len(rates) if self._shared else rates)


def dense_end(system, state, mode, step, stages):
    """Last stage of one step of one mode, from the whole matrix."""
    count = len(system.unknowns)
    matrix = np.kron(np.eye(count), INVERSE_WEIGHTS)
    rate = rate_matrix(System(system.tails, shared=system._shared), mode, 0.0) * step
    matrix -= np.einsum("rc,ij->ricj", rate, np.diag(stages)).reshape(3 * count, 3 * count)
    return np.linalg.solve(matrix, np.kron(state[:, mode], STATE_LOAD)).reshape(count, 3)[:, -1]


def two_chains(length=5):
    rows = np.arange(CORE, CORE + 2 * length).reshape(2, length)
    return chain(length, rows[0], {0: 1.0}, 0), chain(length, rows[1], {1: 1.0}, 1)


CASES = {
    "one pair and a real eigenvalue": ([chain(3, (3, 4, 5), {0: 1.0}, 0)], False),
    "real eigenvalues alone": ([chain(1, (3,), {2: 1.0}, 2)], False),
    "two alike, each its own rates": (two_chains(), False),
    "two alike with the same rates": (two_chains(), True),
    "two of different length": ([chain(4, range(3, 7), {0: 1.0}, 0), chain(6, range(7, 13), {1: 1.0}, 1)], False),
    "driven by two, acting on another": ([chain(4, range(3, 7), {0: 1.0, 1: 1.6}, 2)], False),
    "two of one kind on one sink": ([chain(4, range(3, 7), {0: 1.0}, 2), chain(4, range(7, 11), {1: 1.0}, 2)], False),
    "of one kind, other weights": ([chain(4, range(3, 7), {0: 1.0}, 1), chain(4, range(7, 11), {0: 0.3}, 2)], False),
    "two on one sink": ([chain(4, range(3, 7), {0: 1.0}, 2), chain(5, range(7, 12), {0: 1.0}, 2)], False),
}


@pytest.mark.parametrize("stages", [(1.0, 1.0, 1.0), (1.3, 0.8, 1.1)])
@pytest.mark.parametrize(("tails", "shared"), CASES.values(), ids=CASES)
def test_matches_a_dense_solve(tails, shared, stages):
    system = System(tails, stages, shared)
    step = np.repeat([0.3, 2.0], MODES)
    rates = system.step_rates(np.tile(np.arange(MODES), STEPS), np.zeros((3, LANES)), step)
    elimination = Elimination(CORE, rates, tails)
    factors = elimination.factor(rates, LANES, STEPS, MODES)
    state = np.random.default_rng(5).normal(size=(len(system.unknowns), MODES))
    for number in range(STEPS):
        end = factors.advance(elimination.split(state), number)
        found = elimination.read(end, np.arange(len(state)))
        for mode in range(MODES):
            expected = dense_end(system, state, mode, step[number * MODES], np.array(stages))
            np.testing.assert_allclose(found[:, mode], expected, rtol=1e-10, atol=1e-12)


@pytest.mark.parametrize("pace", [1e-6, 1.0, 1e3, 1e8])
@pytest.mark.parametrize("damping", [0.0, 1.0, 1e10])
def test_any_pace_and_damping(pace, damping):
    # From hardly streaming to far beyond resolution, and from free to tied.
    tail = chain(8, range(1, 9), {0: 1.0}, 0, absorption=1.0)
    factors = np.array([1.0, 0.9, 1.2])[:, None]
    rates = StepRates({(0, 0): -factors}, [TailRates(pace * factors, damping * factors)])
    elimination = Elimination(1, rates, [tail])
    state = np.random.default_rng(2).normal(size=(9, 1))
    end = elimination.read(elimination.factor(rates, 1, 1, 1).advance(elimination.split(state), 0), np.arange(9))
    rate = np.zeros((9, 9))
    rate[1:, 1:], rate[1:, 0], rate[0, 1:] = pace * tail.matrix, pace * tail.entrance, pace * tail.exit
    rate -= np.diag([1.0] + [damping] * 8)
    matrix = np.kron(np.eye(9), INVERSE_WEIGHTS)
    matrix -= np.einsum("rc,ij->ricj", rate, np.diag(factors[:, 0])).reshape(27, 27)
    expected = np.linalg.solve(matrix, np.kron(state[:, 0], STATE_LOAD)).reshape(9, 3)[:, -1]
    np.testing.assert_allclose(end[:, 0], expected, rtol=1e-9, atol=1e-11 * np.abs(expected).max())


def test_integration_against_the_matrix_exponential():
    # General library: scipy.linalg.expm; every unknown is observed, in another order than it is kept.
    system = System(two_chains(6))
    start = np.random.default_rng(3).normal(size=(len(system.unknowns), MODES))
    times = np.repeat(np.linspace(0.0, 2.0, 81)[:, None], MODES, axis=1)
    names = system.unknowns[::-1]
    found = integrate(system, times, start, names).observed[::-1, -1]
    for mode in range(MODES):
        exact = expm(2.0 * rate_matrix(system, mode, 0.0)) @ start[:, mode]
        np.testing.assert_allclose(found[:, mode], exact, rtol=1e-7, atol=1e-9)


def test_tails_of_one_kind_are_followed_together():
    first, second = two_chains()
    assert first.like(second)
    for changed in (replace(second, matrix=2.0 * second.matrix), replace(second, sources={0: 1.0, 1: 1.0})):
        assert not first.like(changed)
    rates = System([first, second]).step_rates(np.zeros(1, int), np.zeros((3, 1)), np.ones(1))
    assert len(Elimination(CORE, rates, [first, second]).families) == 1
    assert len(Elimination(CORE, rates, [first, replace(second, exit=2.0 * second.exit)]).families) == 2


def test_parallel_eigenvectors_are_refused():
    matrix = np.array([[-1.0, 1.0], [0.0, -1.0 - 1e-13]])  # hardly more than one direction
    tail = Tail((1, 2), matrix, np.array([1.0, 0.0]), np.array([0.0, 1.0]), {0: 1.0}, 0)
    with pytest.raises(ValueError, match="a tail of 2 moments is too long"):
        Elimination(1, StepRates({(0, 0): np.ones(1)}, [TailRates(np.ones(1))]), [tail])


@pytest.mark.parametrize(("source", "sink"), [(0, 1), (1, 0)])
def test_unknowns_without_entries_that_tails_touch(source, sink):
    # Nothing but a tail from one of two unknowns to the other: neither is a leaf.
    tail = chain(3, (2, 3, 4), {source: 1.0}, sink)
    rates = StepRates({}, [TailRates(np.full(1, 0.7), np.full(1, 0.2))])
    elimination = Elimination(2, rates, [tail])
    assert not any(pivot.leaf for pivot in elimination.pivots)
    state = np.random.default_rng(2).normal(size=(5, 1))
    end = elimination.read(elimination.factor(rates, 1, 1, 1).advance(elimination.split(state), 0), np.arange(5))
    rate = np.zeros((5, 5))
    rate[2:, 2:] = 0.7 * tail.matrix - 0.2 * np.eye(3)
    rate[2:, source], rate[sink, 2:] = 0.7 * tail.entrance, 0.7 * tail.exit
    matrix = np.kron(np.eye(5), INVERSE_WEIGHTS) - np.kron(rate, np.eye(3))
    expected = np.linalg.solve(matrix, np.kron(state[:, 0], STATE_LOAD)).reshape(5, 3)[:, -1]
    np.testing.assert_allclose(end[:, 0], expected, rtol=1e-11)


def test_a_tail_without_a_source_is_refused():
    with pytest.raises(ValueError, match="a tail without a source"):
        Elimination(1, StepRates({}, [TailRates(np.ones(1))]), [chain(2, (1, 2), {}, 0)])


def test_entries_of_a_tail_beside_it_are_refused():
    tail = chain(2, (1, 2), {0: 1.0}, 0)
    rates = StepRates({(0, 0): np.ones(1), (0, 1): np.ones(1)}, [TailRates(np.ones(1))])
    with pytest.raises(ValueError, match=r"entries \[\(0, 1\)\] belong to tails"):
        Elimination(1, rates, [tail])
