"""From contrasts on a few wavenumbers to the rms contrast in spheres, and how far that can be trusted.

sigma^2(R) is the integral over ln k of P(k) delta^2(k) W^2(k R), P being the primordial power and
W(x) = 3 (sin x - x cos x)/x^3 the window of a sphere. The contrast is a cubic spline in ln k through the
modes, the integral a sum of Gauss-Legendre panels over the wavenumbers of the run; nothing is added for
those beyond. Three errors are estimated: of the sampling (against splines through every second mode, the
odd and the even ones, with differences of either sign counted alike), of the quadrature (against panels
twice as wide), and of the ends: the contrast continued as a power law through its largest values in the
last and the last but one e-fold, to larger wavenumbers at least level, with W^2 at its upper bound.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

PANEL = 0.05  # width of a panel in ln k; ten points in it follow W^2 up to k R of 100, beyond it is below 1e-7
POINTS = 10  # Gauss-Legendre points a panel
FEWEST_MODES = 8  # a spline through every second one still has four points
WIDEST_GAP = 1.4  # factor between neighbouring wavenumbers; with wider ones the sampling error escaped its estimate
SHORTEST_RANGE = 2.0  # in ln k: the e-folds that the continuation beyond an end is read from
REACH = 12.0  # of the continuation beyond the largest wavenumber, in ln k
REACH_POINTS = 481  # trapezoidal points there, of a bound that runs smoothly
SMALL_ARGUMENT = 0.1  # below it W by its series, free of cancellation, good to 1e-11


@dataclass(frozen=True)
class Rms:
    """Rms contrast in spheres.

    Attributes
    ----------
    value : array, shape (radius, redshift)
        Rms contrast from the wavenumbers of the run [unitless].
    error : array, shape (radius, redshift)
        Sum of the three estimates: sampling, quadrature, ends [unitless].
    beyond : array, shape (radius, redshift)
        The part of the error that the ends make; infinite where no end can be seen [unitless].
    """

    value: np.ndarray
    error: np.ndarray
    beyond: np.ndarray


class SphereFilter:
    """Spheres of several radii over the modes of a run.

    Parameters
    ----------
    wavenumber : array, shape (mode,)
        Wavenumbers of the run, in any order [1/Mpc].
    primordial : Primordial
        The power law of the curvature perturbations.
    radius : array, shape (radius,)
        Comoving radii [Mpc].

    Raises
    ------
    ValueError
        If there are too few modes, too narrow a range of them or too wide a gap to interpolate and judge.
    """

    def __init__(self, wavenumber, primordial, radius):
        known, self._order = np.unique(wavenumber, return_index=True)
        self._log_k = np.log(known)
        if len(known) < FEWEST_MODES or np.ptp(self._log_k) < SHORTEST_RANGE:
            raise ValueError(
                f"spheres need at least {FEWEST_MODES} wavenumbers over a factor of "
                f"{np.exp(SHORTEST_RANGE):.2g} or more; this run has {len(known)} over a factor of "
                f"{known[-1] / known[0]:.3g}"
            )
        gap = np.exp(np.diff(self._log_k).max())
        if gap > WIDEST_GAP:
            raise ValueError(
                f"spheres need neighbouring wavenumbers within a factor of {WIDEST_GAP:g}; in this run some are "
                f"a factor of {gap:.3g} apart"
            )
        self._primordial = primordial
        self._radius = np.asarray(radius, dtype=float)
        self._nodes, self._weights = self._panels(PANEL)

    def rms(self, contrast):
        """Rms contrast with its error.

        Parameters
        ----------
        contrast : array, shape (mode, redshift)
            Contrast per unit comoving curvature, in the order of the wavenumbers [unitless].

        Returns
        -------
        Rms
        """
        contrast = contrast[self._order]
        course = self._spline(contrast)
        variance = self._weights @ course**2
        value = np.sqrt(variance)
        halves = (self._spline(contrast, first=first, stride=2) for first in (0, 1))
        sampling = np.maximum(*(self._weights @ abs(course**2 - half**2) for half in halves))
        nodes, weights = self._panels(2.0 * PANEL)
        coarse = np.sqrt(weights @ self._spline(contrast, nodes) ** 2)
        sampling, beyond = (np.sqrt(variance + more) - value for more in (sampling, self._beyond(course)))
        return Rms(value, sampling + abs(value - coarse) + beyond, beyond)

    def rms_and_slope(self, contrast, slope):
        """Rms contrast and its derivative by ln a.

        Parameters
        ----------
        contrast, slope : array, shape (mode, redshift)
            Contrast per unit comoving curvature and its derivative by ln a [unitless].

        Returns
        -------
        value, slope : array, shape (radius, redshift)
            [unitless]
        """
        contrast, slope = (self._spline(array[self._order]) for array in (contrast, slope))
        value = np.sqrt(self._weights @ contrast**2)
        return value, self._weights @ (contrast * slope) / value

    def _panels(self, width):
        """Return nodes in ln k, shape (node,), and weights times P W^2, shape (radius, node)."""
        points, weights = np.polynomial.legendre.leggauss(POINTS)
        edges = np.linspace(self._log_k[0], self._log_k[-1], int(np.ceil(np.ptp(self._log_k) / width)) + 1)
        half = 0.5 * np.diff(edges)[:, None]
        nodes = (edges[:-1, None] + half * (1.0 + points)).ravel()
        k = np.exp(nodes)
        return nodes, (half * weights).ravel() * self._primordial.power(k) * window(np.outer(self._radius, k)) ** 2

    def _spline(self, contrast, nodes=None, *, first=0, stride=1):
        """Return the contrast at the nodes from both ends and every `stride`-th mode from the `first` on."""
        from scipy.interpolate import CubicSpline

        kept = np.unique([0, *range(first, len(self._log_k), stride), len(self._log_k) - 1])
        return CubicSpline(self._log_k[kept], contrast[kept])(self._nodes if nodes is None else nodes)

    def _beyond(self, contrast):
        """Return what wavenumbers beyond the run may add to sigma^2, shape (radius, redshift)."""
        with np.errstate(divide="ignore", over="ignore"):  # what runs away is infinite, and so not covered
            return self._below(contrast) + self._above(contrast)

    def _below(self, contrast):
        """Return the integral from zero to the smallest wavenumber with W = 1, shape (redshift,)."""
        amplitude, slope = _continuation(contrast, self._nodes - self._log_k[0])
        exponent = self._primordial.tilt - 1.0 + 2.0 * slope  # of k in the integrand
        integral = self._primordial.power(np.exp(self._log_k[0])) * amplitude**2 / exponent
        return np.where(exponent > 0.0, integral, np.inf)

    def _above(self, contrast):
        """Return the integral from the largest wavenumber on with the bound of W, shape (radius, redshift)."""
        amplitude, inward_slope = _continuation(contrast, self._log_k[-1] - self._nodes)
        # Never taken to fall: below the damping scale, baryons do so for a while only.
        slope = np.maximum(-inward_slope, 0.0)
        distance = np.linspace(0.0, REACH, REACH_POINTS)
        k = np.exp(self._log_k[-1] + distance)
        step = np.full(REACH_POINTS, distance[1])
        step[[0, -1]] /= 2.0
        bound = self._primordial.power(k) * window_bound(np.outer(self._radius, k))
        integral = (bound * step) @ (amplitude**2 * np.exp(2.0 * slope * distance[:, None]))
        return np.where(self._primordial.tilt - 1.0 + 2.0 * slope < 4.0, integral, np.inf)  # W^2 falls as k^-4


def _continuation(contrast, inwards):
    """Return amplitude at an end and slope by the way inwards of the power law there, shape (redshift,)."""
    epochs = np.arange(contrast.shape[1])
    places, heights = [], []
    for window_start in (0.0, 1.0):
        inside = np.flatnonzero((inwards >= window_start) & (inwards < window_start + 1.0))
        size = np.abs(contrast[inside])
        top = size.argmax(axis=0)
        places.append(inwards[inside][top])
        heights.append(np.maximum(size[top, epochs], np.finfo(float).tiny))
    slope = np.log(heights[1] / heights[0]) / (places[1] - places[0])
    return heights[0] * np.exp(-slope * places[0]), slope


def window(x):
    """Window of a sphere, W(x) = 3 (sin x - x cos x)/x^3, shape as `x` [unitless]."""
    x = np.asarray(x, dtype=float)
    large = np.maximum(x, SMALL_ARGUMENT)
    series = 1.0 - x**2 / 10.0 * (1.0 - x**2 / 28.0 * (1.0 - x**2 / 54.0))
    return np.where(x < SMALL_ARGUMENT, series, 3.0 * (np.sin(large) - large * np.cos(large)) / large**3)


def window_bound(x):
    """Return an upper bound of W^2 that runs smoothly, shape as `x` [unitless]."""
    return np.minimum(1.0, 9.0 * (1.0 + x**2) / x**6)
