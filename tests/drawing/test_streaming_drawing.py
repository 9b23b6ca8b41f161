"""The pictures of the streaming: what they say is read back from the axes."""

import itertools

import numpy as np
import pytest
from astropy.table import MaskedColumn, Table
from matplotlib.text import Text

from twofluid.drawing import draw_streaming_power, draw_velocity_spectrum, streaming_figure

WAVENUMBERS = np.geomspace(1.0, 1e3, 31)
REDSHIFTS = (1000.0, 100.0, 10.0)
VELOCITIES = (0.0, 1.0, 2.0, np.nan)


def power(k, z, v):
    """A power that falls with wavenumber, wind (0.8 for the average) and time."""
    return 1 - 0.3 * np.nan_to_num(v, nan=0.8) / 2 * (k / 1e3) / (1 + z / 100)


def streaming_table(empty=False):
    """A streaming table, modes in falling order."""
    grids = np.meshgrid(WAVENUMBERS[::-1], REDSHIFTS, VELOCITIES, indexing="ij")
    k, z, v = (grid.ravel() for grid in grids)
    table = Table({"wavenumber": k, "redshift": z, "velocity": MaskedColumn(v, mask=np.isnan(v))})
    for fluid, share in (("dark", 0.5), ("baryon", 2.0), ("matter", 1.0)):
        values = 1 - share * (1 - power(k, z, v))
        table[f"suppression_{fluid}"] = MaskedColumn(values, mask=np.full(len(k), empty))
    return table


def spectrum_table(empty=False):
    k, z = np.repeat(WAVENUMBERS[::-1], len(REDSHIFTS)), np.tile(REDSHIFTS, len(WAVENUMBERS))
    return Table({
        "wavenumber": k, "redshift": z, "velocity_spectrum": MaskedColumn((1 + z) / k, mask=np.full(len(k), empty)),
    })  # fmt: skip


def curves(axes):
    return {line.get_label(): line for line in axes.get_lines() if not line.get_label().startswith("_")}


def test_spectrum_has_a_curve_per_redshift():
    axes = draw_velocity_spectrum(spectrum_table())
    lines = curves(axes)
    assert list(lines) == ["$z$ = 1000", "$z$ = 100", "$z$ = 10"]
    assert lines["$z$ = 100"].get_xdata() == pytest.approx(WAVENUMBERS, rel=1e-14)
    assert lines["$z$ = 100"].get_ydata() == pytest.approx(101 / WAVENUMBERS, rel=1e-12)
    assert axes.get_ylabel() == r"rms velocity per ln $k$ $\Delta_\mathrm{v}$ [$\mathrm{km\,s^{-1}}$]"
    assert (axes.get_xscale(), axes.get_yscale()) == ("log", "log")


def test_average_over_patches_has_a_curve_per_redshift():
    axes = draw_streaming_power(streaming_table())
    lines = curves(axes)
    assert list(lines) == ["$z$ = 1000", "$z$ = 100", "$z$ = 10"]
    for redshift, line in zip(REDSHIFTS, lines.values(), strict=True):
        assert line.get_ydata() == pytest.approx(power(WAVENUMBERS, redshift, np.nan), rel=1e-12)
    assert axes.get_ylabel() == r"power of matter $P_\mathrm{m}/P_\mathrm{m}(0)$"
    assert axes.get_title() == "in all patches"


def test_one_redshift_has_a_curve_per_velocity_and_the_average():
    axes = draw_streaming_power(streaming_table(), "baryon", 100.0)
    lines = curves(axes)
    assert list(lines) == [r"$v/\sigma_\mathrm{bc}$ = 1", r"$v/\sigma_\mathrm{bc}$ = 2", "all patches"]
    for velocity, line in zip((1.0, 2.0, np.nan), lines.values(), strict=True):
        assert line.get_ydata() == pytest.approx(2 * power(WAVENUMBERS, 100.0, velocity) - 1, rel=1e-12)
    assert axes.get_title() == "at $z$ = 100"
    low, high = axes.get_ylim()
    assert low < min(line.get_ydata().min() for line in lines.values())
    assert high > 1.0


def test_figure_has_four_panels_without_touching_words():
    figure = streaming_figure({"streaming": streaming_table(), "streaming-spectrum": spectrum_table()})
    assert len(figure.axes) == 4
    assert [axes.get_title() for axes in figure.axes[1:]] == ["in all patches", "at $z$ = 10", "at $z$ = 10"]
    assert figure.get_size_inches()[0] == pytest.approx(7.1)
    figure.draw_without_rendering()
    for axes in figure.axes:
        boxes = [Text.get_window_extent(text) for text in axes.texts]
        for first, second in itertools.combinations(boxes, 2):
            assert not first.overlaps(second)


def test_without_patches_only_the_spectrum_is_drawn():
    figure = streaming_figure({"streaming": streaming_table(empty=True), "streaming-spectrum": spectrum_table()})
    assert len(figure.axes) == 1


def test_without_dark_matter_there_is_no_figure():
    tables = {"streaming": streaming_table(empty=True), "streaming-spectrum": spectrum_table(empty=True)}
    assert streaming_figure(tables) is None
