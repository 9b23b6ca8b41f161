"""The shipped gallery: remade from the scenario it carries, its numbers are the same."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from astropy.table import Table

from twofluid import compare, evolve, read_scenario
from twofluid.scenario import Sampling, scenario_from_mapping

ROOT = Path(__file__).parents[2]
GALLERY = ROOT / "figures"
REDSHIFTS = (1000.0, 300.0, 100.0, 30.0, 10.0, 1.0, 0.0)
# Of an amplitude, where it does not oscillate: straight lines in the logarithm between steps of up to 0.3 in ln a;
# the runs themselves are good to 1e-4.
TOLERANCE = 5e-3


@pytest.fixture(scope="module")
def shipped():
    return Table.read(GALLERY / "without-dark-matter" / "comparison-courses.ecsv")


@pytest.fixture(scope="module")
def remade(shipped):
    """Return both runs, made again from the header of the table, of the one mode that it tells."""
    sampling = Sampling((shipped["wavenumber"][0],), REDSHIFTS)
    asked = [scenario_from_mapping(own["scenario"]) for own in shipped.meta["scenarios"].values()]
    return compare([replace(scenario, sampling=sampling, products={}) for scenario in asked])


def course(table, label, name):
    """Interpolate the logarithm of one curve of the table to the redshifts; NaN at a change of sign."""
    part = table[table["scenario"] == label]
    steps = np.log1p(part["redshift"])[::-1]
    with np.errstate(invalid="ignore"):
        curve = np.log(np.asarray(part[name], dtype=float) * np.sign(part[name][-1]))[::-1]
    return np.sign(part[name][-1]) * np.exp(np.interp(np.log1p(REDSHIFTS), steps, curve))


def test_the_gallery_is_complete():
    for name in (
        "comparison-evolution",
        "comparison-lag",
        "without-dark-matter/comparison-evolution",
        "warm-dark-matter/comparison-lag",
        "mixture/comparison-lag",
        "heated/comparison-lag",
        "heated/comparison-evolution",
        "massive-neutrinos/comparison-matter",
    ):
        for form in ("pdf", "png"):
            assert (GALLERY / f"{name}.{form}").stat().st_size > 10_000  # bytes; an empty page has fewer


def test_remade_curves_agree_with_the_shipped_table(shipped, remade):
    assert remade.labels == ("baseline", "no dark matter")
    for label, history in zip(remade.labels, remade.histories, strict=True):
        ours = history.delta_baryon[0, 1:]
        assert course(shipped, label, "delta_baryon")[1:] == pytest.approx(ours, rel=TOLERANCE)
    assert course(shipped, "baseline", "delta_dark") == pytest.approx(remade.histories[0].delta_dark[0], rel=TOLERANCE)
    assert shipped["delta_dark"].mask.tolist() == (shipped["scenario"] == "no dark matter").tolist()


def test_what_the_figure_is_shown_for_is_so(remade):
    """Without dark matter there is nothing to fall towards, and what the photons left has not made up for it."""
    with_dark, without = (history.delta_baryon[0] for history in remade.histories)
    dark = remade.histories[0].delta_dark[0]
    at_decoupling = REDSHIFTS.index(1000.0)
    # Silk damping: at k = 0.32/Mpc the plasma has kept less than one part in 200 of the curvature it began with, the
    # dark matter has grown to more than 50 times it.
    assert abs(without[at_decoupling]) < 1 / 200
    assert dark[at_decoupling] > 50
    # Two digits, as they are quoted with the figure.
    assert abs(without[-1] / with_dark[-1]) == pytest.approx(1.9e-4, rel=0.02, abs=0)
    assert with_dark[-1] / dark[-1] > 0.99


def test_the_scenario_in_the_gallery_is_the_shipped_one(shipped):
    for label, own in shipped.meta["scenarios"].items():
        path = ROOT / "scenarios" / f"saltmarsh-{label.replace(' ', '-')}.yaml"
        assert scenario_from_mapping(own["scenario"]) == read_scenario(path)


def test_gas_is_ahead_of_dark_matter_with_pressure_as_the_figure_shows():
    scenario = read_scenario(ROOT / "scenarios" / "saltmarsh-warm-dark-matter.yaml")
    history = evolve(scenario, wavenumbers=[0.1, 10.0], redshifts=[100.0, 30.0, 0.0])
    ratio = history.delta_baryon / history.delta_dark
    # Two digits, as they are read off the figure.
    assert ratio[1] == pytest.approx([1.02, 1.40, 1.62], abs=0.01)
    assert ratio[0].max() < 1
    assert history.warnings == ()
