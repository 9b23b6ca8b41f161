"""The pictures of the lag: what they say is read back from the axes."""

import itertools
import subprocess
import sys

import matplotlib
import numpy as np
import pytest
from astropy.table import MaskedColumn, Table
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.text import Text

from twofluid.drawing import draw_catchup, draw_ratio, lag_figure
from twofluid.drawing.style import BARYONS, DARK_MATTER, JOINING, PHOTONS, spread

REDSHIFTS = (1000.0, 100.0, 10.0)


def ratio_table(wavenumbers=(10.0, 0.1, 1.0, 100.0), redshifts=REDSHIFTS):
    """A lag table, its modes not in order, with the ratio 1/(1 + z/100 + k/100)."""
    k, z = np.repeat(wavenumbers, len(redshifts)), np.tile(redshifts, len(wavenumbers))
    return Table({"wavenumber": k, "redshift": z, "ratio": MaskedColumn(1 / (1 + z / 100 + k / 100))})


def catchup_table(wavenumbers, columns, today=1.0):
    """A catch-up table; NaN in a column stands for never."""
    table = Table({"wavenumber": np.asarray(wavenumbers, dtype=float)})
    names = {}
    for fraction, redshift in columns.items():
        name = f"redshift_at_{100 * fraction:.0f}_percent"
        names[name] = fraction
        table[name] = MaskedColumn(redshift, mask=np.isnan(redshift), dtype=float)
    table["ratio_today"] = MaskedColumn(np.broadcast_to(today, len(table)))
    table.meta["fractions"] = names
    return table


def curves(axes):
    return {line.get_label(): line for line in axes.get_lines() if not line.get_label().startswith("_")}


def markers(axes):
    return [line for line in axes.get_lines() if line.get_marker() == "o"]


def words(axes):
    """Drawn label texts with their boxes, in pixels."""
    return {text.get_text(): Text.get_window_extent(text) for text in axes.texts}  # without their leaders


def test_ratio_axes_are_labelled_with_symbol_and_unit():
    axes = draw_ratio(ratio_table())
    assert axes.get_xlabel() == r"wavenumber $k$ [$\mathrm{Mpc^{-1}}$]"
    assert axes.get_ylabel() == r"ratio $\delta_\mathrm{b}/\delta_\mathrm{c}$"
    assert axes.get_xscale() == "log"
    assert axes.get_xlim() == (0.1, 100.0)
    low, high = axes.get_ylim()
    assert low < 0
    assert high > 1


def test_ratio_has_one_labelled_curve_per_redshift_in_order_of_wavenumber():
    axes = draw_ratio(ratio_table())
    lines = curves(axes)
    assert list(lines) == ["$z$ = 1000", "$z$ = 100", "$z$ = 10"]
    assert {text.get_text() for text in axes.texts} == set(lines)
    k = np.array([0.1, 1, 10, 100])
    for redshift, line in zip(REDSHIFTS, lines.values(), strict=True):
        assert line.get_xdata().tolist() == k.tolist()
        assert line.get_ydata() == pytest.approx(1 / (1 + redshift / 100 + k / 100), rel=1e-14)


def test_curves_differ_without_colour():
    lines = list(curves(draw_ratio(ratio_table())).values())
    # No public getter gives the dashes.
    assert len({str(line._dash_pattern) for line in lines}) == len(lines) == 3


def lightness(colour):
    """Relative luminance of a colour, ITU-R BT.709 weights on linear light."""
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in to_rgb(colour)]
    return float(np.dot([0.2126, 0.7152, 0.0722], linear))


def test_palette_keeps_its_order_in_grey():
    ramp = [lightness(colour) for colour in JOINING(np.linspace(0, 1, 20))]
    assert (np.diff(ramp) > 0).all()
    assert lightness(DARK_MATTER) < lightness(PHOTONS) < lightness(BARYONS)
    # 3 to 1 against white: WCAG 2.1, success criterion 1.4.11, for graphics; from memory.
    assert 1.05 / (lightness(BARYONS) + 0.05) > 3


def test_masked_values_leave_gaps_and_lonely_points_are_marked():
    table = ratio_table((1.0, 2.0, 4.0, 8.0, 16.0), (10.0,))
    table["ratio"].mask = [False, False, True, False, True]
    axes = draw_ratio(table)
    (line,) = curves(axes).values()
    assert np.isnan(line.get_ydata()).tolist() == [False, False, True, False, True]
    (mark,) = markers(axes)
    assert mark.get_xdata().tolist() == [8.0]
    assert mark.get_ydata().tolist() == [pytest.approx(1 / 1.18, rel=1e-14)]


def test_single_mode_is_a_marker_in_the_middle():
    axes = draw_ratio(ratio_table((0.3,), (100.0, 50.0)))
    assert [mark.get_xdata().tolist() for mark in markers(axes)] == [[0.3], [0.3]]
    assert axes.get_xlim() == pytest.approx((0.03, 3.0), rel=1e-12)


def test_runaway_ratios_do_not_flatten_the_rest():
    table = ratio_table()
    table["ratio"][2] = -1e4  # dark matter about to pass through zero
    low, high = draw_ratio(table).get_ylim()
    assert -1.5 < low < -1
    assert 1 < high < 1.5


def test_catchup_reads_redshift_spaced_as_one_plus_redshift():
    axes = draw_catchup(catchup_table([1, 2, 4], {0.5: [200, 180, 150], 0.9: [20, 15, 0]}))
    assert axes.get_ylabel() == "redshift of catching up $z$"
    lines = curves(axes)
    assert list(lines) == ["50 %", "90 %"]
    assert lines["90 %"].get_ydata().tolist() == [20, 15, 0]
    low, high = axes.get_ylim()
    assert low == 0
    assert high > 200
    heights = axes.transData.transform([(1, 0), (1, 9), (1, 99)])[:, 1]
    # Factors of ten in 1 + z.
    assert heights[2] - heights[1] == pytest.approx(heights[1] - heights[0], rel=1e-9)
    assert "30" in [label.get_text() for label in axes.get_yticklabels()]


def test_never_always_and_lost_again_leave_gaps():
    redshifts = {0.5: [np.inf, 30, 20, 1e6], 0.9: [np.inf, 3, np.nan, np.nan]}
    lines = curves(draw_catchup(catchup_table([1, 2, 4, 8], redshifts, [1, 0.95, 0.8, 0.3])))
    # The last mode was at 50 % at redshift 1e6 and is at 30 % today.
    assert np.isnan(lines["50 %"].get_ydata()).tolist() == [True, False, False, True]
    assert np.isnan(lines["90 %"].get_ydata()).tolist() == [True, False, True, True]


def test_nothing_ever_caught_up_still_gives_axes():
    axes = draw_catchup(catchup_table([1, 2], {0.5: [np.nan, np.nan]}, 0.1))
    assert len(axes.texts) == 0
    assert np.isfinite(axes.get_ylim()).all()


def test_labels_do_not_touch_even_where_curves_meet():
    k = np.geomspace(0.1, 100, 30)
    table = ratio_table(k, (1000.0, 800.0, 500.0, 300.0, 200.0, 100.0, 50.0, 30.0, 20.0, 10.0))
    table["ratio"] *= np.exp(-table["wavenumber"])  # all meet at zero
    axes = draw_ratio(table)
    axes.figure.draw_without_rendering()
    boxes = words(axes)
    assert len(boxes) == 10
    for (one, first), (two, second) in itertools.combinations(boxes.items(), 2):
        assert not first.overlaps(second), f"{one} touches {two}"


def test_labels_stand_on_curves_that_run_apart():
    k = np.geomspace(0.1, 100, 61)
    axes = draw_catchup(catchup_table(k, {0.5: 0 * k + 200, 0.9: 0 * k + 20, 0.99: 0 * k + 1}))
    axes.figure.draw_without_rendering()
    for text, redshift in zip(axes.texts, (200, 20, 1), strict=True):
        assert text.xy[1] == redshift
        assert text.get_text() in ("50 %", "90 %", "99 %")
        box = words(axes)[text.get_text()]
        x, y = axes.transData.transform(text.xy)
        assert box.x0 < x < box.x1
        assert box.y0 < y < box.y1


def test_axes_given_are_the_axes_drawn_in():
    figure = Figure()
    left, right = figure.subplots(1, 2)
    assert draw_ratio(ratio_table(), left) is left
    assert draw_catchup(catchup_table([1, 2], {0.5: [30, 20]}), right) is right
    assert figure.axes == [left, right]


def test_figure_fills_two_columns_with_type_that_can_be_read():
    figure = lag_figure({"lag": ratio_table(), "catchup": catchup_table([1, 2, 4], {0.5: [200, 180, 150]})})
    assert figure.get_size_inches()[0] == 7.1  # both columns of a journal page; common practice, no source
    figure.draw_without_rendering()
    sizes = [
        text.get_fontsize() for axes in figure.axes
        for text in (axes.xaxis.label, axes.yaxis.label, *axes.get_xticklabels(), *axes.texts)
    ]  # fmt: skip
    assert min(sizes) >= 7  # points at printed size, common practice, no source
    for axes in figure.axes:  # nothing sticks out of the page
        for text, box in words(axes).items():
            assert 0 <= box.x0 and box.x1 <= figure.bbox.x1, text


def test_no_figure_without_dark_matter():
    table = ratio_table()
    table["ratio"].mask = True
    assert lag_figure({"lag": table, "catchup": None}) is None


def test_settings_of_the_user_neither_count_nor_change():
    with matplotlib.rc_context({"axes.labelsize": 30.0, "lines.linewidth": 9.0}):
        axes = draw_ratio(ratio_table())
        assert matplotlib.rcParams["lines.linewidth"] == 9.0
    assert axes.xaxis.label.get_fontsize() == 8
    assert {line.get_linewidth() for line in curves(axes).values()} == {1.2}


def test_drawing_leaves_the_global_state_of_pyplot_alone():
    code = "import sys, twofluid.drawing; sys.exit('matplotlib.pyplot' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


@pytest.mark.parametrize(
    ("heights", "expected"),
    [
        ([0.2, 0.8], [0.2, 0.8]),  # far apart: stay
        ([0.5, 0.5, 0.5], [0.4, 0.5, 0.6]),  # spread evenly about where they were
        ([0.0, 0.0], [0.0, 0.1]),  # not below the axes
        ([1.0, 1.0], [0.9, 1.0]),  # nor above
        ([0.7, 0.65, 0.1], [0.725, 0.625, 0.1]),  # in their order
    ],
)
def test_spread(heights, expected):
    assert spread(np.array(heights), 0.1) == pytest.approx(expected, abs=1e-12)
