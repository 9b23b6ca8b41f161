"""The numerical tools of the smooth universe on problems with known answers."""

import numpy as np
import pytest

from twofluid.universe.collocation import NotConvergedError, solve_stiff
from twofluid.universe.interpolation import UniformCubic
from twofluid.universe.quadrature import RunningIntegral, bisect


def _logistic(t, y):
    return y * (1.0 - y)


def _logistic_error(steps):
    grid = np.linspace(0.0, 4.0, steps + 1)
    exact = 1.0 / (1.0 + 9.0 * np.exp(-grid))
    return np.max(np.abs(solve_stiff(_logistic, grid, [0.1])[0] - exact))


def test_collocation_is_of_fifth_order():
    # Radau IIA with three stages: halving the step divides the error by 2^5 (Hairer & Wanner 1996, IV.5)
    order = np.log2(_logistic_error(16) / _logistic_error(32))
    assert order == pytest.approx(5.0, abs=0.3)


def test_collocation_ignores_stiffness():
    # Prothero & Robinson 1974: y' = -L (y - cos t) - sin t, y = cos t whatever L
    grid = np.linspace(0.0, 2.0, 41)
    found = solve_stiff(lambda t, y: -1e9 * (y - np.cos(t)) - np.sin(t), grid, [1.0])
    np.testing.assert_allclose(found[0], np.cos(grid), atol=1e-10)


def test_collocation_couples_unknowns():
    # A rotation: (cos t, sin t)
    grid = np.linspace(0.0, 3.0, 61)
    found = solve_stiff(lambda t, y: np.stack([-y[1], y[0]]), grid, [1.0, 0.0])
    np.testing.assert_allclose(found, [np.cos(grid), np.sin(grid)], atol=1e-8)


def test_collocation_says_when_there_is_no_solution():
    with pytest.raises(NotConvergedError, match="the last change was"):
        solve_stiff(lambda t, y: y * y, np.linspace(0.0, 2.0, 21), [1.0])  # y = 1/(1 - t)


def test_cubic_interpolation_is_exact_for_cubics():
    nodes = np.linspace(-1.0, 2.0, 31)
    table = UniformCubic(-1.0, 0.1, np.stack([nodes**3 - nodes, 1.0 + nodes**2]))
    point = np.linspace(-1.0, 2.0, 77)
    expected = np.stack([point**3 - point, 1.0 + point**2], axis=1)
    np.testing.assert_allclose(table(point), expected, atol=1e-13)


def _sine_error(intervals):
    step = 3.0 / intervals
    table = UniformCubic(0.0, step, np.sin(step * np.arange(intervals + 1))[None])
    point = np.linspace(0.0, 3.0, 1001)
    return np.max(np.abs(table(point)[:, 0] - np.sin(point)))


def test_cubic_interpolation_is_of_fourth_order():
    # Cubic Hermite: halving the step divides the error by 2^4; finely, for the ends are of fifth
    assert np.log2(_sine_error(200) / _sine_error(400)) == pytest.approx(4.0, abs=0.3)


def test_running_integral_of_an_exponential():
    integral = RunningIntegral(np.exp, -3.0, 1.0, panels=8, initial=np.exp(-3.0))
    point = np.linspace(-3.0, 1.0, 60).reshape(6, 10)
    np.testing.assert_allclose(integral(point), np.exp(point), rtol=1e-14)
    assert integral.total == pytest.approx(np.e, rel=1e-14)
    assert integral.reaches(1.0) == pytest.approx(0.0, abs=1e-13)


def test_bisection_finds_a_root():
    assert bisect(lambda x: x**3 - 2.0, 0.0, 2.0) == pytest.approx(2.0 ** (1.0 / 3.0), rel=1e-14)
