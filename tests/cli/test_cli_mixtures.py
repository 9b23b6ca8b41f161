"""Mixtures of initial modes from a file to files."""

import os

import pytest
from astropy.table import Table

from twofluid import cli, read_scenario
from twofluid.comparison import input_differences

FILE = """\
title: Saltmarsh tiny
cosmology:
  hubble_constant: 67.5 km/(s Mpc)
  baryon_density: 0.0223
  dark_matter_density: 0.1195
primordial:
  mixture:
    compensated: {ratio: 10, correlation: 0.5}
sampling:
  wavenumbers: [0.01 1/Mpc, 0.1 1/Mpc, 1 1/Mpc]
  redshifts: [1000, 50, 0]
"""


@pytest.fixture
def file(tmp_path):
    (tmp_path / "tiny.yaml").write_text(FILE)
    return tmp_path / "tiny.yaml"


def test_run_writes_the_parts_and_says_what_it_started_from(file, capsys):
    assert cli.main(["run", str(file), "--out", str(file.parent / "out"), "--no-certificate"]) == 0
    assert {"evolution.ecsv", "parts.ecsv", "lag.ecsv", "lag.pdf"} <= set(os.listdir(file.parent / "out"))
    printed = capsys.readouterr().out
    assert "starts    adiabatic: ratio 1" in printed
    assert "compensated: ratio 10 at 0.05 1/Mpc, tilt 0.965, correlation 0.5" in printed
    table = Table.read(file.parent / "out" / "lag.ecsv")
    assert table.meta["scenario"]["primordial"]["mixture"]["compensated"]["ratio"] == 10.0


def test_fully_correlated_there_is_nothing_to_part(file):
    file.write_text(FILE.replace("correlation: 0.5", "correlation: -1") + "products: {}\n")
    assert cli.main(["run", str(file), "--out", str(file.parent / "out"), "--no-certificate"]) == 0
    assert "parts.ecsv" not in os.listdir(file.parent / "out")


def test_check_shows_the_mixture(file, capsys):
    assert cli.main(["check", str(file)]) == 0
    printed = capsys.readouterr().out
    assert "starts    adiabatic: ratio 1" in printed
    assert "primordial.mixture.compensated.tilt = that of primordial.tilt" in printed


def test_the_inputs_of_the_mixture_tell_scenarios_apart(file):
    other = file.parent / "other.yaml"
    other.write_text("base: tiny.yaml\ntitle: adiabatic\nprimordial: {mixture: null}\n")
    said = input_differences([read_scenario(other), read_scenario(file)])
    assert said == {
        "primordial.mixture.adiabatic": (None, 1.0),
        "primordial.mixture.compensated.ratio": (None, 10.0),
        "primordial.mixture.compensated.correlation": (None, 0.5),
    }


def test_an_impossible_mixture_is_status_two_and_nothing_is_written(file, capsys):
    file.write_text(FILE.replace("dark_matter_density: 0.1195", "dark_matter_density: 0"))
    assert cli.main(["run", str(file), "--out", str(file.parent / "out")]) == 2
    printed = capsys.readouterr()
    assert printed.err == (
        f"twofluid: error: {file}:8: primordial.mixture.compensated = {{ratio, correlation}}: needs dark matter, and "
        "cosmology.dark_matter_density is 0; remove it\n"
    )
    assert not (file.parent / "out").exists()
