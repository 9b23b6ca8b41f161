"""Radau IIA: nodes, weights, stability function."""

import numpy as np
import pytest
from scipy.special import roots_jacobi

from twofluid.solver import NODES, WEIGHTS
from twofluid.solver.collocation import INVERSE_WEIGHTS, STATE_LOAD


def test_nodes_are_radau_points():
    # Right Radau points: zeros of P_2^(1,0) mapped to (0, 1), and 1 itself; general library: scipy.special.
    inner = (1.0 + roots_jacobi(2, 1.0, 0.0)[0]) / 2.0
    np.testing.assert_allclose(NODES, [*inner, 1.0], rtol=1e-14)


@pytest.mark.parametrize("power", [0, 1, 2])
def test_stages_integrate_quadratics_exactly(power):
    np.testing.assert_allclose(WEIGHTS @ NODES**power, NODES ** (power + 1) / (power + 1), rtol=1e-13)


@pytest.mark.parametrize(("power", "exact"), [(3, True), (4, True), (5, False)])
def test_last_stage_integrates_up_to_fourth_power(power, exact):
    # A quadrature at n Radau points is exact to degree 2 n - 2, here 4 (closed form); degree 5 is the control.
    error = abs(WEIGHTS[-1] @ NODES**power - 1.0 / (power + 1))
    assert (error < 1e-14) == exact


@pytest.mark.parametrize("z", [-0.5, -3.0, -1e4, 2j, -1.0 + 5.0j])
def test_stability_function_is_the_pade_approximant(z):
    # (2, 3) Pade approximant of exp: Hairer & Wanner 1996, section IV.5 (from memory; closed form).
    pade = (1 + 2 * z / 5 + z**2 / 20) / (1 - 3 * z / 5 + 3 * z**2 / 20 - z**3 / 60)
    stages = np.linalg.solve(INVERSE_WEIGHTS - z * np.eye(3), STATE_LOAD)
    assert abs(stages[-1] - pade) < 1e-13


def test_infinitely_stiff_component_is_gone_after_one_step():
    stages = np.linalg.solve(INVERSE_WEIGHTS + 1e12 * np.eye(3), STATE_LOAD)
    assert abs(stages[-1]) < 1e-11  # L-stability: falls as 3 / |z|
