"""The fluids that products compare: dark matter, baryons, and matter, which is all that has mass, weighted by it."""

from __future__ import annotations

import numpy as np

FLUIDS = ("dark", "baryon", "matter")
FLUID_NAMES = {"dark": "dark matter", "baryon": "baryons", "matter": "matter"}  # for people


def contrasts(universe, dark, baryon, neutrino=0.0):
    """Return the contrast of each fluid, or its slope, from those of dark matter, baryons and neutrinos with mass.

    Parameters
    ----------
    universe : Universe
        Its rest masses are the weights in matter; without dark matter and neutrinos with mass, matter is the baryons.
    dark, baryon, neutrino : array, any shape
        Density contrasts or their derivatives; 0 for neutrinos that are smooth or have no mass [unitless].

    Returns
    -------
    dict of str to array, same shape
        By the names in `FLUIDS` [unitless].
    """
    mass = universe.masses
    total = sum(mass.values())
    matter = (mass["dark"] * dark + mass["baryon"] * baryon + mass["massive_neutrino"] * neutrino) / total
    return {"dark": dark, "baryon": baryon, "matter": matter}


def contrasts_of(history):
    """Return the contrast of each fluid at the redshifts of a run.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    dict of str to array, shape (mode, redshift)
        Signed, or of a mixture with independent parts the rms of all of them [unitless].
    """
    parts = [contrasts(part.universe, *(getattr(part, name) for name in _made_of(part))) for part in history.parts]
    return _in_quadrature(parts, parts)[0]


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
        Density contrasts, as `contrasts_of` has them, and their derivatives by ln a [unitless].
    """
    return _in_quadrature(*(
        [contrasts(part.universe, *(getattr(part, read)(name, redshift) for name in _made_of(part)))
         for part in history.parts]
        for read in ("at", "slope_at")
    ))  # fmt: skip


def contrast_courses(history):
    """Return contrasts and slopes of each fluid at every step of a run.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    contrast, slope : dict of str to array, shape (mode, step)
        Density contrasts, as `contrasts_of` has them, and their derivatives by ln a [unitless].
    """
    return _in_quadrature(*(
        [contrasts(part.universe, *(getattr(part.trace, name + suffix) for name in _made_of(part)))
         for part in history.parts]
        for suffix in ("", "_slope")
    ))  # fmt: skip


def _in_quadrature(values, slopes):
    """Add up independent parts: rms and its slope; a single part stays as it is, sign and all."""
    if len(values) == 1:
        return values[0], slopes[0]
    rms, slope = {}, {}
    for fluid in FLUIDS:
        value, change = (np.stack([part[fluid] for part in parts]) for parts in (values, slopes))
        rms[fluid] = np.sqrt((value**2).sum(axis=0))
        slope[fluid] = (value * change).sum(axis=0) / np.where(rms[fluid] > 0.0, rms[fluid], 1.0)
    return rms, slope


def _made_of(part):
    """Return the names of the contrasts that `contrasts` takes of a run."""
    return ("delta_dark", "delta_baryon", *(("delta_neutrino",) if part.has_massive_neutrinos else ()))


def exists(history, fluid):
    """Tell whether a run has this fluid; only dark matter can be missing."""
    return fluid != "dark" or history.has_dark_matter
