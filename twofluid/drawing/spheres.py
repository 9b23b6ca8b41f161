"""Pictures of spheres: the rms contrast of matter, and that of baryons over dark matter, against radius."""

from __future__ import annotations

import numpy as np

from twofluid.drawing.axes import all_empty, by_redshift, logarithmic_abscissa, logarithmic_ordinate, with_room
from twofluid.drawing.style import (
    COLUMN_WIDTH,
    axes_or_new,
    axis_label,
    draw_curves,
    journal_style,
    label_curves,
    page,
)
from twofluid.quantities import QUANTITIES


def draw_spheres(table, axes=None):
    """Draw the rms contrast of matter in spheres against their radius, their mass on the upper edge.

    Parameters
    ----------
    table : astropy.table.Table
        A spheres table.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in, one curve a redshift; nothing is shown or saved.
    """
    with journal_style():
        axes = _radius_axes(table, axes)
        curves = by_redshift(table, "sphere_radius", "sigma_matter")
        draw_curves(axes, curves)
        logarithmic_ordinate(axes, np.ma.concatenate([height for *_, height in curves]))
        axes.set_ylabel(axis_label("sigma_matter", "rms contrast of matter"))
        label_curves(axes)
    return axes


def draw_baryon_share(table, axes=None):
    """Draw the rms contrast of baryons over that of dark matter in spheres against their radius.

    Parameters
    ----------
    table : astropy.table.Table
        A spheres table.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in, one curve a redshift; nothing is shown or saved.
    """
    with journal_style():
        axes = _radius_axes(table, axes)
        axes.axhline(1, color="0.75", linewidth=0.6, zorder=0)
        baryon, dark = (by_redshift(table, "sphere_radius", f"sigma_{fluid}") for fluid in ("baryon", "dark"))
        curves = [(label, x, b / c) for (label, x, b), (_, _, c) in zip(baryon, dark, strict=True)]
        draw_curves(axes, curves)
        drawn = np.append(np.ma.concatenate([height for *_, height in curves]).compressed(), [0.0, 1.0])
        axes.set_ylim(*with_room(drawn.min(), drawn.max()))
        symbols = f"{QUANTITIES['sigma_baryon'].symbol}/{QUANTITIES['sigma_dark'].symbol}"
        axes.set_ylabel(f"baryons over dark matter ${symbols}$")
        label_curves(axes)
    return axes


def spheres_figure(tables):
    """Return the figure of spheres.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The table of the product, under "spheres".

    Returns
    -------
    matplotlib.figure.Figure or None
        Two panels; one if there is no dark matter to compare with; None if the run covers no sphere.
    """
    table = tables["spheres"]
    if all_empty(table["sigma_matter"]):
        return None
    alone = all_empty(table["sigma_dark"])
    with journal_style():
        figure, panels = page(columns=1, width=COLUMN_WIDTH) if alone else page()
        draw_spheres(table, panels[0])
        if not alone:
            draw_baryon_share(table, panels[1])
    return figure


def _radius_axes(table, axes):
    axes = axes_or_new(axes)
    logarithmic_abscissa(axes, "sphere_radius", table["sphere_radius"])
    unit_mass = float(table["sphere_mass"][0] / table["sphere_radius"][0] ** 3)  # of a sphere of 1 Mpc
    axes.tick_params(which="both", top=False)
    top = axes.secondary_xaxis("top", functions=(lambda r: unit_mass * r**3, lambda m: np.cbrt(m / unit_mass)))
    top.set_xlabel(axis_label("sphere_mass"))
    return axes
