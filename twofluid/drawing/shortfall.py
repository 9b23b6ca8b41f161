"""Pictures of the shortfall: contrast at decoupling against the one needed, and what came of it."""

from __future__ import annotations

import numpy as np

from twofluid.drawing.axes import FLUID_COLOURS, all_empty, logarithmic_abscissa, logarithmic_ordinate
from twofluid.drawing.style import (
    LABEL_SIZE,
    axes_or_new,
    draw_curves,
    journal_style,
    label_curves,
    page,
)
from twofluid.products.matter import FLUID_NAMES
from twofluid.quantities import QUANTITIES

THRESHOLD = {"color": "0.35", "linewidth": 0.8, "linestyle": (0, (1, 2)), "zorder": 0}


def draw_at_decoupling(table, axes=None):
    """Draw the rms contrast at decoupling of each fluid against wavenumber, and the contrast needed.

    Parameters
    ----------
    table : astropy.table.Table
        A shortfall table; its spheres are left out.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved.
    """
    needed = float(np.ma.asarray(table["rms_needed"]).compressed()[0])
    words = f"needed for unity by $z$ = {table.meta['target_redshift']:g}"
    label = f"rms contrast at decoupling ${QUANTITIES['rms_at_decoupling'].symbol}$"
    return _draw(table, "rms_at_decoupling", {words: needed}, label, axes)


def draw_at_target(table, axes=None):
    """Draw the rms contrast at the target redshift of each fluid against wavenumber, and the thresholds.

    Parameters
    ----------
    table : astropy.table.Table
        A shortfall table; its spheres are left out.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved.
    """
    label = f"rms contrast at $z$ = {table.meta['target_redshift']:g}, ${QUANTITIES['rms_at_target'].symbol}$"
    return _draw(table, "rms_at_target", {"order unity": 1.0}, label, axes)


def shortfall_figure(tables):
    """Return the figure of the shortfall: what there was against what was needed, and what came of it.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "shortfall" and "contrast".

    Returns
    -------
    matplotlib.figure.Figure
        A figure two columns wide.
    """
    table = tables["shortfall"]
    with journal_style():
        figure, (left, right) = page()
        draw_at_decoupling(table, left)
        draw_at_target(table, right)
    return figure


def _draw(table, name, thresholds, label, axes):
    with journal_style():
        axes = axes_or_new(axes)
        waves = table[~np.ma.getmaskarray(np.ma.asarray(table["wavenumber"]))]
        waves = waves[np.argsort(waves["wavenumber"], kind="stable")]
        parts = {fluid: waves[np.asarray(waves["fluid"]) == fluid] for fluid in FLUID_COLOURS}
        # Without dark matter, matter and baryons are one.
        shown = ["baryon"] if all_empty(parts["dark"][name]) else list(FLUID_COLOURS)
        curves = [
            (FLUID_NAMES[fluid], np.asarray(parts[fluid]["wavenumber"]), np.ma.asarray(parts[fluid][name]))
            for fluid in shown
        ]
        logarithmic_abscissa(axes, "wavenumber", waves["wavenumber"])
        logarithmic_ordinate(axes, np.ma.concatenate([height for *_, height in curves]), thresholds.values())
        draw_curves(axes, curves, colours=[FLUID_COLOURS[fluid] for fluid in shown])
        for words, height in thresholds.items():
            axes.axhline(height, **THRESHOLD)
            axes.annotate(
                words, xy=(0.03, height), xycoords=("axes fraction", "data"), xytext=(0, 1.5),
                textcoords="offset points", color="0.25", fontsize=LABEL_SIZE, va="bottom",
            )  # fmt: skip
        axes.set_ylabel(label)
        label_curves(axes)
    return axes
