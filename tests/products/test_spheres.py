"""Rms in spheres: the window and the integral against mpmath, its errors against truth, and sigma_8."""

import mpmath
import numpy as np
import pytest

from twofluid import evolve
from twofluid.products import sigma_8, spheres_table
from twofluid.products.sphere_filter import SphereFilter, window, window_bound
from twofluid.products.spheres import COVERAGE, sphere_mass, sphere_radii
from twofluid.scenario import Primordial

FLUIDS = ("dark", "baryon", "matter")
TILTED = Primordial(amplitude=2e-9, tilt=0.9, pivot=0.05)


@pytest.mark.parametrize("x", [1e-8, 1e-3, 0.05, 0.0999, 0.1001, 1.0, 4.4934, 30.0, 1e4])
def test_window(x):
    with mpmath.workdps(60):
        exact = 3 * (mpmath.sin(x) - x * mpmath.cos(x)) / mpmath.mpf(x) ** 3
    # Round-off of the difference sin x - x cos x: 1e-16 of x over x^3/3.
    assert float(window(x)) == pytest.approx(float(exact), rel=1e-11, abs=1e-16)
    assert window(x) ** 2 <= window_bound(x)


@pytest.mark.parametrize("radius", [0.5, 3.0, 20.0])
@pytest.mark.parametrize("exponent", [0.4, 1.0])
def test_power_law_contrast_against_mpmath(exponent, radius):
    # sigma^2 = A int dk/k (k/pivot)^(n-1) k^(2s) W^2(kR), adaptively and by pieces of W's period.
    low, high = 1e-3, 100.0 / radius
    k = np.geomspace(low, high, 400)
    found = SphereFilter(k, TILTED, [radius]).rms(k[:, None] ** exponent)

    def integrand(log_k):
        x = mpmath.exp(log_k) * radius
        w = 3 * (mpmath.sin(x) - x * mpmath.cos(x)) / x**3
        return 2e-9 * (mpmath.exp(log_k) / 0.05) ** -0.1 * mpmath.exp(2 * exponent * log_k) * w**2

    pieces = np.log(np.concatenate([np.geomspace(low, 1 / radius, 6), np.arange(4, 101, 4) / radius]))
    exact = float(mpmath.sqrt(mpmath.quad(integrand, [*map(float, pieces)], maxdegree=5)))
    # The spline of a power with some 70 points a decade errs by 1e-8.
    assert found.value[0, 0] == pytest.approx(exact, rel=1e-7)
    assert found.error[0, 0] < 0.05 * exact


def acoustic(k):
    """Contrast with waves of a sound horizon of 147 Mpc on it, fading as they do."""
    smooth = 3e4 * k**2 / (1.0 + (k / 0.015) ** 1.6)
    return (smooth * (1.0 + 0.1 * np.sin(147.0 * k) * np.exp(-((k / 0.12) ** 1.4))))[:, None]


@pytest.mark.parametrize("modes", [49, 55, 61, 81, 121, 161, 241])
def test_stated_error_covers_that_of_few_modes(modes):
    radii = [0.5, 8.0, 50.0]
    spheres = SphereFilter(np.geomspace(1e-4, 1e3, 3000), TILTED, radii)
    exact = spheres.rms(acoustic(np.geomspace(1e-4, 1e3, 3000))).value
    k = np.geomspace(1e-4, 1e3, modes)
    found = SphereFilter(k, TILTED, radii).rms(acoustic(k))
    assert np.all(np.abs(found.value - exact) <= found.error)


def test_sampling_error_falls_with_the_fourth_power_of_the_spacing():
    errors, truths = [], []
    exact = SphereFilter(np.geomspace(1e-4, 1e3, 3000), TILTED, [8.0]).rms(acoustic(np.geomspace(1e-4, 1e3, 3000)))
    for modes in (201, 401, 801):
        k = np.geomspace(1e-4, 1e3, modes)
        found = SphereFilter(k, TILTED, [8.0]).rms(acoustic(k))
        errors.append((found.error - found.beyond)[0, 0])
        truths.append(abs(found.value - exact.value)[0, 0])
    # Sixteenfold per halving once the waves are resolved; a spline in ln k does that late for its last waves.
    assert errors[0] > 5.0 * errors[1] > 50.0 * errors[2]
    assert truths[1] < errors[1]


def test_rms_follows_from_amplitude_and_tilt():
    k = np.geomspace(1e-3, 100.0, 200)
    contrast = (k / (1.0 + k / 0.02))[:, None]
    base = SphereFilter(k, TILTED, [2.0]).rms(contrast).value
    louder = SphereFilter(k, Primordial(8e-9, 0.9, 0.05), [2.0]).rms(contrast).value
    assert louder == pytest.approx(2.0 * base, rel=1e-13)
    # Tilting by k^(n-1) about the pivot is the same as tilting the contrast by k^((n-1)/2).
    level = SphereFilter(k, Primordial(2e-9, 1.0, 0.05), [2.0]).rms(contrast * (k[:, None] / 0.05) ** -0.05).value
    assert level == pytest.approx(base, rel=1e-6)


def test_order_of_wavenumbers_does_not_matter(standard):
    shuffled = np.random.default_rng(1).permutation(len(standard.wavenumber))
    primordial = standard.scenario.primordial
    one = SphereFilter(standard.wavenumber, primordial, [1.0]).rms(standard.delta_dark)
    two = SphereFilter(standard.wavenumber[shuffled], primordial, [1.0]).rms(standard.delta_dark[shuffled])
    assert np.array_equal(one.value, two.value)
    assert np.array_equal(one.error, two.error)


def test_slope_of_the_rms():
    k = np.geomspace(1e-3, 100.0, 100)
    base = (k / (1.0 + k / 0.02))[:, None]
    spheres = SphereFilter(k, TILTED, [0.1, 5.0])
    value, slope = spheres.rms_and_slope(3.0 * base, 0.8 * 3.0 * base)  # delta growing as a^0.8
    assert value == pytest.approx(3.0 * spheres.rms(base).value, rel=1e-13)
    assert slope == pytest.approx(0.8 * value, rel=1e-13)


@pytest.fixture(scope="module")
def fine(scenario_with):
    """Truth for the errors below: twice as many modes as any of them, over a wider range."""
    return evolve(scenario_with(), wavenumbers=np.geomspace(1e-4, 3e4, 400), redshifts=[1000.0, 10.0, 0.0])


RADII = (0.02, 0.5, 8.0, 50.0)


@pytest.mark.parametrize(
    ("low", "high", "modes"),
    [(1e-4, 1e4, 56), (1e-4, 1e4, 81), (1e-3, 1e3, 121), (1e-2, 10.0, 61), (0.1, 1e3, 81), (1e-3, 1.0, 61),
     (0.3, 3.0, 12)],
)  # fmt: skip
def test_stated_error_covers_the_true_one_or_nothing_is_said(fine, low, high, modes):
    run = evolve(fine.scenario, wavenumbers=np.geomspace(low, high, modes), redshifts=fine.redshift)
    table, truth = spheres_table(run, radii=RADII), spheres_table(fine, radii=RADII)
    for fluid in FLUIDS:
        found, error = (np.ma.asarray(table[f"sigma_{fluid}{part}"]) for part in ("", "_error"))
        exact = np.ma.asarray(truth[f"sigma_{fluid}"])
        off = np.abs(found - exact).compressed()
        # The steps of another run differ: 1e-4 of solver error on top.
        assert np.all(off <= error.compressed() + 1e-4 * exact[~found.mask].data), fluid
    if np.ma.is_masked(np.ma.asarray(table["sigma_matter"])):
        assert "10 per cent" in table.meta["not_covered"]


def test_narrow_range_leaves_large_and_small_spheres_empty(fine):
    run = evolve(fine.scenario, wavenumbers=np.geomspace(0.05, 20.0, 60), redshifts=[0.0])
    table = spheres_table(run, radii=[1e-3, 1.0, 300.0])
    assert np.ma.getmaskarray(np.ma.asarray(table["sigma_matter"])).tolist() == [True, False, True]
    assert np.isnan(np.ma.asarray(table["sigma_matter"]).data[[0, 2]]).all()
    assert COVERAGE == 0.1


SPARSE = [
    (np.geomspace(0.01, 10.0, 7), "at least 8 wavenumbers over a factor of 7.4 or more; this run has 7 over a"),
    (np.geomspace(1.0, 7.0, 30), "this run has 30 over a factor of 7"),
    ([1.0], "this run has 1 over a factor of 1"),
    (np.geomspace(1e-3, 1e3, 9), "wavenumbers within a factor of 1.4; in this run some are a factor of 5.62 apart"),
]


@pytest.mark.parametrize(("wavenumbers", "reason"), SPARSE)
def test_too_few_modes_leave_everything_empty_with_the_reason(scenario_with, wavenumbers, reason):
    run = evolve(scenario_with(), wavenumbers=wavenumbers, redshifts=[0.0])
    table = spheres_table(run)
    for fluid in FLUIDS:
        assert np.ma.getmaskarray(np.ma.asarray(table[f"sigma_{fluid}"])).all()
    assert reason in table.meta["not_covered"]
    with pytest.raises(ValueError, match="spheres need"):
        sigma_8(run)


def test_sigma_8(standard):
    value, error = sigma_8(standard)
    # Planck 2018 VI, Table 2: 0.8111 +- 0.0060, with one neutrino of 0.06 eV. Here every neutrino is
    # massless: the same amplitude and densities give 1 to 2 per cent more, as the neutrino's share of 0.45
    # per cent does not hold growth back (by 8 f_nu in power on small scales, less at 8 Mpc/h; Lesgourgues &
    # Pastor 2006, from memory) nor count as matter that does not cluster.
    assert 0.8111 < value < 1.025 * 0.8111
    assert error < 0.01
    table = spheres_table(standard)
    assert table["sphere_radius"][0] == pytest.approx(8.0 / 0.6736, rel=1e-12)
    assert np.ma.asarray(table["sigma_matter"])[-1] == pytest.approx(value, rel=1e-12)


def test_sigma_8_of_a_run_that_does_not_cover_it(fine):
    run = evolve(fine.scenario, wavenumbers=np.geomspace(1.0, 100.0, 40), redshifts=[0.0])
    with pytest.raises(ValueError, match=r"a sphere of 11\.88 Mpc is empty where wavenumbers beyond"):
        sigma_8(run)


def test_masses_and_radii(standard):
    from astropy import constants, units
    from astropy.cosmology import FlatLambdaCDM

    matter = FlatLambdaCDM(H0=67.36, Om0=(0.02237 + 0.12) / 0.6736**2, Tcmb0=0.0)
    density = matter.critical_density(0.0) * matter.Om0
    expected = (4.0 / 3.0 * np.pi * density * (3.0 * units.Mpc) ** 3).to_value(units.solMass)
    assert constants.G.value == 6.6743e-11
    # The nominal G M_sun over G: astropy's solar mass is the same to 1e-6.
    assert sphere_mass(standard.universe, 3.0) == pytest.approx(expected, rel=2e-6)
    table = spheres_table(standard, radii=[3.0], masses=[expected, 8.0 * expected])
    assert np.asarray(table["sphere_radius"])[::4] == pytest.approx([3.0, 3.0, 6.0], rel=1e-6)
    assert np.asarray(table["sphere_mass"])[::4] == pytest.approx(
        [expected, expected, 8.0 * expected], rel=2e-6
    )
    assert np.asarray(table["redshift"])[:4].tolist() == [1000.0, 100.0, 10.0, 0.0]


@pytest.mark.parametrize("value", [0.0, -1.0, np.inf, np.nan])
def test_impossible_spheres_are_refused(standard, value):
    with pytest.raises(ValueError, match="must be positive and finite"):
        sphere_radii(standard.universe, [1.0, value])
    with pytest.raises(ValueError, match="must be positive and finite"):
        spheres_table(standard, masses=[value])


def test_no_sphere_is_made_up_where_none_is_wanted(standard):
    assert len(sphere_radii(standard.universe)) == 0


def test_without_dark_matter(baryons_alone):
    table = spheres_table(baryons_alone, radii=[8.0])
    for name in ("sigma_dark", "sigma_dark_error"):
        assert table[name].mask.all()
        assert np.isnan(table[name].data.data).all()
    assert np.ma.allequal(table["sigma_matter"], table["sigma_baryon"])
    assert not np.ma.asarray(table["sigma_baryon"]).mask.any()
