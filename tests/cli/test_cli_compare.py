"""The command that sets scenarios side by side, from end to end."""

import os
from pathlib import Path

import numpy as np
import pytest
from astropy.table import Table

import twofluid
from twofluid import cli
from twofluid.solver import SolverFailure

BASE = """\
title: base
cosmology:
  hubble_constant: 67.5 km/(s Mpc)
  baryon_density: 0.0223
  dark_matter_density: 0.1195
sampling:
  wavenumbers: [0.05 1/Mpc, 0.2 1/Mpc, 1 1/Mpc]
  redshifts: [100, 10, 0]
products:
  lag: {fractions: [0.5, 0.9]}
"""
BARE = "base: base.yaml\ncosmology: {dark_matter_density: 0}\n"
HEAVY = "base: base.yaml\ntitle: heavy\ncosmology: {neutrinos: {masses: [0.1 eV]}}\n"
HALF = "base: base.yaml\ntitle: half\ncosmology: {dark_matter_density: 0.06}\n"
STEMS = ("catchup", "courses", "differences", "evolution", "lag")
OUTPUTS = sorted(
    [f"comparison-{stem}.ecsv" for stem in STEMS]
    + [f"comparison-{stem}.{form}" for stem in ("differences", "evolution", "lag") for form in ("pdf", "png")]
)


@pytest.fixture(scope="module")
def files(tmp_path_factory):
    place = tmp_path_factory.mktemp("scenarios")
    for name, text in (("base", BASE), ("bare", BARE), ("half", HALF), ("heavy", HEAVY)):
        (place / f"{name}.yaml").write_text(text)
    return place


@pytest.fixture(scope="module")
def finished(files):
    """Output directory of one comparison, only to be read."""
    names = [files / f"{name}.yaml" for name in ("base", "bare", "half")]
    assert run("compare", *names, "--out", files / "out") == 0
    return files / "out"


@pytest.fixture
def nothing_solved(monkeypatch):
    """Let the test fail if anything is solved."""

    def evolve(*arguments, **options):
        raise AssertionError("solved, though the request should have been refused")

    monkeypatch.setattr("twofluid.comparison.evolve_many", evolve)


@pytest.fixture
def unsaved(monkeypatch):
    """Save time where figures do not matter: they are drawn but not rendered."""
    monkeypatch.setattr("twofluid.registry.figure_bytes", lambda *arguments: b"figure")


def run(*arguments, certificate=False):
    """Run the program, without a certificate where nothing depends on it: that saves time."""
    if arguments[:1] in (("run",), ("compare",)) and not certificate:
        arguments = (*arguments, "--no-certificate")
    return cli.main([str(argument) for argument in arguments])


def refused(files, tmp_path, capsys, other, *told):
    """Compare the base with another text; check that one clear error is all that comes of it."""
    path, out = files / "other.yaml", tmp_path / "results"
    path.write_text(other)
    assert run("compare", files / "base.yaml", path, "--out", out) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert shown.err.startswith("twofluid: error: ")
    assert shown.err.count("\n") == 1
    for text in told:
        assert text in shown.err
    assert not out.exists()


def test_everything_is_written(finished):
    assert sorted(os.listdir(finished)) == OUTPUTS


def test_tables_hold_every_run_as_it_is_alone(files, finished):
    table = Table.read(finished / "comparison-evolution.ecsv")
    for label, name in (("base", "base"), ("bare", "bare"), ("half", "half")):
        history = twofluid.evolve(twofluid.read_scenario(files / f"{name}.yaml"))
        part = table[table["scenario"] == label]
        assert np.array_equal(part["delta_baryon"], history.delta_baryon.ravel())  # every bit
    assert table.meta["scenarios"]["half"]["scenario"]["cosmology"]["dark_matter_density"] == 0.06
    assert table.meta["closure"] == "kinetic"


def test_without_dark_matter_the_lag_is_empty_and_the_reason_said(finished):
    table = Table.read(finished / "comparison-lag.ecsv")
    assert table["ratio"].mask.tolist() == (table["scenario"] == "bare").tolist()
    assert "no dark matter" in table.meta["scenarios"]["bare"]["no_dark_matter"]


def test_the_summary_says_what_differs_and_what_that_does(files, tmp_path, capsys, unsaved):
    assert run("compare", files / "base.yaml", files / "half.yaml", "--out", tmp_path / "out") == 0
    shown = capsys.readouterr()
    assert shown.err == ""  # no terminal, so no progress
    lines = [line.split() for line in shown.out.splitlines()]
    assert ["cosmology.dark_matter_density", "0.1195", "0.06"] in lines
    (filled,) = [words for words in lines if words[0] == "cosmology.cosmological_constant_fraction"]
    scenarios = [twofluid.read_scenario(files / f"{name}.yaml") for name in ("base", "half")]
    shares = [twofluid.Universe(scenario.cosmology).density_fraction("constant", 1.0) for scenario in scenarios]
    expected = [f"{share:.4g}" for share in shares]
    assert filled[1:] == [expected[0], "(fills)", expected[1], "(fills)"]
    assert not any("hubble" in line for line in shown.out.splitlines())
    catchup = Table.read(tmp_path / "out" / "comparison-catchup.ecsv")
    at_one = catchup[catchup["wavenumber"] == 1]
    assert ["k", "=", "1", "1/Mpc", *(f"{z:.5g}" for z in at_one["redshift_at_50_percent"])] in lines


def test_a_cut_sampling_is_announced(files, tmp_path, capsys, unsaved):
    path = files / "narrow.yaml"
    sampling = "sampling: {wavenumbers: [0.1 1/Mpc, 1 1/Mpc], redshifts: [10, 5]}\n"
    path.write_text("base: base.yaml\nproducts: {}\n" + sampling)
    assert run("compare", files / "base.yaml", path, "--out", tmp_path / "out") == 0
    shown = capsys.readouterr().out
    assert "note: 2 of the 3 wavenumbers of 'base' are compared" in shown
    assert "note: the redshifts compared are those every scenario asks for: 10" in shown
    assert "note: products not every scenario asks for are left out: lag" in shown
    table = Table.read(tmp_path / "out" / "comparison-evolution.ecsv")
    assert sorted(set(table["wavenumber"])) == [0.2, 1]
    assert not (tmp_path / "out" / "comparison-lag.ecsv").exists()


def test_the_first_may_be_the_one_without_dark_matter(files, tmp_path, capsys, unsaved):
    for other in ("base", "poor"):
        (files / "poor.yaml").write_text("base: bare.yaml\ncosmology: {baryon_density: 0.02}\n")
        out = tmp_path / other
        out.mkdir()
        (out / "comparison-lag.pdf").write_text("figure of an earlier comparison")
        assert run("compare", files / "bare.yaml", files / f"{other}.yaml", "--out", out, "--overwrite") == 0
        assert (out / "comparison-lag.pdf").exists() == (other == "base")
        assert (out / "comparison-evolution.pdf").exists()
    assert "nan" not in capsys.readouterr().out


@pytest.mark.parametrize(
    ("other", "told"),
    [
        ("base: base.yaml\nsampling: {wavenumbers: [20 1/Mpc, 30 1/Mpc]}\n", ["no wavenumber of 'base'", "20 to 30"]),
        ("base: base.yaml\nsampling: {redshifts: [50]}\n", ["no redshift of 'base'"]),
        ("base: base.yaml\nsampling: {redshifts: [2000000]}\n", ["other.yaml:2: sampling.redshifts", "out of range"]),
        ("base: base.yaml\ncosmology: {dark_matter_density: -0.1}\n",
         ["other.yaml:2: cosmology.dark_matter_density = -0.1", "out of range"]),
        ("base: none.yaml\n", ["other.yaml:1: base = none.yaml", "does not exist"]),
        # Too much constant for its matter: this universe never was dense.
        ("base: base.yaml\ncosmology: {cosmological_constant_fraction: 1.9}\n", ["other.yaml: ", "does not expand"]),
        ("base: base.yaml\ncosmology: {photon_temperature: 29 K}\n", ["other.yaml: "]),
        (BASE, ["is given twice"]),
    ],
)  # fmt: skip
def test_bad_requests_are_one_clear_error(files, tmp_path, capsys, nothing_solved, other, told):
    if other == BASE:
        assert run("compare", files / "base.yaml", files / "base.yaml", "--out", tmp_path / "results") == 2
        assert "is given twice" in capsys.readouterr().err
        assert not (tmp_path / "results").exists()
        return
    refused(files, tmp_path, capsys, other, *told)


def test_one_file_is_not_enough(files, tmp_path, capsys, nothing_solved):
    assert run("compare", files / "base.yaml", "--out", tmp_path / "out") == 2
    assert capsys.readouterr().err == "twofluid: error: compare: a comparison needs at least two scenarios\n"
    assert not (tmp_path / "out").exists()


def test_existing_outputs_are_refused_before_solving(files, tmp_path, capsys, nothing_solved):
    (tmp_path / "comparison-lag.ecsv").write_text("precious")
    assert run("compare", files / "base.yaml", files / "half.yaml", "--out", tmp_path) == 2
    assert "already holds comparison-lag.ecsv; add --overwrite" in capsys.readouterr().err
    assert os.listdir(tmp_path) == ["comparison-lag.ecsv"]


def test_a_failure_is_status_one_with_its_sentence(files, tmp_path, capsys, monkeypatch):
    def integrate(*arguments):
        raise SolverFailure("the solution is no longer finite", mode=0, time=300.0)

    monkeypatch.setattr("twofluid.evolution.integrate", integrate)
    assert run("compare", files / "base.yaml", files / "half.yaml", "--out", tmp_path / "out") == 1
    assert capsys.readouterr().err.startswith("twofluid: error: base: the integration failed at k = ")
    assert not (tmp_path / "out").exists()


def test_a_full_disk_is_status_one_and_an_interrupt_130(files, tmp_path, capsys, monkeypatch, unsaved):
    def stop(error):
        def raises(*arguments, **options):
            raise error

        return raises

    out = tmp_path / "out"
    monkeypatch.setattr("twofluid.files.os.fsync", stop(OSError(28, "No space left on device")))
    assert run("compare", files / "base.yaml", files / "half.yaml", "--out", out) == 1
    assert f"cannot write {out / 'comparison-evolution.ecsv'}: No space left" in capsys.readouterr().err
    assert os.listdir(out) == []
    monkeypatch.setattr("twofluid.comparison.evolve_many", stop(KeyboardInterrupt()))
    assert run("compare", files / "base.yaml", files / "half.yaml", "--out", tmp_path / "other") == 130
    assert not Path(tmp_path / "other").exists()


def test_a_comparison_with_massive_neutrinos_draws_the_matter(files, tmp_path):
    assert run("compare", files / "base.yaml", files / "heavy.yaml", "--out", tmp_path, "--no-certificate") == 0
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(
        [*OUTPUTS, "comparison-matter.pdf", "comparison-matter.png"]
    )


def test_massive_neutrinos_in_the_small_model_are_refused(files, tmp_path, capsys, nothing_solved):
    small = files / "small.yaml"
    small.write_text("base: heavy.yaml\nmethod: {closure: sound-speed}\n")
    assert run("compare", files / "base.yaml", small, "--out", tmp_path / "out") == 2
    assert "method.closure = sound-speed follows neutrinos without mass only" in capsys.readouterr().err
    assert not (tmp_path / "out").exists()
