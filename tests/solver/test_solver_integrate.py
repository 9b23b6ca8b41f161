"""Integration of linear systems with known solutions."""

import numpy as np
import pytest
from matrix_system import MatrixSystem, constant
from scipy.linalg import expm
from scipy.special import airy

from twofluid.solver import SolverFailure, integrate
from twofluid.solver.integrate import LANES_PER_STRETCH


def clock(end, steps, modes=1, start=0.0):
    return np.repeat(np.linspace(start, end, steps + 1)[:, None], modes, axis=1)


def final(system, times, start, progress=None):
    return integrate(system, times, np.asarray(start, float), system.unknowns, progress).observed[:, -1]


def test_order_of_convergence_is_five():
    # Airy's equation y'' = t y, closed form from scipy.special.airy.
    system = MatrixSystem([lambda time: np.array([[0.0, 1.0], [time, 0.0]])], 2)
    value, slope, *_ = airy(-4.0)
    exact = airy(1.0)[0]
    errors = []
    for steps in (20, 40, 80):
        end = final(system, clock(1.0, steps, start=-4.0), [[value], [slope]])
        errors.append(abs(end[0, 0] - exact))
    orders = np.log2(np.divide(errors[:-1], errors[1:]))
    assert np.all(np.abs(orders - 5.0) < 0.3), orders


def test_coupled_system_against_the_matrix_exponential():
    # General library: scipy.linalg.expm.
    matrices = np.random.default_rng(1).normal(size=(3, 4, 4))
    start = np.random.default_rng(2).normal(size=(4, 3))
    end = final(MatrixSystem([constant(m) for m in matrices], 4), clock(2.0, 60, 3), start)
    for mode, matrix in enumerate(matrices):
        exact = expm(2.0 * matrix) @ start[:, mode]
        np.testing.assert_allclose(end[:, mode], exact, rtol=1e-8)


@pytest.mark.parametrize("rate", [1e3, 1e9, 1e15])
def test_stiff_component_follows_its_slow_partner(rate):
    # y0' = -y0, y1' = -rate (y1 - y0): y1 -> y0 rate / (rate - 1), from a start far away (closed form).
    system = MatrixSystem([constant([[-1.0, 0.0], [rate, -rate]])], 2)
    end = final(system, clock(1.0, 20), [[1.0], [100.0]])
    assert end[0, 0] == pytest.approx(np.exp(-1.0), rel=1e-9)
    assert end[1, 0] == pytest.approx(np.exp(-1.0) * rate / (rate - 1.0), rel=1e-9)


def test_unresolved_oscillation_is_damped_and_the_slow_course_kept():
    # y0' = 1 as a slow source, y1' = omega y2, y2' = -omega (y1 - y0): once the oscillation is gone y1 = y0 = t.
    omega, start_amplitude = 1e4, 5.0
    matrix = [[0, 0, 0, 1.0], [0, 0, omega, 0], [omega, -omega, 0, 0], [0, 0, 0, 0]]
    system = MatrixSystem([constant(matrix)], 4)
    times = clock(10.0, 50)
    y = integrate(system, times, np.array([[0.0], [start_amplitude], [0.0], [1.0]]), system.unknowns).observed[..., 0]
    assert abs(y[1, 0] - y[0, 0]) == start_amplitude
    assert abs(y[1, -1] - times[-1, 0]) < 1e-8  # in nature it would still swing with its full amplitude
    resolved = final(system, clock(0.01, 1000), [[0.0], [start_amplitude], [0.0], [1.0]])
    assert np.hypot(resolved[1, 0] - 0.01, resolved[2, 0] - 1.0 / omega) > 0.99 * start_amplitude


def test_result_does_not_depend_on_companions():
    matrices = [constant(m) for m in np.random.default_rng(3).normal(size=(5, 3, 3))]
    lengths = [4, 40, 15, 40, 1]
    times = np.ones((41, 5))
    for mode, steps in enumerate(lengths):
        times[: steps + 1, mode] = np.linspace(0.0, 1.0, steps + 1)
    start = np.ones((3, 5))
    together = final(MatrixSystem(matrices, 3), times, start)
    for mode, steps in enumerate(lengths):
        alone = final(MatrixSystem([matrices[mode]], 3), times[: steps + 1, [mode]], start[:, [mode]])
        np.testing.assert_allclose(together[:, mode], alone[:, 0], rtol=1e-13)


def test_modes_leave_the_march_in_any_order():
    # Closed form: exponential decay. More modes than march together, of every length down to none at all.
    draw = np.random.default_rng(7)
    lengths, rates = draw.integers(0, 40, 1100), draw.uniform(0.1, 2.0, 1100)
    times = np.ones((41, 1100))
    for mode, steps in enumerate(lengths):
        times[: steps + 1, mode] = np.linspace(1.0 - steps / 40.0, 1.0, steps + 1)
    system = MatrixSystem([constant([[-rate]]) for rate in rates], 1)
    observed = integrate(system, times, np.ones((1, 1100)), ["y0"]).observed[0]
    np.testing.assert_allclose(observed, np.exp(-rates * (times - times[0])), rtol=1e-9)  # after arrival as well


def test_steps_of_no_length_on_the_way_change_nothing():
    system = MatrixSystem([constant([[-1.0]])], 1)
    with_pause = np.array([0.0, 0.25, 0.5, 0.5, 0.75, 1.0])[:, None]
    course = integrate(system, with_pause, np.ones((1, 1)), ["y0"])
    np.testing.assert_allclose(course.observed[0, :, 0], np.exp(-with_pause[:, 0]), rtol=1e-6)
    assert course.counts["steps"] == 4


def test_nothing_observed():
    system = MatrixSystem([constant([[-1.0]])], 1)
    assert integrate(system, clock(1.0, 3), np.ones((1, 1)), []).observed.shape == (0, 4, 1)


def test_many_modes_are_split_into_batches_without_a_trace():
    decay = np.linspace(0.1, 2.0, 700)
    system = MatrixSystem([constant([[-rate]]) for rate in decay], 1)
    np.testing.assert_allclose(final(system, clock(1.0, 3, 700), np.ones((1, 700)))[0], np.exp(-decay), rtol=1e-4)


def test_padding_is_left_out_of_the_work():
    times = np.ones((101, 64))
    times[:, :32] = np.linspace(0.0, 1.0, 101)[:, None]
    times[:3, 32:] = np.linspace(0.0, 1.0, 3)[:, None]
    system = MatrixSystem([constant([[-1.0]])] * 64, 1)
    counts = integrate(system, times, np.ones((1, 64)), ["y0"]).counts
    assert counts["steps"] == 32 * 100 + 32 * 2
    assert counts["lanes"] <= counts["steps"] + LANES_PER_STRETCH  # modes leave at the end of a stretch, 6400 in all


def test_progress_ends_at_the_total():
    calls = []
    system = MatrixSystem([constant([[-1.0]])] * 300, 1)
    final(system, clock(1.0, 30, 300), np.ones((1, 300)), lambda done, total: calls.append((done, total)))
    assert len(calls) > 1
    assert [done for done, _ in calls] == sorted({done for done, _ in calls})
    assert calls[-1] == (9000, 9000)


def test_failure_names_mode_and_time():
    def poisoned(time):
        return np.array([[np.nan if time > 0.5 else -1.0]])

    system = MatrixSystem([constant([[-1.0]]), constant([[-1.0]]), poisoned], 1)
    times = clock(1.0, 10, 3)
    times[5:, 0] = times[5, 0]  # the shortest clock: last in the march
    times[9:, 1] = times[9, 1]
    with pytest.raises(SolverFailure, match="no longer finite") as failure:
        final(system, times, np.ones((1, 3)))
    assert failure.value.mode == 2
    assert failure.value.time == pytest.approx(0.6)  # the step that first evaluates beyond 0.5 ends at 0.6


# Two cold fluids in a matter era and the infall of baryons from rest: closed form delta_b / delta_c with
# delta_m = f_c [(3/2+p)/(5/2) r + (1-p)/(5/2) r^(-3/2)], delta_b - delta_c = -(1+2p) + 2p r^(-1/2), derived from the
# linear growth equation; six digits of its values.
INFALL = {2: 0.183349, 5: 0.542563, 10: 0.735703, 50: 0.937673, 100: 0.967770}  # f_b = 0.157081, p = 0.901902


def infall_system(baryon_fraction):
    """Growth of two cold fluids in ln a: delta'' + delta'/2 = (3/2) sum f delta, rows (delta_c, v_c, delta_b, v_b)."""
    dark = 1.0 - baryon_fraction
    pull = [1.5 * dark, 1.5 * baryon_fraction]
    matrix = np.zeros((4, 4))
    matrix[0, 1] = matrix[2, 3] = 1.0
    for velocity in (1, 3):
        matrix[velocity, [0, 2]] = pull
        matrix[velocity, velocity] = -0.5
    return MatrixSystem([constant(matrix)], 4)


@pytest.mark.parametrize(("ratio", "expected"), INFALL.items())
def test_baryon_infall_from_rest(ratio, expected):
    end = final(infall_system(0.157081), clock(np.log(ratio), 60), [[1.0], [0.901902], [0.0], [0.0]])
    assert end[2, 0] / end[0, 0] == pytest.approx(expected, abs=1e-6)  # the table has six digits
