"""Pictures of the streaming: the spectrum of its velocity, and the power that is left where gas streams."""

from __future__ import annotations

import numpy as np

from twofluid.drawing.axes import all_empty, by_redshift, logarithmic_abscissa, logarithmic_ordinate, with_room
from twofluid.drawing.style import (
    axes_or_new,
    axis_label,
    draw_curves,
    journal_style,
    label_curves,
    page,
)
from twofluid.products.matter import FLUID_NAMES
from twofluid.quantities import QUANTITIES

ALL_PATCHES = "all patches"  # the average over velocities


def draw_velocity_spectrum(table, axes=None):
    """Draw the rms streaming velocity per unit ln k against wavenumber.

    Parameters
    ----------
    table : astropy.table.Table
        A table of the velocity spectrum.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in, one curve a redshift; nothing is shown or saved.
    """
    with journal_style():
        axes = axes_or_new(axes)
        logarithmic_abscissa(axes, "wavenumber", table["wavenumber"])
        curves = by_redshift(table, "wavenumber", "velocity_spectrum")
        draw_curves(axes, curves)
        logarithmic_ordinate(axes, np.ma.concatenate([height for *_, height in curves]))
        axes.set_ylabel(axis_label("velocity_spectrum", "rms velocity per ln $k$"))
        label_curves(axes)
    return axes


def draw_streaming_power(table, fluid="matter", redshift=None, axes=None):
    """Draw the power of a fluid where gas streams over that where it does not, against wavenumber.

    Parameters
    ----------
    table : astropy.table.Table
        A streaming table.
    fluid : str
        "dark", "baryon" or "matter".
    redshift : float, optional
        One of the table's: one curve a velocity. The average over all patches by default, one curve a redshift.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved.
    """
    name = f"suppression_{fluid}"
    where = "in all patches" if redshift is None else f"at $z$ = {redshift:g}"
    with journal_style():
        axes = axes_or_new(axes)
        logarithmic_abscissa(axes, "wavenumber", table["wavenumber"])
        axes.axhline(1, color="0.75", linewidth=0.6, zorder=0)
        if redshift is None:
            curves = by_redshift(table[_averaged(table)], "wavenumber", name)
        else:
            curves = _by_velocity(table[np.asarray(table["redshift"]) == redshift], name)
        draw_curves(axes, curves)
        drawn = np.append(np.ma.concatenate([height for *_, height in curves]).compressed(), 1.0)
        axes.set_ylim(*with_room(drawn.min(), drawn.max()))
        axes.set_ylabel(f"power of {FLUID_NAMES[fluid]} ${QUANTITIES[name].symbol}$")
        axes.set_title(where)
        label_curves(axes, margin=True)  # the minimum is what is looked for
    return axes


def streaming_figure(tables):
    """Return the figure of the streaming: velocity spectrum, and power by redshift and by velocity.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "streaming-spectrum" and "streaming".

    Returns
    -------
    matplotlib.figure.Figure or None
        A figure two columns wide, the lower row at the last redshift of the run; None without dark matter.
    """
    spectrum, streaming = tables["streaming-spectrum"], tables["streaming"]
    if all_empty(spectrum["velocity_spectrum"]):
        return None
    rows = 1 if all_empty(streaming["suppression_matter"]) else 2
    with journal_style():
        figure, panels = page(rows, columns=rows)
        draw_velocity_spectrum(spectrum, panels[0])
        if rows == 2:
            last = float(np.min(streaming["redshift"]))
            draw_streaming_power(streaming, axes=panels[1])
            for axes, fluid in zip(panels[2:], ("dark", "baryon"), strict=True):
                draw_streaming_power(streaming, fluid, last, axes)
    return figure


def _averaged(table):
    """Tell which rows are averages over all patches."""
    return np.ma.getmaskarray(np.ma.asarray(table["velocity"]))


def _by_velocity(table, name):
    """Return one curve a velocity, in the order of the table, the average last."""
    averaged = _averaged(table)
    symbol = QUANTITIES["velocity"].symbol
    parts = [
        (f"${symbol}$ = {velocity:g}", table[~averaged & (np.ma.asarray(table["velocity"]).filled(np.nan) == velocity)])
        for velocity in dict.fromkeys(np.ma.asarray(table["velocity"]).compressed().tolist())
        if velocity > 0.0
    ]
    parts.append((ALL_PATCHES, table[averaged]))
    curves = []
    for label, rows in parts:
        order = np.argsort(rows["wavenumber"])
        curves.append((label, np.asarray(rows["wavenumber"])[order], np.ma.asarray(rows[name])[order]))
    return curves
