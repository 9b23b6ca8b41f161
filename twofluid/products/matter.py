"""The fluids that products compare: dark matter, baryons, and matter, which is all that has mass, weighted by it."""

from __future__ import annotations

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
        Density contrasts [unitless].
    """
    return contrasts(history.universe, *_parts(history, lambda name: getattr(history, name)))


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
        contrasts(history.universe, *_parts(history, lambda name, read=read: read(name, redshift)))
        for read in (history.at, history.slope_at)
    )


def contrast_courses(history):
    """Return contrasts and slopes of each fluid at every step of a run.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    contrast, slope : dict of str to array, shape (mode, step)
        Density contrasts and their derivatives by ln a [unitless].
    """
    return tuple(
        contrasts(history.universe, *_parts(history, lambda name, end=end: getattr(history.trace, name + end)))
        for end in ("", "_slope")
    )


def _parts(history, values):
    """Return what `contrasts` takes of a run, given the function that finds each."""
    names = ("delta_dark", "delta_baryon", *(("delta_neutrino",) if history.has_massive_neutrinos else ()))
    return [values(name) for name in names]


def exists(history, fluid):
    """Tell whether a run has this fluid; only dark matter can be missing."""
    return fluid != "dark" or history.has_dark_matter
