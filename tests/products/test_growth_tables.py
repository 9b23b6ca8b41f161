"""Growth factors and rates: made-up curves, closed forms, and whole runs against closed forms."""

import numpy as np
import pytest
from scipy.special import hyp2f1

from twofluid import evolve
from twofluid.products import growth_table
from twofluid.products.cold_growth import cold_growth
from twofluid.products.growth import smooth_baryon_exponent


def power(exponent, factor=1.0):
    return (lambda x: factor * np.exp(exponent * x), lambda x: factor * exponent * np.exp(exponent * x))


def entries(column):
    """Plain values of a column, all of which must be there."""
    assert not np.ma.is_masked(np.ma.asarray(column))
    return np.asarray(column)


def straight(value, slope):
    """Contrast that runs as a straight line in ln a and is `value` today."""
    return (lambda x: value + slope * x, lambda x: slope + 0.0 * x)


def test_powers_of_the_scale_factor(make_up_run):
    run = make_up_run([power(0.9)], [power(1.3, 0.2)], redshift=(99.0, 9.0, 0.0))
    table = growth_table(run, reference_redshift=99.0)
    share = 0.12 / (0.12 + 0.02237)  # of dark matter
    a = np.array([0.01, 0.1, 1.0])
    matter = share * a**0.9 + (1 - share) * 0.2 * a**1.3
    slope = share * 0.9 * a**0.9 + (1 - share) * 0.2 * 1.3 * a**1.3
    # Cubic Hermite pieces of width 0.02 at the reference: error below 0.02^4/384.
    assert entries(table["growth_dark"]) == pytest.approx((a / 0.01) ** 0.9, rel=1e-9)
    assert entries(table["growth_baryon"]) == pytest.approx((a / 0.01) ** 1.3, rel=1e-9)
    assert entries(table["growth_matter"]) == pytest.approx(matter / matter[0], rel=1e-9)
    # The slope of a piece errs by 0.02^3 times some hundredths.
    assert entries(table["rate_dark"]) == pytest.approx([0.9] * 3, abs=1e-6)
    assert entries(table["rate_matter"]) == pytest.approx(slope / matter, abs=1e-6)
    assert entries(table["exponent_dark"]) == pytest.approx([0.9] * 3, abs=1e-6)
    assert entries(table["exponent_baryon"]) == pytest.approx([1.3] * 3, abs=1e-6)
    assert table.meta["reference_redshift"] == 99.0


def test_cold_matter_is_not_suppressed(make_up_run, scenario_with):
    from scipy.interpolate import CubicSpline

    grid = np.linspace(-14.0, 0.0, 1401)
    universe = make_up_run([power(1)], [power(1)]).universe
    course = CubicSpline(grid, cold_growth(universe, np.expm1(-grid))[0])
    curve = (course, course.derivative())
    table = growth_table(make_up_run([curve], [curve], redshift=(1000.0, 20.0, 0.0)), reference_redshift=200.0)
    assert entries(table["suppression"]) == pytest.approx([1.0] * 3, rel=1e-6)
    slower = growth_table(make_up_run([power(0.9)], [power(0.9)], redshift=(0.0,)), reference_redshift=200.0)
    assert slower["suppression"][0] < 0.9


def test_change_of_sign_leaves_no_exponent(make_up_run):
    table = growth_table(make_up_run([power(1)], [straight(1.0, 0.3)], redshift=(0.0,)), reference_redshift=99.0)
    expected = 1.0 / (1.0 - 0.3 * np.log(100.0))
    assert table["growth_baryon"][0] == pytest.approx(expected, rel=1e-12)
    assert expected < 0.0
    assert table["exponent_baryon"].mask.all()
    assert not table["exponent_dark"].mask.any()


def test_growth_from_nothing_is_empty(make_up_run):
    table = growth_table(make_up_run([power(1)], [straight(0.0, 0.0)], redshift=(0.0,)), reference_redshift=9.0)
    for stem in ("growth", "rate", "exponent"):
        assert table[f"{stem}_baryon"].mask.all()
        assert not table[f"{stem}_matter"].mask.any()


def test_without_dark_matter_matter_is_the_baryons(baryons_alone):
    table = growth_table(baryons_alone)
    for stem in ("growth", "rate", "exponent"):
        assert table[f"{stem}_dark"].mask.all()
        assert np.isnan(table[f"{stem}_dark"].data.data).all()
        matter, baryon = table[f"{stem}_matter"], table[f"{stem}_baryon"]
        np.testing.assert_allclose(matter.filled(0.0), baryon.filled(0.0), rtol=1e-13)  # (g delta) / g
        np.testing.assert_array_equal(matter.mask, baryon.mask)
    assert "no dark matter" in table.meta["no_dark_matter"]


@pytest.mark.parametrize("redshift", [-0.5, 1e15])
def test_reference_outside_the_run_is_refused(standard, redshift):
    with pytest.raises(ValueError, match="redshifts must lie within the run"):
        growth_table(standard, reference_redshift=redshift)


def test_exponent_while_baryons_stay_smooth(standard):
    # Bond, Efstathiou & Silk 1980: p = [(1 + 24 f_c)^(1/2) - 1]/4; 0.9019 at f_c = 0.84292.
    assert smooth_baryon_exponent(standard.universe) == pytest.approx(0.9019, abs=2e-4)  # f_c = 0.84287 here
    assert growth_table(standard).meta["exponent_with_smooth_baryons"] == smooth_baryon_exponent(standard.universe)


def test_dark_matter_grows_by_the_exponent_of_smooth_baryons(scenario_with):
    # Cold photons: equality at z = 1e6, baryons held until z = 8000, so there is a matter era with smooth
    # baryons. On its growing mode the rate is p (1 - O(1/y)), y = 40 at the redshift taken.
    run = evolve(scenario_with(photon_temperature=0.7), wavenumbers=[300.0, 1000.0], redshifts=[2e4])
    table = growth_table(run, reference_redshift=4e4)
    exponent = table.meta["exponent_with_smooth_baryons"]
    assert run.universe.landmarks.drag_redshift < 1e4
    assert entries(table["rate_dark"]) == pytest.approx([exponent] * 2, abs=0.02)
    assert abs(1.0 - exponent) > 0.09  # so it is not the exponent of clustering baryons


def test_smooth_baryons_across_equality(scenario_with):
    # Hu & Sugiyama 1996, appendix D (from memory, verified by substitution): between horizon entry and the
    # drag epoch delta_c is a mixture of U_i = (1 + y)^(-alpha_i) 2F1(alpha_i, alpha_i + 1/2; 2 alpha_i + 1/2;
    # 1/(1 + y)), alpha = [1 -+ (1 + 24 f_c)^(1/2)]/4.
    redshift = np.array([30000.0, 12000.0, 5000.0, 2000.0])
    run = evolve(scenario_with(), wavenumbers=[1000.0], redshifts=redshift)
    y = (1.0 + run.universe.landmarks.equality_redshift) / (1.0 + redshift)
    share = 0.12 / (0.12 + 0.02237)
    pair = []
    for sign in (-1.0, 1.0):
        alpha = (1.0 + sign * np.sqrt(1.0 + 24.0 * share)) / 4.0
        pair.append((1 + y) ** -alpha * hyp2f1(alpha, alpha + 0.5, 2 * alpha + 0.5, 1.0 / (1.0 + y)))
    pair = np.array(pair).T
    growth = entries(growth_table(run, reference_redshift=redshift[0])["growth_dark"])
    mixture = np.linalg.solve(pair[[0, 1]], growth[[0, 1]])
    # Baryons hold 1e-3 of the contrast at z = 2000 by then, photons less: that is what is left out.
    assert growth[2:] == pytest.approx(pair[2:] @ mixture, rel=1e-3)


def test_late_growth_is_that_of_matter_and_a_cosmological_constant(standard):
    # Closed form, D = a 2F1(1/3, 1; 11/6; -a^3 Omega_Lambda/Omega_m); at a = 1 and Omega_m = 0.3153 the rate
    # is 0.527386. Here Omega_m = 0.31377; radiation left out costs 2/3 a_eq/a of the growth, 2e-3 at z = 10.
    matter = (0.02237 + 0.12) / 0.6736**2

    def closed(a):
        return a * hyp2f1(1 / 3, 1, 11 / 6, -(a**3) * (1 - matter) / matter)

    table = growth_table(standard, reference_redshift=10.0)
    waves = (table["redshift"] == 0.0) & (table["wavenumber"] > 0.005) & (table["wavenumber"] < 50.0)
    ratio = table["growth_matter"][waves] / (closed(1.0) / closed(1.0 / 11.0))
    assert np.abs(ratio - 1.0).max() < 4e-3
    step = 1e-5
    rate = np.log(closed(1.0) / closed(1.0 - step)) / -np.log1p(-step)
    assert entries(table["rate_matter"][waves]) == pytest.approx(np.full(waves.sum(), rate), abs=5e-4)


def test_infall_suppresses_the_growth_of_small_scales(standard):
    # Infall from rest (closed form, verified): of what cold matter would have grown since the drag epoch,
    # delta_m on its growing mode has (3/2 + p)/(5/2). Real baryons do not start at rest and are let go
    # gradually, and half the energy is not yet matter: to 2 per cent.
    table = growth_table(standard, reference_redshift=standard.universe.landmarks.drag_redshift)
    exponent = table.meta["exponent_with_smooth_baryons"]
    small = (table["redshift"] == 0.0) & (table["wavenumber"] > 1.0) & (table["wavenumber"] < 20.0)
    assert entries(table["suppression"][small]) == pytest.approx(
        np.full(small.sum(), (1.5 + exponent) / 2.5), abs=0.02
    )
    # Below the Jeans length baryons never cluster, and the suppression goes on.
    smallest = (table["redshift"] == 0.0) & (table["wavenumber"] > 5000.0)
    assert np.all(table["suppression"][smallest] < 0.7)


def test_slopes_between_the_steps_are_those_of_the_interpolation(standard):
    redshift, step = 333.0, 1e-4
    for name in ("delta_dark", "delta_baryon"):
        around = standard.at(name, np.expm1(np.log1p(redshift) + np.array([step, -step])))
        found = standard.slope_at(name, redshift)[:, 0]
        difference = (around[:, 1] - around[:, 0]) / (2.0 * step)
        assert found == pytest.approx(difference, rel=1e-5, abs=1e-5 * np.abs(difference).max())
    with pytest.raises(ValueError, match="no quantity is named 'speed'"):
        standard.slope_at("speed", 10.0)
