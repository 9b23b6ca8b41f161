"""The pictures of growth, spheres and shortfall: what they say is read back from the axes."""

import itertools

import numpy as np
import pytest
from astropy.table import MaskedColumn, Table
from matplotlib.colors import same_color
from matplotlib.text import Text

from twofluid.drawing import (
    draw_at_decoupling,
    draw_at_target,
    draw_baryon_share,
    draw_growth_rate,
    draw_spheres,
    draw_suppression,
    growth_figure,
    shortfall_figure,
    spheres_figure,
)
from twofluid.drawing.axes import FLUID_COLOURS

WAVENUMBERS = np.geomspace(1e-3, 1e3, 31)
REDSHIFTS = (1000.0, 100.0, 0.0)


def growth_table(dark=True):
    """A growth table whose rates are 1/(1 + z/1000) less k/1e4, modes in falling order."""
    k, z = np.repeat(WAVENUMBERS[::-1], len(REDSHIFTS)), np.tile(REDSHIFTS, len(WAVENUMBERS))
    rate = 1 / (1 + z / 1000) - k / 1e4
    table = Table({"wavenumber": k, "redshift": z, "suppression": MaskedColumn(rate)})
    for fluid, factor in (("dark", 0.9), ("baryon", 2.0), ("matter", 1.0)):
        table[f"rate_{fluid}"] = MaskedColumn(factor * rate, mask=np.full(len(k), fluid == "dark" and not dark))
    table.meta["exponent_with_smooth_baryons"] = 0.9
    return table


def spheres_table(radii=(1.0, 8.0, 64.0), dark=True, covered=True):
    """A spheres table with sigma = 10/R/(1 + z), baryons at half."""
    r, z = np.repeat(radii, len(REDSHIFTS)), np.tile(REDSHIFTS, len(radii))
    table = Table({"sphere_radius": r, "sphere_mass": 2e11 * r**3, "redshift": z})
    for fluid, factor in (("dark", 1.0), ("baryon", 0.5), ("matter", 0.9)):
        missing = not covered or (fluid == "dark" and not dark)
        table[f"sigma_{fluid}"] = MaskedColumn(factor * 10 / r / (1 + z), mask=np.full(len(r), missing))
    return table


def shortfall_table(dark=True):
    """A shortfall table, waves then one sphere, with contrasts of 1e-3, 1e-5 (baryons) and 8e-4 times k^0.2."""
    waves = len(WAVENUMBERS)
    k = np.repeat(np.append(WAVENUMBERS, np.nan), 3)
    fluid = ["dark", "baryon", "matter"] * (waves + 1)
    scale = {"dark": 1e-3, "baryon": 1e-5, "matter": 8e-4}
    there = np.array([scale[name] for name in fluid]) * np.nan_to_num(k, nan=1.0) ** 0.2
    missing = [name == "dark" and not dark for name in fluid]
    table = Table({"wavenumber": MaskedColumn(k, mask=np.isnan(k)), "fluid": fluid})
    for name, values in (("rms_at_decoupling", there), ("rms_needed", 0 * there + 0.01), ("rms_at_target", 90 * there)):
        table[name] = MaskedColumn(values, mask=missing)
    table.meta["target_redshift"] = 7.5
    return table


def curves(axes):
    return {line.get_label(): line for line in axes.get_lines() if not line.get_label().startswith("_")}


def level_lines(axes):
    """Heights of the lines drawn right across."""
    return {float(line.get_ydata()[0]) for line in axes.get_lines() if line.get_label().startswith("_child")}


def test_suppression_has_a_curve_per_redshift_by_rising_wavenumber():
    axes = draw_suppression(growth_table())
    lines = curves(axes)
    assert list(lines) == ["$z$ = 1000", "$z$ = 100", "$z$ = 0"]
    for redshift, line in zip(REDSHIFTS, lines.values(), strict=True):
        assert line.get_xdata() == pytest.approx(WAVENUMBERS, rel=1e-14)
        assert line.get_ydata() == pytest.approx(1 / (1 + redshift / 1000) - WAVENUMBERS / 1e4, rel=1e-12)
    assert axes.get_xlabel() == r"wavenumber $k$ [$\mathrm{Mpc^{-1}}$]"
    assert axes.get_ylabel() == r"growth over cold matter's $D_\mathrm{m}/D_\mathrm{cold}$"
    assert (axes.get_xscale(), axes.get_xlim()) == ("log", pytest.approx((1e-3, 1e3), rel=1e-12))


def test_growth_rate_of_dark_matter_shows_the_exponent_of_smooth_baryons():
    assert 0.9 in level_lines(draw_growth_rate(growth_table(), "dark"))
    assert 0.9 not in level_lines(draw_growth_rate(growth_table(), "matter"))
    assert draw_growth_rate(growth_table(), "baryon").get_yscale() == "log"


def test_nothing_is_drawn_between_the_poles_of_a_rate():
    table = growth_table()
    swing = np.where((table["wavenumber"] > 0.1) & (table["wavenumber"] < 1) & (table["redshift"] == 1000), 1, 0)
    table["rate_matter"] += 30.0 * swing * np.where(np.arange(len(table)) // 3 % 2, 1, -1)
    lines = curves(draw_growth_rate(table, "matter"))
    hidden = np.isnan(lines["$z$ = 1000"].get_ydata())
    assert hidden[np.abs(np.log10(WAVENUMBERS) + 0.5) < 0.45].all()
    assert not hidden[np.abs(np.log10(WAVENUMBERS) + 0.5) > 0.75].any()
    assert not np.isnan(lines["$z$ = 100"].get_ydata()).any()


def test_growth_figure_has_four_panels_and_two_without_dark_matter():
    assert len(growth_figure({"growth": growth_table()}).axes) == 4
    labels = [axes.get_ylabel() for axes in growth_figure({"growth": growth_table(dark=False)}).axes]
    assert [label.split(" $")[0] for label in labels] == ["growth over cold matter's", "growth rate of matter"]


def test_spheres_show_radius_below_and_mass_above():
    axes = draw_spheres(spheres_table())
    assert axes.get_xlabel() == r"sphere radius $R$ [$\mathrm{Mpc}$]"
    assert axes.get_ylabel() == r"rms contrast of matter $\sigma_\mathrm{m}$"
    (top,) = axes.child_axes
    assert top.get_xlabel() == r"sphere mass $M$ [$\mathrm{M_{\odot}}$]"
    axes.figure.draw_without_rendering()
    assert top.get_xlim() == pytest.approx((2e11, 2e11 * 64**3), rel=1e-9)
    line = curves(axes)["$z$ = 100"]
    assert line.get_ydata() == pytest.approx([9 / 101, 9 / 808, 9 / 6464], rel=1e-12)
    share = curves(draw_baryon_share(spheres_table()))["$z$ = 0"]
    assert share.get_ydata() == pytest.approx([0.5] * 3, rel=1e-12)


def test_a_single_sphere_is_a_marker():
    axes = draw_spheres(spheres_table(radii=(8.0,)))
    marks = [line for line in axes.get_lines() if line.get_marker() == "o"]
    assert [mark.get_xdata().tolist() for mark in marks] == [[8.0]] * 3
    axes.figure.draw_without_rendering()


def test_panels_of_spheres_follow_what_there_is():
    assert len(spheres_figure({"spheres": spheres_table()}).axes) == 2
    assert len(spheres_figure({"spheres": spheres_table(dark=False)}).axes) == 1
    assert spheres_figure({"spheres": spheres_table(covered=False)}) is None


def test_shortfall_draws_the_fluids_in_their_colours_and_what_was_needed():
    axes = draw_at_decoupling(shortfall_table())
    lines = curves(axes)
    assert list(lines) == ["dark matter", "matter", "baryons"]
    for line, colour in zip(lines.values(), FLUID_COLOURS.values(), strict=True):
        assert same_color(line.get_color(), colour)
        assert len(line.get_xdata()) == len(WAVENUMBERS)  # the sphere is left out
    assert len({str(line._dash_pattern) for line in lines.values()}) == 3  # told apart without colour
    assert lines["baryons"].get_ydata() == pytest.approx(1e-5 * WAVENUMBERS**0.2, rel=1e-12)
    assert level_lines(axes) == {0.01}
    assert "needed for unity by $z$ = 7.5" in [text.get_text() for text in axes.texts]
    low, high = axes.get_ylim()
    assert low < lines["baryons"].get_ydata().min()
    assert high > 0.02
    target = draw_at_target(shortfall_table())
    assert level_lines(target) == {1.0}
    assert target.get_ylabel() == r"rms contrast at $z$ = 7.5, $\Delta(z_\mathrm{target})$"


def test_shortfall_without_dark_matter_draws_the_baryons_alone():
    assert list(curves(draw_at_decoupling(shortfall_table(dark=False)))) == ["baryons"]


def test_contrasts_that_pass_zero_do_not_stretch_the_axis():
    table = shortfall_table()
    table["rms_at_decoupling"][np.asarray(table["fluid"]) == "baryon"] *= 1e-30
    low, high = draw_at_decoupling(table).get_ylim()
    assert np.log10(high / low) < 7.0


FIGURES = [
    lambda: growth_figure({"growth": growth_table()}),
    lambda: growth_figure({"growth": growth_table(dark=False)}),
    lambda: spheres_figure({"spheres": spheres_table()}),
    lambda: shortfall_figure({"shortfall": shortfall_table()}),
    lambda: shortfall_figure({"shortfall": shortfall_table(dark=False)}),
]


@pytest.mark.parametrize("make", FIGURES)
def test_figures_fill_the_page_with_type_that_can_be_read_and_does_not_touch(make):
    figure = make()
    assert figure.get_size_inches()[0] == 7.1  # both columns of a journal page; common practice, no source
    figure.draw_without_rendering()
    for axes in figure.axes:
        labels = (axes.xaxis.label, axes.yaxis.label, *axes.get_xticklabels(), *axes.texts)
        assert min(text.get_fontsize() for text in labels) >= 7  # points at printed size, common practice, no source
        boxes = {text.get_text(): Text.get_window_extent(text) for text in axes.texts}
        for (one, first), (two, second) in itertools.combinations(boxes.items(), 2):
            assert not first.overlaps(second), f"{one} touches {two}"
        for text in (axes.yaxis.label, axes.xaxis.label):
            box = text.get_window_extent()
            assert 0 <= box.x0 and box.x1 <= figure.bbox.x1 and 0 <= box.y0 and box.y1 <= figure.bbox.y1
