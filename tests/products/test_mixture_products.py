"""Every product of a mixture with independent parts: sums of powers, and b as cross-power over power."""

from dataclasses import replace

import numpy as np
import pytest
from standard_universe import standard_scenario

from twofluid import evolve
from twofluid.products import (
    catchup_table,
    contrast_table,
    evolution_table,
    growth_table,
    lag_table,
    parts_table,
    scales_table,
    shortfall_table,
    spheres_table,
    verdict_table,
)
from twofluid.products.matter import contrast_courses, contrasts_at, contrasts_of
from twofluid.products.sphere_filter import SphereFilter
from twofluid.registry import PRODUCTS, make_outputs, output_names
from twofluid.scenario import Mixture, Primordial, Share
from twofluid.streaming import find_wind, follow_patches

REDSHIFTS = (1000.0, 100.0, 10.0, 0.0)


def mixture_scenario(correlation, **products):
    mixture = Mixture(1.0, compensated=Share(20.0, correlation=correlation), neutrino_density=Share(0.5, 1.0))
    return replace(standard_scenario(), primordial=Primordial(mixture=mixture), products=products)


@pytest.fixture(scope="module")
def partly():
    return evolve(mixture_scenario(0.5), wavenumbers=np.geomspace(0.003, 10.0, 41), redshifts=REDSHIFTS)


@pytest.fixture(scope="module")
def fully():
    return evolve(mixture_scenario(1.0), wavenumbers=[0.01, 0.3, 10.0], redshifts=REDSHIFTS)


def total(history, name):
    """Power of a quantity, all parts together."""
    return sum(getattr(part, name) ** 2 for part in history.parts).ravel()


def test_ratio_is_cross_power_over_power(partly):
    assert len(partly.parts) == 2
    cross = sum(part.delta_baryon * part.delta_dark for part in partly.parts).ravel()
    np.testing.assert_allclose(lag_table(partly)["ratio"], cross / total(partly, "delta_dark"), rtol=1e-10)
    ratio = (cross / total(partly, "delta_dark")).reshape(41, 4)
    found = catchup_table(partly, [0.9])
    np.testing.assert_allclose(found["ratio_today"], ratio[:, -1], rtol=1e-10)
    redshift = found["redshift_at_90_percent"]
    assert np.sum(np.isfinite(redshift)) > 30
    for mode in np.flatnonzero(np.isfinite(redshift)):
        at = {name: [part.at(name, redshift[mode])[mode, 0] for part in partly.parts] for name in
              ("delta_dark", "delta_baryon")}  # fmt: skip
        b = np.dot(at["delta_baryon"], at["delta_dark"]) / np.dot(at["delta_dark"], at["delta_dark"])
        assert b == pytest.approx(0.9, abs=2e-3)  # interpolated apart and together


def test_rms_contrasts_add_in_quadrature(partly):
    table = contrast_table(partly)
    root = np.repeat(np.sqrt(partly.scenario.primordial.power(partly.wavenumber)), len(REDSHIFTS))
    np.testing.assert_allclose(table["rms_dark"], root * np.sqrt(total(partly, "delta_dark")), rtol=1e-10)
    np.testing.assert_allclose(table["rms_baryon"], root * np.sqrt(total(partly, "delta_baryon")), rtol=1e-10)
    # What the evolution table has of the baryons is less: what goes along with the dark matter.
    along = np.abs(evolution_table(partly)["delta_baryon"])
    assert np.all(along <= np.sqrt(total(partly, "delta_baryon")) * (1 + 1e-12))
    assert np.min(along / np.sqrt(total(partly, "delta_baryon"))) < 0.5


def test_variance_in_spheres_is_that_of_the_parts(partly):
    whole = spheres_table(partly, radii=[8.0])
    sphere = SphereFilter(partly.wavenumber, partly.scenario.primordial, [8.0])
    for fluid in ("dark", "baryon", "matter"):
        variance = sum(sphere.rms(contrasts_of(part)[fluid]).value[0] ** 2 for part in partly.parts)
        sigma = np.ma.asarray(whole[f"sigma_{fluid}"])
        assert sigma.count() >= 3  # of the baryons at first the run does not reach far enough
        # 2e-3: splines through the rms and through each part.
        np.testing.assert_allclose(sigma.compressed(), np.sqrt(variance)[~np.ma.getmaskarray(sigma)], rtol=2e-3)


def test_growth_is_that_of_the_rms(partly):
    table = growth_table(partly, reference_redshift=100.0)
    rms = np.sqrt(total(partly, "delta_baryon")).reshape(41, 4)
    np.testing.assert_allclose(table["growth_baryon"], (rms / rms[:, [1]]).ravel(), rtol=1e-10)
    contrast, slope = contrasts_at(partly, [30.0])
    (later, _), (earlier, _) = (contrasts_at(partly, [np.expm1(np.log(31.0) - step)]) for step in (1e-4, -1e-4))
    for fluid in ("dark", "baryon", "matter"):
        np.testing.assert_allclose(slope[fluid], (later[fluid] - earlier[fluid]) / 2e-4, rtol=1e-3)
        assert np.all(contrast[fluid] > 0.0)


def test_shortfall_follows_the_rms(partly):
    found = shortfall_table(partly, 7.5, radii=[8.0])
    there = np.asarray(found["rms_at_decoupling"]).reshape(-1, 3)[:41, 1]
    drag = partly.universe.landmarks.drag_redshift
    power = sum(part.at("delta_baryon", drag)[:, 0] ** 2 for part in partly.parts)
    root = np.sqrt(partly.scenario.primordial.power(partly.wavenumber))
    np.testing.assert_allclose(there, root * np.sqrt(power), rtol=1e-10)
    contrast, _ = contrast_courses(partly)
    assert np.all(contrast["baryon"] >= 0.0)


def test_streaming_velocity_adds_in_quadrature():
    wavenumbers = np.geomspace(0.001, 1.0, 61)
    run = evolve(mixture_scenario(0.5), wavenumbers=wavenumbers, redshifts=[1000.0])
    variance = sum(find_wind(part, [1000.0]).rms ** 2 for part in run.parts)
    assert find_wind(run, [1000.0]).rms == pytest.approx(np.sqrt(variance), rel=1e-10)


def test_verdicts_are_given_and_filtering_is_left_out_with_its_reason(partly):
    assert set(verdict_table(partly)["verdict"].filled("")) > {"larger than the horizon", "grows"}
    scales = scales_table(partly)
    assert np.all(scales["filtering_wavenumber"].mask)
    assert "the ratio has no plateau" in scales.meta["filtering"]


def test_header_says_what_the_mixture_is_and_what_amplitudes_mean(partly, fully, standard_run):
    words = evolution_table(partly).meta["mixture"]
    assert words[0].startswith("initial modes other than the adiabatic one alone: amplitudes are not per unit")
    assert words[1].startswith("its parts follow independent random fields: delta_dark is the rms")
    assert words[3].startswith("compensated: ratio 20 at 0.05 1/Mpc, tilt 0.965, correlation 0.5; baryons denser")
    assert not any("independent" in line for line in evolution_table(fully).meta["mixture"])
    assert "mixture" not in evolution_table(standard_run).meta


def test_parts_table_holds_each_part(partly):
    table = parts_table(partly)
    names = list(dict.fromkeys(table["part"]))
    assert names == ["adiabatic + compensated + neutrino_density", "compensated"]
    for name, part in zip(names, partly.parts, strict=True):
        rows = table[table["part"] == name]
        np.testing.assert_array_equal(rows["delta_baryon"], part.delta_baryon.ravel())
        np.testing.assert_array_equal(rows["wavenumber"], np.repeat(partly.wavenumber, len(REDSHIFTS)))
    assert table["theta_baryon"].unit == "1/Mpc"


def test_streaming_weighs_the_parts_by_their_power():
    mixture = Mixture(1.0, baryon=Share(100.0))  # of about the same power at that wavenumber
    scenario = replace(standard_scenario(), primordial=Primordial(mixture=mixture))
    run = evolve(scenario, wavenumbers=[30.0], redshifts=[1000.0])

    def suppression(part):
        found = follow_patches(part, [30.0], [1.0], lambda a: 1e-7 / a)
        return np.array([found.dark, found.baryon])[:, 0, 0, 0]

    both, *each = (suppression(part) for part in (run, *run.parts))
    assert np.all((both > np.min(each, axis=0)) & (both < np.max(each, axis=0)))
    assert np.all(np.abs(each[0] - each[1]) > 1e-3)


@pytest.mark.parametrize("name", [name for name in PRODUCTS if name != "streaming"])
def test_every_product_takes_independent_parts_without_dark_matter(name, bare_partly):
    product = PRODUCTS[name]
    material = product.prepare(bare_partly, {})
    tables = {stem: make(material, {}) for stem, make in product.tables.items()}
    assert all(len(table) and "mixture" in table.meta for table in tables.values())
    assert product.summary(tables)


@pytest.fixture(scope="module")
def bare_partly():
    mixture = Mixture(1.0, baryon=Share(20.0, correlation=-0.5))
    scenario = replace(standard_scenario(dark_matter_density=0.0), primordial=Primordial(mixture=mixture))
    return evolve(scenario, wavenumbers=np.geomspace(0.003, 0.3, 21), redshifts=REDSHIFTS)


def test_a_run_writes_its_parts(partly):
    outputs, _ = make_outputs(replace(partly, scenario=replace(partly.scenario, products={})))
    assert set(outputs) == {"evolution.ecsv", "parts.ecsv"}
    assert set(outputs) == set(output_names(replace(partly.scenario, products={})))


def test_fully_correlated_amplitudes_keep_their_signs(fully):
    assert fully.parts == (fully,)
    contrast, _ = contrasts_at(fully, [1000.0])
    np.testing.assert_allclose(contrast["baryon"][:, 0], fully.delta_baryon[:, 0], rtol=1e-10)
