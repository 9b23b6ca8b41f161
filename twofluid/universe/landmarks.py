"""Landmark epochs and scales of a universe."""

from dataclasses import dataclass

import numpy as np

from .errors import UniverseError
from .quadrature import RunningIntegral, bisect

_DEPTH_PANEL = 0.05  # of the optical-depth integrals, in ln(1 + z): the ionization table's cubics average out
_LATE_PANEL = 0.02  # the same where reionization may be sharp
_EARLIEST_LOG = np.log(1.0e7)  # ln(1 + z) where the search for last scattering ends


@dataclass(frozen=True)
class Landmarks:
    """Landmark epochs and scales; reionization, and heat and electrons from a table, are left out of all but the last.

    Parameters
    ----------
    equality_redshift : float
        Baryons and dark matter equal photons and neutrinos, all neutrinos taken as massless and none as matter, as is
        the custom [unitless].
    equality_wavenumber : float
        a H there [1/Mpc].
    last_scattering_redshift : float
        Optical depth from today is one [unitless].
    last_scattering_sound_horizon : float
        Comoving [Mpc].
    last_scattering_age : float
        [Myr]
    drag_redshift : float
        Drag depth from today, the optical depth weighted by 1/R, is one [unitless].
    drag_sound_horizon : float
        Comoving [Mpc].
    diffusion_wavenumber : float
        k_D at last scattering; waves are damped by exp[-(k/k_D)^2] [1/Mpc].
    thermal_decoupling_redshift : float
        Compton heating rate equals the expansion rate [unitless].
    age_today : float
        [Gyr]
    conformal_age : float
        Conformal time today [Mpc].
    reionization_optical_depth : float or None
        Photon depth of the electrons that a table or reionization adds, up to today; None without either [unitless].
    """

    equality_redshift: float
    equality_wavenumber: float
    last_scattering_redshift: float
    last_scattering_sound_horizon: float
    last_scattering_age: float
    drag_redshift: float
    drag_sound_horizon: float
    diffusion_wavenumber: float
    thermal_decoupling_redshift: float
    age_today: float
    conformal_age: float
    reionization_optical_depth: float | None = None

def find_landmarks(universe):
    """Landmarks of a universe.

    Raises
    ------
    UniverseError
        If one of them does not exist; the message names it.
    """
    equality = universe.equality
    last_scattering = _unit_depth(universe, universe.scattering_rate, "last scattering")
    drag = _unit_depth(universe, universe.drag_rate, "drag epoch")
    return Landmarks(
        equality_redshift=1.0 / equality - 1.0,
        equality_wavenumber=float(universe.conformal_hubble_rate(equality)),
        last_scattering_redshift=1.0 / last_scattering - 1.0,
        last_scattering_sound_horizon=float(universe.sound_horizon(last_scattering)),
        last_scattering_age=float(universe.age(last_scattering)),
        drag_redshift=1.0 / drag - 1.0,
        drag_sound_horizon=float(universe.sound_horizon(drag)),
        diffusion_wavenumber=float(universe.diffusion_wavenumber(last_scattering)),
        thermal_decoupling_redshift=1.0 / _thermal_decoupling(universe) - 1.0,
        age_today=float(universe.age(1.0)) / 1000.0,
        conformal_age=float(universe.conformal_time(1.0)),
    )


def _unit_depth(universe, rate, name):
    """Scale factor where the depth from today, the integral of `rate` over conformal time, is one."""

    def integrand(log_redshift):
        a = np.exp(-log_redshift)
        return rate(a) / universe.conformal_hubble_rate(a)

    depth = RunningIntegral(integrand, 0.0, _EARLIEST_LOG, panels=int(np.ceil(_EARLIEST_LOG / _DEPTH_PANEL)))
    if depth.total <= 1.0:
        raise UniverseError(f"this universe has no {name}: its depth from today stays below one")
    return float(np.exp(-depth.reaches(1.0)))


def reionization_depth(universe, unheated):
    """Photon depth of the electrons that one universe has and the other has not [unitless]."""
    start = -np.log(universe.heated_from)

    def integrand(log_redshift):
        a = np.exp(-log_redshift)
        return (universe.scattering_rate(a) - unheated.scattering_rate(a)) / universe.conformal_hubble_rate(a)

    return float(RunningIntegral(integrand, 0.0, start, panels=int(np.ceil(start / _LATE_PANEL))).total)


def _thermal_decoupling(universe):
    def excess(log_a):
        a = np.exp(log_a)
        return universe.conformal_hubble_rate(a) - universe.compton_rate(a)

    if excess(0.0) <= 0.0:
        raise UniverseError("this universe has no thermal decoupling: the photons still heat its gas today")
    return float(np.exp(bisect(excess, -_EARLIEST_LOG, 0.0)))
