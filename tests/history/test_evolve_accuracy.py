"""Whole runs against an independent integration, finer runs of our own, and the facts of the trade."""

from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace

import numpy as np
import pytest
from brute_force import DELTA_BARYON, DELTA_DARK, DELTA_GAS_TEMPERATURE, REDSHIFTS, WAVENUMBERS

from twofluid import evolve, evolve_many
from twofluid.fluids import ChainLengths, Resolution, Stepping
from twofluid.scenario import Cosmology, Method, Neutrinos, Primordial, Sampling, Scenario

FINER = Resolution(
    Stepping(
        outside_step=0.1,
        smooth_step=0.03,
        free_step=0.05,
        scattering_change=0.3,
        phase_step=0.35,
        diffusion_exponent=40.0,
        felt_phase=500.0,
    ),
    ChainLengths(photon=20, polarization=20, neutrino=30),
)


def scenario(effective_number=3.046, **changes):
    values = {"hubble_constant": 67.36, "baryon_density": 0.02237, "dark_matter_density": 0.12}
    values |= {"photon_temperature": 2.7255, "helium_mass_fraction": 0.2454}
    cosmology = Cosmology(**(values | changes), neutrinos=Neutrinos(effective_number=effective_number))
    sampling = Sampling(wavenumbers=(0.1,), redshifts=(0.0,))
    return Scenario("Saltmarsh test", cosmology, Primordial(), sampling, {}, (), None)


@pytest.fixture(scope="module")
def standard():
    return evolve(scenario(), wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS)


# Independent brute-force integration, good to a few 1e-5 (see brute_force.py).


def test_dark_matter_against_brute_force(standard):
    np.testing.assert_allclose(standard.delta_dark, DELTA_DARK, rtol=1e-4)


def test_baryon_ratio_against_brute_force(standard):
    found = standard.delta_baryon / standard.delta_dark
    np.testing.assert_allclose(found, DELTA_BARYON / DELTA_DARK, rtol=0.0, atol=4e-5)


def test_gas_temperature_against_brute_force(standard):
    scale = np.maximum(np.abs(DELTA_GAS_TEMPERATURE), np.abs(DELTA_BARYON))
    np.testing.assert_array_less(np.abs(standard.delta_gas_temperature - DELTA_GAS_TEMPERATURE) / scale, 5e-4)


def test_control_another_helium_fraction_is_noticed():
    history = evolve(scenario(helium_mass_fraction=0.24), wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS)
    found = history.delta_baryon / history.delta_dark
    assert np.abs(found - DELTA_BARYON / DELTA_DARK).max() > 4e-4


def test_control_a_short_neutrino_chain_is_noticed():
    resolution = Resolution(FINER.stepping, ChainLengths(10, 10, 5))
    history = evolve(scenario(), wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS, resolution=resolution)
    assert np.abs(history.delta_dark / DELTA_DARK - 1.0).max() > 4e-4


# Our own much finer run, in universes for which there is no other.

WITHOUT = np.geomspace(2e-3, 2.0, 30)
OTHERS = {
    "baryon-rich": (scenario(baryon_density=0.06, dark_matter_density=0.08), np.geomspace(2e-3, 1e4, 40)),
    "high radiation": (scenario(effective_number=10.0), np.geomspace(2e-3, 1e4, 40)),
    "no dark matter": (scenario(dark_matter_density=0.0), WITHOUT),
    "no dark matter, baryons instead": (scenario(baryon_density=0.14, dark_matter_density=0.0), WITHOUT),
}


@pytest.mark.parametrize("name", OTHERS)
def test_other_universes_against_a_finer_run(name):
    asked, wavenumbers = OTHERS[name]
    run, finer = (evolve(asked, wavenumbers=wavenumbers, redshifts=REDSHIFTS, resolution=r) for r in (None, FINER))
    # Without dark matter contrasts pass through zero: relative to the larger of both fluids, and for the dust that
    # carries the frame to 1 per cent of its largest value at least.
    dark = np.abs(finer.delta_dark)
    floor = 0.01 * dark.max(axis=1, keepdims=True)
    assert (np.abs(run.delta_dark - finer.delta_dark) / np.maximum(dark, floor)).max() < 3e-4
    larger = np.maximum(dark, np.abs(finer.delta_baryon))
    assert (np.abs(run.delta_baryon - finer.delta_baryon) / larger).max() < 2e-4
    if "no dark" not in name:
        np.testing.assert_allclose(
            run.delta_baryon / run.delta_dark, finer.delta_baryon / finer.delta_dark, rtol=0.0, atol=2e-4
        )


def test_finer_settings_shrink_the_error():
    # Convergence in step and chain length against the independent integration's own floor of a few 1e-5.
    coarse = Resolution(
        Stepping(
            outside_step=1.0,
            smooth_step=0.4,
            free_step=0.6,
            scattering_change=1.5,
            phase_step=2.5,
            diffusion_exponent=10.0,
            felt_phase=40.0,
        ),
        ChainLengths(photon=6, polarization=6, neutrino=7),
    )
    errors = []
    for resolution in (coarse, None, FINER):
        history = evolve(scenario(), wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS, resolution=resolution)
        errors.append(np.abs(history.delta_dark / DELTA_DARK - 1.0).max())
    assert errors[0] > 10.0 * errors[1]
    assert errors[2] < errors[1]


def test_results_do_not_depend_on_companions():
    wavenumbers = np.geomspace(1e-4, 1e5, 37)
    together = evolve(scenario(), wavenumbers=wavenumbers, redshifts=[1000.0, 10.0])
    for mode in (0, 18, 36):
        alone = evolve(scenario(), wavenumbers=wavenumbers[mode], redshifts=[1000.0, 10.0])
        for name in ("delta_dark", "delta_baryon", "theta_baryon"):
            np.testing.assert_allclose(getattr(alone, name)[0], getattr(together, name)[mode], rtol=1e-9)


def test_many_universes_in_one_sweep_are_what_each_is_alone():
    asked = [scenario(), scenario(baryon_density=0.03), scenario(dark_matter_density=0.1)]
    wavenumbers = np.geomspace(1e-3, 1e3, 9)
    alone = [evolve(one, wavenumbers=wavenumbers, redshifts=[1000.0, 10.0]) for one in asked]
    universes = [history.universe for history in alone]
    for given in (None, universes):
        together = evolve_many(asked, wavenumbers=wavenumbers, redshifts=[1000.0, 10.0], universes=given)
        for one, other in zip(alone, together, strict=True):
            np.testing.assert_allclose(other.delta_baryon, one.delta_baryon, rtol=1e-8)
    with pytest.raises(ValueError, match="3 scenarios need as many universes, got 2"):
        evolve_many(asked, wavenumbers=wavenumbers, universes=universes[:2])


def test_results_do_not_depend_on_other_threads():
    asked = [np.geomspace(0.01, 10.0, 5), np.geomspace(0.1, 100.0, 7)] * 2
    alone = [evolve(scenario(), wavenumbers=k, redshifts=[10.0]).delta_baryon for k in asked]
    with ThreadPoolExecutor(4) as pool:
        found = list(pool.map(lambda k: evolve(scenario(), wavenumbers=k, redshifts=[10.0]).delta_baryon, asked))
    for one, other in zip(alone, found, strict=True):
        np.testing.assert_array_equal(one, other)


def test_redshifts_that_are_one_to_the_clock():
    near = np.nextafter(1000.0, 2000.0)
    for closure in ("kinetic", "sound-speed"):
        asked = replace(scenario(), method=Method(closure))
        history = evolve(asked, wavenumbers=[0.1, 1.0], redshifts=[1000.0, near, 0.0])
        np.testing.assert_allclose(history.delta_dark[:, 0], history.delta_dark[:, 1], rtol=1e-12)
        expected = evolve(asked, wavenumbers=[0.1, 1.0], redshifts=[1000.0, 0.0]).delta_dark
        np.testing.assert_allclose(history.delta_dark[:, [0, 2]], expected, rtol=1e-6)


def test_every_wavenumber_from_the_smallest_to_the_largest_in_one_call():
    history = evolve(scenario(), wavenumbers=np.geomspace(1e-4, 1e5, 91), redshifts=[1000.0, 100.0, 0.0])
    assert np.all(np.isfinite(history.delta_baryon))
    assert np.all(np.diff(history.delta_dark[:, 0]) > 0.0)  # contrast grows with wavenumber, no mode out of line
    ratio = history.delta_baryon / history.delta_dark
    assert np.all(ratio[history.wavenumber > 1e4, 1] < 1e-2)  # held up by pressure


def test_einstein_constraint_along_the_run():
    history = evolve(scenario(), wavenumbers=np.geomspace(1e-4, 1e5, 46), redshifts=[0.0])
    assert history.constraint.max() < 6e-3
    assert history.constraint[history.wavenumber < 1.0].max() < 2e-4


def test_baryons_catch_up_late_and_sit_still_first(standard):
    # Common practice, no source: small scales start from rest at decoupling and need a factor of a few in expansion
    # to reach half, several tens for 95 per cent. Closed form of infall from rest: 0.736 at a/a_d = 10.
    ratio = standard.delta_baryon / standard.delta_dark
    at_ten = ratio[3:6, list(REDSHIFTS).index(100.0)]
    assert np.all(np.abs(at_ten - 0.736) < 0.05)  # decoupling takes time, some radiation is left


def test_curvature_is_warned_of_where_it_could_show():
    curved = scenario(curvature_fraction=0.01)
    assert not evolve(curved, wavenumbers=[1.0, 10.0], redshifts=[0.0]).warnings
    (warning,) = evolve(curved, wavenumbers=[1e-3, 10.0], redshifts=[0.0]).warnings
    assert warning.startswith("1 of 2 wavenumbers are below 0.00225 1/Mpc, not well inside the curvature radius")


def test_constraint_holds_in_a_curved_universe():
    history = evolve(scenario(curvature_fraction=-0.1), wavenumbers=[0.05, 1.0], redshifts=[0.0])
    assert history.constraint.max() < 2e-4


def test_cost_is_bounded_by_counts():
    history = evolve(scenario(), wavenumbers=np.geomspace(1e-4, 1e4, 64), redshifts=[1000.0, 0.0])
    assert history.counts["steps"] <= 170 * 64
    assert history.counts["lanes"] <= 1.6 * history.counts["steps"]
    assert history.counts["rate_evaluations"] == history.counts["factorizations"] <= 16
