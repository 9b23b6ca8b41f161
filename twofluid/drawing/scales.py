"""Pictures of the scales: the map of verdicts with the scales as curves, and the masses against redshift."""

from __future__ import annotations

import numpy as np
from matplotlib.colors import BoundaryNorm, ListedColormap
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke

from twofluid.drawing.placing import Room
from twofluid.drawing.style import (
    BARYONS,
    DARK_MATTER,
    LABEL_SIZE,
    LEADER,
    PAGE_WIDTH,
    PHOTONS,
    axes_or_new,
    axis_label,
    draw_curves,
    journal_style,
    label_curves,
    redshift_axis,
)
from twofluid.products.verdict import VERDICTS

# In the order of VERDICTS; each has a lightness of its own, so that grey tells them apart.
TONES = ("#f6f5f2", "#86bfba", PHOTONS, DARK_MATTER, BARYONS, "#f2d9a6")
# What is written in each area: the first that finds room.
WORDS = (
    ("larger than\nthe horizon", "larger than\nthe\nhorizon"),
    ("oscillates with\nthe plasma", "oscillates\nwith the\nplasma", "oscillates"),
    ("damped",),
    ("held up\nby pressure", "held up"),
    ("falls in",),
    ("grows",),
)
DARK_TONES = (2, 3)  # that want white words
INK = "#11181e"  # of curves and words on light tones
HALO = withStroke(linewidth=2.0, foreground="white", alpha=0.85)
DASHES = {
    "horizon": "-",
    "Jeans": (0, (6, 1.5)),
    "filtering": (0, (2, 1.2)),
    "diffusion": (0, (6, 1.5, 1.2, 1.5)),
}  # unit: line width
LINE_ABOVE = 0.045  # from one line of words above the map to the next [fraction of the axes]
MAP_HEIGHT = 3.6  # of the figure [inch]
WIDTHS = (1.75, 1.0)  # of map and masses, relative
ROOM = 3.0  # factor left free beyond the masses
GUTTER = 0.03  # between the panels, over what their labels need [fraction of the figure]


def draw_map(verdict, scales, axes=None):
    """Draw the verdict on every wavenumber and redshift as areas, and the scales as curves over them.

    Parameters
    ----------
    verdict : astropy.table.Table
        A verdict table on the redshifts of the map.
    scales : astropy.table.Table
        A scales table on the same redshifts.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved. Time runs downward; white is where the run cannot tell.
    """
    with journal_style():
        axes = axes_or_new(axes)
        wavenumber, redshift, codes = _grid(verdict)
        edges = _edges(np.log(wavenumber)), _edges(np.log1p(redshift))
        axes.set_xscale("log")
        axes.set_xlim(*np.exp(edges[0][[0, -1]]))
        redshift_axis(axes, "y", np.expm1(edges[1][[0, -1]]))
        axes.set_xlabel(axis_label("wavenumber"))
        axes.pcolormesh(
            np.exp(edges[0]), np.expm1(edges[1]), codes.T, cmap=ListedColormap(TONES),
            norm=BoundaryNorm(np.arange(len(TONES) + 1) - 0.5, len(TONES)), rasterized=True,
        )  # fmt: skip
        axes.tick_params(which="both", color=INK)
        curves = _scale_curves(scales)
        for label, x, y in curves:
            axes.plot(x, y, color=INK, linewidth=1.0, linestyle=DASHES[label], label=label, path_effects=[HALO])
        room = Room(axes, edges, codes, [(x, y) for _, x, y in curves])
        _label_areas(axes, room, codes)
        _label_scales(axes, room, curves)
    return axes


def draw_masses(scales, told, axes=None):
    """Draw Jeans and filtering mass of the gas against redshift.

    Parameters
    ----------
    scales : astropy.table.Table
        A scales table on many redshifts, for the curves.
    told : astropy.table.Table
        A scales table on the redshifts asked of the run, for the masses read off its ratio.
    axes : matplotlib.axes.Axes, optional
        Where to draw; new axes, one column wide, by default.

    Returns
    -------
    matplotlib.axes.Axes
        The axes drawn in; nothing is shown or saved. Time runs to the right. What is measured stands as circles.
    """
    with journal_style():
        axes = axes_or_new(axes)
        gas = np.ma.getmaskarray(np.ma.asarray(scales["silk_wavenumber"]))
        gas_era = scales[gas]
        axes.set_yscale("log")
        redshift = np.asarray(gas_era["redshift"])
        redshift_axis(axes, "x", (redshift.max(), redshift.min()))
        axes.tick_params(axis="x", labelrotation=45)
        names = {
            "Jeans": "jeans_mass",
            "filtering, one growth": "filtering_mass",
            "filtering, two fluids": "filtering_mass_two_fluids",
        }
        curves = [(label, redshift, np.ma.asarray(gas_era[name])) for label, name in names.items()]
        draw_curves(axes, [curve for curve in curves if curve[2].count()])
        measured = np.ma.asarray(told["filtering_mass_measured"]).filled(np.nan)
        circles = axes.plot(
            told["redshift"], measured, linestyle="none", marker="o", color=INK, markerfacecolor="white", zorder=3,
        )  # fmt: skip
        axes.set_ylim(*_mass_limits(curves))
        axes.set_ylabel(axis_label("jeans_mass", "mass").replace(r"M_\mathrm{J}", "M"))
        if np.isfinite(measured).any():
            axes.legend(circles, ["measured"], loc="upper right", frameon=False, fontsize=LABEL_SIZE)
        label_curves(axes)
    return axes


def scales_figure(tables):
    """Return the figure of the scales: the map of verdicts, and the masses of the gas beside it.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product under "scales", and on the redshifts of the map "scales_map" and "verdict_map".

    Returns
    -------
    matplotlib.figure.Figure
        A figure two columns wide.
    """
    with journal_style():
        figure = Figure(figsize=(PAGE_WIDTH, MAP_HEIGHT), layout="constrained")
        figure.get_layout_engine().set(wspace=GUTTER)
        left, right = figure.subplots(1, 2, width_ratios=WIDTHS)
        draw_map(tables["verdict_map"], tables["scales_map"], left)
        draw_masses(tables["scales_map"], tables["scales"], right)
    return figure


def _grid(verdict):
    """Return wavenumber and redshift, both increasing, and the verdicts as masked numbers (mode, redshift)."""
    words = np.ma.asarray(verdict["verdict"])
    numbers = np.ma.masked_all(len(words), dtype=int)
    for number, name in enumerate(VERDICTS):
        numbers[np.ma.filled(words == name, False)] = number
    wavenumber, row = np.unique(np.asarray(verdict["wavenumber"]), return_inverse=True)
    redshift, column = np.unique(np.asarray(verdict["redshift"]), return_inverse=True)
    codes = np.ma.masked_all((len(wavenumber), len(redshift)), dtype=int)
    codes[row, column] = numbers
    return wavenumber, redshift, codes


def _edges(centres):
    """Return the edges of cells about increasing centres; the outermost centres are edges themselves."""
    if len(centres) == 1:
        return centres[0] + np.log([0.1, 10.0])  # a single mode stands in the middle of two decades
    return np.concatenate([centres[:1], 0.5 * (centres[1:] + centres[:-1]), centres[-1:]])


def _scale_curves(scales):
    """Return label, wavenumber and redshift of each curve; NaN where there is none."""
    redshift = np.asarray(scales["redshift"])
    plasma = ~np.ma.getmaskarray(np.ma.asarray(scales["silk_wavenumber"]))
    jeans = np.asarray(scales["jeans_wavenumber"])
    curves = [
        ("horizon", 1.0 / np.asarray(scales["hubble_radius"])),
        ("Jeans", np.where(plasma, jeans, np.nan)),
        ("Jeans", np.where(plasma, np.nan, jeans)),
        ("filtering", np.ma.asarray(scales["filtering_wavenumber_two_fluids"]).filled(np.nan)),
        ("diffusion", np.ma.asarray(scales["silk_wavenumber"]).filled(np.nan)),
    ]
    return [(label, wavenumber, redshift) for label, wavenumber in curves]


def _label_areas(axes, room, codes):
    """Write the verdict into each area; above the map, with a line to it, where the area is too small."""
    above = 0
    for code in np.unique(codes.compressed()):
        place, words = next(((p, w) for w in WORDS[code] if (p := room.inside(code, w))), (None, WORDS[code][0]))
        if place is not None:
            axes.text(
                *place, words, transform=axes.transAxes, ha="center", va="center", fontsize=LABEL_SIZE,
                color="white" if code in DARK_TONES else INK,
            )  # fmt: skip
        elif (middle := room.middle(code)) is not None:
            axes.annotate(
                words.replace("\n", " "), xy=middle, xycoords="axes fraction", fontsize=LABEL_SIZE, color=INK,
                xytext=(middle[0], 1.03 + above * LINE_ABOVE), textcoords="axes fraction", ha="center", va="bottom",
                arrowprops=LEADER | {"color": INK, "relpos": (0.5, 0)},
            )  # fmt: skip
            above += 1


def _label_scales(axes, room, curves):
    """Write the name of each scale beside its curve, where there is room."""
    for number, (label, *_) in enumerate(curves):
        place = room.beside(number, label)
        if place is not None:
            axes.text(
                *place, label, transform=axes.transAxes, ha="center", va="center", fontsize=LABEL_SIZE,
                color=INK, style="italic", path_effects=[HALO],
            )  # fmt: skip


def _mass_limits(curves):
    """Limits that hold all masses of today and everything heavier; filtering masses begin at nothing."""
    masses = [mass.compressed() for *_, mass in curves if mass.count()]
    return min(mass[-1] for mass in masses) / ROOM, max(mass.max() for mass in masses) * ROOM
