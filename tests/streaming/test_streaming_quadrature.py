"""Averages over directions and patches, against moments and adaptive quadrature."""

import numpy as np
import pytest
from scipy.integrate import quad

from twofluid.streaming.quadrature import LARGEST_COMPONENT, component_grid, direction_weights, patch_weights

GRID = component_grid(32, LARGEST_COMPONENT)
SPEEDS = (0.0, 0.3, 1.0, 2.5)


@pytest.mark.parametrize("power", [0, 2, 4, 6])
def test_moments_of_directions(power):
    # The component of a speed V along any axis is even over -V to V: <u^n> = V^n/(n + 1).
    expected = np.power(SPEEDS, power) / (power + 1)
    assert direction_weights(GRID, SPEEDS) @ GRID**power == pytest.approx(expected, rel=1e-11, abs=1e-13)


@pytest.mark.parametrize(("power", "expected"), [(0, 1.0), (2, 1 / 3), (4, 3 / 9)])
def test_moments_of_patches(power, expected):
    # A Gaussian of variance 1/3: <u^2> = 1/3, <u^4> = 3/9. Beyond five standard deviations lie 2e-5 and 2e-4 of these.
    assert patch_weights(GRID) @ GRID**power == pytest.approx(expected, rel=3e-4 if power == 4 else 3e-5)


def test_a_fall_near_zero_is_resolved():
    def fall(u):
        return 1.0 / (1.0 + (u / 0.1) ** 2)

    expected = [quad(fall, 0, speed)[0] / speed for speed in SPEEDS[1:]]
    assert direction_weights(GRID, SPEEDS[1:]) @ fall(GRID) == pytest.approx(expected, abs=1e-6)
    gaussian = quad(lambda u: 2 * np.sqrt(1.5 / np.pi) * np.exp(-1.5 * u * u) * fall(u), 0, 10)[0]
    assert patch_weights(GRID) @ fall(GRID) == pytest.approx(gaussian, abs=1e-6)
    # Half the components do worse, and the difference tells by how much.
    coarse = patch_weights(GRID[::2]) @ fall(GRID[::2])
    assert 1e-6 < abs(coarse - gaussian) < 1e-3


def test_every_second_component_is_such_a_grid():
    assert GRID[::2] == pytest.approx(component_grid(16, LARGEST_COMPONENT), abs=1e-15)
    assert GRID[0] == 0.0
    assert GRID[-1] == LARGEST_COMPONENT


def test_averages_over_speeds_are_the_average_over_patches():
    # Maxwell: speeds are distributed as V^2 exp(-3 V^2/2), directions evenly; the component is then a Gaussian.
    nodes, weights = np.polynomial.legendre.leggauss(60)
    speeds = 0.5 * LARGEST_COMPONENT * (1 + nodes)
    maxwell = weights * speeds**2 * np.exp(-1.5 * speeds**2)
    f = np.cos(GRID) / (1 + GRID**2)
    average = maxwell / maxwell.sum() @ direction_weights(GRID, speeds) @ f
    # The tails beyond the grid are left out in one way here and in another there.
    assert average == pytest.approx(patch_weights(GRID) @ f, abs=5e-5)
