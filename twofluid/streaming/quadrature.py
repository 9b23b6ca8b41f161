"""Averages over directions and patches, from the answer at a few velocity components.

The growth of a wave depends on the streaming velocity only through its component ``u`` along the wavevector, and
``-u`` gives the complex conjugate. So with the answer f on one grid of components, every average is an integral over u:

* over the directions of a given speed V: u is evenly distributed, ``(1/V) int_0^V f du``;
* over all patches: each component of the velocity is a Gaussian with a third of the variance,
  ``2 (3/2 pi)^(1/2) int_0^inf exp(-3 u^2/2) f du``.

The grid is that of the Chebyshev extrema: dense near zero, where waves shorter than the wind's way in an expansion time
feel it first, and every second point of it is such a grid again.
"""

from __future__ import annotations

import numpy as np
from numpy.polynomial import chebyshev
from numpy.polynomial.legendre import leggauss

LARGEST_COMPONENT = 5.0 / np.sqrt(3.0)  # five standard deviations of a component, beyond it 6e-7 of all patches [rms]
POINTS = 192  # of the quadrature on the interpolating polynomial: exact for 256 intervals, with the Gaussian too


def component_grid(intervals: int, largest: float) -> np.ndarray:
    """Components at which the answer is wanted.

    Parameters
    ----------
    intervals : int
        One less than the number of components.
    largest : float
        The largest of them [rms].

    Returns
    -------
    array, shape (component,)
        Increasing from 0 [rms].
    """
    grid = 0.5 * largest * (1.0 - np.cos(np.pi * np.arange(intervals + 1) / intervals))
    grid[0], grid[-1] = 0.0, largest
    return grid


def direction_weights(grid: np.ndarray, speeds) -> np.ndarray:
    """Weights of the average over the directions of given speeds.

    Parameters
    ----------
    grid : array, shape (component,)
        As from `component_grid`, no shorter than the speeds [rms].
    speeds : array, shape (speed,)
        [rms]

    Returns
    -------
    array, shape (speed, component)
        [unitless]
    """
    x, w = leggauss(POINTS)
    return np.stack([0.5 * w @ _basis(grid, 0.5 * speed * (1.0 + x)) for speed in speeds])


def patch_weights(grid: np.ndarray) -> np.ndarray:
    """Weights of the average over all patches, shape (component,) [unitless].

    Parameters
    ----------
    grid : array, shape (component,)
        As from `component_grid`, up to `LARGEST_COMPONENT` or further [rms].
    """
    x, w = leggauss(POINTS)
    u = 0.5 * LARGEST_COMPONENT * (1.0 + x)
    density = w * np.exp(-1.5 * u**2)
    return density / density.sum() @ _basis(grid, u)


def _basis(grid, points):
    """Values of the polynomials that are one at one component and zero at all others, shape (point, component)."""
    degree = len(grid) - 1
    nodes, places = (2.0 * array / grid[-1] - 1.0 for array in (grid, points))
    return np.linalg.solve(chebyshev.chebvander(nodes, degree).T, chebyshev.chebvander(places, degree).T).T
