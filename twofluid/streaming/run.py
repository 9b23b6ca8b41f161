"""From a run to its streaming: a companion that makes the wind, and patches that feel it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..evolution import evolve
from ..history import History
from .patches import Patches, follow_patches
from .velocity import Wind, find_wind, wind_wavenumbers

FROM_REDSHIFT = 1000.0  # at which the wind sets in, if the caller says nothing
VELOCITIES = (0.0, 1.0, 2.0)  # in units of the rms, if the caller says nothing
NODES_PER_UNIT = 40  # of the rms velocity per unit of ln a: a cubic spline to 1e-6


@dataclass(frozen=True)
class Streaming:
    """The streaming of a run.

    Attributes
    ----------
    history : History
        The run.
    from_redshift : float
        Redshift at which the wind sets in [unitless].
    velocities : array, shape (velocity,)
        Streaming velocities in units of the rms [unitless].
    wind : Wind or None
        The streaming velocity at the redshifts of the run; None without dark matter.
    patches : Patches or None
        What it does to the modes of the run; None without dark matter.
    """

    history: History
    from_redshift: float
    velocities: np.ndarray
    wind: Wind | None
    patches: Patches | None


def stream(history: History, from_redshift: float = FROM_REDSHIFT, velocities=VELOCITIES) -> Streaming:
    """Work out how fast baryons stream through dark matter, and what that does to the modes of a run.

    Two companion runs, with the equations and the accuracy of the first, follow the wavenumbers that make the wind,
    whatever the first was asked for, and tell its modes at the redshift where the patches start.

    Parameters
    ----------
    history : History
        The run.
    from_redshift : float
        Redshift at which the wind sets in [unitless].
    velocities : sequence of float
        Streaming velocities in units of the rms, not negative [unitless].

    Returns
    -------
    Streaming

    Raises
    ------
    ValueError
        If the redshift is not above 0 or a velocity is negative.
    SolverFailure
        If a solution is no longer finite; names wavenumber and redshift.
    """
    if not from_redshift > 0.0:
        raise ValueError(f"from_redshift must be above 0, got {from_redshift!r}")
    speeds = np.asarray(velocities, dtype=float)
    if speeds.ndim != 1 or not len(speeds) or not np.all((speeds >= 0.0) & np.isfinite(speeds)):
        raise ValueError(f"velocities must be a list of one or more numbers, not negative, got {velocities!r}")
    if not history.has_dark_matter:
        return Streaming(history, from_redshift, speeds, None, None)
    def companion(wavenumbers, redshifts):
        return evolve(history.scenario, wavenumbers=wavenumbers, redshifts=redshifts, universe=history.universe)

    windy = companion(wind_wavenumbers(), history.redshift)
    own = companion(history.wavenumber, [from_redshift])
    patches = follow_patches(own, history.redshift, speeds, rms_velocity(windy, from_redshift))
    return Streaming(history, from_redshift, speeds, find_wind(windy, history.redshift), patches)


def rms_velocity(run: History, from_redshift: float):
    """Make the rms streaming velocity a function of the scale factor.

    Parameters
    ----------
    run : History
        A run of the wavenumbers of `wind_wavenumbers`.
    from_redshift : float
        Redshift at which it begins [unitless].

    Returns
    -------
    callable
        Scale factors up to today, any shape -> [c], same shape.
    """
    from scipy.interpolate import CubicSpline

    first = -np.log1p(from_redshift)
    log_a = np.linspace(first, 0.0, 2 + int(-NODES_PER_UNIT * first))
    wind = find_wind(run, np.expm1(-log_a))
    spline = CubicSpline(log_a, np.log(wind.rms))
    return lambda scale_factor: np.exp(spline(np.log(scale_factor)))
