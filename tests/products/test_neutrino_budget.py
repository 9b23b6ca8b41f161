"""Neutrinos with mass: the matter budget of a real universe, and what mass does to growth."""

from functools import cache

import numpy as np
import pytest

from twofluid import evolve, evolve_many
from twofluid.products import sigma_8
from twofluid.scenario import Cosmology, Neutrinos, Primordial, Sampling, Scenario
from twofluid.universe import Universe

HUBBLE, BARYONS, DARK = 67.32, 0.022383, 0.12011  # Planck 2018 VI, table 1, best fit, with A_s and n_s below
PRIMORDIAL = Primordial(2.1006e-9, 0.96605, 0.05)
NEUTRINO_DENSITY = 93.12  # [eV] over Omega h^2 of one species, for 3.046 shared by three; from memory, to 2e-3
WAVENUMBERS = (3e-3, 0.01, 0.1, 0.3, 1.0, 5.0)


def scenario(masses=(), dark=DARK):
    cosmology = Cosmology(HUBBLE, BARYONS, dark, neutrinos=Neutrinos(3.046, masses))
    return Scenario("Saltmarsh test", cosmology, PRIMORDIAL, Sampling((0.1,), (0.0,)))


@cache
def power(masses=(), total=0.0):
    """Power of all matter today over the primordial, the sum of dark matter and neutrinos kept."""
    history = evolve(scenario(masses, DARK - total / NEUTRINO_DENSITY), wavenumbers=WAVENUMBERS, redshifts=[0.0])
    return history.delta_matter[:, 0] ** 2


def matter_fraction(universe):
    return 1.0 - sum(universe.density_fraction(species, 1.0) for species in ("constant", "photon", "neutrino"))


def test_sigma_8_of_planck_from_the_published_parameters_alone():
    # Planck 2018 VI, table 1, best fit: sigma_8 = 0.8120, S_8 = 0.8331, one neutrino of 0.06 eV. Four digits are given,
    # and the reionization of the original has no part in either.
    history = evolve(scenario((0.06,)), wavenumbers=np.geomspace(1e-4, 20.0, 120), redshifts=[0.0])
    value, _ = sigma_8(history)
    value = float(np.squeeze(value))
    assert value == pytest.approx(0.8120, rel=1e-3)
    assert value * np.sqrt(matter_fraction(history.universe) / 0.3) == pytest.approx(0.8331, rel=1e-3)
    massless, _ = sigma_8(evolve(scenario(), wavenumbers=np.geomspace(1e-4, 20.0, 120), redshifts=[0.0]))
    assert abs(float(np.squeeze(massless)) / 0.8120 - 1.0) > 0.01  # control: mass is noticed


def test_matter_fraction_of_planck():
    # The same table: Omega_m = 0.3158, neutrino included.
    assert matter_fraction(Universe(scenario((0.06,)).cosmology)) == pytest.approx(0.3158, abs=1e-4)


@pytest.mark.parametrize("mass", [0.06, 0.3])
def test_small_scales_lose_eight_times_the_share_of_neutrinos(mass):
    # Hu, Eisenstein & Tegmark 1998 (from memory): -8 f_nu for small f_nu; the factor creeps with scale, mass and epoch.
    share = mass / NEUTRINO_DENSITY / (BARYONS + DARK)
    loss = power((mass,), mass) / power() - 1.0
    assert np.all((loss[2:4] / share > -9.0) & (loss[2:4] / share < -7.0))  # at 0.1 and 0.3/Mpc
    assert abs(loss[0]) < 1.2 * share  # scales larger than free streaming keep their power


def test_three_light_neutrinos_against_one_of_the_same_sum():
    # Lighter ones become slow later: they stream further, so power is lost on larger scales, and they were
    # radiation for longer, so that less of the time of growth was spent with them as matter that does not cluster.
    three_over_one = power((0.1, 0.1, 0.1), 0.3) / power((0.3,), 0.3)
    assert three_over_one[1] < 0.98
    assert np.all(three_over_one[3:] > 1.01)


def test_neutrinos_cluster_on_large_scales_and_not_on_small_ones():
    history = evolve(scenario((0.3,)), wavenumbers=[1e-3, 5.0], redshifts=[0.0])
    ratio = history.delta_neutrino[:, 0] / history.delta_dark[:, 0]
    assert ratio[0] == pytest.approx(1.0, abs=0.01)
    assert abs(ratio[1]) < 0.01


def test_constraint_and_expansion_with_masses():
    from astropy import units
    from astropy.cosmology import FlatLambdaCDM

    history = evolve(scenario((0.06,)), wavenumbers=[0.01, 0.3, 10.0], redshifts=[0.0])
    massless = evolve(scenario(), wavenumbers=[0.01, 0.3, 10.0], redshifts=[0.0])
    assert np.all(history.constraint < 3.0 * massless.constraint + 1e-5)
    matter = (BARYONS + DARK) / (HUBBLE / 100.0) ** 2
    other = FlatLambdaCDM(HUBBLE, matter, Tcmb0=2.7255, Neff=3.046, m_nu=[0.0, 0.0, 0.06] * units.eV)
    universe = history.universe
    for redshift in (0.5, 10.0, 300.0, 1100.0):
        a = 1.0 / (1.0 + redshift)
        # astropy fits the Fermi-Dirac integral to some 1e-3 of the neutrinos, 1e-5 of the whole.
        rate = universe.conformal_hubble_rate(a) / a / universe.conformal_hubble_rate(1.0)
        assert rate == pytest.approx(other.efunc(redshift), rel=1e-4)
        assert universe.age(a) == pytest.approx(other.age(redshift).to_value("Myr"), rel=1e-4)


def test_universes_with_masses_side_by_side():
    asked = [scenario((0.06,)), scenario((0.1, 0.1)), scenario()]
    together = evolve_many(asked, wavenumbers=[0.02, 1.0], redshifts=[10.0, 0.0])
    for history, alone in zip(together, asked, strict=True):
        expected = evolve(alone, wavenumbers=[0.02, 1.0], redshifts=[10.0, 0.0])
        np.testing.assert_allclose(history.delta_matter, expected.delta_matter, rtol=1e-9)


def test_more_than_three_masses_are_refused():
    from twofluid.scenario import ScenarioError, scenario_from_mapping

    with pytest.raises(ScenarioError, match="masses"):
        scenario_from_mapping(scenario((0.1, 0.1, 0.1, 0.1)).to_mapping())


def test_without_masses_nothing_is_added():
    plain = evolve(scenario(), wavenumbers=[0.1], redshifts=[0.0])
    assert plain.delta_neutrino is None
    massive = evolve(scenario((0.06,)), wavenumbers=[0.1], redshifts=[0.0])
    assert massive.delta_neutrino.shape == (1, 1)
    assert massive.counts["steps"] >= plain.counts["steps"] > 0
