"""Relic fermions with mass: energy and pressure of the gas, and the momenta its perturbations are followed at.

The occupation is that of decoupling, f = 1/(e^q + 1) with q the comoving momentum over temperature; a particle's energy
in the same unit is (q^2 + y^2)^(1/2), y = a m c^2/(k T_0).

Sums over momenta are Gauss's, in the variable q^(1/3): integrands are square roots that bend at q = y wherever y is, so
polynomials of a variable that spreads the small momenta do far better than those of q. Number density and the energy
of fast particles come out exactly.
"""

from functools import lru_cache

import numpy as np

_SPREAD = 1.0 / 3.0  # power of q the sums are polynomials of; errors at 6 nodes: 1e-6, against 5e-5 for q (measured)
_BACKGROUND_NODES = 14  # of energy and pressure: good to 3e-9, 3e-8, see the tests
# 3 zeta(3)/(2 pi^2) over 7 pi^2/240 twice: number density times temperature over energy density of massless particles
REST = 180.0 * 1.2020569031595942 / (7.0 * np.pi**4)
_REFERENCE = np.linspace(-18.0, 5.0, 1441)  # ln q of the integrals behind: trapezoids, to round-off


def energy(mass):
    """Energy density over that of massless particles.

    Parameters
    ----------
    mass : float or array, any shape
        Mass over temperature, y [unitless].

    Returns
    -------
    float or array, same shape
        [unitless]
    """
    total = 0.0
    for momentum, weight in zip(*_background_sum(), strict=True):
        total = total + weight * np.sqrt(momentum**2 + mass * mass)
    return total


def pressure(mass):
    """Three times the pressure over the energy density of massless particles; as `energy`."""
    total = 0.0
    for momentum, weight in zip(*_background_sum(), strict=True):
        total = total + weight * momentum**2 / np.sqrt(momentum**2 + mass * mass)
    return total


@lru_cache(maxsize=16)
def momentum_sum(count):
    """Momenta and weights that stand in for integrals over q^3 (-df/dq), which those over perturbations are.

    With the moments N of each momentum defined such that they are those of massless neutrinos while these are
    fast (Ma & Bertschinger 1995: Psi = -(1/4) (d ln f/d ln q) N), the sums of weight times (q^2 + y^2)^(1/2) N_0,
    times q N_1 and times q^2 (q^2 + y^2)^(-1/2) N_0 are density, momentum and three times pressure, over the energy
    density of massless particles.

    Parameters
    ----------
    count : int
        How many.

    Returns
    -------
    momenta, weights : array, shape (momentum,)
        q and its weight; the weights of q sum to one [unitless].
    """
    q = np.exp(_REFERENCE)
    momenta, weights = _gauss(q**4 / (2.0 * np.cosh(q / 2.0)) ** 2, count)
    return momenta, weights / (weights @ momenta)


@lru_cache(maxsize=1)
def _background_sum():
    """Momenta and weights of integrals over q^2 f, the weights of q summing to one, as plain numbers."""
    q = np.exp(_REFERENCE)
    momenta, weights = _gauss(q**3 / (np.exp(q) + 1.0), _BACKGROUND_NODES)
    return momenta.tolist(), (weights / (weights @ momenta)).tolist()


def _gauss(measure, count):
    """Gauss's nodes and weights for a measure on the reference grid, by its orthogonal polynomials (Stieltjes)."""
    variable = np.exp(_SPREAD * _REFERENCE)
    measure = measure / measure.sum()
    before, here, ratio = np.zeros_like(variable), np.ones_like(variable), 0.0
    norm, diagonal, beside = 1.0, [], []
    for _ in range(count):
        diagonal.append((measure * variable * here**2).sum() / norm)
        before, here = here, (variable - diagonal[-1]) * here - ratio * before
        ratio = (measure * here**2).sum() / norm
        norm *= ratio
        beside.append(ratio**0.5)
    jacobi = np.diag(diagonal) + np.diag(beside[:-1], 1) + np.diag(beside[:-1], -1)
    nodes, vectors = np.linalg.eigh(jacobi)
    return nodes ** (1.0 / _SPREAD), vectors[0] ** 2
