"""The kinetic closure in limits with closed forms."""

import numpy as np
import pytest
from courses import cosmology, course, metric_shift, radiation_potential
from scipy.special import hyp2f1, sici, spherical_jn

from twofluid.fluids import ChainLengths, KineticSystem
from twofluid.solver import integrate
from twofluid.universe import Universe

TRACE_OF_BARYONS = 1e-5  # baryon density low enough to drop from the dynamics at the level tested


def matter_over_radiation(run):
    now = run.now
    return (now.gravity_baryon + now.gravity_dark) / (now.gravity_photon + now.gravity_neutrino)


def test_superhorizon_potential_falls_to_nine_tenths():
    # Kodama & Sasaki 1984; Dodelson 2003 eq. 7.32 (from memory; substituted in its equation). No anisotropic stress:
    # no neutrinos, and photons cold enough that the plasma holds them until matter rules.
    run = course(cosmology(effective_number=0.0, photon_temperature=1.0), 1e-4, end=3e-4)
    y = matter_over_radiation(run)
    exact = (16 * np.sqrt(1 + y) + 9 * y**3 + 2 * y**2 - 8 * y - 16) / (10 * y**3)
    inside = y > 0.01  # the closed form cancels catastrophically below
    assert y[-1] > 80.0
    phi = radiation_potential(run)
    # 2e-4: gradients, of order (k tau)^2 / 20.
    np.testing.assert_allclose(phi[inside] / phi[0], exact[inside], rtol=2e-4)
    assert phi[inside][-1] / phi[0] == pytest.approx(0.9, abs=0.005)


@pytest.mark.parametrize("effective_number", [0.0, 3.046, 8.0])
def test_initial_potential_with_neutrinos(effective_number):
    # Ma & Bertschinger 1995 (from memory): radiation era, psi = (2/3) zeta / (1 + 4 R/15), phi = (1 + 2 R/5) psi.
    run = course(cosmology(effective_number=effective_number), 1.0, end=1e-7)
    share = run.now.gravity_neutrino / (run.now.gravity_neutrino + run.now.gravity_photon)
    phi = 2.0 / 3.0 * (1 + 0.4 * share) / (1 + 4 / 15 * share)
    early = run.x < 0.05
    assert early.sum() > 5
    np.testing.assert_allclose(radiation_potential(run)[early], phi[early], rtol=2e-3)  # gradients (k tau)^2


def test_radiation_era_dark_matter_without_anisotropic_stress():
    # Closed form of a fluid with c_s^2 = 1/3, no baryons, no neutrinos: delta_c in the Newtonian gauge (Dodelson 2003
    # chapter 7, from memory; coefficients A = 9, B = 0.6237 verified numerically).
    run = course(cosmology(effective_number=0.0, baryon_density=TRACE_OF_BARYONS), 3000.0, end=2e-7)
    x = run.x / np.sqrt(3.0)
    psi_primordial = 2.0 / 3.0
    cosine_integral = sici(x)[1]
    wave = (np.sin(x) - x * np.cos(x)) / x**3
    exact = 9 * psi_primordial * (np.log(x) + np.euler_gamma - 0.5 - cosine_integral + np.sin(x) / x - wave)
    newtonian = run.delta_dark - 3.0 * run.now.hubble_rate * metric_shift(run)
    later = (run.x > 0.3) & (matter_over_radiation(run) < 1e-3)
    assert run.x[later][-1] > 50.0
    # Matter over radiation reaches 1e-3 at the end: that bounds the agreement.
    np.testing.assert_allclose(newtonian[later], exact[later], rtol=1e-3, atol=2e-3)


def test_neutrinos_change_the_logarithmic_growth_as_published():
    # Hu & Sugiyama 1996: delta_c = I1 Phi ln(I2 a / a_H), I1 = 9.11 (1 + 0.128 f + 0.029 f^2) (fit, from memory;
    # middle confidence, hence 2 per cent). The slope by ln a is I1 Phi, Phi the primordial potential of the fit.
    run = course(cosmology(baryon_density=TRACE_OF_BARYONS), 3000.0, end=2e-7)
    share = (run.now.gravity_neutrino / (run.now.gravity_neutrino + run.now.gravity_photon))[0]
    late = run.x > 40.0
    slope = np.polyfit(np.log(run.x[late]), run.delta_dark[late], 1)[0]
    potential = 2.0 / 3.0 * (1 + 0.4 * share) / (1 + 4 / 15 * share)
    assert slope == pytest.approx(9.11 * (1 + 0.128 * share + 0.029 * share**2) * potential, rel=0.02)
    assert slope != pytest.approx(9.0 * 2.0 / 3.0, rel=0.02)  # control: the value without neutrinos fails


def predicted_from_two_epochs(first_mode, second_mode, epoch, delta):
    """Fit two growth modes at the first two epochs, predict the others."""
    modes = np.array([first_mode(epoch), second_mode(epoch)]).T
    weights = np.linalg.solve(modes[:2], delta[:2])
    return modes[2:] @ weights


def at_epochs(run, y, epochs):
    return np.interp(np.log(epochs), np.log(y), run.delta_dark)


def growth_modes(clustering):
    """Growing and decaying mode under the horizon across equality, a fraction of the matter clustering."""
    # Hu & Sugiyama 1996, appendix D (from memory; substituted in its equation); fraction 1 is Meszaros 1974.
    def mode(sign):
        alpha = (1.0 + sign * np.sqrt(1.0 + 24.0 * clustering)) / 4.0
        return lambda y: (1 + y) ** (-alpha) * hyp2f1(alpha, alpha + 0.5, 2 * alpha + 0.5, 1 / (1 + y))

    return mode(-1.0), mode(1.0)


def test_meszaros_growth_without_baryons():
    # Meszaros 1974: D1 = 1 + 3 y / 2, D2 = D1 ln[(sqrt(1+y)+1)/(sqrt(1+y)-1)] - 3 sqrt(1+y).
    run = course(cosmology(baryon_density=TRACE_OF_BARYONS), 30.0, end=0.03)
    y = matter_over_radiation(run)
    epochs = np.array([0.3, 3.0, 1.0, 10.0, 60.0])

    def growing(y):
        return 1 + 1.5 * y

    def decaying(y):
        return growing(y) * np.log((np.sqrt(1 + y) + 1) / (np.sqrt(1 + y) - 1)) - 3 * np.sqrt(1 + y)

    found = at_epochs(run, y, epochs)
    predicted = predicted_from_two_epochs(growing, decaying, epochs, found)
    # 5e-4: linear interpolation between steps, radiation not perfectly smooth, 1e-5 of baryons.
    np.testing.assert_allclose(found[2:], predicted, rtol=5e-4)


def test_growth_with_smooth_baryons_before_decoupling():
    run = course(cosmology(), 30.0, end=4e-4)
    y = matter_over_radiation(run)
    epochs = np.array([0.05, 0.3, 0.1, 0.6, 1.2])
    found = at_epochs(run, y, epochs)
    share = 0.12 / (0.12 + 0.02237)
    predicted = predicted_from_two_epochs(*growth_modes(share), epochs, found)
    np.testing.assert_allclose(found[2:], predicted, rtol=1e-3)  # baryons creep at terminal velocity, interpolation
    all_clusters = predicted_from_two_epochs(*growth_modes(1 - 1e-9), epochs, found)
    assert abs(found[-1] / all_clusters[-1] - 1.0) > 5e-3  # control: counting baryons as clustering is noticed


def test_tight_coupling_oscillation_phase_amplitude_and_damping():
    # Theta_0 = delta_photon / 4 swings as (1+R)^(-1/4) exp[-(k/k_D)^2] cos(k r_s + phase): sound horizon of
    # Eisenstein & Hu 1998 eq. 6, WKB amplitude of Hu & Sugiyama 1996, damping of Kaiser 1983 with 16/15 (all from
    # memory). Nothing but plasma, so that R grows; deep inside the horizon its gravity is a small offset.
    run = course(cosmology(effective_number=0.0, baryon_density=0.3, dark_matter_density=0.0), 2.0, end=4e-4)
    now = run.now
    a = now.scale_factor
    R = 1.0 / now.photon_baryon_ratio
    phase = run.x[0] / run.tau[0] * run.universe.sound_horizon(a)
    damping = np.exp(-((2.0 / run.universe.diffusion_wavenumber(a)) ** 2))
    window = (run.x > 120.0) & (damping > 0.2)
    assert R[window][-1] / R[window][0] > 2.0
    envelope = (1 + R) ** -0.25 * damping
    monopole = run.delta_photon / 4

    def misfit(envelope):
        waves = np.array([envelope * np.cos(phase), envelope * np.sin(phase)])[:, window]
        weights, *_ = np.linalg.lstsq(waves.T, monopole[window], rcond=None)
        return np.abs(monopole[window] - weights @ waves).max() / np.hypot(*weights)

    assert misfit(envelope) < 0.02  # the plasma's own gravity, of order 2 / (k tau)
    assert misfit((1 + R) ** -0.25) > 0.1  # control: no diffusion
    assert misfit(damping) > 0.04  # control: no baryon loading of the amplitude


def test_silk_factor_needs_polarization():
    # Damping rate 16/15 with polarization against 8/9 without (Kaiser 1983, from memory): over the window of two
    # damping exponents the amplitudes would differ by more than the tolerance.
    run = course(cosmology(effective_number=0.0, baryon_density=0.1, dark_matter_density=0.0), 4.0, end=3e-4)
    a = run.now.scale_factor
    exponent = (4.0 / run.universe.diffusion_wavenumber(a)) ** 2
    R = 1.0 / run.now.photon_baryon_ratio
    quadrature = run.delta_photon / 4 * (1 + R) ** 0.25
    velocity = -np.gradient(quadrature, 4.0 * run.universe.sound_horizon(a))
    amplitude = np.hypot(quadrature, velocity)
    first, last = np.searchsorted(exponent, [0.5, 2.5])
    measured = -np.log(amplitude[last] / amplitude[first]) / (exponent[last] - exponent[first])
    assert measured == pytest.approx(1.0, abs=0.06)  # finite differences of an oscillation at 0.4 rad a step


def test_massless_neutrinos_stream_freely():
    # Without gravity N_l(tau) = N_0(0) j_l(k tau), immediate from exp(-i k mu tau). Late in a standard universe the
    # neutrinos' own gravity is 1e-9 of the streaming; the absorbing layer is far away from low moments.
    universe = Universe(cosmology())
    k, start = 0.2, float(universe.conformal_time(1 / 21.0))
    system = KineticSystem(universe, np.array([k]), ChainLengths(photon=4, polarization=4, neutrino=60))
    state = np.zeros((len(system.unknowns), 1))
    state[system.unknowns.index("delta_neutrino")] = 1.0
    times = np.linspace(start, start + 20.0 / k, 201)[:, None]
    names = ["delta_neutrino", "theta_neutrino", *(f"neutrino_{moment}" for moment in range(2, 8))]
    observed = integrate(system, times, state, names).observed[..., 0]
    x = k * (times[:, 0] - start)
    for moment, found in enumerate(observed):
        scale = 4.0 / 3.0 if moment == 1 else 1.0  # N_1 = 4 theta / (3 k)
        np.testing.assert_allclose(found * scale, spherical_jn(moment, x), atol=2e-6)


def test_absorbing_layer_lets_no_reflection_return():
    # The same stream in a chain of default length: a sharp cut sends it back at k tau of about twice the length.
    universe = Universe(cosmology())
    k, start = 0.2, float(universe.conformal_time(1 / 21.0))
    times = np.linspace(start, start + 60.0 / k, 601)[:, None]
    returned = {}
    for layer in ((2.0, 6.0), (0.0, 6.0)):
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr("twofluid.fluids.kinetic.NEUTRINO_LAYER", layer)
            system = KineticSystem(universe, np.array([k]), ChainLengths(4, 4, 12))
            state = np.zeros((len(system.unknowns), 1))
            state[system.unknowns.index("delta_neutrino")] = 1.0
            density = integrate(system, times, state, ["delta_neutrino"]).observed[0, :, 0]
        x = k * (times[:, 0] - start)
        returned[layer] = np.abs(density - spherical_jn(0, x)).max()
    assert returned[2.0, 6.0] < 0.05  # of a unit start; twice the length makes it 1e-3
    assert returned[0.0, 6.0] > 0.5  # control: without the layer most of it comes back


def test_two_cold_fluids_after_decoupling():
    # Matter and smooth radiation: delta_b - delta_c is a constant plus ln[(sqrt(1+y)-1)/(sqrt(1+y)+1)] (closed form,
    # derived from the growth equation). From z = 200 drag is gone; pressure is negligible at 2/Mpc.
    run = course(cosmology(), 2.0, end=1 / 11.0)
    y = matter_over_radiation(run)
    epochs = y[-1] * 11.0 / np.array([151.0, 41.0, 101.0, 21.0, 11.0])
    difference = np.interp(np.log(epochs), np.log(y), run.delta_baryon - run.delta_dark)

    def decaying(y):
        return np.log((np.sqrt(1 + y) - 1) / (np.sqrt(1 + y) + 1))

    predicted = predicted_from_two_epochs(np.ones_like, decaying, epochs, difference)
    np.testing.assert_allclose(difference[2:], predicted, rtol=1e-3)  # residual drag, interpolation between steps


def test_late_growth_against_the_closed_lambda_form():
    # D = a 2F1(1/3, 1; 11/6; -a^3 Omega_L / Omega_m) for cold matter and a cosmological constant. Little radiation.
    light = cosmology(effective_number=0.0, photon_temperature=1.0, baryon_density=TRACE_OF_BARYONS)
    run = course(light, 1.0)
    a = run.now.scale_factor
    ratio = run.universe.density_fraction("constant", 1.0) / run.universe.density_fraction("dark", 1.0)

    def growth(a):
        return a * hyp2f1(1 / 3, 1.0, 11 / 6, -ratio * a**3)

    late = a > 0.05
    # 4e-4: radiation is 2e-5 of matter today and 4e-4 at a = 0.05.
    np.testing.assert_allclose((run.delta_dark / run.delta_dark[-1])[late], growth(a[late]) / growth(1.0), rtol=4e-4)
    assert growth(0.05) / growth(1.0) != pytest.approx(0.05, rel=0.1)  # control: Einstein-de Sitter growth fails


