"""The map of verdicts and the masses: what they say is read back from the axes."""

import itertools

import numpy as np
import pytest
from astropy.table import MaskedColumn, Table
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.text import Text

from twofluid.drawing import draw_map, draw_masses, scales_figure
from twofluid.drawing.placing import COLUMNS, ROWS, Room
from twofluid.drawing.scales import TONES
from twofluid.products.verdict import VERDICTS

DRAG = 1000.0
WAVENUMBERS, REDSHIFTS = np.geomspace(1e-3, 1e3, 61), np.expm1(np.linspace(0, 9, 60))


def verdict_table(wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS):
    """Six areas: by wavenumber in three before the drag epoch and in three after; some rows in no order."""
    k, z = np.repeat(wavenumbers, len(redshifts)), np.tile(redshifts, len(wavenumbers))
    third = np.digitize(np.log10(k), [-1, 1])
    words = np.array(VERDICTS)[np.where(z > DRAG, third, 3 + third)]
    table = Table({"wavenumber": k, "redshift": z, "verdict": MaskedColumn(words, mask=np.zeros(len(k), dtype=bool))})
    return table[np.argsort(np.sin(np.arange(len(k))))]


def scales_table(redshifts=REDSHIFTS[::-1], *, dark=True):
    redshifts = np.asarray(redshifts)
    released = redshifts < DRAG
    empty = np.full(len(redshifts), not dark) | ~released
    growth = 1e4 / (1 + redshifts)
    return Table({
        "redshift": redshifts,
        "hubble_radius": 3000 / np.sqrt(1 + redshifts),
        "silk_wavenumber": MaskedColumn(1e-6 * (1 + redshifts) ** 1.5, mask=released),
        "jeans_wavenumber": np.where(released, 300.0, 0.01),
        "jeans_mass": np.where(released, 1e5, 1e16) / (1 + 30 / (1 + redshifts)),
        "filtering_wavenumber_two_fluids": MaskedColumn(500 + redshifts, mask=empty),
        "filtering_mass": MaskedColumn(2 * growth, mask=empty),
        "filtering_mass_two_fluids": MaskedColumn(growth, mask=empty),
        "filtering_mass_measured": MaskedColumn(growth, mask=empty),
    })  # fmt: skip


def boxes(axes):
    """Drawn words with their boxes, in pixels."""
    axes.figure.draw_without_rendering()
    return [(text.get_text(), Text.get_window_extent(text)) for text in axes.texts]


def test_map_holds_the_verdicts_where_they_belong():
    axes = draw_map(verdict_table(), scales_table())
    (mesh,) = axes.collections
    codes = mesh.get_array()  # (redshift, mode)
    assert codes.shape == (60, 61)
    table = verdict_table()
    for row in table[:200]:
        column = np.argmin(abs(WAVENUMBERS - row["wavenumber"]))
        line = np.argmin(abs(REDSHIFTS - row["redshift"]))
        assert VERDICTS[codes[line, column]] == row["verdict"]
    assert axes.get_xlim() == pytest.approx((1e-3, 1e3), rel=1e-9)
    assert axes.get_ylim() == pytest.approx((0.0, np.expm1(9)), rel=1e-9)
    assert axes.get_xlabel() == r"wavenumber $k$ [$\mathrm{Mpc^{-1}}$]"
    assert axes.get_ylabel() == "redshift $z$"


def test_a_mode_without_verdict_is_left_white():
    table = verdict_table()
    table["verdict"].mask = table["wavenumber"] > 100
    mesh = draw_map(table, scales_table()).collections[0]
    assert np.ma.getmaskarray(mesh.get_array())[:, -1].all()
    assert not np.ma.getmaskarray(mesh.get_array())[:, 0].any()


def test_tones_can_be_told_apart_in_grey():
    # CIE lightness from the relative luminance of ITU-R BT.709; 10 units are a clear step, common practice, no source.
    def lightness(colour):
        linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in to_rgb(colour)]
        return 116 * np.dot([0.2126, 0.7152, 0.0722], linear) ** (1 / 3) - 16

    steps = np.diff(sorted(lightness(tone) for tone in TONES))
    assert len(TONES) == len(VERDICTS)
    assert steps.min() > 8
    assert np.sort(steps)[1] > 10


def test_scales_are_drawn_as_wavenumbers_with_gaps_where_there_is_none():
    axes = draw_map(verdict_table(), scales_table())
    lines = {}
    for line in axes.get_lines():
        lines.setdefault(line.get_label(), []).append(line)
    assert {label: len(found) for label, found in lines.items()} == {
        "horizon": 1, "Jeans": 2, "filtering": 1, "diffusion": 1,
    }  # fmt: skip
    redshift = REDSHIFTS[::-1]
    assert lines["horizon"][0].get_xdata() == pytest.approx(np.sqrt(1 + redshift) / 3000, rel=1e-14)
    assert np.isnan(lines["diffusion"][0].get_xdata()).tolist() == (redshift < DRAG).tolist()
    assert np.isnan(lines["filtering"][0].get_xdata()).tolist() == (redshift >= DRAG).tolist()
    assert len({str(found[0]._dash_pattern) for found in lines.values()}) == 4  # no public getter


def test_each_area_and_each_scale_has_its_words_and_none_touch():
    figure = scales_figure({"verdict_map": verdict_table(), "scales_map": scales_table(), "scales": scales_table()})
    placed = boxes(figure.axes[0])
    words = {text.replace("\n", " ") for text, _ in placed}
    assert {"damped", "falls in", "grows", "horizon", "Jeans", "filtering", "diffusion"} <= words
    assert any(word.startswith("larger") for word in words)
    assert any(word.startswith("oscillates") for word in words)
    assert any(word.startswith("held up") for word in words)
    for (one, first), (two, second) in itertools.combinations(placed, 2):
        if one != two:
            assert not first.overlaps(second), f"{one} touches {two}"
    for text, box in placed:
        assert 0 <= box.x0 and box.x1 <= figure.bbox.x1 and box.y1 <= figure.bbox.y1, text
        assert box.height > 0


def test_words_stand_in_their_own_area():
    axes = draw_map(verdict_table(), scales_table())
    places = {text: box for text, box in boxes(axes) if text in ("falls in", "grows", "damped")}
    for text, box in places.items():
        (x0, y0), (x1, y1) = axes.transData.inverted().transform(box.get_points())
        inside = [
            row["verdict"] for row in verdict_table() if x0 < row["wavenumber"] < x1 and y0 < row["redshift"] < y1
        ]
        assert set(inside) == {text}


def test_an_area_too_small_for_words_is_told_of_above_the_map():
    table = verdict_table()
    narrow = abs(np.log10(table["wavenumber"])) < 0.12
    table["verdict"][narrow & (table["redshift"] <= DRAG)] = "oscillates with the plasma"
    table["verdict"][~narrow & (table["redshift"] > DRAG)] = "damped"
    axes = draw_map(table, scales_table())
    above = [text for text, box in boxes(axes) if box.y0 >= axes.bbox.y1]
    assert "oscillates with the plasma" in above
    assert "damped" not in above


def test_type_can_be_read_at_printed_size():
    figure = scales_figure({"verdict_map": verdict_table(), "scales_map": scales_table(), "scales": scales_table()})
    assert figure.get_size_inches()[0] == 7.1  # both columns of a journal page; common practice, no source
    sizes = [
        text.get_fontsize() for axes in figure.axes
        for text in (axes.xaxis.label, axes.yaxis.label, *axes.get_xticklabels(), *axes.texts)
    ]  # fmt: skip
    assert min(sizes) >= 7  # points at printed size, common practice, no source


def test_masses_of_the_gas_against_redshift():
    axes = draw_masses(scales_table(), scales_table([500.0, 50.0]))
    lines = {line.get_label(): line for line in axes.get_lines()}
    redshift = lines["Jeans"].get_xdata()
    assert redshift.max() < DRAG
    assert axes.get_xlim() == (redshift.max(), 0.0)  # time runs to the right
    assert lines["filtering, two fluids"].get_ydata() == pytest.approx(1e4 / (1 + redshift), rel=1e-14)
    assert lines["filtering, one growth"].get_ydata() == pytest.approx(2e4 / (1 + redshift), rel=1e-14)
    (circles,) = [line for line in axes.get_lines() if line.get_marker() == "o"]
    assert circles.get_xdata().tolist() == [500.0, 50.0]
    assert circles.get_ydata() == pytest.approx([1e4 / 501, 1e4 / 51], rel=1e-14)
    assert axes.get_ylabel() == r"mass $M$ [$\mathrm{M_{\odot}}$]"


def test_without_dark_matter_only_the_jeans_mass_is_drawn():
    axes = draw_masses(scales_table(dark=False), scales_table([500.0], dark=False))
    assert {line.get_label() for line in axes.get_lines() if np.isfinite(line.get_ydata()).any()} == {"Jeans"}
    assert axes.get_legend() is None


def test_single_mode_still_makes_a_map():
    axes = draw_map(verdict_table(np.array([0.5])), scales_table())
    low, high = axes.get_xlim()
    assert low < 0.5 < high
    assert axes.collections[0].get_array().shape == (60, 1)


def test_room_is_given_once():
    axes = Figure().add_subplot()
    edges = np.array([0.0, 1.0]), np.array([0.0, 1.0])
    room = Room(axes, edges, np.ma.zeros((1, 1), dtype=int), [])
    first, second = room.inside(0, "word"), room.inside(0, "word")
    assert first == pytest.approx((0.5, 0.5), abs=2 / min(COLUMNS, ROWS))
    assert second is not None
    assert second != first
    assert room.inside(0, "x" * 500) is None
    assert room.inside(1, "word") is None
