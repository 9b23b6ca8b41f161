"""Neutrinos with mass in the smooth universe: against quadrature, published numbers, conservation, astropy."""

import astropy.units as u
import numpy as np
import pytest
from astropy.cosmology import FlatLambdaCDM
from scipy.integrate import quad

from twofluid.scenario import Cosmology, Neutrinos
from twofluid.universe import Universe, UniverseError, UniverseStack, build_universes
from twofluid.universe.fermi_dirac import REST, energy, momentum_sum, pressure

MASSLESS = 7.0 * np.pi**4 / 120.0  # integral of q^3/(e^q + 1), closed form


def cosmology(masses=(), effective_number=3.046, **changes):
    values = {"hubble_constant": 67.32, "baryon_density": 0.022383, "dark_matter_density": 0.12011} | changes
    return Cosmology(**values, neutrinos=Neutrinos(effective_number, masses))


def integral(function):
    """Integrate over q by a general library: scipy.integrate.quad."""
    pieces = [quad(function, *ends, epsabs=0.0, epsrel=1e-11)[0] for ends in ((0.0, 1.0), (1.0, 10.0), (10.0, 60.0))]
    return sum(pieces) / MASSLESS


@pytest.mark.parametrize("mass", [0.01, 0.5, 3.0, 20.0, 400.0])
def test_energy_and_pressure_against_quadrature(mass):
    def root(q):
        return np.sqrt(q * q + mass * mass)

    exact = integral(lambda q: q * q * root(q) / (np.exp(q) + 1.0))
    thrice = integral(lambda q: q**4 / root(q) / (np.exp(q) + 1.0))
    assert energy(mass) == pytest.approx(exact, rel=1e-8)
    assert pressure(mass) == pytest.approx(thrice, abs=1e-7 * exact)  # measured: 3e-8


def test_limits_of_energy_and_pressure():
    assert energy(0.0) == pytest.approx(1.0, rel=1e-12)
    assert pressure(0.0) == pytest.approx(1.0, rel=1e-12)
    # Slow: rest energy, and <q^2> = 15 zeta(5)/zeta(3) times 1/y^2 as the square of the speed. Closed form.
    speed_squared = 15.0 * 1.03692775514337 / 1.2020569031595942 / 1e4**2
    assert energy(1e4) / 1e4 == pytest.approx(REST * (1.0 + speed_squared / 2.0), rel=1e-8)
    assert pressure(1e4) / energy(1e4) == pytest.approx(speed_squared, rel=1e-4)


@pytest.mark.parametrize(("count", "accuracy"), [(4, 1e-4), (5, 3e-5), (7, 3e-6)])
def test_few_momenta_stand_for_all(count, accuracy):
    momenta, weights = momentum_sum(count)
    assert weights @ momenta == pytest.approx(1.0, rel=1e-13)
    for mass in np.geomspace(0.05, 5e3, 12):
        root = np.sqrt(momenta**2 + mass**2)

        def slope(q):
            return q**3 / (2.0 * np.cosh(q / 2.0)) ** 2 / 4.0  # integral of q is that of q^3 f, by parts

        size = energy(mass)
        both = integral(lambda q, mass=mass: slope(q) * np.sqrt(q * q + mass * mass))
        assert both == pytest.approx((3.0 * size + pressure(mass)) / 4.0, rel=1e-7)  # 3 (rho + P), by parts
        assert weights @ root == pytest.approx(both, rel=accuracy)
        thrice = integral(lambda q, mass=mass: slope(q) * q * q / np.sqrt(q * q + mass * mass))
        assert weights @ (momenta**2 / root) == pytest.approx(thrice, abs=accuracy * size)


def test_density_today():
    # Omega_nu h^2 = sum of masses/93.14 eV for an effective number of 3.046: Lesgourgues & Pastor 2006 (Phys. Rep.
    # 429, 307), from memory; with their spectra, 0.2 per cent from those of one temperature for each species.
    universe = Universe(cosmology((0.06,)))
    density = universe.density_fraction("massive_neutrino", 1.0) * 0.6732**2
    assert density == pytest.approx(0.06 / 93.14, rel=3e-3)
    # All but the energy of motion is rest mass.
    assert universe.masses["massive_neutrino"] == pytest.approx(universe.gravity("massive_neutrino", 1.0), rel=1e-4)


def test_while_fast_they_are_as_those_without_mass():
    massless, mixed = (Universe(cosmology(masses)) for masses in ((), (0.06, 0.3)))
    early = 1e-10
    total = mixed.gravity("neutrino", early) + mixed.gravity("massive_neutrino", early)
    assert total == pytest.approx(massless.gravity("neutrino", early), rel=1e-10)
    assert mixed.gravity("neutrino", early) == pytest.approx(total / 3.0, rel=1e-10)
    assert mixed.landmarks.equality_redshift == pytest.approx(massless.landmarks.equality_redshift, rel=1e-12)


def test_energy_is_conserved():
    # d ln rho/d ln a = -3 (1 + P/rho); numpy.gradient at steps of 0.01, its error 1e-6.
    universe = Universe(cosmology((0.05, 0.2)))
    log_a = np.linspace(-9.0, 0.0, 901)
    a = np.exp(log_a)
    density = universe.gravity("massive_neutrino", a) / a**2
    lost = -np.gradient(np.log(density), log_a)
    gone = 3.0 * (1.0 + universe.massive_neutrino_pressure(a) / a**2 / density)
    assert lost[1:-1] == pytest.approx(gone[1:-1], rel=5e-6)


@pytest.mark.parametrize("masses", [(0.06,), (0.1, 0.1, 0.1), (0.0, 0.01, 0.05)])
def test_expansion_and_age_against_astropy(masses):
    # General library: astropy.cosmology, whose densities are a fit (Komatsu et al. 2011, its eq. 26), and which
    # takes the effective number into the density alone, not into the temperature. 1e-4 covers both.
    other = FlatLambdaCDM(
        67.32, (0.022383 + 0.12011) / 0.6732**2, Tcmb0=2.7255, Neff=3.046, m_nu=[*masses, 0, 0, 0][:3] * u.eV
    )
    universe = Universe(cosmology(masses))
    redshift = np.array([0.0, 0.5, 2.0, 10.0, 100.0, 1000.0, 1e4])
    a = 1.0 / (1.0 + redshift)
    expected = other.H(redshift).to_value("km/(s Mpc)")
    assert universe.conformal_hubble_rate(a) / a * 299792.458 == pytest.approx(expected, rel=1e-4)
    assert universe.landmarks.age_today == pytest.approx(other.age(0).to_value("Gyr"), rel=1e-4)


def test_equal_masses_are_kept_together_and_none_is_no_mass():
    contents = Universe(cosmology((0.1, 0.0, 0.1))).contents
    assert len(contents.massive) == len(contents.mass) == 1
    assert contents.massive[0] == pytest.approx(2.0 * contents.neutrino, rel=1e-12)
    assert Universe(cosmology((0.0,))).contents == Universe(cosmology()).contents


def test_universes_with_and_without_masses_side_by_side():
    asked = [cosmology(masses) for masses in ((), (0.06,), (0.3, 0.1))]
    together, alone = build_universes(asked), [Universe(one) for one in asked]
    owner = np.array([2, 0, 1, 2])
    time = np.array([[0.1, 30.0, 200.0, 5000.0], [280.0, 300.0, 9000.0, 14000.0]])
    stack = UniverseStack(together, owner)
    found = stack.conditions(time).hubble_rate
    for column, number in enumerate(owner):
        expected = alone[number].conditions(time[:, column]).hubble_rate
        assert found[:, column] == pytest.approx(expected, rel=1e-11)
    assert stack.contents.mass[1].tolist() == [together[2].contents.mass[1], 0.0, 0.0, together[2].contents.mass[1]]


@pytest.mark.parametrize(
    ("neutrinos", "message"),
    [
        (Neutrinos(masses=(0.1, -0.1)), r"neutrinos\.masses = \(0\.1, -0\.1\) eV must lie between 0 and 10 eV"),
        (Neutrinos(masses=(float("nan"),)), r"neutrinos\.masses = \(nan,\) eV must lie"),
        (Neutrinos(masses=(0.1,) * 4), r"are more than the 3 species there are"),
        (Neutrinos(0.0, (0.1,)), r"effective_number = 0 leaves no neutrino"),
    ],
)
def test_impossible_masses_are_refused(neutrinos, message):
    with pytest.raises(UniverseError, match=message):
        Universe(Cosmology(67.32, 0.022383, 0.12011, neutrinos=neutrinos))
