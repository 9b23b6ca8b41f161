"""Landmarks against Planck, closed forms and independent integration."""

import numpy as np
import pytest
from scipy.integrate import trapezoid

from twofluid.scenario import Neutrinos
from twofluid.universe import UniverseError

# Planck 2018 VI, Table 2, TT,TE,EE+lowE+lensing, mean; Planck counts one neutrino of 0.06 eV, here all are
# massless, and it corrects the three-level atom by more than its factor: hence 0.1 per cent.
PLANCK = [
    ("last_scattering_redshift", 1089.92, 1e-3),
    ("last_scattering_sound_horizon", 144.43, 1e-3),
    ("drag_redshift", 1059.94, 1e-3),
    ("drag_sound_horizon", 147.09, 1e-3),
    ("diffusion_wavenumber", 0.14087, 5e-3),  # visibility-weighted there, the plain integral here
    ("equality_redshift", 3402.0, 1e-4),  # Planck too counts all neutrinos as massless here
    ("equality_wavenumber", 0.010384, 1e-4),
    ("age_today", 13.797, 2e-3),  # 0.06 eV of neutrinos make 0.1 per cent
]
# Independent brute-force integration of the same universe, digits as given
INDEPENDENT = [
    ("last_scattering_redshift", 1090.26, 1e-5),
    ("last_scattering_sound_horizon", 144.410, 4e-6),
    ("drag_redshift", 1060.39, 1e-5),
    ("drag_sound_horizon", 147.058, 4e-6),
    ("conformal_age", 14174.52, 4e-7),
]


@pytest.mark.parametrize(("name", "value", "tolerance"), PLANCK)
def test_landmark_agrees_with_planck(name, value, tolerance, planck):
    assert getattr(planck.landmarks, name) == pytest.approx(value, rel=tolerance)


@pytest.mark.parametrize(("name", "value", "tolerance"), INDEPENDENT)
def test_landmark_agrees_with_independent_integration(name, value, tolerance, planck):
    assert getattr(planck.landmarks, name) == pytest.approx(value, rel=tolerance)


@pytest.mark.parametrize(
    ("change", "missed"),
    [
        ({"helium_mass_fraction": 0.0}, {"last_scattering_redshift", "drag_redshift"}),
        ({"dark_matter_density": 0.123}, {"equality_redshift", "drag_sound_horizon", "age_today"}),
        ({"baryon_density": 0.0230}, {"equality_wavenumber", "drag_sound_horizon"}),
        ({"neutrinos": Neutrinos(3.2)}, {"equality_redshift", "last_scattering_sound_horizon"}),
    ],
)
def test_planck_notices_another_universe(change, missed, make_universe):
    # Negative control: each change must push the landmarks named outside the tolerances above
    landmarks = make_universe(**change).landmarks
    found = {
        name
        for name, value, tolerance in PLANCK
        if getattr(landmarks, name) != pytest.approx(value, rel=tolerance)
    }
    assert missed <= found


def test_age_at_last_scattering(planck):
    # About 380 000 years: common practice, no source
    assert planck.landmarks.last_scattering_age == pytest.approx(0.38, rel=0.05)


def test_depths_at_the_landmarks(planck):
    # The definitions: depth from today, and depth weighted by 1/R, are one; by plain trapezium sums
    for name, rate in (("last_scattering", planck.scattering_rate), ("drag", planck.drag_rate)):
        redshift = getattr(planck.landmarks, f"{name}_redshift")
        a = np.geomspace(1.0 / (1.0 + redshift), 1.0, 40001)
        depth = trapezoid(rate(a) / planck.conformal_hubble_rate(a), np.log(a))
        assert depth == pytest.approx(1.0, rel=1e-6)


@pytest.mark.parametrize(
    ("baryons", "dark"), [(0.02237, 0.12), (0.0215, 0.115), (0.0235, 0.130), (0.0225, 0.11)]
)
def test_drag_sound_horizon_follows_published_fit(baryons, dark, make_universe):
    # Aubourg et al. 2015 (arXiv:1411.1074), eq. 16, from memory, no neutrino mass; the fit is good to 0.02
    # per cent and the three-level atom to 0.05
    fit = 55.154 * np.exp(-72.3 * 0.0006**2) / ((baryons + dark) ** 0.25351 * baryons**0.12807)
    u = make_universe(baryon_density=baryons, dark_matter_density=dark)
    assert u.landmarks.drag_sound_horizon == pytest.approx(fit, rel=7e-4)


@pytest.mark.parametrize("redshift", [1e6, 3400.0, 1060.0, 100.0])
def test_sound_horizon_closed_form(redshift, matter_and_radiation):
    # Eisenstein & Hu 1998, eq. 6 (number from memory), exact for matter and radiation with R ~ a
    u = matter_and_radiation
    here = u.momentum_ratio(1.0 / (1.0 + redshift))
    equal = u.momentum_ratio(1.0 / (1.0 + u.landmarks.equality_redshift))
    logarithm = np.log((np.sqrt(1.0 + here) + np.sqrt(here + equal)) / (1.0 + np.sqrt(equal)))
    expected = 2.0 / (3.0 * u.landmarks.equality_wavenumber) * np.sqrt(6.0 / equal) * logarithm
    assert u.sound_horizon(1.0 / (1.0 + redshift)) == pytest.approx(expected, rel=1e-9)


def test_diffusion_wavenumber_in_the_radiation_era(planck):
    # R -> 0, fully ionized: 1/k_D^2 = (8/45) int d eta/tau' = (8/45) a/(3 tau' a H); Kaiser 1983, from memory
    a = 1e-8
    expected = (8.0 / 45.0 / (3.0 * planck.scattering_rate(a) * planck.conformal_hubble_rate(a))) ** -0.5
    assert planck.diffusion_wavenumber(a) == pytest.approx(expected, rel=1e-4)  # matter's share is 3e-5 here


def _decoupling(make_universe, baryons):
    u = make_universe(baryon_density=baryons, dark_matter_density=0.14237 - baryons)
    return 1.0 + u.landmarks.thermal_decoupling_redshift


def test_thermal_decoupling_scales_with_baryons(make_universe):
    # 1 + z ~ omega_b^(2/5): Peebles 1993, Barkana & Loeb 2001, from memory. The power takes the frozen
    # electrons as exactly inverse to the baryons; they are not quite, so 0.05.
    ratio = _decoupling(make_universe, 0.025) / _decoupling(make_universe, 0.018)
    slope = np.log(ratio) / np.log(25.0 / 18.0)
    assert slope == pytest.approx(0.4, abs=0.05)


def test_thermal_decoupling_redshift(planck, make_universe):
    # Rates equal by hand: 8.558e-13/yr (1+z)^4 x_e/(1 + f) = H_0 Omega_m^(1/2) (1+z)^1.5, with x_e = 2.86e-4
    # at z = 123 from the values 2.724e-4 (z = 100) and 3.371e-4 (z = 200) of the independent integration;
    # radiation adds 3.6 per cent to H^2
    hubble = 0.14237**0.5 * 100.0 * 1.02271e-12  # sqrt(omega_m) times 100 km/(s Mpc) [1/yr]
    by_hand = (hubble * 1.08188 / (8.558e-13 * 2.86e-4)) ** 0.4
    assert 1.0 + planck.landmarks.thermal_decoupling_redshift == pytest.approx(by_hand, rel=0.02)
    # Published prefactors at omega_b = 0.022 run from 137 to 160 (from memory): they take the smaller
    # electron fraction of z < 20, or other definitions. 25 per cent about the middle.
    assert _decoupling(make_universe, 0.022) == pytest.approx(148.0, rel=0.25)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"baryon_density": 1e-5, "dark_matter_density": 0.0}, "no equality: its radiation outweighs"),
        (
            {"baryon_density": 1e-6, "dark_matter_density": 10.0, "photon_temperature": 30.0},
            "no last scattering: its depth from today stays below one",
        ),
        (
            {"dark_matter_density": 10.0, "photon_temperature": 30.0},
            "no thermal decoupling: the photons still heat its gas",
        ),
    ],
)
def test_missing_landmark_is_named(change, message, make_universe):
    u = make_universe(**change)  # the universe itself is fine
    assert u.conformal_time(1.0) > 0.0
    with pytest.raises(UniverseError, match=message):
        _ = u.landmarks
