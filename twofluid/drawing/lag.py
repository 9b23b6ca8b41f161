"""Pictures of the lag: the ratio against scale, and the redshift of catching up against scale."""

from __future__ import annotations

import numpy as np

from twofluid.drawing.axes import by_redshift, logarithmic_abscissa, with_room
from twofluid.drawing.style import (
    REDSHIFT_TICKS,
    axes_or_new,
    axis_label,
    draw_curves,
    journal_style,
    label_curves,
    page,
    redshift_axis,
)

RATIO_VIEW = (-1.0, 2.0)  # ratios beyond are cut off: dark matter passing through zero makes them infinite


def draw_ratio(table, axes=None):
    """Draw the ratio of the amplitudes against wavenumber, one curve per redshift.

    Parameters
    ----------
    table : astropy.table.Table
        A lag table.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved.
    """
    with journal_style():
        axes = axes_or_new(axes)
        curves = by_redshift(table, "wavenumber", "ratio")
        logarithmic_abscissa(axes, "wavenumber", table["wavenumber"])
        axes.axhline(1, color="0.75", linewidth=0.6, zorder=0)
        draw_curves(axes, curves)
        drawn = np.ma.concatenate([[0.0, 1.0], np.ma.asarray(table["ratio"])]).compressed()
        axes.set_ylim(*with_room(*np.clip([drawn.min(), drawn.max()], *RATIO_VIEW)))
        axes.set_ylabel(axis_label("ratio"))
        label_curves(axes)
    return axes


def draw_catchup(table, axes=None):
    """Draw the redshift of catching up against wavenumber, one curve per fraction.

    A fraction that the mode has fallen below again by today, one never reached, and one the mode has been at
    since the start of the run leave a gap.

    Parameters
    ----------
    table : astropy.table.Table
        A catch-up table.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved. Heights are redshifts, spaced as the logarithm of 1 + z.
    """
    with journal_style():
        axes = axes_or_new(axes)
        curves = [(f"{100 * fraction:g} %", *_caught_up(table, name, fraction))
                  for name, fraction in table.meta["fractions"].items()]
        logarithmic_abscissa(axes, "wavenumber", table["wavenumber"])
        _redshift_axis(axes, np.ma.concatenate([redshift for *_, redshift in curves]).compressed())
        draw_curves(axes, curves)
        label_curves(axes)
    return axes


def lag_figure(tables):
    """Return the figure of the lag: ratio and redshift of catching up, side by side.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "lag" and "catchup".

    Returns
    -------
    matplotlib.figure.Figure or None
        A figure two columns wide; None if there is no dark matter to lag behind.
    """
    if np.all(np.ma.getmaskarray(np.ma.asarray(tables["lag"]["ratio"]))):
        return None
    with journal_style():
        figure, (left, right) = page()
        draw_ratio(tables["lag"], left)
        draw_catchup(tables["catchup"], right)
    return figure


def _sorted(table, name):
    """Return wavenumber and the named column, by rising wavenumber."""
    order = np.argsort(table["wavenumber"])
    return np.asarray(table["wavenumber"])[order], np.ma.asarray(table[name])[order]


def _caught_up(table, name, fraction):
    """Return wavenumber and redshift of catching up; masked where infinite or no longer true today."""
    wavenumber, redshift = _sorted(table, name)
    kept = np.ma.filled(_sorted(table, "ratio_today")[1] >= fraction, False)
    return wavenumber, np.ma.masked_where(~kept, np.ma.masked_invalid(redshift))


def _redshift_axis(axes, redshifts):
    """Ticks at round redshifts on an axis spaced as ln(1 + z); the span of the data and some room."""
    drawn = redshifts if redshifts.size else np.array([0, REDSHIFT_TICKS[-1]])
    low, high = with_room(np.log1p(drawn.min()), np.log1p(drawn.max()))
    redshift_axis(axes, "y", (np.expm1(max(low, 0)), np.expm1(high)), "redshift of catching up")
