"""The fluids that products compare: dark matter, baryons, and matter, which is both weighted by density."""

from __future__ import annotations

FLUIDS = ("dark", "baryon", "matter")
FLUID_NAMES = {"dark": "dark matter", "baryon": "baryons", "matter": "matter"}  # for people


def contrasts(universe, dark, baryon):
    """Return the contrast of each fluid, or its slope, from those of dark matter and baryons.

    Parameters
    ----------
    universe : Universe
        Its densities are the weights in matter; without dark matter, matter is the baryons.
    dark, baryon : array, any shape
        Density contrasts or their derivatives [unitless].

    Returns
    -------
    dict of str to array, same shape
        By the names in `FLUIDS` [unitless].
    """
    dark_density, baryon_density = universe.gravity("dark", 1.0), universe.gravity("baryon", 1.0)
    share = dark_density / (dark_density + baryon_density)
    return {"dark": dark, "baryon": baryon, "matter": share * dark + (1.0 - share) * baryon}


def contrasts_at(history, redshift):
    """Return contrasts and slopes of each fluid at any redshifts of a run.

    Parameters
    ----------
    history : History
        The run.
    redshift : float or array, shape (redshift,)
        Redshifts [unitless].

    Returns
    -------
    contrast, slope : dict of str to array, shape (mode, redshift)
        Density contrasts and their derivatives by ln a [unitless].
    """
    return tuple(
        contrasts(history.universe, read("delta_dark", redshift), read("delta_baryon", redshift))
        for read in (history.at, history.slope_at)
    )


def exists(history, fluid):
    """Tell whether a run has this fluid; only dark matter can be missing."""
    return fluid != "dark" or history.has_dark_matter
