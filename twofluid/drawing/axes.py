"""Axes that several figures share."""

from __future__ import annotations

import numpy as np

from twofluid.drawing.style import BARYONS, DARK_MATTER, PHOTONS, axis_label

ROOM = 0.05  # of the span of an axis left free beyond the data at either end
MOST_DECADES = 6  # of a logarithmic ordinate below its top; oscillations passing zero reach down for ever
HEADROOM = 2.5  # factor left free above a line on a logarithmic ordinate, for its words
FLUID_COLOURS = {"dark": DARK_MATTER, "matter": PHOTONS, "baryon": BARYONS}  # matter lies between the two


def logarithmic_abscissa(axes, name, values):
    """Span a logarithmic abscissa from the least to the greatest value.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Where to.
    name : str
        Entry of the nomenclature, for the label.
    values : array, shape (point,)
        Positive values.
    """
    low, high = np.min(values), np.max(values)
    axes.set_xscale("log")
    # A single value stands in the middle of two decades.
    axes.set_xlim((low, high) if high > low else (low / 10, high * 10))
    axes.set_xlabel(axis_label(name))


def logarithmic_ordinate(axes, values, lines=()):
    """Span a logarithmic ordinate over what is drawn, at most six decades down.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Where to.
    values : masked array, shape (point,)
        Heights drawn; masked, not finite and not positive ones do not count.
    lines : sequence of float
        Heights that have to be in view.
    """
    values = np.ma.masked_less_equal(np.ma.masked_invalid(np.ma.asarray(values)), 0.0)
    drawn = np.append(values.compressed(), [HEADROOM * line for line in lines])
    drawn = drawn if len(drawn) else np.array([0.1, 1.0])
    top = np.log10(drawn.max())
    low, high = with_room(max(np.log10(drawn.min()), top - MOST_DECADES), top)
    axes.set_yscale("log")
    axes.set_ylim(10**low, 10**high)


def with_room(low, high):
    """Return the ends of a span with some room beyond both."""
    room = ROOM * (high - low) or ROOM
    return low - room, high + room


def by_redshift(table, scale, name):
    """Return one curve a redshift, in the order of the table, each by rising scale.

    Parameters
    ----------
    table : astropy.table.Table
        Rows of scale and redshift.
    scale, name : str
        Columns of abscissa and ordinate.

    Returns
    -------
    list of (str, array, masked array)
        Label, abscissa and ordinate, as `draw_curves` takes them.
    """
    curves = []
    for redshift in dict.fromkeys(np.asarray(table["redshift"]).tolist()):
        rows = table[np.asarray(table["redshift"]) == redshift]
        order = np.argsort(rows[scale])
        curves.append((f"$z$ = {redshift:g}", np.asarray(rows[scale])[order], np.ma.asarray(rows[name])[order]))
    return curves


def all_empty(column):
    """Tell whether a column holds no entry."""
    return bool(np.all(np.ma.getmaskarray(np.ma.asarray(column))))
