"""The quick look-up against the functions it tabulates, and universes far from ours."""

import dataclasses

import numpy as np
import pytest

from twofluid.scenario import Neutrinos
from twofluid.universe import Conditions

# name, the same from the direct functions, tolerance
FIELDS = {
    "scale_factor": (lambda u, a: a, 1e-8),
    "hubble_rate": (lambda u, a: u.conformal_hubble_rate(a), 1e-8),
    "gravity_photon": (lambda u, a: u.gravity("photon", a), 2e-8),  # goes as the inverse square of a
    "gravity_neutrino": (lambda u, a: u.gravity("neutrino", a), 2e-8),
    "gravity_baryon": (lambda u, a: u.gravity("baryon", a), 1e-8),
    "gravity_dark": (lambda u, a: u.gravity("dark", a), 1e-8),
    "scattering_rate": (lambda u, a: u.scattering_rate(a), 1e-6),  # at the end of helium recombination
    "photon_baryon_ratio": (lambda u, a: 1.0 / u.momentum_ratio(a), 1e-8),
    "isothermal_sound_speed_squared": (lambda u, a: u.isothermal_sound_speed(a) ** 2, 1e-6),
    "compton_rate": (lambda u, a: u.compton_rate(a), 1e-6),
    "photon_gas_temperature_ratio": (lambda u, a: u.photon_temperature(a) / u.gas_temperature(a), 1e-8),
}
VARIANTS = {
    "planck": {},
    "no dark matter": {"dark_matter_density": 0.0},
    "few baryons": {"baryon_density": 0.005},
    "many baryons": {"baryon_density": 0.2, "dark_matter_density": 0.05},
    "much dark matter": {"dark_matter_density": 0.5},
    "cold": {"photon_temperature": 2.0},
    "warm": {"photon_temperature": 4.0},
    "hydrogen only": {"helium_mass_fraction": 0.0},
    "half helium": {"helium_mass_fraction": 0.5},
    "no neutrinos": {"neutrinos": Neutrinos(effective_number=0.0)},
    "many neutrinos": {"neutrinos": Neutrinos(effective_number=10.0)},
    "open": {"curvature_fraction": 0.2},
    "closed": {"curvature_fraction": -0.05},
    "negative constant": {"hubble_constant": 35.0},
}


@pytest.fixture(scope="module", params=VARIANTS)
def universe(request, make_universe):
    return make_universe(**VARIANTS[request.param])


def _times(universe, count=20000):
    ends = np.log(universe.conformal_time(np.array([1e-14, 1.0])))
    late = np.log(universe.conformal_time(1e-5))  # most of the points where most happens
    random = np.random.default_rng(20)
    return np.exp(np.concatenate([random.uniform(late, ends[1], count), random.uniform(*ends, count // 10)]))


def test_look_up_agrees_with_direct_functions(universe):
    time = _times(universe)
    conditions, a = universe.conditions(time), universe.scale_factor(time)
    for name, (direct, tolerance) in FIELDS.items():
        np.testing.assert_allclose(
            getattr(conditions, name), direct(universe, a), rtol=tolerance, atol=0.0, err_msg=name
        )


def test_every_field_is_compared():
    assert set(FIELDS) == {field.name for field in dataclasses.fields(Conditions)}


def test_gravity_sums_to_the_expansion_rate(make_universe):
    # Friedmann: 3 (a'/a)^2 = sum of 8 pi G a^2 rho, here with curvature and no cosmological constant
    u = make_universe(hubble_constant=70.0, cosmological_constant_fraction=0.0)
    c = u.conditions(np.geomspace(1e-6, 10.0, 50))
    total = c.gravity_photon + c.gravity_neutrino + c.gravity_baryon + c.gravity_dark
    np.testing.assert_allclose(3.0 * c.hubble_rate**2, total + u.gravity("curvature", 1.0), rtol=1e-12)


def test_gravity_is_an_exact_power(planck):
    c = planck.conditions(np.geomspace(1e-6, 1e4, 50))
    for name, power in (("photon", -2), ("neutrino", -2), ("baryon", -1), ("dark", -1)):
        expected = planck.gravity(name, 1.0) * c.scale_factor**power
        np.testing.assert_allclose(getattr(c, f"gravity_{name}"), expected, rtol=1e-15)


@pytest.mark.parametrize("shape", [(), (1,), (3, 5, 7)])
def test_fields_have_the_shape_asked(shape, planck):
    conditions = planck.conditions(np.full(shape, 280.0))
    assert {np.shape(getattr(conditions, name)) for name in FIELDS} == {shape}


def test_array_equals_single_values_across_blocks(planck):
    time = _times(planck, 20000)
    whole = planck.conditions(time)
    for place in (0, 8191, 8192, 21999):
        single = planck.conditions(time[place])
        assert {name: float(getattr(single, name)) for name in FIELDS} == {
            name: getattr(whole, name)[place] for name in FIELDS
        }


def test_today_is_in_the_table(planck):
    assert planck.conditions(planck.landmarks.conformal_age).scale_factor == pytest.approx(1.0, abs=1e-12)


@pytest.mark.parametrize("time", [0.0, -1.0, 1e-9, 14174.6, float("nan")])
def test_times_outside_are_refused(time, planck):
    with pytest.raises(ValueError, match=r"between 4\.\d+e-09 Mpc \(scale factor 1e-14\) and 14174\.5"):
        planck.conditions(np.array([100.0, time]))


def test_universe_is_finite_and_runs_one_way(universe):
    a = np.geomspace(1e-14, 1.0, 4001)
    electrons = universe.electron_fraction(a)
    assert np.all(np.diff(electrons) <= 1e-12)
    assert electrons[-1] > 0.0
    for name in ("gas_temperature", "scattering_rate", "gas_sound_speed", "plasma_sound_speed"):
        assert np.all(np.diff(getattr(universe, name)(a)) < 0.0), name
    for name in ("conformal_time", "age", "sound_horizon"):
        assert np.all(np.diff(getattr(universe, name)(a)) > 0.0), name
    assert np.all(universe.gas_temperature(a) <= universe.photon_temperature(a))


def test_landmarks_are_ordered(universe):
    landmarks = universe.landmarks
    values = [value for value in dataclasses.astuple(landmarks) if value is not None]
    assert all(np.isfinite(value) and value > 0.0 for value in values)
    assert landmarks.thermal_decoupling_redshift < landmarks.last_scattering_redshift
    assert 500.0 < landmarks.last_scattering_redshift < 2000.0
    assert landmarks.drag_sound_horizon < landmarks.conformal_age / 3.0**0.5
