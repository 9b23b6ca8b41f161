"""The effective-sound-speed closure in limits with closed forms."""

import numpy as np
import pytest
from courses import cosmology, course
from scipy.interpolate import CubicSpline
from scipy.special import sici

from twofluid.fluids import CLOSURES, SoundSpeedSystem, sound_speed
from twofluid.scenario.keys import KEY_AT
from twofluid.universe import Universe

TRACE_OF_BARYONS = 1e-5  # baryon density low enough to drop from the dynamics at the level tested


def follow(asked, wavenumber, **options):
    return course(asked, wavenumber, system_class=options.pop("system_class", SoundSpeedSystem), **options)


class DampsItsOwnVelocity(SoundSpeedSystem):
    """Control: diffusion works on theta_b of this frame, that is relative to the dark matter."""

    def _rates(self, k, time, in_plasma):
        rates = super()._rates(k, time, in_plasma)
        return rates | {("theta_baryon", "metric_rate"): 0.0, ("theta_baryon", "theta_stream"): 0.0}


def test_the_scenario_knows_every_closure():
    assert KEY_AT["method.closure"].choices == tuple(CLOSURES)


# --- start


@pytest.mark.parametrize("effective_number", [0.0, 3.046, 8.0])
def test_adiabatic_series_outside_the_horizon(effective_number, monkeypatch):
    # Ma & Bertschinger 1995, eq. 96 (from memory): theta_nu = (23 + 4 R) / (15 + 4 R) theta_gamma, theta_gamma =
    # k (k tau)^3 / 36. Only the viscosity of what streams makes the difference; the plasma has none so early.
    def velocities():
        run = follow(cosmology(effective_number=effective_number), 1.0, end=1e-7)
        early = run.x < 0.2
        share = (run.now.gravity_neutrino / (run.now.gravity_neutrino + run.now.gravity_photon))[0]
        cube = run.x[early][-1] ** 3 / 36.0
        stream, plasma = run.theta_stream[early][-1] / cube, run.theta_baryon[early][-1] / cube
        return stream, plasma, (23 + 4 * share) / (15 + 4 * share)

    stream, plasma, expected = velocities()
    assert stream == pytest.approx(expected, rel=5e-3)  # next order, (k tau)^2 / 10
    assert plasma == pytest.approx(1.0, rel=5e-3)
    monkeypatch.setattr(sound_speed, "STREAMING_LIMIT", 1e-9)  # control: no viscosity
    assert abs(velocities()[0] / expected - 1.0) > 0.1


def test_all_contrasts_stay_adiabatic_outside_the_horizon():
    run = follow(cosmology(), 1e-4, end=0.02)  # k tau = 0.2 at the end, the photons released long before
    np.testing.assert_allclose(run.delta_baryon, run.delta_dark, rtol=3e-3)
    np.testing.assert_allclose(run.delta_stream, 4 / 3 * run.delta_dark, rtol=3e-3)


@pytest.mark.parametrize(("effective_number", "tolerance"), [(0.0, 4e-3), (3.046, 0.02), (8.0, 0.03)])
def test_dark_matter_grows_logarithmically_in_the_radiation_era(effective_number, tolerance):
    # Without anisotropic stress the slope by ln(k tau) is 9 psi, psi = 2/3 (closed form, Dodelson 2003, from memory).
    # With neutrinos I1 Phi of Hu & Sugiyama 1996 (fit, from memory, middle confidence): no closed form.
    # 4e-3: matter over radiation reaches 1e-3.
    asked = cosmology(effective_number=effective_number, baryon_density=TRACE_OF_BARYONS)
    run = follow(asked, 3000.0, end=2e-7)
    share = (run.now.gravity_neutrino / (run.now.gravity_neutrino + run.now.gravity_photon))[0]
    late = run.x > 40.0
    slope = np.polyfit(np.log(run.x[late]), run.delta_dark[late], 1)[0]
    potential = 2.0 / 3.0 * (1 + 0.4 * share) / (1 + 4 / 15 * share)
    factor = 9.11 * (1 + 0.128 * share + 0.029 * share**2) if share else 9.0
    assert slope == pytest.approx(factor * potential, rel=tolerance)


# --- plasma


def test_plasma_swings_with_the_sound_horizon_loses_amplitude_and_is_damped():
    # delta_b / 3 swings as (1+R)^(-1/4) exp[-(k/k_D)^2] cos(k r_s + phase): Eisenstein & Hu 1998 eq. 6, Hu & Sugiyama
    # 1996, Kaiser 1983 (all from memory). Nothing but plasma, so that R grows.
    run = follow(cosmology(effective_number=0.0, baryon_density=0.3, dark_matter_density=0.0), 2.0, end=4e-4)
    a = run.now.scale_factor
    R = 1.0 / run.now.photon_baryon_ratio
    damping = np.exp(-((2.0 / run.universe.diffusion_wavenumber(a)) ** 2))
    window = (run.x > 120.0) & (damping > 0.2)
    assert R[window][-1] / R[window][0] > 2.0

    def misfit(envelope, stretch=1.0):
        phase = stretch * 2.0 * run.universe.sound_horizon(a)
        waves = np.array([envelope * np.cos(phase), envelope * np.sin(phase)])[:, window]
        weights, *_ = np.linalg.lstsq(waves.T, run.delta_baryon[window], rcond=None)
        return np.abs(run.delta_baryon[window] - weights @ waves).max() / np.hypot(*weights)

    envelope = (1 + R) ** -0.25 * damping
    assert misfit(envelope) < 0.02  # the plasma's own gravity, of order 2 / (k tau)
    assert misfit(envelope, 1.002) > 0.04  # control: another sound horizon
    assert misfit((1 + R) ** -0.25) > 0.1  # control: no diffusion
    assert misfit(damping) > 0.04  # control: no baryon loading of the amplitude


def test_overdamped_plasma_is_hydrostatic():
    # Once its waves are gone, pressure balances gravity: k^2 c_s^2 delta_b = delta_c'' + R/(1+R) H delta_c', where
    # delta_c'' = -H delta_c' + g_c delta_c / 2 (radiation smooth). Derived here.
    def misfit(system_class):
        k = 10.0
        run = follow(cosmology(), k, end=1 / 2000.0, system_class=system_class)
        now, r = run.now, run.now.photon_baryon_ratio
        dark_rate = -k * run.metric_rate / 2
        acceleration = now.gravity_dark * run.delta_dark / 2 - now.hubble_rate * dark_rate * r / (1 + r)
        expected = acceleration * 3 * (1 + r) / r / k**2
        return abs(run.delta_baryon[-1] / expected[-1] - 1.0)

    assert misfit(SoundSpeedSystem) < 0.05  # it takes its time: diffusion over pressure, H / (c_s^2 / 2 k_D^-2')
    assert misfit(DampsItsOwnVelocity) > 1.0


# --- released gas


def released(run):
    at = int(np.searchsorted(run.now.scale_factor, 1.0 / (1.0 + run.universe.landmarks.drag_redshift) * (1 - 1e-9)))
    return at, run.now.scale_factor / run.now.scale_factor[at]


def test_infall_from_rest_in_a_matter_era():
    # Two cold fluids, closed form (substituted in its equations): at a_d delta_b = delta_b' = 0 and p is the
    # slope dln delta_c / dln a.
    # Photons cold enough that matter rules at the drag epoch; released from rest relative to the expansion.
    def misfit(system_class):
        k = 3.0
        run = follow(cosmology(effective_number=0.0, photon_temperature=0.6), k, end=0.3, system_class=system_class)
        at, r = released(run)
        fb = 0.02237 / 0.14237
        fc = 1.0 - fb
        p = -k * run.metric_rate[at] / 2 / run.now.hubble_rate[at] / run.delta_dark[at]
        later = (r > 1.5) & (run.now.scale_factor < 0.1)
        r = r[later]
        matter = fc * ((1.5 + p) / 2.5 * r + (1 - p) / 2.5 * r**-1.5)
        difference = -(1 + 2 * p) + 2 * p * r**-0.5
        expected = (matter + fc * difference) / (matter - fb * difference)
        return np.abs((run.delta_baryon / run.delta_dark)[later] - expected).max()

    assert misfit(SoundSpeedSystem) < 0.01  # gas pressure, the dark energy, some radiation
    assert misfit(DampsItsOwnVelocity) > 0.1  # control: baryons that fall along before their release


def test_difference_of_the_fluids_fades_as_published_with_radiation():
    # delta_b - delta_c: a constant and ln[(sqrt(1+y) - 1) / (sqrt(1+y) + 1)], for cold fluids in smooth radiation
    # (substituted in its equation).
    run = follow(cosmology(), 1.0, end=0.1)
    at, _ = released(run)
    now = run.now
    y = (now.gravity_baryon + now.gravity_dark) / (now.gravity_photon + now.gravity_neutrino)
    modes = np.array([np.ones_like(y), np.log((np.sqrt(1 + y) - 1) / (np.sqrt(1 + y) + 1))])[:, at:]
    difference = (run.delta_baryon - run.delta_dark)[at:]
    weights = np.linalg.solve(modes[:, [0, -1]].T, difference[[0, -1]])
    np.testing.assert_allclose(weights @ modes, difference, rtol=1e-3)  # pressure, radiation not perfectly smooth


def test_pressure_holds_the_gas_as_in_the_closed_form():
    # Gas in dark matter, matter era, c_s^2 ~ a^-2, x = sqrt(6) k / k_J: delta_b / delta_c = 1 - x^2 g(x),
    # g = -Ci(x) cos x + (pi/2 - Si(x)) sin x, with free waves sin x, cos x in delta_b (substituted in its equation).
    # Cold photons, so that the gas cools adiabatically from early on.
    asked = cosmology(effective_number=0.0, photon_temperature=0.6, baryon_density=1e-3, dark_matter_density=0.3)
    universe = Universe(asked)
    k = 3000.0
    run = follow(asked, k, end=0.1)
    a = run.now.scale_factor
    sound = universe.gas_sound_speed(np.minimum(a, 1.0)) ** 2
    x = np.sqrt(6.0 * k**2 * sound / (run.now.gravity_dark / 2.0))
    late = a > 0.01
    assert x[late][0] > 2.0 > 1.0 > x[late][-1]
    sine, cosine = sici(x)
    g = -cosine * np.cos(x) + (np.pi / 2 - sine) * np.sin(x)

    def misfit(expected):
        waves = np.array([np.sin(x), np.cos(x)])[:, late]
        rest = (run.delta_baryon - run.delta_dark * expected)[late]
        weights, *_ = np.linalg.lstsq(waves.T, rest, rcond=None)
        return (np.abs(rest - weights @ waves) / run.delta_dark[late]).max()

    assert misfit(1 - x**2 * g) < 3e-3  # the temperature slope is not yet quite -2
    assert misfit(1 / (1 + x**2 / 6)) > 0.03  # control: the form for c_s^2 ~ 1/a


def test_slopes_read_off_are_those_of_what_is_read_off():
    universe = Universe(cosmology())
    run = follow(cosmology(), 100.0)
    system = SoundSpeedSystem(universe, np.array([100.0]))
    observed = np.stack([getattr(run, name) for name in system.observed])[..., None]
    read = {name: values[:, 0] for name, values in system.read_off(run.tau[:, None], observed).quantities.items()}
    x = read["log_scale_factor"]
    inside = (x > -np.log(800.0)) & (x < -0.5)
    for name in ("delta_dark", "delta_baryon", "theta_baryon", "delta_gas_temperature"):
        free = x > -np.log(1000.0)
        spline = CubicSpline(x[free], read[name][free])(x[inside], 1)
        slope = read[f"{name}_slope"][inside]
        # 1 per cent: the spline knows nothing but the values at steps of up to 0.15 in ln a.
        np.testing.assert_allclose(slope, spline, rtol=0.01, atol=0.01 * np.abs(slope[0]), err_msg=name)
