"""The shortfall: made-up histories with closed forms, the facts of the trade, and universes of our own."""

import numpy as np
import pytest

from twofluid import evolve
from twofluid.products import contrast_table, shortfall_table, spheres_table
from twofluid.products.shortfall import COLLAPSE


def power(exponent, factor=1.0):
    return (lambda x: factor * np.exp(exponent * x), lambda x: factor * exponent * np.exp(exponent * x))


def row(table, fluid, scale=0):
    """One row of the table as a mapping; empty entries are None."""
    chosen = table[np.asarray(table["fluid"]) == fluid][scale]
    return {name: None if np.ma.is_masked(chosen[name]) else chosen[name] for name in table.colnames}


def rms_of_unit_contrast(run, mode=0):
    """Square root of the primordial power, A (k/pivot)^(n-1), by hand."""
    return np.sqrt(2.1e-9 * (run.wavenumber[mode] / 0.05) ** (0.9649 - 1.0))


def test_threshold_of_collapse():
    # Linear contrast of a sphere that collapses in the matter era, 1.686 (common practice, no source).
    assert pytest.approx(1.686, abs=5e-4) == COLLAPSE


def test_growth_as_the_scale_factor(make_up_run):
    # delta = C a with rms x today: order unity at 1 + z = x.
    unit = rms_of_unit_contrast(make_up_run([power(1)], [power(1)]))
    run = make_up_run([power(1, 20.0 / unit)], [power(1, 0.5 / unit)])
    table = shortfall_table(run, target_redshift=9.0)
    dark, baryon = row(table, "dark"), row(table, "baryon")
    age, drag = run.universe.age, run.universe.landmarks.drag_redshift
    assert dark["rms_at_decoupling"] == pytest.approx(20.0 / (1.0 + drag), rel=1e-9)
    assert dark["rms_at_target"] == pytest.approx(2.0, rel=1e-9)
    # Cubic Hermite pieces of width 0.02 in ln a.
    assert dark["unity_redshift"] == pytest.approx(19.0, rel=1e-9)
    assert dark["unity_age"] == pytest.approx(float(age(0.05)) / 1000.0, rel=1e-8)
    assert dark["collapse_redshift"] == pytest.approx(20.0 / COLLAPSE - 1.0, rel=1e-9)
    assert dark["collapse_age"] == pytest.approx(float(age(COLLAPSE / 20.0)) / 1000.0, rel=1e-8)
    assert (dark["greatest_rms"], dark["greatest_redshift"]) == (pytest.approx(20.0, rel=1e-12), 0.0)
    # t^(2/3) from the age and contrast at the drag epoch on.
    expected = float(age(1.0 / (1.0 + drag))) / 1000.0 * ((1.0 + drag) / 20.0) ** 1.5
    assert dark["matter_era_age"] == pytest.approx(expected, rel=1e-8)
    assert dark["shortfall"] == pytest.approx(dark["rms_needed"] / dark["rms_at_decoupling"], rel=1e-14)
    for name in ("unity_redshift", "unity_age", "collapse_redshift", "collapse_age"):
        assert baryon[name] is None  # half of order unity by today
    assert baryon["greatest_rms"] == pytest.approx(0.5, rel=1e-12)
    assert baryon["shortfall"] == pytest.approx(40.0 * dark["shortfall"], rel=1e-9)
    matter = row(table, "matter")["rms_at_target"]
    assert matter == pytest.approx((0.12 * 2.0 + 0.02237 * 0.05) / (0.12 + 0.02237), rel=1e-9)


def test_growth_that_stops(make_up_run):
    # delta = C a exp(-a/a_1): greatest at a = a_1 = e^-3, where it is C a_1/e.
    unit = rms_of_unit_contrast(make_up_run([power(1)], [power(1)]))
    rate = np.exp(3.0)
    stopping = (
        lambda x: 0.1 / unit * np.exp(x - rate * np.exp(x)),
        lambda x: 0.1 / unit * (1.0 - rate * np.exp(x)) * np.exp(x - rate * np.exp(x)),
    )
    for step in (0.02, 0.19):  # the top between two knots
        found = row(shortfall_table(make_up_run([power(1)], [stopping], step=step)), "baryon")
        # A parabola through a top of this breadth: the cube of the step, and its square in height.
        assert 1.0 + found["greatest_redshift"] == pytest.approx(rate, rel=2.0 * step**2)
        assert found["greatest_rms"] == pytest.approx(0.1 / rate / np.e, rel=step**3)
        assert found["unity_redshift"] is None


def test_a_wave_that_passes_unity_twice_counts_from_the_first_time(make_up_run):
    unit = rms_of_unit_contrast(make_up_run([power(1)], [power(1)]))
    # rms |1.5 sin(ln a)| from just after its zero at ln a = -4 pi on: 1 first where sin = 2/3, never 1.686.
    wave = (lambda x: 1.5 / unit * np.sin(x), lambda x: 1.5 / unit * np.cos(x))
    found = row(shortfall_table(make_up_run([power(1)], [wave], start=-12.5)), "baryon")
    first = -4.0 * np.pi + np.arcsin(2.0 / 3.0)
    assert np.log1p(found["unity_redshift"]) == pytest.approx(-first, rel=1e-8)
    assert found["collapse_redshift"] is None
    assert found["greatest_rms"] == pytest.approx(1.5, rel=1e-6)


def test_at_unity_from_the_start_is_infinite(make_up_run):
    unit = rms_of_unit_contrast(make_up_run([power(1)], [power(1)]))
    found = row(shortfall_table(make_up_run([power(0.01, 3.0 / unit)], [power(1)])), "dark")
    assert found["unity_redshift"] == np.inf
    assert found["unity_age"] is None
    assert found["shortfall"] < 1.0


def test_needed_contrast_across_equality(make_up_run):
    # Meszaros 1974: cold matter grows as 1 + 3y/2; a flat universe without a cosmological constant.
    trial = make_up_run([power(1)], [power(1)], hubble_constant=100.0).universe
    omega = sum(trial.density_fraction(name, 1.0) for name in ("photon", "neutrino", "baryon", "dark"))
    run = make_up_run([power(1)], [power(1)], hubble_constant=100.0 * omega**0.5)
    landmarks = run.universe.landmarks
    y = (1.0 + landmarks.equality_redshift) / (1.0 + np.array([landmarks.drag_redshift, 7.5]))
    table = shortfall_table(run)
    expected = (1.0 + 1.5 * y[0]) / (1.0 + 1.5 * y[1])
    assert row(table, "matter")["rms_needed"] == pytest.approx(expected, rel=1e-8)
    assert table.meta["growth_needed"] == pytest.approx(1.0 / expected, rel=1e-5)  # six digits in a header


@pytest.mark.parametrize("redshift", [7.0, 8.0])
def test_what_order_unity_takes(standard, redshift):
    # Common practice, no source, to a factor of 1.5: 0.7 to 0.8 per cent at decoupling for order unity at
    # redshift 7 to 8. That is growth as the scale factor alone; radiation adds a quarter.
    needed = row(shortfall_table(standard, target_redshift=redshift), "matter")["rms_needed"]
    assert 0.0075 / 1.5 < needed < 0.0075 * 1.5
    assert needed > (1.0 + redshift) / (1.0 + standard.universe.landmarks.drag_redshift)


def test_dark_matter_had_it_and_baryons_had_not(standard):
    table = shortfall_table(standard)
    modes = np.flatnonzero((standard.wavenumber > 100.0) & (standard.wavenumber < 1000.0))
    for mode in modes:
        dark, baryon = row(table, "dark", mode), row(table, "baryon", mode)
        assert 0.5 < dark["shortfall"] < 2.0  # within a factor of order one of what it took
        assert baryon["shortfall"] > 100.0
        assert dark["unity_age"] < 2.0 < 100.0 < baryon["matter_era_age"]


def test_baryons_alone_are_too_late(baryons_alone):
    # Common practice, no source, to a factor of 1.5: a contrast of 1e-4 at decoupling on the scales of the
    # sound horizon; from there order unity after a few 1e11 years by growth as t^(2/3).
    table = shortfall_table(baryons_alone, radii=[8.0])
    waves = table[~np.ma.getmaskarray(table["wavenumber"]) & (np.asarray(table["fluid"]) == "baryon")]
    there = np.asarray(waves["rms_at_decoupling"]).max()
    assert 1e-4 / 1.5 < there < 1e-4 * 1.5
    age = np.asarray(waves["matter_era_age"]).min()  # of the wave that is furthest
    assert 200.0 / 1.5 < age < 500.0 * 1.5
    assert waves["unity_redshift"].mask.all()
    assert np.all(np.asarray(waves["greatest_rms"]) < 0.1)
    assert np.asarray(waves["shortfall"]).min() > 50.0
    sphere = row(table, "baryon", len(baryons_alone.wavenumber))
    assert 1e-4 / 1.5 < sphere["rms_at_decoupling"] < 1e-4 * 1.5
    assert sphere["unity_redshift"] is None
    assert 200.0 / 1.5 < sphere["matter_era_age"] < 500.0 * 1.5
    dark = row(table, "dark")
    assert {name for name, entry in dark.items() if entry is not None} == {"wavenumber", "fluid"}
    assert "no dark matter" in table.meta["no_dark_matter"]


def test_a_wave_reaches_unity_where_the_run_says(standard):
    table = shortfall_table(standard)
    root = np.sqrt(standard.scenario.primordial.power(standard.wavenumber))
    for mode in (100, 130):
        for fluid in ("dark", "baryon"):
            redshift = row(table, fluid, mode)["unity_redshift"]
            reached = root[mode] * standard.at(f"delta_{fluid}", redshift)[mode, 0]
            assert reached == pytest.approx(1.0, rel=1e-9)  # the same interpolation


def test_spheres_stand_below_the_waves_and_agree_with_their_own_table(standard, scenario_with):
    table = shortfall_table(standard, radii=[0.5], masses=[1e6])
    waves = len(standard.wavenumber)
    assert len(table) == 3 * (waves + 2)
    assert np.ma.getmaskarray(table["wavenumber"]).tolist() == [False] * 3 * waves + [True] * 6
    assert np.ma.getmaskarray(table["sphere_mass"]).tolist() == [True] * 3 * waves + [False] * 6
    found = row(table, "matter", waves + 1)
    assert found["sphere_mass"] == pytest.approx(1e6, rel=1e-12)
    marks = [standard.universe.landmarks.drag_redshift, 7.5, found["unity_redshift"], found["collapse_redshift"]]
    run = evolve(standard.scenario, wavenumbers=standard.wavenumber, redshifts=marks)
    sigma = np.asarray(spheres_table(run, masses=[1e6])["sigma_matter"])
    # Another run with other steps: 1e-4 of solver error, and as much from the steps in ln a here.
    assert found["rms_at_decoupling"] == pytest.approx(sigma[0], rel=2e-4)
    assert found["rms_at_target"] == pytest.approx(sigma[1], rel=2e-4)
    assert sigma[2:] == pytest.approx([1.0, COLLAPSE], rel=3e-4)


def test_sphere_the_run_does_not_cover_is_empty_with_the_reason(scenario_with):
    run = evolve(scenario_with(), wavenumbers=np.geomspace(0.5, 50.0, 40), redshifts=[0.0])
    table = shortfall_table(run, radii=[100.0])
    found = row(table, "matter", 40)
    assert {name for name, entry in found.items() if entry is not None} == {"sphere_radius", "sphere_mass", "fluid"}
    assert "wider range of wavenumbers" in table.meta["not_covered"]
    few = evolve(scenario_with(), wavenumbers=[0.1, 1.0], redshifts=[0.0])
    table = shortfall_table(few, masses=[1e6])
    assert row(table, "matter", 2)["rms_at_decoupling"] is None
    assert "spheres need" in table.meta["not_covered"]
    assert "not_covered" not in shortfall_table(few).meta


@pytest.mark.parametrize("redshift", [-0.1, 1100.0, 1e6, np.nan])
def test_target_must_lie_between_drag_epoch_and_today(standard, redshift):
    with pytest.raises(ValueError, match=r"target_redshift = .* must lie between today, 0, and the drag epoch .*, 106"):
        shortfall_table(standard, target_redshift=redshift)


def test_contrast_is_the_rms_per_logarithm_of_wavenumber(standard):
    table = contrast_table(standard)
    mode, epoch = 80, 2
    chosen = table[4 * mode + epoch]
    unit = rms_of_unit_contrast(standard, mode)
    assert chosen["rms_dark"] == pytest.approx(unit * standard.delta_dark[mode, epoch], rel=1e-12)
    assert chosen["rms_baryon"] == pytest.approx(unit * standard.delta_baryon[mode, epoch], rel=1e-12)
    assert np.all(np.asarray(table["rms_baryon"]) >= 0.0)


def test_contrast_without_dark_matter(baryons_alone):
    table = contrast_table(baryons_alone)
    assert table["rms_dark"].mask.all()
    assert np.array_equal(table["rms_matter"], table["rms_baryon"])


def test_growth_to_this_day_ends_at_redshift_zero_exactly(standard):
    # The last step of a run lies at a = 1 to round-off only.
    table = shortfall_table(standard, radii=[2.0])
    assert np.all(np.asarray(table["greatest_redshift"])[-3:] == 0.0)
    large = np.ma.asarray(table["wavenumber"]).filled(np.inf) < 10.0
    assert np.all(np.asarray(table["greatest_redshift"])[large] == 0.0)
