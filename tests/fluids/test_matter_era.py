"""Pressure in a matter era: one fluid, and gas in cold dark matter, through the equations and the solver.

Closed forms of the growth equation, each substituted in it: d^2 delta/dlna^2 + (1/2) d delta/dlna = (3/2) (delta_m -
kappa^2 delta), kappa = k/k_J. The gas in dark matter is that of Nusser, A. 2000, MNRAS 317, 902 (astro-ph/0002317;
abstract).
"""

from types import SimpleNamespace

import numpy as np
import pytest
from matter_era import MatterEra, pressure, run
from scipy.interpolate import CubicSpline
from scipy.special import jv, sici

from twofluid.products.filtering import filtering

K = 1e4  # k tau from here on, so that the horizon is far away
CONSTANT, COOLING = (pressure(1.0, K, power) for power in (0, 1))  # kappa = k/K, and (k/K) a^(-1/2)


def one_fluid(fluid, law, kappa, a, step=0.01):
    """Contrast of a fluid that is all there is, dark or gas, shape (scale factor, mode); 1 and at rest at a = 1."""
    if fluid == "dark":
        return run(MatterEra(dark=law), K * kappa, a, step=step, delta_dark=1.0)[0]
    universe = MatterEra(gas=law, gas_share=1.0, heated=fluid == "heated gas")
    return run(universe, K * kappa, a, step=step, delta_baryon=1.0)[1]


# On equal terms: the same closed forms for dark matter and for gas. Heated gas is good to (k tau)^-1: photons, not
# quite smooth, hold its temperature.
@pytest.mark.parametrize(("fluid", "tolerance"), [("dark", 1e-6), ("gas", 1e-6), ("heated gas", 2e-4)])
def test_constant_jeans_scale_gives_powers(fluid, tolerance):
    # c_s^2 ~ 1/a: a^n with n = [-1 +- sqrt(25 - 24 kappa^2)]/4. From rest both powers take part.
    kappa, a = np.array([0.2, 0.7, 1.0, 1.02, 2.0, 10.0]), np.geomspace(1.0, 100.0, 41)
    root = np.sqrt(25 - 24 * kappa**2 + 0j)
    plus, minus = (-1 + root) / 4, (-1 - root) / 4
    exact = ((plus * a[:, None] ** minus - minus * a[:, None] ** plus) / (plus - minus)).real
    found = one_fluid(fluid, CONSTANT, kappa, a)
    assert np.all(np.abs(found - exact) < tolerance * np.abs(exact).max(axis=0))


def bessel_from_rest(kappa, a):
    """a^(-1/4) J_(+-5/2)(sqrt(6) kappa_0 a^(-1/2)), summed so that at a = 1 it is 1 and at rest."""

    def mode(order, a):
        return a**-0.25 * jv(order, np.sqrt(6) * kappa / np.sqrt(a))

    near = 1e-5  # of the difference quotient: good to 1e-8
    value, slope = (
        np.array([part(order) for order in (2.5, -2.5)])
        for part in (
            lambda order: mode(order, 1.0),
            lambda order: (mode(order, 1 + near) - mode(order, 1 - near)) / (2 * near),
        )
    )
    first, second = np.linalg.solve([value, slope], [1.0, 0.0])
    return first * mode(2.5, a) + second * mode(-2.5, a)


@pytest.mark.parametrize("fluid", ["dark", "gas"])
def test_cooling_fluid_gives_bessel_functions(fluid):
    # c_s^2 ~ a^-2, kappa^2 = kappa_0^2/a. What is left of the waves of the beginning is what grows in the end.
    kappa, a = np.array([0.3, 3.0, 15.0]), np.geomspace(1.0, 1e3, 31)
    found = one_fluid(fluid, COOLING, kappa, a)
    exact = np.stack([bessel_from_rest(one, a) for one in kappa], axis=1)
    assert np.all(np.abs(found - exact) < 2e-6 * np.maximum.accumulate(np.abs(exact)))
    constant = one_fluid(fluid, CONSTANT, kappa, a)
    assert np.all(np.abs(constant[-1] / exact[-1] - 1) > 0.1)  # control: a constant Jeans scale is another thing


@pytest.mark.parametrize("fluid", ["dark", "gas"])
def test_unresolved_waves_are_noticed(fluid):
    # Control: the same with steps of more than a radian; a wave that nothing damps has to be resolved.
    kappa, a = np.array([10.0]), np.geomspace(1.0, 100.0, 5)
    fine, coarse = (one_fluid(fluid, CONSTANT, kappa, a, step) for step in (0.01, 0.2))
    assert np.abs(fine - coarse).max() > 0.1 * np.abs(fine).max()


# Gas without weight in dark matter that grows as a.


def infall(law, kappa, a, heated=False, delta=0.0, slope=0.0):
    """Ratio of gas to dark-matter contrast, shape (scale factor, mode), from those of the gas where a = 1."""
    universe = MatterEra(gas=law, heated=heated)
    first = {"delta_dark": 1.0, "dark_slope": 1.0, "delta_baryon": delta, "baryon_slope": slope}
    dark, gas = run(universe, K * kappa, a, **first)
    assert np.all(np.abs(dark / a[:, None] - 1) < 1e-8)
    return gas / dark


@pytest.mark.parametrize(("heated", "tolerance"), [(False, 1e-7), (True, 1e-4)])  # heated: photons, as above
def test_gas_at_constant_jeans_scale_settles_as_published(heated, tolerance):
    # a/(1 + kappa^2) plus a^s, s = [-1 +- sqrt(1 - 24 kappa^2)]/4; here from rest.
    kappa, a = np.array([0.1, 0.19, 0.5, 2.0, 8.0]), np.geomspace(1.0, 1000.0, 61)
    root = np.sqrt(1 - 24 * kappa**2 + 0j)
    plus, minus = (-1 + root) / 4, (-1 - root) / 4
    free = -1 / (1 + kappa**2)  # what the free part is at a = 1, and its slope
    first, second = free * (1 - minus) / (plus - minus), free * (plus - 1) / (plus - minus)
    exact = -free + (first * a[:, None] ** (plus - 1) + second * a[:, None] ** (minus - 1)).real
    found = infall(CONSTANT, kappa, a, heated)
    np.testing.assert_allclose(found, exact, rtol=0, atol=tolerance)
    # Nusser 2000: tends to 1/(1 + kappa^2); the free part is left to a^(-5/4), and more where it does not oscillate.
    assert found[-1, 2:] == pytest.approx(1 / (1 + kappa[2:] ** 2), rel=0.01)


@pytest.mark.parametrize("kappa", [1.5, 8.0])
def test_oscillation_of_the_gas_has_the_published_decay_and_period(kappa):
    # Nusser 2000: relative to the growth it decays as a^(-5/4), with the period 8 pi/sqrt(24 kappa^2 - 1) in ln a.
    period = 8 * np.pi / np.sqrt(24 * kappa**2 - 1)
    log_a = np.linspace(0.0, 3 * period, 301)
    free = infall(CONSTANT, np.array([kappa]), np.exp(log_a))[:, 0] - 1 / (1 + kappa**2)
    wave = free * np.exp(1.25 * log_a)
    change = np.flatnonzero(wave[1:] * wave[:-1] < 0)
    crossings = log_a[change] - wave[change] * log_a[1] / (wave[change + 1] - wave[change])
    assert len(crossings) >= 5
    assert 2 * np.diff(crossings) == pytest.approx(period, rel=1e-3)  # straight lines between samples
    largest = np.abs(wave[:300]).reshape(3, 100).max(axis=1)  # of each period
    assert largest == pytest.approx(largest[0], rel=2e-3)  # of 100 samples a period
    undone = np.abs(free[:300]).reshape(3, 100).max(axis=1)
    assert np.all(np.diff(undone) < -0.1 * undone[:-1])  # control: without the factor it is not level


def test_gas_oscillates_only_above_the_published_limit():
    # Nusser 2000: for k > k_J/sqrt(24).
    kappa, log_a = np.array([0.2, 0.3]), np.linspace(0.0, 14.0, 29)  # 1/sqrt(24) = 0.204
    free = infall(CONSTANT, kappa, np.exp(log_a)) - 1 / (1 + kappa**2)
    assert np.any(free[1:] * free[:-1] < 0, axis=0).tolist() == [False, True]


COOLED = {0.1: 0.981339235910, 0.5: 0.831827051783, 1: 0.656622038444, 2: 0.421818787851, 5: 0.152594484709}


def cooled(x):
    """1 - x^2 g(x), g = -Ci(x) cos x + [pi/2 - Si(x)] sin x, and its slope by x."""
    si, ci = sici(x)
    g = -ci * np.cos(x) + (np.pi / 2 - si) * np.sin(x)
    slope = ci * np.sin(x) + (np.pi / 2 - si) * np.cos(x) - 1 / x
    return 1 - x**2 * g, -2 * x * g - x**2 * slope


def test_cooling_gas_follows_its_sine_and_cosine_integrals():
    # c_s^2 ~ a^-2, x = sqrt(6) k/k_J(a): closed form, values to 12 digits, on the solution without free waves.
    x = np.array([20.0, *sorted(COOLED, reverse=True)])
    ratio, slope = cooled(20.0)
    assert ratio == pytest.approx(0.0143174456887, rel=1e-10)  # of the same list
    kappa, a = np.array([20.0 / np.sqrt(6)]), (20.0 / x) ** 2
    found = infall(COOLING, kappa, a, delta=ratio, slope=ratio - 10.0 * slope)[1:, 0]
    assert found == pytest.approx([COOLED[value] for value in x[1:]], rel=1e-6)
    assert found[-1] == pytest.approx(1 + 0.01 * (np.log(0.1) + np.euler_gamma), abs=2e-3)  # x << 1; next (pi/2) x^3
    assert np.all(np.abs(found * (1 + x[1:] ** 2 / 6) - 1) > 0.01)  # control: not that of a constant Jeans scale


def test_cooling_gas_from_rest_has_the_free_modes_of_the_closed_form():
    # Free modes of delta_b: sin x and cos x.
    x = np.geomspace(5.0, 0.05, 33)
    a = (5.0 / x) ** 2
    ratio, slope = cooled(5.0)
    modes = np.array([[np.sin(5.0), np.cos(5.0)], [np.cos(5.0), -np.sin(5.0)]])
    sine, cosine = np.linalg.solve(modes, [-ratio, 2 / 5.0 * ratio - slope])  # of a (1 - x^2 g) by x, a = 25/x^2
    exact = cooled(x)[0] + (sine * np.sin(x) + cosine * np.cos(x)) / a
    found = infall(COOLING, np.array([5.0 / np.sqrt(6)]), a)[:, 0]
    np.testing.assert_allclose(found, exact, rtol=0, atol=1e-7)


# The filtering scale of such gas, through the product.

RELEASE = 1e-3  # scale factor at which gas that has kept up with the dark matter is set free


def released(law):
    """Ratios (mode, redshift) as `filtering` reads them, of gas set free with the dark matter's contrast and rate."""
    kappa = np.array([0.004, 0.01, 0.02, 0.05, 0.1, 0.12, 0.14, 0.16, 0.2, 0.3, 1.0, 3.0])
    log_a = np.linspace(np.log(RELEASE), 0.0, 101)
    a = np.exp(log_a)
    universe = MatterEra(gas=law)
    first = dict.fromkeys(("delta_dark", "dark_slope", "delta_baryon", "baryon_slope"), RELEASE)
    dark, gas = run(universe, K * kappa, a, step=0.02, **first)
    course = {"delta_dark": dark, "delta_baryon": gas, "delta_gas_temperature": 2 / 3 * gas}
    splines = {name: CubicSpline(log_a, values) for name, values in course.items()}
    smooth = SimpleNamespace(
        landmarks=SimpleNamespace(drag_redshift=1 / RELEASE - 1),
        diffusion_wavenumber=lambda a: 1e-4 * K,  # acoustic waves are long gone on all scales followed
        conformal_hubble_rate=lambda a: 2 / np.sqrt(a),
        gas_sound_speed=lambda a: np.sqrt(law(a)),
        isothermal_sound_speed=lambda a: np.sqrt(law(a) / (5 / 3)),
        gravity=lambda species, a: 12 / a if species == "dark" else 0.0,
    )
    return SimpleNamespace(
        initial_modes="adiabatic",
        universe=smooth,
        wavenumber=K * kappa,
        has_dark_matter=True,
        at=lambda name, redshift: splines[name](-np.log1p(redshift)).T,
    )


FILTERED = {  # (k_J today/k_F)^2 by s = a of release/a: Gnedin & Hui 1998 in Einstein-de Sitter, from memory
    "constant": (CONSTANT, lambda s: 1 - 3 * s + 2 * s**1.5),
    "cooling": (COOLING, lambda s: 3 * s / RELEASE * (np.log(1 / s) - 2 * (1 - np.sqrt(s)))),
}


@pytest.mark.parametrize("name", FILTERED)
def test_filtering_scale_is_the_square_term_of_the_exact_solution(name):
    law, area = FILTERED[name]
    history = released(law)
    redshift = np.array([100.0, 30.0, 9.0, 0.0])
    expected = K / np.sqrt(area(RELEASE * (1 + redshift)))
    # First order in k^2 of gas that the solver has followed: two scales, the next order taken out.
    ratio = history.at("delta_baryon", redshift) / history.at("delta_dark", redshift)
    square = history.wavenumber[:2, None] ** 2
    lack = (1 - ratio[:2]) / square
    term = lack[0] + (lack[0] - lack[1]) * square[0] / (square[1] - square[0])
    assert 1 / np.sqrt(term) == pytest.approx(expected, rel=1e-4)
    found = filtering(history, redshift)
    assert found.one_growth == pytest.approx(expected, rel=1e-4)  # trapezoids
    assert found.two_fluids == pytest.approx(expected, rel=2e-3)  # the reference lacks (k/k_F)^2 itself
    # Where the gas lacks 2 per cent, the next order shows: for cooling gas the more the later, since there the
    # wavenumber that lacks so little was above the Jeans scale at release (15 per cent today).
    assert found.measured[:2] == pytest.approx(expected[:2], rel=0.02)
    if name == "constant":
        assert found.measured == pytest.approx(expected, rel=0.02)
    other = FILTERED[{"constant": "cooling", "cooling": "constant"}[name]][1]
    assert np.all(np.abs(found.one_growth / K * np.sqrt(other(RELEASE * (1 + redshift))) - 1)[:3] > 0.1)  # control


def test_at_constant_jeans_scale_they_are_the_same_in_the_end():
    # Gnedin & Hui 1998, from memory: k_F = k_J. Exact solution: 1/(1 + kappa^2) against exp(-kappa^2).
    history = released(CONSTANT)
    ratio = (history.at("delta_baryon", np.zeros(1)) / history.at("delta_dark", np.zeros(1)))[:, 0]
    kappa = history.wavenumber / K
    small = kappa < 0.2
    # What waves of the release have left, 3 s of kappa^2 and for the largest kappa s^(5/4), is 1e-3 at the most.
    assert ratio == pytest.approx(1 / (1 + kappa**2), abs=1e-3)
    assert ratio[small] == pytest.approx(np.exp(-(kappa[small] ** 2)), abs=1e-3)
    assert ratio[-1] > 100 * np.exp(-(kappa[-1] ** 2))  # the Gaussian holds on large scales only
