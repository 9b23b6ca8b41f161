"""Growth of a cold fluid that holds all the matter: what gravity does if nothing withstands it.

Without pressure and drag every scale well inside the horizon grows alike: (a D')' = (1/2) a g_m D with
g_m = 8 pi G a^2 rho_m and primes by conformal time, while radiation, curvature and the cosmological
constant only expand the universe. In matter and radiation the growing solution is 1 + 3y/2 with
y = rho_m/rho_r (Meszaros 1974); in matter and a cosmological constant it is
a 2F1(1/3, 1; 11/6; -a^3 Omega_Lambda/Omega_m).
"""

from __future__ import annotations

import numpy as np

EARLY = 1e-3  # matter over radiation from which on the equation is solved; 1 + 3y/2 holds before
TOLERANCE = 1e-10  # relative, of the solution


def cold_growth(universe, redshift):
    """Return the growing solution, 1 at the beginning, and its growth rate.

    Parameters
    ----------
    universe : Universe
        The smooth universe.
    redshift : float or array, shape (redshift,)
        Redshifts, in any order [unitless].

    Returns
    -------
    growth, rate : array, shape (redshift,)
        D and d ln D/d ln a [unitless].

    Raises
    ------
    ArithmeticError
        If the integration fails; names the redshift.
    """
    from scipy.integrate import solve_ivp

    log_a, place = np.unique(-np.log1p(np.atleast_1d(np.asarray(redshift, dtype=float))), return_inverse=True)
    equality = 1.0 / (1.0 + universe.landmarks.equality_redshift)
    start = min(np.log(EARLY * equality), log_a[0])

    def slope(x, state):
        a = np.exp(x)
        hubble = universe.conformal_hubble_rate(a)
        gravity = universe.gravity("dark", a) + universe.gravity("baryon", a)
        return state[1] / (a * hubble), 0.5 * a * gravity * state[0] / hubble

    ratio = np.exp(start) / equality
    momentum = 1.5 * ratio * np.exp(start) * universe.conformal_hubble_rate(np.exp(start))  # a dD/d tau
    solution = solve_ivp(
        slope, (start, max(log_a[-1], start)), (1.0 + 1.5 * ratio, momentum), method="DOP853",
        rtol=TOLERANCE, atol=0.0, t_eval=log_a,
    )  # fmt: skip
    if not solution.success or solution.y.shape[1] != len(log_a) or not np.all(np.isfinite(solution.y)):
        reached = np.expm1(-solution.t[-1]) if len(solution.t) else np.expm1(-start)
        raise ArithmeticError(f"the growth of cold matter could not be followed beyond z = {reached:.6g}")
    growth, momentum = solution.y[:, place]
    a = np.exp(log_a[place])
    return growth, momentum / (a * universe.conformal_hubble_rate(a) * growth)
