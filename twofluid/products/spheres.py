"""Rms contrast in spheres of any radius or mass: dark matter, baryons, matter."""

from __future__ import annotations

import numpy as np

from twofluid.products.matter import FLUIDS, contrasts_at, contrasts_of, exists
from twofluid.products.sphere_filter import SphereFilter
from twofluid.products.table import column, make_table
from twofluid.universe.constants import SOLAR_MASS_LENGTH

COVERAGE = 0.1  # share of an rms that may lie beyond the wavenumbers of the run; with more it is left empty
NOT_COVERED = (
    f"empty where wavenumbers beyond those of the run may add more than {100 * COVERAGE:g} per cent; "
    "give a wider range of wavenumbers"
)


def spheres_table(history, radii=None, masses=None):
    """Return the rms contrast in spheres at every asked redshift.

    Parameters
    ----------
    history : History
        The run; all of its wavenumbers are used.
    radii : sequence of float, optional
        Comoving radii [Mpc].
    masses : sequence of float, optional
        Mean masses of matter in further spheres [solMass]. With neither, one sphere of 8 Mpc/h.

    Returns
    -------
    astropy.table.Table
        One row per sphere and redshift, redshift (in the order asked) running fastest: sphere_radius [Mpc],
        sphere_mass [solMass], redshift [unitless], and for dark, baryon and matter sigma_FLUID and
        sigma_FLUID_error [unitless]. Dark matter is empty without dark matter, every fluid where the run's
        wavenumbers do not cover the sphere; the header entry `not_covered` says so.
    """
    radius = sphere_radii(history.universe, radii, masses, default=True)
    contrast = contrasts_of(history)
    epochs = len(history.redshift)
    columns = [
        column("sphere_radius", np.repeat(radius, epochs)),
        column("sphere_mass", np.repeat(sphere_mass(history.universe, radius), epochs)),
        column("redshift", np.tile(history.redshift, len(radius))),
    ]
    try:
        spheres, reason = SphereFilter(history.wavenumber, history.scenario.primordial, radius), NOT_COVERED
    except ValueError as problem:
        spheres, reason = None, str(problem)
    any_empty = False
    for fluid in FLUIDS:
        value, error, empty = _covered(spheres, contrast[fluid], len(radius))
        any_empty |= bool(empty.any())
        empty = empty.ravel() | (not exists(history, fluid))
        columns.append(column(f"sigma_{fluid}", value.ravel(), masked=empty))
        columns.append(column(f"sigma_{fluid}_error", error.ravel(), masked=empty))
    return make_table(history, columns, **({"not_covered": reason} if any_empty else {}))


def sigma_8(history):
    """Return the rms contrast of matter today in spheres of 8 Mpc/h.

    Parameters
    ----------
    history : History
        The run; its wavenumbers have to reach well beyond 1/8 h/Mpc both ways.

    Returns
    -------
    value, error : float
        Rms contrast and what sampling, quadrature and ends of the run leave uncertain in it [unitless].

    Raises
    ------
    ValueError
        If the run's wavenumbers do not cover the sphere.
    """
    radius = sphere_radii(history.universe, default=True)
    today, _ = contrasts_at(history, 0.0)
    spheres = SphereFilter(history.wavenumber, history.scenario.primordial, radius)
    value, error, empty = _covered(spheres, today["matter"], 1)
    if empty.any():
        raise ValueError(f"a sphere of {radius[0]:.4g} Mpc is {NOT_COVERED}")
    return float(value[0, 0]), float(error[0, 0])


def sphere_radii(universe, radii=None, masses=None, *, default=False):
    """Return the comoving radii of spheres given by radius, then those given by mass.

    Parameters
    ----------
    universe : Universe
        The smooth universe.
    radii : sequence of float, optional
        Comoving radii [Mpc].
    masses : sequence of float, optional
        Mean masses of matter inside [solMass].
    default : bool
        Whether to return 8 Mpc/h where neither is given.

    Returns
    -------
    array, shape (radius,)
        Comoving radii [Mpc].

    Raises
    ------
    ValueError
        If a radius or mass is not positive and finite.
    """
    given = np.array([*(radii or ()), *(masses or ())], dtype=float)
    if not np.all((given > 0.0) & np.isfinite(given)):
        raise ValueError(f"radii and masses of spheres must be positive and finite, got {given}")
    if not len(given) and default:
        return np.array([8.0 / (universe.cosmology.hubble_constant / 100.0)])
    count = len(radii or ())
    return np.concatenate([given[:count], np.cbrt(given[count:] / sphere_mass(universe, 1.0))])


def sphere_mass(universe, radius):
    """Return the mean mass of matter inside a comoving radius [Mpc], shape as `radius` [solMass].

    (4 pi/3) rho_m R^3 = g_m R^3/(6 G) with g_m = 8 pi G rho_m.
    """
    matter = universe.gravity("dark", 1.0) + universe.gravity("baryon", 1.0)
    return matter * np.asarray(radius, dtype=float) ** 3 / 6.0 / SOLAR_MASS_LENGTH


def _covered(spheres, contrast, radii):
    """Return rms and error, and which of them are to be left empty, each of shape (radius, redshift)."""
    if spheres is None:
        nothing = np.full((radii, contrast.shape[1]), np.nan)
        return nothing, nothing, np.isnan(nothing)
    found = spheres.rms(contrast)
    # Not "greater": what is no number is not covered either.
    return found.value, found.error, ~(found.beyond <= COVERAGE * found.value)
