"""How a mode starts: the adiabatic growing solution outside the horizon, deep in the radiation era.

References
----------
Ma, C.-P. & Bertschinger, E. 1995, ApJ 455, 7, eq. 96 (number from memory) with C = -1/2: unit
curvature, densities growing positive.
"""

import numpy as np

from ..universe import Universe

START_PHASE = 0.01  # k tau at the start: the terms left out are smaller by (k tau)^2 / 30
START_MATTER = 4e-6  # or matter over radiation there, if that is earlier: the series has no matter in it


def start_time(universe: Universe, wavenumber: np.ndarray) -> np.ndarray:
    """Conformal time at which each mode starts.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].

    Returns
    -------
    array, shape (mode,)
        Conformal time [Mpc].
    """
    early_matter = START_MATTER * universe.equality
    return np.minimum(START_PHASE / wavenumber, universe.conformal_time(early_matter))


def adiabatic(universe: Universe, wavenumber: np.ndarray, time: np.ndarray) -> dict[str, np.ndarray]:
    """Leading order of the adiabatic mode; unknowns that do not appear start at zero.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    time : array, shape (mode,)
        Conformal time of the start [Mpc].

    Returns
    -------
    dict of str to array, shape (mode,)
        Unknowns of the kinetic closure [unitless].
    """
    now = universe.conditions(time)
    x = wavenumber * time
    fraction = now.gravity_neutrino / (now.gravity_neutrino + now.gravity_photon)  # R_nu
    theta = x**3 / 36.0
    radiation = x**2 / 3.0
    return {
        "metric_rate": -x,
        "curvature": -1.0 + (5.0 + 4.0 * fraction) / (12.0 * (15.0 + 4.0 * fraction)) * x**2,
        "delta_photon": radiation,
        "delta_neutrino": radiation,
        "delta_baryon": 0.75 * radiation,
        "delta_dark": 0.75 * radiation,
        "delta_gas_temperature": 0.25 * radiation,
        "theta_baryon": theta,
        "theta_neutrino": theta * (23.0 + 4.0 * fraction) / (15.0 + 4.0 * fraction),
        "neutrino_2": -4.0 / 3.0 * x**2 / (15.0 + 4.0 * fraction),
    }
