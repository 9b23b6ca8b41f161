"""Pictures of several scenarios in one: amplitudes, lag, and differences from the first."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, NullLocator, ScalarFormatter

from twofluid.drawing.lag import REDSHIFT_TICKS
from twofluid.drawing.style import (
    COLUMN_WIDTH,
    DARK_MATTER,
    LABEL_SIZE,
    PAGE_WIDTH,
    PANEL_HEIGHT,
    SCENARIOS,
    axis_label,
    draw_curves,
    journal_style,
    safe_label,
    share_legend,
)
from twofluid.products.comparison import DIFFERENCES
from twofluid.quantities import QUANTITIES

FAINTEST = 1e-10  # of the largest amplitude in a panel; what is fainter is cut off
CLEARANCE = 3.0  # factor left free above the largest amplitude and below the smallest
RATIO_VIEW = (-1.0, 2.0)  # ratios beyond are cut off: dark matter passing through zero makes them infinite
LARGEST_DIFFERENCE = 3.0  # differences beyond are cut off: a wave passing through zero makes them infinite
DECADES = 3  # of a difference, on either side of zero, that the panel shows; linear inside
SMALLEST_DIFFERENCE = 1e-9  # round-off: no panel looks closer than this
EVEN = 10.0  # largest over typical difference, below which a linear panel shows all there is
ROOM = 0.05  # of the span of an axis left free beyond the data at either end
ROW_HEIGHT = 1.7  # one row of panels in a figure of several [inch]
LEGEND_HEIGHT = 0.3  # what a legend above the panels adds [inch]
MOST_REDSHIFTS = 6  # curves in a panel of differences
LOW_SHARE = 2.0  # per cent of the points that may lie below the view, for waves that pass through zero
CORNERS = ((1, 1), (0, 0), (1, 0), (0, 1))  # right and top, for words that give way to curves
CORNER = (0.25, 0.15)  # of a panel, what words in its corner take
DARK_DASHES = (0, (2, 1.5))  # dark matter beside baryons


def evolution_comparison_figure(tables):
    """Return the figure of the amplitudes of several scenarios: one scale in time, all scales at one time.

    Baryons of each scenario, and for comparison the dark matter of the first that has any.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        Stacked tables, under "courses" and "evolution".

    Returns
    -------
    matplotlib.figure.Figure
        A figure two columns wide: on the left one wavenumber against redshift, on the right the lowest redshift
        against wavenumber.
    """
    from astropy.units import Unit

    courses, evolution = tables["courses"], tables["evolution"]
    lowest = np.min(evolution["redshift"])
    unit = Unit(QUANTITIES["wavenumber"].unit).to_string("latex_inline")
    with journal_style():
        figure, (left, right) = _panels(1, 2, PANEL_HEIGHT)
        _draw_amplitudes(left, courses, "redshift")
        _redshift_axis(left.xaxis, left.set_xscale)
        left.set_xlim(np.max(courses["redshift"]), 0)
        _say(left, f"${QUANTITIES['wavenumber'].symbol}$ = {courses['wavenumber'][0]:.3g} {unit}")
        _draw_amplitudes(right, evolution[evolution["redshift"] == lowest], "wavenumber")
        _wavenumber_axis(right, evolution)
        _say(right, f"${QUANTITIES['redshift'].symbol}$ = {lowest:g}")
        left.set_ylabel(_contrast_label(evolution))
        share_legend(figure, left)
    return figure


def _contrast_label(table):
    """Say what the contrasts of stacked tables are relative to: P is the primordial power, with any mixture."""
    mixed = any("mixture" in meta for meta in (table.meta, *table.meta.get("scenarios", {}).values()))
    return r"contrast $|\delta|\,/\,\sqrt{\mathcal{P}}$" if mixed else r"contrast $|\delta|$ per unit curvature"


def lag_comparison_figure(tables):
    """Return the figure of the lag in several scenarios: ratio, and redshift of catching up, against scale.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        Stacked tables of the product, under "lag" and "catchup".

    Returns
    -------
    matplotlib.figure.Figure or None
        A figure two columns wide, the middle of the redshifts on the left and the middle of the fractions on the
        right; None if no scenario has dark matter to lag behind.
    """
    lag, catchup = tables["lag"], tables["catchup"]
    if np.all(np.ma.getmaskarray(np.ma.asarray(lag["ratio"]))):
        return None
    redshift = _middle(np.unique(lag["redshift"]))
    name, fraction = _middle(list(catchup.meta["fractions"].items()))
    with journal_style():
        figure, (left, right) = _panels(1, 2, PANEL_HEIGHT)
        left.axhline(1, color="0.75", linewidth=0.6, zorder=0)
        ratios = _by_scenario(lag[lag["redshift"] == redshift], "wavenumber", "ratio")
        draw_curves(left, ratios, SCENARIOS)
        _wavenumber_axis(left, lag)
        left.set_ylim(*_view([y for *_, y in ratios], RATIO_VIEW))
        left.set_ylabel(axis_label("ratio"))
        _say(left, f"${QUANTITIES['redshift'].symbol}$ = {redshift:g}", corners=CORNERS)
        caught = _by_scenario(catchup, "wavenumber", name)
        draw_curves(right, caught, SCENARIOS)
        _wavenumber_axis(right, catchup)
        _redshift_axis(right.yaxis, right.set_yscale)
        low, high = _view([np.log1p(np.ma.masked_invalid(y)) for *_, y in caught], (0.0, np.inf))
        right.set_ylim(np.expm1(max(low, 0.0)), np.expm1(high))
        right.set_ylabel(axis_label("redshift", f"caught up to {100 * fraction:g} % at redshift"))
        share_legend(figure, left)
    return figure


def matter_comparison_figure(tables):
    """Return the figure of the power of all matter over that of the first scenario, a panel for each other one.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        Stacked tables, under "evolution".

    Returns
    -------
    matplotlib.figure.Figure
        A figure one column wide: ratio of the squares of delta_matter against wavenumber, one curve per redshift.
    """
    table = tables["evolution"]
    first, *others = dict.fromkeys(table["scenario"].tolist())
    symbol = QUANTITIES["delta_matter"].symbol
    with journal_style():
        size = (COLUMN_WIDTH, len(others) * PANEL_HEIGHT + LEGEND_HEIGHT)
        figure = Figure(figsize=size, layout="constrained")
        panels = figure.subplots(len(others), 1, squeeze=False)[:, 0]
        for label, axes in zip(others, panels, strict=True):
            part = table[table["scenario"] == label]
            axes.set_title(f"{safe_label(label)}, over {safe_label(first)}", loc="left", fontsize=LABEL_SIZE)
            axes.axhline(1, color="0.75", linewidth=0.6, zorder=0)
            curves = [(name, k, ratio**2) for name, k, ratio in _by_redshift(part, "delta_matter_over_first")]
            draw_curves(axes, curves)
            _wavenumber_axis(axes, part)
            axes.set_ylim(*_view([np.ones(1), *(y for *_, y in curves)], RATIO_VIEW))
            axes.set_ylabel(f"power of matter $({symbol}/{symbol[:-1]},1}})^2$")
        share_legend(figure, panels)
    return figure


def difference_figure(tables):
    """Return the figure of the differences from the first scenario, a row of panels for each other one.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        Stacked tables, under "differences".

    Returns
    -------
    matplotlib.figure.Figure
        A figure two columns wide: relative differences of both amplitudes and difference of their ratio against
        wavenumber, one curve per redshift. Where differences vary much, heights are logarithmic but for the
        smallest.
    """
    table = tables["differences"]
    labels = list(dict.fromkeys(table["scenario"].tolist()))
    with journal_style():
        figure, rows = _panels(len(labels), len(DIFFERENCES), ROW_HEIGHT)
        for label, panels in zip(labels, np.atleast_2d(rows), strict=True):
            part = table[table["scenario"] == label]
            panels[0].set_title(safe_label(label), loc="left", fontsize=LABEL_SIZE)
            for axes, name in zip(panels, DIFFERENCES, strict=True):
                _draw_differences(axes, part, name)
        for axes in np.atleast_2d(rows)[-1]:
            axes.set_xlabel(axis_label("wavenumber"))
        share_legend(figure, rows)
    return figure


def _panels(rows, columns, height):
    figure = Figure(figsize=(PAGE_WIDTH, rows * height + LEGEND_HEIGHT), layout="constrained")
    return figure, figure.subplots(rows, columns)


def _draw_amplitudes(axes, table, across):
    """Draw baryons of every scenario and dark matter of the first that has any, without signs."""
    axes.set_yscale("log")
    dark = next((curve for curve in _by_scenario(table, across, "delta_dark") if curve[2].count()), None)
    baryons = _by_scenario(table, across, "delta_baryon")
    if dark is not None:
        label, x, y = dark
        axes.plot(x, abs(y), color=DARK_MATTER, linestyle=DARK_DASHES, label=f"dark matter: {label}", zorder=3)
    draw_curves(axes, [(f"baryons: {label}", x, abs(y)) for label, x, y in baryons], SCENARIOS)
    heights = np.ma.concatenate([abs(y) for *_, y in (*baryons, *([dark] if dark else []))])
    heights = heights[heights > 0].compressed()
    if heights.size:
        least = max(np.percentile(heights, LOW_SHARE), FAINTEST * heights.max())
        axes.set_ylim(least / CLEARANCE, CLEARANCE * heights.max())


def _draw_differences(axes, table, name):
    curves = _by_redshift(table, name)
    axes.axhline(0, color="0.75", linewidth=0.6, zorder=0)
    draw_curves(axes, curves)
    _wavenumber_axis(axes, table)
    axes.set_xlabel("")
    axes.set_ylabel(f"${QUANTITIES[name].symbol}$")
    heights = np.ma.abs(np.ma.concatenate([y for *_, y in curves])).compressed()
    if heights.size == 0:
        _say(axes, "no dark matter")
        axes.set_yticks([])
        return
    largest = np.clip(heights.max(), SMALLEST_DIFFERENCE, LARGEST_DIFFERENCE)
    if largest < EVEN * np.median(heights):
        axes.set_ylim(*_view([np.zeros(1), *(y for *_, y in curves)], (-largest, largest)))
        return
    linear = 10.0 ** (np.ceil(np.log10(largest)) - DECADES)
    axes.set_yscale("symlog", linthresh=linear, linscale=1.0)
    axes.set_ylim(*((1 + ROOM) * np.array([-largest, largest])))
    axes.yaxis.set_minor_locator(NullLocator())


def _by_scenario(table, across, name):
    """Return label, abscissa and ordinate of each scenario, by rising abscissa."""
    return [
        (safe_label(label), *_sorted(table[table["scenario"] == label], across, name))
        for label in dict.fromkeys(table["scenario"].tolist())
    ]


def _by_redshift(table, name):
    """Return label, wavenumber and ordinate of a spread of redshifts, the highest first."""
    redshifts = np.unique(table["redshift"])[::-1]
    redshifts = redshifts[np.unique(np.linspace(0, len(redshifts) - 1, MOST_REDSHIFTS).round().astype(int))]
    symbol = QUANTITIES["redshift"].symbol
    return [
        (f"${symbol}$ = {redshift:g}", *_sorted(table[table["redshift"] == redshift], "wavenumber", name))
        for redshift in redshifts
    ]


def _sorted(table, across, name):
    order = np.argsort(table[across])
    return np.asarray(table[across])[order], np.ma.asarray(table[name])[order]


def _middle(values):
    return values[len(values) // 2]


def _view(ordinates, limits):
    """Return the span of finite values, cut to limits, with room at either end."""
    values = np.clip(np.ma.masked_invalid(np.ma.concatenate(ordinates)).compressed(), *limits)
    low, high = (values.min(), values.max()) if values.size else (0.0, 1.0)
    room = ROOM * (high - low) or ROOM
    return low - room, high + room


def _wavenumber_axis(axes, table):
    axes.set_xscale("log")
    least, greatest = np.min(table["wavenumber"]), np.max(table["wavenumber"])
    # A single mode stands in the middle of two decades.
    axes.set_xlim((least, greatest) if greatest > least else (least / 10, greatest * 10))
    axes.set_xlabel(axis_label("wavenumber"))


def _redshift_axis(axis, set_scale):
    """Ticks at round redshifts on an axis spaced as ln(1 + z)."""
    set_scale("function", functions=(np.log1p, np.expm1))
    axis.set_major_locator(FixedLocator(REDSHIFT_TICKS))
    axis.set_minor_locator(NullLocator())
    axis.set_major_formatter(ScalarFormatter())
    axis.set_label_text(axis_label("redshift"))


def _say(axes, text, *, corners=((0, 1),)):
    """Write in a corner of a panel which slice it shows: of those allowed, the first that fewest curves run through."""
    right, top = min(corners, key=lambda corner: _points_in_corner(axes, *corner))
    axes.text(0.97 if right else 0.03, 0.95 if top else 0.05, text, transform=axes.transAxes, fontsize=LABEL_SIZE,
              ha="right" if right else "left", va="top" if top else "bottom")  # fmt: skip


def _points_in_corner(axes, right, top):
    """Count the points of all curves in one corner; limits have to be set."""
    to_panel = axes.transData - axes.transAxes
    points = np.concatenate([to_panel.transform_path(line.get_path()).vertices for line in axes.lines])
    across, up = CORNER
    return np.count_nonzero((np.abs(points[:, 0] - right) < across) & (np.abs(points[:, 1] - top) < up))
