"""What all figures share: the style file, the palette, axis labels, and labels that stand at their curves."""

from __future__ import annotations

from pathlib import Path

import matplotlib
import numpy as np
from matplotlib.colors import LinearSegmentedColormap, to_hex
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, NullLocator, ScalarFormatter

from twofluid.quantities import QUANTITIES

STYLE_FILE = Path(__file__).with_name("journal.mplstyle")
COLUMN_WIDTH = 3.5  # one journal column [inch]
PAGE_WIDTH = 7.1  # both columns and the gap between [inch]
PANEL_HEIGHT = 2.6  # one panel [inch]
GUTTER = 0.04  # between panels, over what their labels need [fraction of the figure]

DARK_MATTER = "#2c3e52"  # slate
BARYONS = "#d08208"  # amber
PHOTONS = "#0d6f6b"  # teal

# From dark matter alone to baryons that have joined it; lightness rises all the way, so grey keeps the order.
JOINING = LinearSegmentedColormap.from_list("joining", [DARK_MATTER, PHOTONS, BARYONS])
# One universe beside another, told apart by dashes first; grey keeps the order here too.
SCENARIOS = LinearSegmentedColormap.from_list("scenarios", [BARYONS, PHOTONS])
# In turn; unit: line width.
DASHES = ("-", (0, (5, 1.5)), (0, (1.2, 1.2)), (0, (6, 1.5, 1.2, 1.5)), (0, (3, 1.2, 1.2, 1.2, 1.2, 1.2)))

REDSHIFT_TICKS = (0, 1, 3, 10, 30, 100, 300, 1000, 3000, 10**4, 10**5, 10**6)

LABEL_SIZE = 7  # labels at curves [pt]
LABEL_PITCH = 8.5  # distance between two of them, so that they do not touch [pt]
MOST_LABELS = 14  # what a panel's height holds at that pitch
# Line from a label to its curve.
LEADER = {"arrowstyle": "-", "linewidth": 0.5, "shrinkA": 1, "shrinkB": 0, "relpos": (0, 0.5)}
PATCH = {"facecolor": "white", "edgecolor": "none", "pad": 1.0}  # opens the curve behind a label on it
ROOMY = 1.5  # pitches that labels on curves keep, so that each curve shows beside its neighbour's label
LEAST_POINTS = 3  # of a curve beside a label that tell how it runs there
LABEL_SHARE = 0.16  # width that a label on a curve takes [fraction of the axes]
LEGEND_HANDLE, LETTER = 0.6, 0.055  # width of a line with its gaps, and of a letter, in a legend [inch]
LONGEST_LABEL = 40  # letters of a title in a legend
MIDDLE = 0.02  # unevenness accepted for a place in the middle rather than at a side [fraction of the axes]
MOST_CHOICES = 200  # places tried
AXES_SHARE = 0.8  # of the figure's height that its axes take, near enough to space labels by


def journal_style():
    """Return a context in which matplotlib follows the style file and nothing of the user's own settings.

    Returns
    -------
    context manager
        Matplotlib's own settings come back on leaving it.
    """
    return matplotlib.rc_context(fname=STYLE_FILE)


def axes_or_new(axes):
    """Return the given axes, or those of a new figure one column wide.

    Parameters
    ----------
    axes : matplotlib.axes.Axes or None
        Axes to draw in.

    Returns
    -------
    matplotlib.axes.Axes
        Axes to draw in.
    """
    if axes is not None:
        return axes
    return Figure(figsize=(COLUMN_WIDTH, PANEL_HEIGHT), layout="constrained").add_subplot()


def page(rows=1, columns=2, width=PAGE_WIDTH):
    """Return a new figure of panels of equal size, and its axes.

    Parameters
    ----------
    rows, columns : int, optional
        Number of panels.
    width : float, optional
        Of the figure, two columns of a journal by default [inch].

    Returns
    -------
    figure : matplotlib.figure.Figure
    panels : array of matplotlib.axes.Axes, shape (row times column,)
        Row by row.
    """
    figure = Figure(figsize=(width, rows * PANEL_HEIGHT), layout="constrained")
    figure.get_layout_engine().set(wspace=GUTTER, hspace=GUTTER)
    return figure, figure.subplots(rows, columns, squeeze=False).ravel()


def axis_label(name, words=None):
    """Return an axis label: words, symbol, unit.

    Parameters
    ----------
    name : str
        Entry of the nomenclature.
    words : str, optional
        Words instead of the name.

    Returns
    -------
    str
        Label with mathtext.
    """
    from astropy.units import Unit

    quantity = QUANTITIES[name]
    label = f"{words or name.replace('_', ' ')} ${quantity.symbol}$"
    return f"{label} [{Unit(quantity.unit).to_string('latex_inline')}]" if quantity.unit else label


def redshift_axis(axes, which, limits, words=None):
    """Make an axis one of redshifts, spaced as ln(1 + z), with ticks at round redshifts.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Its axes.
    which : str
        "x" or "y".
    limits : (float, float)
        Redshifts at its ends [unitless].
    words : str, optional
        Words of its label instead of "redshift".
    """
    getattr(axes, f"set_{which}scale")("function", functions=(np.log1p, np.expm1))
    getattr(axes, f"set_{which}lim")(*limits)
    axis = getattr(axes, f"{which}axis")
    axis.set_major_locator(FixedLocator(REDSHIFT_TICKS))
    axis.set_minor_locator(NullLocator())
    axis.set_major_formatter(ScalarFormatter())
    axis.set_label_text(axis_label("redshift", words))


def draw_curves(axes, curves, palette=JOINING, colours=None):
    """Draw curves that belong to one sequence, each told apart by colour, dashes and a label in the margin.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Where to; scales must be set.
    curves : list of (str, array, array)
        Label, abscissa and ordinate of each curve, shape (point,); masked or not finite ordinates leave gaps.
        A point with a gap on both sides is drawn as a marker.
    palette : matplotlib.colors.Colormap
        Where the colours come from, in order.
    colours : list of colour, optional
        One a curve, instead of those.
    """
    if colours is None:
        colours = palette(np.linspace(0, 1, len(curves))) if len(curves) > 1 else [DARK_MATTER]
    for number, ((label, x, ordinate), colour) in enumerate(zip(curves, colours, strict=True)):
        y = np.ma.filled(np.ma.masked_invalid(ordinate), np.nan)
        axes.plot(x, y, color=colour, linestyle=DASHES[number % len(DASHES)], label=label)
        alone = _alone(y)
        if alone.any():
            axes.plot(x[alone], y[alone], color=colour, linestyle="none", marker="o")


def _alone(y):
    """Tell which finite points have no finite neighbour and so would show no line."""
    finite = np.concatenate([[False], np.isfinite(y), [False]])
    return finite[1:-1] & ~finite[:-2] & ~finite[2:]


def share_legend(figure, axes):
    """Put one legend for all panels above them.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        The figure.
    axes : matplotlib.axes.Axes or sequence of them
        Axes whose labelled lines the legend explains, a label and colour that several share once.
    """
    lines = [line for panel in np.ravel(axes) for line in panel.get_lines() if not line.get_label().startswith("_")]
    drawn = [line for line in lines if np.isfinite(line.get_ydata()).any()]
    lines = list({(line.get_label(), to_hex(line.get_color())): line for line in drawn}.values())
    if not lines:
        return
    longest = max(len(line.get_label()) for line in lines)
    columns = max(1, int(figure.get_figwidth() // (LEGEND_HANDLE + LETTER * longest)))
    figure.legend(handles=lines, loc="outside upper center", ncols=columns, fontsize=LABEL_SIZE, frameon=False,
                  handlelength=3.0, columnspacing=1.5)  # fmt: skip


def safe_label(text):
    """Return a user's text as it can stand in a figure: short, and no mathtext."""
    text = text if len(text) <= LONGEST_LABEL else text[: LONGEST_LABEL - 3] + "..."
    text = f" {text}" if text.startswith("_") else text  # matplotlib leaves such labels out of a legend
    return text.replace("$", r"\$")


def label_curves(axes, margin=False):
    """Write each curve's label: on the curves where they lie far enough apart, else in the right margin.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Axes whose lines carry labels; limits must be final.
    margin : bool
        Whether to leave the curves whole and write in the margin anyway.
    """
    lines = [line for line in axes.get_lines() if not line.get_label().startswith("_")]
    lines = [line for line in lines if np.isfinite(line.get_ydata()).any()]
    if len(lines) > MOST_LABELS:
        lines = [lines[i] for i in np.linspace(0, len(lines) - 1, MOST_LABELS).round().astype(int)]
    place = axes.get_subplotspec()
    rows = place.get_gridspec().nrows if place else 1
    pitch = LABEL_PITCH * rows / (72 * axes.figure.get_figheight() * AXES_SHARE)
    to_fraction = axes.transData + axes.transAxes.inverted()
    place = None if margin else _apart(lines, to_fraction, pitch)
    if place is None:
        _label_in_margin(axes, lines, to_fraction, pitch)
        return
    for line in lines:
        axes.annotate(
            line.get_label(), xy=(line.get_xdata()[place], line.get_ydata()[place]), ha="center", va="center",
            color=line.get_color(), fontsize=LABEL_SIZE, bbox=PATCH,
        )


def _apart(lines, to_fraction, pitch):
    """Return the point number where all curves lie well apart and run as level as can be; None if nowhere."""
    if len({line.get_xdata().tobytes() for line in lines}) != 1:
        return None
    across, heights = np.moveaxis([to_fraction.transform(line.get_xydata()) for line in lines], -1, 0)
    across = across[0]
    gaps = np.diff(np.sort(heights, axis=0), axis=0).min(axis=0, initial=1.0)
    inside = (heights > 0) & (heights < 1)
    good = inside.all(axis=0) & (gaps > ROOMY * pitch) & (abs(across - 0.5) < 0.5 - LABEL_SHARE / 2)
    choices = np.flatnonzero(good)
    best, place = np.inf, None
    for choice in choices[:: len(choices) // MOST_CHOICES + 1]:
        beside = heights[:, abs(across - across[choice]) < LABEL_SHARE / 2]
        # Where the curves run equally level the middle is best.
        unrest = np.ptp(beside, axis=1).max() + MIDDLE * abs(across[choice] - 0.5)
        if beside.shape[1] >= LEAST_POINTS and unrest < best:  # an unrest of NaN, a gap beside, is no choice
            best, place = unrest, choice
    return place


def _label_in_margin(axes, lines, to_fraction, pitch):
    """Write labels level with the last point of each curve, moved apart where they would touch."""
    ends = np.array([to_fraction.transform(_end(line)) for line in lines]).reshape(-1, 2)
    ends = ends.clip(0, 1)  # a curve that leaves the view is pointed at where it does
    for line, end, height in zip(lines, ends, spread(ends[:, 1], pitch), strict=True):
        axes.annotate(
            line.get_label(), xy=end, xycoords="axes fraction", xytext=(1.06, height), textcoords="axes fraction",
            color=line.get_color(), fontsize=LABEL_SIZE, va="center", annotation_clip=False,
            arrowprops=LEADER | {"color": line.get_color()},
        )


def _end(line):
    """Return the last finite point of a line."""
    return line.get_xydata()[np.isfinite(line.get_ydata())][-1]


def spread(heights, pitch):
    """Move heights apart to at least `pitch`, in their order, as little as can be and inside 0 to 1.

    Parameters
    ----------
    heights : array, shape (label,)
        Wanted heights [fraction of the axes].
    pitch : float
        Least distance [fraction of the axes].

    Returns
    -------
    array, shape (label,)
        Heights to use; if they do not fit between 0 and 1 they stick out at the bottom.
    """
    order = np.argsort(heights, kind="stable")
    steps = pitch * np.arange(len(heights))
    # Less its share of the steps each height only has to be non-decreasing: the mean of the greatest before
    # and the least after is.
    wanted = heights[order] - steps
    level = (np.maximum.accumulate(wanted) + np.minimum.accumulate(wanted[::-1])[::-1]) / 2
    top = 1 - pitch * (len(heights) - 1)
    placed = np.empty_like(heights)
    placed[order] = np.minimum(np.maximum(level, 0), top) + steps
    return placed
