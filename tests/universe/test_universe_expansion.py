"""Expansion against closed forms, astropy and high-precision quadrature."""

import mpmath
import numpy as np
import pytest
from astropy.cosmology import LambdaCDM

from twofluid.scenario import Neutrinos
from twofluid.universe import Universe, UniverseError
from twofluid.universe.constants import HUBBLE_UNIT
from twofluid.universe.expansion import photon_density

SPECIES = ("photon", "neutrino", "baryon", "dark", "curvature", "constant")
VARIANTS = {
    "flat": {},
    "open": {"curvature_fraction": 0.1},
    "closed": {"curvature_fraction": -0.05},
    "no constant": {"cosmological_constant_fraction": 0.0},
    "constant given": {"cosmological_constant_fraction": 0.8},
    "no dark matter": {"dark_matter_density": 0.0},
    "many neutrinos": {"neutrinos": Neutrinos(effective_number=8.0)},
    "warm": {"photon_temperature": 3.5},
}


@pytest.fixture(params=VARIANTS)
def pair(request, make_universe):
    """The same universe here and in astropy."""
    ours = make_universe(**VARIANTS[request.param])
    c = ours.cosmology
    theirs = LambdaCDM(
        H0=c.hubble_constant,
        Om0=(c.baryon_density + c.dark_matter_density) / (c.hubble_constant / 100.0) ** 2,
        Ode0=ours.density_fraction("constant", 1.0),
        Tcmb0=c.photon_temperature,
        name="the same universe",
        Neff=c.neutrinos.effective_number,
    )
    return ours, theirs


REDSHIFTS = np.array([0.0, 0.01, 0.5, 2.0, 20.0, 1100.0, 3400.0, 1e5])


def test_hubble_rate_agrees_with_astropy(pair):
    ours, theirs = pair
    a = 1.0 / (1.0 + REDSHIFTS)
    expected = theirs.H(REDSHIFTS).value * a / 299792.458
    # 1e-7: G and sigma_SB of another vintage
    np.testing.assert_allclose(ours.conformal_hubble_rate(a), expected, rtol=1e-7)


def test_age_agrees_with_astropy(pair):
    ours, theirs = pair
    redshifts = REDSHIFTS[:-1]  # astropy's general-purpose quadrature loses the age at 1e5
    a = 1.0 / (1.0 + redshifts)
    np.testing.assert_allclose(ours.age(a), theirs.age(redshifts).value * 1e3, rtol=2e-6)


def test_comoving_distance_agrees_with_astropy(pair):
    ours, theirs = pair
    expected = theirs.comoving_distance(REDSHIFTS).value
    np.testing.assert_allclose(ours.comoving_distance(REDSHIFTS), expected, rtol=1e-6, atol=1e-9)


def test_comoving_distance_notices_another_cosmology(pair):
    # Negative control: a tenth of a per cent in the rate must show in the comparison above
    ours, theirs = pair
    other = theirs.clone(H0=theirs.H0 * 1.001)
    assert abs(ours.comoving_distance(0.5) / other.comoving_distance(0.5).value - 1.0) > 1e-4


def test_fractions_sum_to_one(pair):
    ours, _ = pair
    for a in (1e-8, 1e-3, 1.0):
        assert sum(ours.density_fraction(name, a) for name in SPECIES) == pytest.approx(1.0, rel=1e-12)


def test_photon_and_neutrino_densities():
    # omega_gamma(2.7255 K) = 2.47298e-5, recomputed from CODATA constants
    assert photon_density(2.7255) == pytest.approx(2.47298e-5, rel=2e-6)


def test_neutrino_share_of_radiation(planck):
    # R_nu(3.046) = 0.40890, recomputed from 7/8 (4/11)^(4/3)
    photon, neutrino = planck.gravity("photon", 1.0), planck.gravity("neutrino", 1.0)
    assert neutrino / (photon + neutrino) == pytest.approx(0.40890, abs=5e-6)


def test_conformal_time_closed_form(matter_and_radiation):
    # Matter and radiation: y = (eta/eta_*)^2 + 2 eta/eta_*, eta_* = 2 sqrt(2)/k_eq (Mukhanov 2005, eq. 1.81,
    # from memory; verified by substitution)
    u, landmarks = matter_and_radiation, matter_and_radiation.landmarks
    a = np.geomspace(1e-15, 1.0, 200)
    eta_star = 2.0 * np.sqrt(2.0) / landmarks.equality_wavenumber
    y = a * (1.0 + landmarks.equality_redshift)
    np.testing.assert_allclose(u.conformal_time(a), eta_star * y / (1.0 + np.sqrt(1.0 + y)), rtol=1e-11)


def test_age_closed_form(matter_and_radiation):
    # H_eq t = (2 sqrt(2)/3) [(y - 2) sqrt(1 + y) + 2]; verified by substitution
    u, landmarks = matter_and_radiation, matter_and_radiation.landmarks
    y = np.geomspace(0.01, 1000.0, 50)  # below, the closed form itself loses digits
    a = y / (1.0 + landmarks.equality_redshift)
    hubble = landmarks.equality_wavenumber * (1.0 + landmarks.equality_redshift)  # [1/Mpc]
    expected = 2.0 * np.sqrt(2.0) / 3.0 * ((y - 2.0) * np.sqrt(1.0 + y) + 2.0) / hubble
    megayear = 3.261563777  # light years in a parsec (IAU parsec, Julian year)
    np.testing.assert_allclose(u.age(a), expected * megayear, rtol=1e-9)


@pytest.mark.parametrize("name", VARIANTS)
def test_scale_factor_inverts_conformal_time(name, make_universe):
    u = make_universe(**VARIANTS[name])
    a = np.geomspace(1e-15, 1.0, 300).reshape(3, 100)
    np.testing.assert_allclose(u.scale_factor(u.conformal_time(a)), a, rtol=1e-12)


def _loitering_edge(matter):
    # Carroll, Press & Turner 1992 (ARA&A 30, 499), eq. 12 (number from memory): no beginning above it
    return 4.0 * matter * np.cosh(np.arccosh((1.0 - matter) / matter) / 3.0) ** 3


def _near_loitering(make_cosmology, part):
    matter = 0.3
    h = 0.7
    return make_cosmology(
        hubble_constant=100.0 * h,
        dark_matter_density=matter * h**2 - 0.02237,
        photon_temperature=0.5,  # hardly any radiation: the closed form has none
        cosmological_constant_fraction=part * _loitering_edge(matter),
    )


def test_universe_close_to_loitering_is_integrated_well(make_cosmology):
    u = Universe(_near_loitering(make_cosmology, 0.99))
    a = mpmath.mpf(1)
    term = {name: mpmath.mpf(u.density_fraction(name, 1.0)) for name in SPECIES}
    radiation, matter = term["photon"] + term["neutrino"], term["baryon"] + term["dark"]

    def integrand(a):
        return 1 / mpmath.sqrt(radiation + matter * a + term["curvature"] * a**2 + term["constant"] * a**4)

    expected = mpmath.quad(integrand, [0, 1e-6, 1e-4, 0.01, 0.1, 0.3, 0.5, 0.7, 0.9, a])
    assert u.conformal_time(1.0) * 0.7 * HUBBLE_UNIT == pytest.approx(float(expected), rel=1e-10)


def test_universe_without_beginning_is_refused(make_cosmology):
    with pytest.raises(UniverseError, match=r"H\^2 is negative or all but zero near redshift 1\.\d+"):
        Universe(_near_loitering(make_cosmology, 1.01))


@pytest.mark.parametrize("fractions", [(0.01, 0.7), (0.0, 0.68)])
def test_contradicting_fractions_are_refused(fractions, make_universe):
    with pytest.raises(UniverseError, match=r"fractions sum to 1\.0\d+|fractions sum to 0\.99\d+"):
        make_universe(curvature_fraction=fractions[0], cosmological_constant_fraction=fractions[1])


def test_agreeing_fractions_are_taken(make_universe, planck):
    constant = planck.density_fraction("constant", 1.0)
    both = make_universe(curvature_fraction=0.0, cosmological_constant_fraction=constant + 5e-7)
    assert both.conformal_time(1.0) == pytest.approx(planck.conformal_time(1.0), rel=1e-6)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"hubble_constant": 0.0}, r"hubble_constant = 0\.0 must be finite and positive"),
        ({"baryon_density": 0.0}, r"baryon_density = 0\.0 must be finite and positive"),
        ({"dark_matter_density": -0.1}, r"dark_matter_density = -0\.1 must be finite and zero or positive"),
        ({"photon_temperature": float("nan")}, r"photon_temperature = nan must be finite and positive"),
        ({"photon_temperature": 2e3}, r"photon_temperature = 2000\.0 K must be at most 1000 K"),
        ({"helium_mass_fraction": 1.0}, r"helium_mass_fraction = 1\.0 must be less than 1"),
        ({"neutrinos": Neutrinos(effective_number=-1.0)}, r"neutrinos\.effective_number = -1\.0 must be"),
    ],
)
def test_impossible_ingredients_are_refused(change, message, make_universe):
    with pytest.raises(UniverseError, match=message):
        make_universe(**change)


@pytest.mark.parametrize("a", [0.0, -1.0, 1e-17, 1.001, float("nan")])
def test_scale_factor_out_of_range_is_refused(a, planck):
    with pytest.raises(ValueError, match="scale factors must lie between 1e-16 and 1"):
        planck.conformal_time(np.array([0.5, a]))


@pytest.mark.parametrize("time", [0.0, -1.0, 14200.0, float("nan")])
def test_conformal_time_out_of_range_is_refused(time, planck):
    with pytest.raises(ValueError, match=r"conformal times must lie between .* and 14174\.5\d* Mpc"):
        planck.scale_factor(time)
