"""Growth of cold matter against closed forms."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import hyp2f1

from twofluid.products.cold_growth import cold_growth
from twofluid.universe import Universe

COLD_PHOTONS = 0.1  # [K]: radiation that changes growth since z = 100 by less than 1e-7


@pytest.fixture
def universe(scenario_with):
    return lambda **changes: Universe(scenario_with(**changes).cosmology)


def test_matter_and_radiation(universe):
    # Meszaros 1974 (A&A 37, 225): D = 1 + 3y/2; as in Peacock's lectures, eqs 30-32.
    trial = universe(hubble_constant=100.0)
    omega = sum(trial.density_fraction(name, 1.0) for name in ("photon", "neutrino", "baryon", "dark"))
    flat = universe(hubble_constant=100.0 * omega**0.5)  # nothing is left open for a cosmological constant
    redshift = np.array([0.0, 1e6, 3000.0, 100.0])
    y = (1.0 + flat.landmarks.equality_redshift) / (1.0 + redshift)
    growth, rate = cold_growth(flat, redshift)
    assert growth == pytest.approx(1.0 + 1.5 * y, rel=1e-8)  # a hundred times the tolerance of a step
    assert rate == pytest.approx(1.5 * y / (1.0 + 1.5 * y), rel=1e-8)


@pytest.mark.parametrize(
    ("fraction", "growth_today", "rate_today"),
    [
        # a 2F1(1/3, 1; 11/6; -a^3 Omega_Lambda/Omega_m), verified by substitution with 30 digits
        (0.3, 0.778981016770788, 0.512796247730238),
        (0.3153, 0.787985183673617, 0.527386067646791),
    ],
)
def test_matter_and_cosmological_constant(universe, fraction, growth_today, rate_today):
    density = fraction * 0.6736**2 - 0.02237
    flat = universe(dark_matter_density=density, photon_temperature=COLD_PHOTONS)
    growth, rate = cold_growth(flat, [0.0, 1.0, 99.0])
    a = np.array([1.0, 0.5, 0.01])
    closed = a * hyp2f1(1 / 3, 1, 11 / 6, -(a**3) * (1 - fraction) / fraction)
    assert closed[0] == pytest.approx(growth_today, rel=1e-12)
    assert growth / growth[2] == pytest.approx(closed / closed[2], rel=1e-6)  # the radiation left
    assert rate[0] == pytest.approx(rate_today, rel=1e-7)


@pytest.mark.parametrize("curvature", [-0.2, 0.3])
def test_curvature(universe, curvature):
    # Heath 1977 (MNRAS 179, 351), from memory: D = (5/2) Omega_m E(a) int_0^a da'/(a' E)^3.
    curved = universe(curvature_fraction=curvature, photon_temperature=COLD_PHOTONS)
    matter = (0.02237 + 0.12) / 0.6736**2

    def rate(a):
        return np.sqrt(matter / a**3 + curvature / a**2 + 1.0 - matter - curvature)

    def heath(a):
        return 2.5 * matter * rate(a) * quad(lambda x: (x * rate(x)) ** -3.0, 0.0, a, epsabs=0.0, epsrel=1e-11)[0]

    growth, _ = cold_growth(curved, [0.0, 1.0, 9.0])
    closed = np.array([heath(a) for a in (1.0, 0.5, 0.1)])
    assert growth / growth[2] == pytest.approx(closed / closed[2], rel=1e-7)  # the radiation left


def test_order_and_repetition_of_redshifts_do_not_matter(universe):
    growth, _ = cold_growth(universe(), [10.0, 0.0, 10.0])
    assert growth[0] == growth[2] < growth[1]
    alone, _ = cold_growth(universe(), 10.0)
    assert alone == pytest.approx(growth[:1], rel=1e-9)
