"""Free electrons and gas temperature against independent integration, Saha's equation and published facts."""

import mpmath
import numpy as np
import pytest
from scipy import constants as codata

import twofluid.universe.ionization as ionization_module
from twofluid.universe import collocation
from twofluid.universe.expansion import Expansion
from twofluid.universe.gas import Baryons
from twofluid.universe.ionization import Ionization

# Independent brute-force integration of the same atom (factor 1.125, Lyman-alpha 121.567 nm, helium in Saha
# equilibrium, no reionization) for the cosmology of the fixture `planck`: redshift, electrons per hydrogen
# nucleus, gas temperature [K]
REFERENCE = np.array(
    [
        [1000.0, 0.0484466, 2728.12],
        [800.0, 0.00352576, 2181.29],
        [500.0, 0.000682637, 1347.99],
        [200.0, 0.00033708, 466.319],
        [100.0, 0.000272427, 167.633],
        [50.0, 0.000238453, 50.6646],
        [20.0, 0.000211739, 9.30911],
        [10.0, 0.000198665, 2.60245],
        [0.0, 0.000173709, 0.0217404],
    ]
)
SCALE_FACTORS = 1.0 / (1.0 + REFERENCE[:, 0])


def _ionization(cosmology, **options):
    baryons = Baryons(cosmology.baryon_density, cosmology.helium_mass_fraction, cosmology.photon_temperature)
    return Ionization(Expansion(cosmology), baryons, **options)


def test_electron_fraction_agrees_with_independent_integration(planck):
    # 1e-4: the reference has five to six digits
    np.testing.assert_allclose(planck.electron_fraction(SCALE_FACTORS), REFERENCE[:, 1], rtol=1e-4)


def test_gas_temperature_agrees_with_independent_integration(planck):
    np.testing.assert_allclose(planck.gas_temperature(SCALE_FACTORS), REFERENCE[:, 2], rtol=1e-5)


@pytest.mark.parametrize(
    ("change", "options"),
    [
        ({}, {"recombination_factor": 1.0}),
        ({"helium_mass_fraction": 0.0}, {}),
        ({"baryon_density": 0.0230}, {}),
    ],
)
def test_independent_integration_notices_another_atom_or_gas(change, options, make_cosmology):
    # Negative control: each of these must miss the reference by more than the 1 per cent asked of x_e
    found = _ionization(make_cosmology(**change), **options).electron_fraction(SCALE_FACTORS)
    assert np.max(np.abs(found / REFERENCE[:, 1] - 1.0)) > 0.02


def test_electron_fraction_without_correction_factor(make_cosmology):
    # F = 1.00, Planck best fit: an independent throw-away calculation with the same equations, three digits
    cosmology = make_cosmology(hubble_constant=67.32, baryon_density=0.022383, dark_matter_density=0.12011)
    found = _ionization(cosmology, recombination_factor=1.0)
    a = 1.0 / (1.0 + np.array([1000.0, 800.0, 500.0, 200.0, 100.0, 50.0, 20.0]))
    expected = [4.86e-2, 3.73e-3, 7.57e-4, 3.77e-4, 3.06e-4, 2.68e-4, 2.39e-4]
    np.testing.assert_allclose(found.electron_fraction(a), expected, rtol=3e-3)


def test_solution_converges_with_the_step(make_cosmology, monkeypatch):
    cosmology, a = make_cosmology(), np.geomspace(1e-5, 1.0, 5000)
    errors, exact = [], None
    for step in (1.25e-3, 5e-3, 1e-2):
        monkeypatch.setattr(ionization_module, "STEP", step)
        found = _ionization(cosmology).electron_fraction(a)
        exact = found if exact is None else exact
        errors.append(np.max(np.abs(found / exact - 1.0)))
    assert errors[1] < 2e-7  # what the documented step promises
    assert errors[2] > 8.0 * errors[1]  # fourth order: 16, rounded down for safety


def test_few_newton_steps_suffice(make_cosmology, monkeypatch):
    # Cost guarded by count
    calls, original = [], collocation._newton_change
    monkeypatch.setattr(collocation, "_newton_change", lambda *a: calls.append(1) or original(*a))
    _ionization(make_cosmology())
    assert len(calls) <= 5


def _saha_electrons(temperature, baryons, scale):
    """Charge balance of hydrogen and helium in Saha equilibrium, by bisection in high precision."""
    quantum = (2 * mpmath.pi * codata.m_e * codata.k * temperature / mpmath.mpf(codata.h) ** 2) ** 1.5
    hydrogen = baryons.hydrogen_density / scale**3
    helium = baryons.helium_per_hydrogen

    def law(weight, volts):  # ion times electron over atom, per hydrogen nucleus
        return weight * quantum * mpmath.exp(-volts * codata.e / (codata.k * temperature)) / hydrogen

    # binding energies: NIST atomic spectra database; weights 2 g(ion)/g(atom)
    h, he, ion = law(1, 13.598434599702), law(4, 24.587389011), law(1, 54.4177655282)

    def excess(x):
        parts = 1 + he / x + he * ion / x**2
        return x - h / (h + x) - helium * (he / x + 2 * he * ion / x**2) / parts

    return float(mpmath.findroot(excess, (mpmath.mpf("1e-12"), mpmath.mpf(3)), solver="anderson"))


@pytest.mark.parametrize("temperature", [6.0e4, 2.0e4, 1.6e4, 1.5e4, 1.2e4, 9.0e3, 7.0e3, 6.0e3])
def test_early_gas_is_in_saha_equilibrium(temperature, make_universe, make_cosmology):
    c = make_cosmology(helium_mass_fraction=0.3)
    baryons = Baryons(c.baryon_density, c.helium_mass_fraction, c.photon_temperature)
    scale = c.photon_temperature / temperature
    expected = _saha_electrons(temperature, baryons, scale)
    # 3e-6: the gas is cooler than the photons by 1e-7, and helium's ratio goes as exp(40) of it
    found = make_universe(helium_mass_fraction=0.3).electron_fraction(scale)
    assert found == pytest.approx(expected, rel=3e-6)


def test_everything_is_ionized_early(planck):
    # n_He/n_H = 0.08188 for Y = 0.2454, from the atomic masses
    a = np.array([1e-15, 1e-9, 1e-6, 2.6e-5])
    np.testing.assert_allclose(planck.electron_fraction(a), 1.0 + 2.0 * 0.08188, atol=2e-5)


def test_helium_ion_recombines_half_way(planck):
    # Mukhanov 2005, eqs 3.181-3.182: half at T = 15000 K (1 + 0.023 ln eta_10), an approximate solution of
    # Saha's equation to a few per cent; down to 1e-4 by 12000 K. eta_10 = 273.9 omega_b = 6.13
    half = 15000.0 * (1.0 + 0.023 * np.log(6.13))
    helium = (planck.electron_fraction(1e-9) - 1.0) / 2.0
    temperature = np.linspace(14000.0, 18000.0, 401)
    share = (planck.electron_fraction(2.7255 / temperature) - 1.0 - helium) / helium
    assert np.interp(0.5, share, temperature) == pytest.approx(half, rel=0.04)
    assert planck.electron_fraction(2.7255 / 12000.0) == pytest.approx(1.0 + helium, abs=1e-4 * helium)


def test_helium_is_neutral_by_redshift_1800(planck):
    # Switzer & Hirata 2008 (astro-ph/0702143): He I finished at z = 1800; in equilibrium it is so earlier
    assert planck.electron_fraction(1.0 / 1801.0) == pytest.approx(1.0, abs=2e-3)


@pytest.mark.parametrize("redshift", [900.0, 1000.0, 1100.0])
def test_electrons_near_last_scattering(redshift, planck):
    # Jones & Wyse 1985 (A&A 149, 144), from memory: x_e = 2.4e-3 omega_m^(1/2)/omega_b (z/1000)^12.75.
    # An older atom and a rough fit: 20 per cent
    expected = 2.4e-3 * 0.14237**0.5 / 0.02237 * (redshift / 1000.0) ** 12.75
    assert planck.electron_fraction(1.0 / (1.0 + redshift)) == pytest.approx(expected, rel=0.2)


def test_frozen_electrons_scale_inversely_with_baryons(planck, make_universe):
    # Peebles 1993, from memory: residual x_e = 1.2e-5 Omega_m^(1/2)/(Omega_b h), here at z = 20; 10 per cent
    matter = 0.14237
    for baryons in (0.01, 0.02237, 0.04):
        u = make_universe(baryon_density=baryons, dark_matter_density=matter - baryons)
        assert u.electron_fraction(1.0 / 21.0) == pytest.approx(1.2e-5 * matter**0.5 / baryons, rel=0.1)


def test_gas_keeps_the_photon_temperature_early(planck):
    a = np.geomspace(1e-14, 1.0 / 1101.0, 60)
    np.testing.assert_allclose(planck.gas_temperature(a), planck.photon_temperature(a), rtol=2e-4)
    np.testing.assert_allclose(planck.gas_temperature_slope(a), -1.0, atol=1e-3)


def test_gas_cools_adiabatically_late(planck):
    # T falls as (1 + z)^2 once the photons no longer heat it (Scott & Moss 2009); a little is left at z = 10
    assert planck.gas_temperature_slope(1.0 / 11.0) == pytest.approx(-2.0, abs=0.02)
    assert planck.gas_temperature_slope(1.0) == pytest.approx(-2.0, abs=1e-3)


def test_gas_temperature_today(planck):
    # Scott & Moss 2009 (MNRAS 397, 445): would be about 20 mK today without reionization
    assert planck.gas_temperature(1.0) == pytest.approx(0.020, rel=0.15)


def test_gas_temperature_slope_is_the_slope(planck):
    # Against central differences of the temperature itself
    a, step = np.geomspace(1e-4, 0.9, 40), 1e-3
    ahead, behind = planck.gas_temperature(a * np.exp(step)), planck.gas_temperature(a * np.exp(-step))
    slope = np.log(ahead / behind) / (2.0 * step)
    np.testing.assert_allclose(planck.gas_temperature_slope(a), slope, atol=2e-5)


@pytest.mark.parametrize("name", ["electron_fraction", "gas_temperature"])
def test_arrays_equal_single_values(name, planck):
    function, a = getattr(planck, name), np.array([[1e-9, 3e-4], [1e-3, 1.0]])
    single = [[float(function(value)) for value in row] for row in a]
    np.testing.assert_array_equal(function(a), single)
