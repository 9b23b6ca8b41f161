"""Gas and plasma: weights, sound speeds, exchange rates."""

import numpy as np
import pytest

from twofluid.universe.constants import MEGAYEAR_PER_MEGAPARSEC
from twofluid.universe.gas import Baryons

LIGHT = 299792.458  # [km/s]


def test_compton_rate_today():
    # 8 sigma_T a_R T_0^4/(3 m_e c) = 8.558e-13/yr at 2.7255 K, recomputed from CODATA; Naoz & Barkana 2005
    # give 8.55e-13/yr. Per electron's share of the particles.
    gas = Baryons(density=0.0224, helium_mass_fraction=0.25, photon_temperature=2.7255)
    share = 0.3 / (1.3 + gas.helium_per_hydrogen)
    per_year = gas.compton_rate(1.0, 0.3) / share / MEGAYEAR_PER_MEGAPARSEC / 1e6
    assert per_year == pytest.approx(8.558e-13, rel=2e-4)


def test_compton_rate_scales_with_temperature_and_epoch():
    # (1 + z)^4 in proper time is (1 + z)^3 in conformal time
    cold, warm = (Baryons(0.0224, 0.25, temperature) for temperature in (2.0, 4.0))
    assert warm.compton_rate(1.0, 0.3) == pytest.approx(16.0 * cold.compton_rate(1.0, 0.3), rel=1e-12)
    assert cold.compton_rate(0.01, 0.3) == pytest.approx(1e6 * cold.compton_rate(1.0, 0.3), rel=1e-12)


def test_scattering_rate_today_if_all_were_ionized():
    # Hydrogen alone: sigma_T omega_b rho_crit/m_H, with 3 (100 km/s/Mpc)^2/(8 pi G) = 1.87834e-26 kg/m^3 and
    # m_H = 1.67353e-27 kg, times 3.0856776e22 m
    gas = Baryons(density=0.02, helium_mass_fraction=0.0, photon_temperature=2.7)
    expected = 0.02 * 1.87834e-26 / 1.67353e-27 * 6.6524587e-29 * 3.0856776e22
    assert gas.scattering_rate(1.0, 1.0) == pytest.approx(expected, rel=2e-5)
    assert gas.scattering_rate(0.1, 0.5) == pytest.approx(50.0 * expected, rel=2e-5)


def test_helium_per_hydrogen():
    # Y = 0.24539 is n_He/n_H = 0.08188 (nucleon fraction 0.24672)
    assert Baryons(0.0224, 0.24539, 2.7255).helium_per_hydrogen == pytest.approx(0.08188, rel=1e-4)


def _mean_weight(electrons):
    gas = Baryons(density=0.0224, helium_mass_fraction=0.24, photon_temperature=2.7255)
    # k/(m_H c^2) with m_H = 1.6735328e-27 kg [1/K]
    return 1.380649e-23 / 1.6735328e-27 / 299792458.0**2 / gas.isothermal_sound_speed_squared(1.0, electrons)


def test_mean_weight_of_neutral_gas():
    # mu = 1.22 for neutral primordial gas (common practice, no source)
    assert _mean_weight(0.0) == pytest.approx(1.22, abs=0.005)


def test_mean_weight_of_ionized_gas():
    # mu = 0.59 when fully ionized (common practice, no source)
    assert _mean_weight(1.0 + 2.0 * 0.0795) == pytest.approx(0.59, abs=0.005)


def test_isothermal_sound_speed_after_recombination(planck):
    # kT/(mu m_H) at z = 1020, mu = 1.22: 4.34 km/s, with gamma = 5/3 5.60 km/s (recomputed); about 6 km/s in
    # Tseliakhovich & Hirata 2010
    speed = planck.isothermal_sound_speed(1.0 / 1021.0) * LIGHT
    assert speed == pytest.approx(4.34, rel=0.03)  # 6 per cent of electrons add to the particles
    assert np.sqrt(5.0 / 3.0) * speed == pytest.approx(5.60, rel=0.03)


@pytest.mark.parametrize(("redshift", "factor"), [(1e6, 4.0 / 3.0), (3000.0, 4.0 / 3.0), (0.0, 5.0 / 3.0)])
def test_gas_sound_speed_limits(redshift, factor, planck):
    # c_s^2 = (kT/mu m_H)(1 - (1/3) dlnT/dlna): 4/3 while T ~ 1/a, 5/3 once T ~ a^-2
    a = 1.0 / (1.0 + redshift)
    ratio = (planck.gas_sound_speed(a) / planck.isothermal_sound_speed(a)) ** 2
    assert ratio == pytest.approx(factor, rel=2e-4)


def test_momentum_ratio(planck):
    # Eisenstein & Hu 1998, eq. 5 (number from memory), constant recomputed: 31.490 omega_b/Theta^4 at z = 999
    theta = 2.7255 / 2.7
    expected = 31.490 * 0.02237 / theta**4
    assert planck.momentum_ratio(1e-3) == pytest.approx(expected, rel=2e-4)


def test_plasma_sound_speed(planck):
    # 1/sqrt(3) while radiation dominates its inertia, slower by 1/sqrt(1 + R) later
    assert planck.plasma_sound_speed(1e-10) == pytest.approx(3.0**-0.5, rel=1e-6)
    ratio = planck.momentum_ratio(1e-3)
    assert planck.plasma_sound_speed(1e-3) == pytest.approx(1.0 / np.sqrt(3.0 * (1.0 + ratio)), rel=1e-12)
