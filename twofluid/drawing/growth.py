"""Pictures of growth: how it depends on scale, for matter and for each of its fluids."""

from __future__ import annotations

import numpy as np
from matplotlib.ticker import FixedLocator, NullLocator, StrMethodFormatter

from twofluid.drawing.axes import all_empty, by_redshift, logarithmic_abscissa, with_room
from twofluid.drawing.style import (
    LABEL_SIZE,
    axes_or_new,
    draw_curves,
    journal_style,
    label_curves,
    page,
)
from twofluid.quantities import QUANTITIES

VIEW = {  # what lies beyond is cut off: it belongs to contrasts passing through zero
    "suppression": (-0.5, 2.0),
    "rate_matter": (-1.0, 4.0),
    "rate_dark": (-1.0, 4.0),
    "rate_baryon": (0.3, 12.0),  # logarithmic: released baryons first grow eight times as fast as they will
}
WORDS = {
    "suppression": "growth over cold matter's",
    "rate_matter": "growth rate of matter",
    "rate_dark": "growth rate of dark matter",
    "rate_baryon": "growth rate of baryons",
}
POLE = 5.0  # change of sign with a jump beyond this, from one wavenumber to the next: the contrast passes zero
RATE_TICKS = (0.3, 0.5, 1, 2, 3, 5, 10)


def draw_suppression(table, axes=None):
    """Draw the growth of matter since the reference epoch, over that of a cold fluid, against wavenumber.

    Parameters
    ----------
    table : astropy.table.Table
        A growth table.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in, one curve a redshift; nothing is shown or saved.
    """
    return _draw(table, "suppression", axes)


def draw_growth_rate(table, fluid="matter", axes=None):
    """Draw the growth rate of a fluid against wavenumber.

    Parameters
    ----------
    table : astropy.table.Table
        A growth table.
    fluid : str
        "dark", "baryon" or "matter". With "dark" a dotted line tells the exponent p while baryons stay smooth.
        Between the first and the last wavenumber at which the contrast passes through zero nothing is drawn.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in, one curve a redshift; nothing is shown or saved.
    """
    axes = _draw(table, f"rate_{fluid}", axes)
    if fluid == "dark":
        exponent = table.meta["exponent_with_smooth_baryons"]
        axes.axhline(exponent, color="0.5", linewidth=0.8, linestyle=(0, (1, 2)), zorder=0)
        axes.annotate(
            "$p$", xy=(0.03, exponent), xycoords=("axes fraction", "data"), xytext=(0, 1.5),
            textcoords="offset points", color="0.4", fontsize=LABEL_SIZE, va="bottom",
        )  # fmt: skip
    return axes


def growth_figure(tables):
    """Return the figure of growth: suppression of matter, and growth rates of matter and its fluids.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The table of the product, under "growth".

    Returns
    -------
    matplotlib.figure.Figure
        A figure two columns wide; without dark matter it has one row, suppression and growth rate.
    """
    table = tables["growth"]
    rows = 1 if all_empty(table["rate_dark"]) else 2
    with journal_style():
        figure, panels = page(rows)
        draw_suppression(table, panels[0])
        for axes, fluid in zip(panels[1:], ("matter", "dark", "baryon"), strict=False):
            draw_growth_rate(table, fluid, axes)
    return figure


def _draw(table, name, axes):
    with journal_style():
        axes = axes_or_new(axes)
        logarithmic_abscissa(axes, "wavenumber", table["wavenumber"])
        axes.axhline(1, color="0.75", linewidth=0.6, zorder=0)
        curves = [(label, k, _between_poles(y)) for label, k, y in by_redshift(table, "wavenumber", name)]
        draw_curves(axes, curves)
        drawn = np.append(np.ma.concatenate([height for *_, height in curves]).compressed(), 1.0)
        low, high = np.clip([drawn.min(), drawn.max()], *VIEW[name])
        if name == "rate_baryon":
            axes.set_yscale("log")
            axes.set_ylim(*np.exp(with_room(*np.log([low, high]))))
            axes.yaxis.set_major_locator(FixedLocator(RATE_TICKS))
            axes.yaxis.set_minor_locator(NullLocator())
            axes.yaxis.set_major_formatter(StrMethodFormatter("{x:g}"))
        else:
            axes.set_ylim(*with_room(low, high))
        axes.set_ylabel(f"{WORDS[name]} ${QUANTITIES[name].symbol}$")
        label_curves(axes)
    return axes


def _between_poles(height):
    """Mask what lies between the first and the last pole of a curve."""
    values = np.ma.filled(height, np.nan)
    change = np.abs(np.diff(values))
    poles = np.flatnonzero((values[1:] * values[:-1] < 0.0) & (change > POLE))
    hidden = np.zeros(len(values), dtype=bool)
    if len(poles):
        hidden[poles[0] : poles[-1] + 2] = True
    return np.ma.masked_where(hidden, height)
