"""How a mode starts outside the horizon, deep in the radiation era: the adiabatic growing solution, or a mixture.

References
----------
Ma, C.-P. & Bertschinger, E. 1995, ApJ 455, 7, eq. 96 (number from memory) with C = -1/2: unit
curvature, densities growing positive.
"""

from collections.abc import Mapping

import numpy as np

from ..universe import Universe
from .modes import isocurvature, neutrino_gravity

ADIABATIC = "adiabatic"  # the one mode that has curvature at the beginning

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
    neutrino = neutrino_gravity(universe, now)
    fraction = neutrino / (neutrino + now.gravity_photon)  # R_nu
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


def mixed(
    universe: Universe, wavenumber: np.ndarray, time: np.ndarray, weights: Mapping[str, np.ndarray] | None = None
) -> dict[str, np.ndarray]:
    """Add up initial modes; unknowns that do not appear start at zero.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    time : array, shape (mode,)
        Conformal time of the start [Mpc].
    weights : mapping of str to array, shape (mode,), optional
        How much of each initial mode, "adiabatic" or one of `twofluid.fluids.modes.BEGINNINGS`, every wavenumber
        has [unitless]; the adiabatic mode alone if left out.

    Returns
    -------
    dict of str to array, shape (mode,)
        Unknowns of the kinetic closure [unitless].
    """
    if weights is None:
        return adiabatic(universe, wavenumber, time)
    state: dict[str, np.ndarray] = {}
    for mode, weight in weights.items():
        if mode == ADIABATIC:
            alone = adiabatic(universe, wavenumber, time)
        else:
            alone = isocurvature(mode, universe, wavenumber, time)
        for name, values in alone.items():
            state[name] = state.get(name, 0.0) + weight * values
    return state
