"""The pictures of several scenarios: what they say is read back from the axes."""

import numpy as np
import pytest
from astropy.table import Column, MaskedColumn, Table, vstack
from matplotlib.text import Text

from twofluid.drawing import (
    difference_figure,
    evolution_comparison_figure,
    lag_comparison_figure,
    matter_comparison_figure,
)

LABELS = ("baseline", "no dark matter", "half the $ dark matter")
WAVENUMBERS = np.geomspace(0.01, 10, 13)
REDSHIFTS = (1000.0, 30.0, 0.0)


def stacked(across, value, bare=LABELS[1], **columns):
    """Stack one table per scenario, each number `value` times 1, 2, 3; empty where `bare` has no dark matter."""
    parts = []
    for number, label in enumerate(LABELS, 1):
        part = Table(across)
        part["scenario"] = Column([label] * len(part))
        for name, masked in columns.items():
            part[name] = MaskedColumn(number * value, mask=np.full(len(part), masked and label == bare))
        parts.append(part)
    return vstack(parts)


def grid():
    return {"wavenumber": np.repeat(WAVENUMBERS, len(REDSHIFTS)), "redshift": np.tile(REDSHIFTS, len(WAVENUMBERS))}


def tables(bare=LABELS[1]):
    k, z = grid()["wavenumber"], grid()["redshift"]
    steps = np.linspace(2999.0, 0.0, 200)
    course = {"wavenumber": np.full(steps.shape, 0.3), "redshift": steps}
    differences = stacked(grid(), 1e-3 * np.sin(k), bare, delta_dark_difference=True, delta_baryon_difference=False,
                          ratio_difference=True)  # fmt: skip
    catchup = stacked({"wavenumber": WAVENUMBERS}, 10 + WAVENUMBERS, bare, redshift_at_50_percent=True,
                      redshift_at_90_percent=True)  # fmt: skip
    catchup.meta["fractions"] = {"redshift_at_50_percent": 0.5, "redshift_at_90_percent": 0.9}
    return {
        "courses": stacked(course, 1e4 / (1 + steps), bare, delta_dark=True, delta_baryon=False),
        "evolution": stacked(grid(), -k / (1 + z), bare, delta_dark=True, delta_baryon=False),
        "lag": stacked(grid(), 0.3 / (1 + k), bare, ratio=True),
        "catchup": catchup,
        "differences": differences[differences["scenario"] != LABELS[0]],
    }


def curves(axes):
    return {line.get_label(): line for line in axes.get_lines() if not line.get_label().startswith("_")}


def legend(figure):
    return [text.get_text() for text in figure.legends[0].get_texts()]


def test_amplitudes_are_drawn_for_every_scenario_with_one_dark_matter_to_compare():
    figure = evolution_comparison_figure(tables())
    left, right = figure.axes
    names = ["dark matter: baseline", "baryons: baseline", "baryons: no dark matter",
             r"baryons: half the \$ dark matter"]  # fmt: skip
    assert list(curves(left)) == list(curves(right)) == legend(figure) == names
    half = curves(right)[names[3]]
    assert half.get_xdata() == pytest.approx(WAVENUMBERS, rel=1e-14)
    assert half.get_ydata() == pytest.approx(3 * WAVENUMBERS, rel=1e-14)  # z = 0, without its sign
    course = curves(left)[names[1]]
    assert course.get_ydata() == pytest.approx(1e4 / (1 + course.get_xdata()), rel=1e-14)


def test_amplitude_axes_are_labelled_and_time_runs_to_the_right():
    left, right = evolution_comparison_figure(tables()).axes
    assert left.get_xlim() == (2999.0, 0.0)
    assert left.get_xlabel() == "redshift $z$"
    assert right.get_xlabel() == r"wavenumber $k$ [$\mathrm{Mpc^{-1}}$]"
    assert left.get_yscale() == right.get_yscale() == "log"
    assert left.texts[0].get_text() == r"$k$ = 0.3 $\mathrm{Mpc^{-1}}$"
    assert right.texts[0].get_text() == "$z$ = 0"


def test_dark_matter_is_that_of_the_first_that_has_any():
    figure = evolution_comparison_figure(tables(bare=LABELS[0]))
    assert legend(figure)[0] == "dark matter: no dark matter"  # the second is called so, and has some here


def test_a_wave_through_zero_does_not_flatten_the_rest():
    values = tables()
    values["evolution"]["delta_baryon"][2] = 1e-300
    low, high = evolution_comparison_figure(values).axes[1].get_ylim()
    assert high / low < 1e6


def test_the_lag_is_drawn_for_those_with_dark_matter_in_their_own_dashes():
    figure = lag_comparison_figure(tables())
    left, right = figure.axes
    assert legend(figure) == ["baseline", r"half the \$ dark matter"]
    lines = curves(left)
    assert lines["baseline"].get_ydata() == pytest.approx(0.3 / (1 + WAVENUMBERS), rel=1e-14)
    assert len({str(line._dash_pattern) for line in lines.values()}) == 3  # no public getter
    assert [text.get_text() for text in left.texts] == ["$z$ = 30"]
    assert right.get_ylabel() == "caught up to 90 % at redshift $z$"
    low, high = right.get_ylim()
    assert 5 < low < 10
    assert 60 < high < 75


def test_no_lag_figure_where_nothing_can_lag():
    values = tables()
    values["lag"]["ratio"].mask = True
    assert lag_comparison_figure(values) is None


def test_never_and_always_leave_gaps_and_never_caught_up_still_gives_axes():
    values = tables()
    values["catchup"]["redshift_at_90_percent"][0] = np.inf
    values["catchup"]["redshift_at_90_percent"].mask[1] = True
    right = lag_comparison_figure(values).axes[1]
    assert np.isnan(curves(right)["baseline"].get_ydata()).tolist() == [True, True] + [False] * 11
    values["catchup"]["redshift_at_90_percent"].mask = True
    assert np.isfinite(lag_comparison_figure(values).axes[1].get_ylim()).all()


def test_differences_have_a_row_of_panels_for_each_other_scenario():
    figure = difference_figure(tables())
    bare, half = np.reshape(figure.axes, (2, 3))
    assert bare[0].get_title(loc="left") == "no dark matter"
    assert half[0].get_title(loc="left") == r"half the \$ dark matter"
    assert legend(figure) == ["$z$ = 1000", "$z$ = 30", "$z$ = 0"]
    assert [axes.get_ylabel() for axes in half] == [
        r"$\Delta\delta_\mathrm{c}/\delta_\mathrm{c}$", r"$\Delta\delta_\mathrm{b}/\delta_\mathrm{b}$",
        r"$\Delta(\delta_\mathrm{b}/\delta_\mathrm{c})$",
    ]  # fmt: skip
    for axes in half:
        assert curves(axes)["$z$ = 30"].get_ydata() == pytest.approx(3e-3 * np.sin(WAVENUMBERS), rel=1e-14)
        largest = 3e-3 * abs(np.sin(WAVENUMBERS)).max()
        assert 1 < axes.get_ylim()[1] / largest < 1.1
    assert [[text.get_text() for text in axes.texts] for axes in bare] == [["no dark matter"], [], ["no dark matter"]]


def test_heights_are_linear_where_differences_are_alike_and_logarithmic_where_not():
    values = tables()["differences"]
    values["delta_baryon_difference"] = -0.002 - 0.001 * np.sin(values["wavenumber"])
    axes = difference_figure({"differences": values}).axes[1]
    assert axes.get_yscale() == "linear"
    low, high = axes.get_ylim()
    assert -0.0035 < low < -0.0029
    assert 0 < high < 0.0005
    values["delta_baryon_difference"][0] = 500.0  # a wave passing through zero
    axes = difference_figure({"differences": values}).axes[1]
    assert axes.get_yscale() == "symlog"
    assert axes.get_ylim()[1] < 4


def test_no_difference_at_all_can_be_drawn():
    values = tables()["differences"]
    values["delta_baryon_difference"] = 0.0
    low, high = difference_figure({"differences": values}).axes[1].get_ylim()
    assert low < 0 < high


@pytest.mark.parametrize("draw", [evolution_comparison_figure, lag_comparison_figure, difference_figure])
def test_figures_fill_two_columns_with_type_that_can_be_read_and_nothing_sticks_out(draw):
    figure = draw(tables())
    assert figure.get_size_inches()[0] == 7.1  # both columns of a journal page; common practice, no source
    figure.draw_without_rendering()
    texts = [text for axes in figure.axes for text in (axes.xaxis.label, axes.yaxis.label, *axes.texts)]
    texts += figure.legends[0].get_texts()
    assert min(text.get_fontsize() for text in texts) >= 7  # points at printed size, common practice, no source
    for text in texts:
        box = Text.get_window_extent(text)
        assert box.x0 >= 0 and box.x1 <= figure.bbox.x1 and box.y1 <= figure.bbox.y1, text.get_text()
    box = figure.legends[0].get_window_extent()
    for axes in figure.axes:
        assert not box.overlaps(axes.get_window_extent())


def test_long_titles_stay_on_the_page():
    values = tables()
    for table in values.values():
        table["scenario"] = [f"_{label} {'and so on ' * 30}" for label in table["scenario"]]
    for draw in (lag_comparison_figure, evolution_comparison_figure):
        figure = draw(values)
        figure.draw_without_rendering()
        box = figure.legends[0].get_window_extent()
        assert box.x0 >= 0 and box.x1 <= figure.bbox.x1


def test_power_of_matter_over_the_first_scenario():
    k = grid()["wavenumber"]
    evolution = stacked(grid(), 0.5 / (1 + k), delta_matter_over_first=False)
    figure = matter_comparison_figure({"evolution": evolution})
    assert [axes.get_title(loc="left") for axes in figure.axes] == [
        "no dark matter, over baseline", r"half the \$ dark matter, over baseline",
    ]  # fmt: skip
    for number, axes in enumerate(figure.axes, 2):
        lines = curves(axes)
        assert list(lines) == ["$z$ = 1000", "$z$ = 30", "$z$ = 0"]
        for line in lines.values():
            assert line.get_xdata() == pytest.approx(WAVENUMBERS)
            assert line.get_ydata() == pytest.approx((number * 0.5 / (1 + WAVENUMBERS)) ** 2)
        assert axes.get_xscale() == "log"
        assert axes.get_xlabel() == r"wavenumber $k$ [$\mathrm{Mpc^{-1}}$]"
        assert axes.get_ylabel() == r"power of matter $(\delta_\mathrm{m}/\delta_\mathrm{m,1})^2$"
    assert legend(figure) == ["$z$ = 1000", "$z$ = 30", "$z$ = 0"]
