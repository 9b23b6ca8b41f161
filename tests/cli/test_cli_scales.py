"""Scales and verdicts from a file to files."""

import os

import numpy as np
import pytest
from astropy.table import Table

from twofluid import cli

FILE = """\
title: Saltmarsh tiny
cosmology:
  hubble_constant: 67.5 km/(s Mpc)
  baryon_density: 0.0223
  dark_matter_density: 0.1195
sampling:
  wavenumbers: [0.001 1/Mpc, 0.1 1/Mpc, 1 1/Mpc, 200 1/Mpc, 5000 1/Mpc]
  redshifts: [2000, 300, 50, 5]
products:
  scales: {mass_radius: 1, together: 0.97, map_from: 1000}
"""


def run(place, text):
    (place / "tiny.yaml").write_text(text)
    return cli.main(["run", str(place / "tiny.yaml"), "--out", str(place / "out"), "--no-certificate"])


@pytest.fixture(scope="module")
def finished(tmp_path_factory):
    place = tmp_path_factory.mktemp("scales")
    assert run(place, FILE) == 0
    return place / "out"


def test_tables_and_figure_are_written_and_nothing_of_the_map(finished):
    assert sorted(os.listdir(finished)) == ["evolution.ecsv", "scales.ecsv", "scales.pdf", "scales.png", "verdict.ecsv"]


def test_tables_stand_at_the_asked_redshifts_with_the_asked_options(finished):
    scales, verdict = Table.read(finished / "scales.ecsv"), Table.read(finished / "verdict.ecsv")
    assert scales["redshift"].tolist() == [2000, 300, 50, 5]
    assert scales.meta["mass_radius"] == 1.0
    assert verdict.meta["together"] == 0.97
    found = {(row["wavenumber"], row["redshift"]): row["verdict"] for row in verdict}
    assert len(found) == 20
    assert found[0.001, 2000] == "larger than the horizon"
    assert found[0.1, 2000] == "oscillates with the plasma"
    assert found[1, 300] == "falls in"
    assert found[5000, 50] == "held up by pressure"
    assert found[1, 5] == "grows"


def test_summary_shows_masses_and_verdicts(tmp_path, capsys):
    assert run(tmp_path, FILE.replace("mass_radius: 1", "mass_radius: 0.5")) == 0
    shown = capsys.readouterr().out
    scales = Table.read(tmp_path / "out" / "scales.ecsv")
    assert f"{scales['jeans_mass'][1]:.3g}" in shown
    assert np.ma.is_masked(scales["filtering_mass_two_fluids"][0])
    (line,) = [line for line in shown.splitlines() if line.startswith("    filtering")]
    assert line.split()[1] == "-"  # not before the drag epoch
    (line,) = [line for line in shown.splitlines() if line.startswith("    k = 1 ")]
    assert line.split()[-4:] == ["damped", "falls", "falls", "grows"]
    assert "the Jeans criterion agrees with" in shown


@pytest.mark.parametrize(
    ("wrong", "told"),
    [
        ("mass_radius: 2", "products.scales.mass_radius = 2"),
        ("together: 1", "products.scales.together = 1"),
        ("map_from: 0", "products.scales.map_from = 0"),
        ("mapfrom: 10", "did you mean map_from?"),
    ],
)
def test_impossible_options_are_refused(tmp_path, capsys, wrong, told):
    assert run(tmp_path, FILE.split("  scales:", maxsplit=1)[0] + f"  scales: {{{wrong}}}\n") == 2
    message = capsys.readouterr().err
    assert told in message
    assert message.count("\n") == 1
    assert not (tmp_path / "out").exists()
