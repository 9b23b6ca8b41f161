"""The product: tables of a run, with dark matter and without, and its files."""

import os
from dataclasses import replace

import numpy as np
import pytest
from astropy.table import Table

from twofluid import cli, compare, evolve, parse_scenario
from twofluid.products import streaming_spectrum_table, streaming_table, streaming_velocity_table
from twofluid.registry import comparison_tables
from twofluid.streaming import stream

WAVENUMBERS, REDSHIFTS, VELOCITIES = (300.0, 3.0), (20.0, 1100.0, 100.0), (2.0, 0.0)


@pytest.fixture(scope="module")
def history(make_scenario):
    return evolve(make_scenario(), wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS)


@pytest.fixture(scope="module")
def streaming(history):
    return stream(history, 1050.0, VELOCITIES)


def test_rows_stand_in_the_order_asked(streaming):
    table = streaming_table(streaming)
    assert table.colnames == [
        "wavenumber", "redshift", "velocity", "suppression_dark", "suppression_baryon", "suppression_matter", "error",
    ]  # fmt: skip
    assert len(table) == 2 * 3 * 3
    assert table["wavenumber"].tolist() == [300.0] * 9 + [3.0] * 9
    assert table["redshift"][:9].tolist() == [20.0] * 3 + [1100.0] * 3 + [100.0] * 3
    assert table["velocity"][:3].tolist() == [2.0, 0.0, None]
    assert table.meta["from_redshift"] == 1050.0
    early = table["redshift"] == 1100.0
    for name in table.colnames[3:]:
        assert np.array_equal(table[name].mask, early)


def test_numbers_are_those_of_the_patches(streaming):
    table = streaming_table(streaming)
    shape = streaming.patches.dark.shape
    for name in ("dark", "baryon", "matter"):
        told = np.ma.asarray(table[f"suppression_{name}"]).filled(np.nan).reshape(shape)
        np.testing.assert_array_equal(told, getattr(streaming.patches, name))
    strong, none, average = table["suppression_baryon"][:3]
    assert strong < average < none
    assert none == pytest.approx(1.0, abs=1e-13)


def test_velocity_table(streaming, history):
    table = streaming_velocity_table(streaming)
    assert table["redshift"].tolist() == list(REDSHIFTS)
    assert table["rms_velocity"].unit == "km / s"
    assert table["mach_number"].mask.tolist() == [False, True, False]  # the gas is not free before the drag epoch
    a = 1 / (1 + np.array(REDSHIFTS))
    sigma = np.asarray(table["rms_velocity"]) / 299792.458
    rate = history.universe.conformal_hubble_rate(a)
    assert np.asarray(table["streaming_wavenumber"]) == pytest.approx(rate / sigma, rel=1e-9)
    assert table["mach_number"][0] == pytest.approx(sigma[0] / history.universe.gas_sound_speed(a[0]), rel=1e-9)
    assert table["half_variance_wavenumber"][0] < table["most_variance_wavenumber"][0]


def test_spectrum_adds_up_to_the_velocity(streaming):
    spectrum, velocity = streaming_spectrum_table(streaming), streaming_velocity_table(streaming)
    for row in velocity:
        rows = spectrum[spectrum["redshift"] == row["redshift"]]
        variance = np.trapezoid(np.asarray(rows["velocity_spectrum"]) ** 2, np.log(rows["wavenumber"]))
        assert np.sqrt(variance) == pytest.approx(row["rms_velocity"], rel=1e-9)


def test_the_wind_does_not_depend_on_what_was_asked(streaming, make_scenario):
    other = stream(evolve(make_scenario(), wavenumbers=[0.01], redshifts=[20.0]))
    assert other.wind.rms[0] == pytest.approx(streaming.wind.rms[0], rel=1e-5)  # by the steps of the run


def test_no_redshift_after_the_start_is_said(history):
    table = streaming_table(stream(history, 15.0))
    assert table["suppression_matter"].mask.all()
    assert table.meta["not_covered"] == "no redshift of the run is below that where patches start, 15"


def test_without_dark_matter_everything_is_empty(make_scenario):
    bare = stream(evolve(make_scenario(dark_matter_density=0.0), wavenumbers=[1.0], redshifts=[20.0, 10.0]))
    assert (bare.wind, bare.patches) == (None, None)
    for make in (streaming_velocity_table, streaming_spectrum_table, streaming_table):
        table = make(bare)
        for name in set(table.colnames) - {"wavenumber", "redshift", "velocity"}:
            assert table[name].mask.all()
        assert "no dark matter" in table.meta["no_dark_matter"]


@pytest.mark.parametrize(
    ("options", "told"),
    [
        ({"from_redshift": 0.0}, "from_redshift must be above 0, got 0.0"),
        ({"velocities": []}, r"velocities must be a list of one or more numbers, not negative, got \[\]"),
        ({"velocities": [1.0, -0.5]}, r"not negative, got \[1.0, -0.5\]"),
        ({"velocities": [float("nan")]}, r"not negative, got \[nan\]"),
        ({"velocities": 1.0}, "not negative, got 1.0"),
    ],
)
def test_impossible_options_are_refused(history, options, told):
    with pytest.raises(ValueError, match=told):
        stream(history, **options)


FILE = """\
title: Saltmarsh tiny
cosmology:
  hubble_constant: 67.5 km/(s Mpc)
  baryon_density: 0.0223
  dark_matter_density: 0.1195
sampling:
  wavenumbers: [20 1/Mpc, 100 1/Mpc, 300 1/Mpc]
  redshifts: [1000, 40]
products:
  streaming: {from_redshift: 900, velocities: [0, 1.5]}
"""


def run(place, text, *options):
    (place / "tiny.yaml").write_text(text)
    return cli.main(["run", str(place / "tiny.yaml"), "--out", str(place / "out"), *options])


def test_from_a_file_to_files(tmp_path, capsys):
    assert run(tmp_path, FILE, "--no-certificate") == 0
    assert sorted(os.listdir(tmp_path / "out")) == [
        "evolution.ecsv", "streaming-spectrum.ecsv", "streaming-velocity.ecsv", "streaming.ecsv", "streaming.pdf",
        "streaming.png",
    ]  # fmt: skip
    table = Table.read(tmp_path / "out" / "streaming.ecsv")
    assert table.meta["from_redshift"] == 900.0
    assert table["velocity"].tolist()[:3] == [0.0, 1.5, None]
    velocity = Table.read(tmp_path / "out" / "streaming-velocity.ecsv")
    shown = capsys.readouterr().out
    assert f"{velocity['rms_velocity'][1]:.4g}" in shown
    (line,) = [line for line in shown.splitlines() if line.startswith("    k = 300 1/Mpc")]
    assert line.split()[-2:] == ["-", f"{table['suppression_matter'][-1]:.4f}"]


def test_without_dark_matter_there_are_tables_and_a_reason(tmp_path, capsys):
    assert run(tmp_path, FILE.replace("0.1195", "0").replace("20 1/Mpc, 100 1/Mpc, 300", "1"), "--no-certificate") == 0
    assert "streaming.png" not in os.listdir(tmp_path / "out")
    assert Table.read(tmp_path / "out" / "streaming.ecsv")["suppression_dark"].mask.all()
    assert "  streaming: this universe has no dark matter" in capsys.readouterr().out


def test_compared_with_a_universe_without_dark_matter():
    first = parse_scenario(FILE.replace("20 1/Mpc, 100 1/Mpc, 300", "1"))
    second = replace(first, title="bare", cosmology=replace(first.cosmology, dark_matter_density=0.0))
    table = comparison_tables(compare([first, second]))["streaming"]
    assert table["suppression_matter_over_first"].mask.tolist()[:6] == [True] * 3 + [False] * 3
    assert table["suppression_matter_over_first"][table["scenario"] == "bare"].mask.all()


@pytest.mark.parametrize(
    ("wrong", "told"),
    [
        ("from_redshift: 5", "products.streaming.from_redshift = 5"),
        ("velocities: [-1]", "products.streaming.velocities = -1"),
        ("velocities: []", "must not be an empty list"),
        ("velocity: [1]", "did you mean velocities?"),
    ],
)
def test_impossible_files_are_refused(tmp_path, capsys, wrong, told):
    assert run(tmp_path, FILE.split("  streaming:", maxsplit=1)[0] + f"  streaming: {{{wrong}}}\n") == 2
    message = capsys.readouterr().err
    assert told in message
    assert message.count("\n") == 1
    assert not (tmp_path / "out").exists()


def test_a_wind_with_too_many_waves_of_the_dark_matter_is_refused(tmp_path, capsys):
    text = FILE.replace("sampling:", "  dark_matter: {sound_speed: 100 km/s, scaling: 1}\nsampling:")
    assert run(tmp_path, text.replace("20 1/Mpc, 100 1/Mpc, 300", "0.1")) == 2  # the scales of the wind go further
    message = capsys.readouterr().err
    assert "products.streaming.wind: at k = 10 1/Mpc sound waves of the dark matter" in message
    assert message.count("\n") == 1
