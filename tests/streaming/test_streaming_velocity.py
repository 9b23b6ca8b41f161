"""The streaming velocity: published values, closed forms, and what its error is worth."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import dawsn

from twofluid import evolve
from twofluid.streaming import Wind, find_wind, wind_wavenumbers

KILOMETRES = 299792.458  # per second, of the speed of light; exact
LITTLE_H = 0.675  # of the universe at hand


@pytest.fixture(scope="module")
def wind(windy):
    return find_wind(windy, windy.redshift)


def at(wind, redshift):
    return int(np.flatnonzero(wind.redshift == redshift)[0])


def test_about_thirty_kilometres_per_second_just_after_recombination(wind):
    # About 30 km/s at z = 1020: Tseliakhovich & Hirata 2010 (arXiv:1005.2416), as quoted in the abstract of Maio,
    # Koopmans & Ciardi 2011 (arXiv:1011.4006). One digit is said; 28.8 here.
    assert wind.rms[at(wind, 1020.0)] * KILOMETRES == pytest.approx(30.0, rel=0.05)


def test_late_it_decays_as_one_plus_redshift(wind):
    # 30 km/s (1 + z)/1000, the rule used in models of galaxy formation after Fialkov et al. 2012: to 5 per cent.
    late = wind.redshift <= 100.0
    per_redshift = wind.rms[late] * KILOMETRES / (1.0 + wind.redshift[late])
    assert per_redshift == pytest.approx(30.0 / 1000.0, rel=0.05)
    # No force is left that moves one against the other on such scales; small waves still fall together.
    assert np.ptp(per_redshift) < 4e-3 * per_redshift.mean()


def test_at_decoupling_photons_still_drive_it(wind):
    # Negative control of the last: up to z = 300 drag is felt, and (1 + z) alone would miss by 8 per cent.
    per_redshift = wind.rms / (1.0 + wind.redshift)
    assert per_redshift[at(wind, 300.0)] / per_redshift[at(wind, 1000.0)] == pytest.approx(1.08, abs=0.01)


def test_it_is_supersonic(windy, wind):
    # Mach number about 5: Tseliakhovich & Hirata 2010, from memory; 5.4 with adiabatic and 6.9 with isothermal sound of
    # a gas at z = 1020 in a standard universe, for 30 km/s.
    a, sigma = 1 / 1021.0, wind.rms[at(wind, 1020.0)]
    assert 5.0 < sigma / windy.universe.gas_sound_speed(a) < 7.0
    assert 5.0 < sigma / windy.universe.isothermal_sound_speed(a) < 7.0


def test_its_scale_in_an_expansion_time(windy, wind):
    # a H/sigma is about 40/Mpc at z = 1020: Tseliakhovich & Hirata 2010, from memory; with 28.8 instead of 30 km/s
    # four per cent more, and the universe of that paper is another.
    rate = windy.universe.conformal_hubble_rate(1 / 1021.0)
    assert rate / wind.rms[at(wind, 1020.0)] == pytest.approx(43.0, rel=0.15)


def test_it_is_the_same_over_a_few_megaparsec(wind):
    # Coherent on <= 3 Mpc/h: abstract of Maio, Koopmans & Ciardi 2011; "a few Mpc": Tseliakhovich & Hirata 2010, from
    # memory.
    place = at(wind, 1020.0)
    assert wind.correlation([3.0 / LITTLE_H])[0, place] > 0.9
    assert 2.0 < wind.coherence_length()[place] < 3.0 / LITTLE_H
    assert wind.correlation([100.0])[0, place] < 0.2  # and another beyond the acoustic scale


def test_acoustic_scales_hold_the_variance(wind):
    # Waves from the horizon at equality (0.01/Mpc) to the diffusion scale (0.14/Mpc) make it.
    place = at(wind, 1020.0)
    assert 0.01 < wind.holding(0.5)[place] < 0.14
    assert wind.holding(0.9)[place] < 0.3
    between = (wind.wavenumber > 0.01) & (wind.wavenumber < 1.0)
    assert wind.spectrum[between, place].sum() > 0.95 * wind.spectrum[:, place].sum()


def gaussian_wind(length, wavenumber):
    """A wind with spectrum k^2 exp(-k^2 L^2)."""
    k = np.asarray(wavenumber)
    spectrum = (k**2 * np.exp(-((k * length) ** 2)))[:, None]
    return Wind(k, np.array([0.0]), spectrum, np.array([np.sqrt(0.5) / length]), np.zeros(1))


def test_correlation_and_shares_in_closed_form():
    # int dlnk k^2 exp(-k^2 L^2) = 1/(2 L^2); share up to k: 1 - exp(-k^2 L^2); correlation 2 (L/r) D(r/2L), Dawson's D.
    length = 10.0
    wind = gaussian_wind(length, np.geomspace(1e-5, 10.0, 2001))
    assert wind.holding(0.5)[0] == pytest.approx(np.sqrt(np.log(2.0)) / length, rel=1e-3)
    distance = np.array([1.0, 10.0, 50.0])
    expected = 2.0 * length / distance * dawsn(0.5 * distance / length)
    assert wind.correlation(distance)[:, 0] == pytest.approx(expected, rel=1e-4)
    assert wind.correlation(wind.coherence_length())[0, 0] == pytest.approx(0.95, abs=2e-4)


def test_the_error_covers_a_wider_and_denser_run(make_scenario, windy, wind):
    redshifts = [1020.0, 100.0, 10.0]
    ours = [at(wind, z) for z in redshifts]
    wavenumbers = np.geomspace(1e-4, 10.0, 401)
    denser = find_wind(evolve(make_scenario(), wavenumbers=wavenumbers, redshifts=redshifts), redshifts)
    assert np.all(np.abs(denser.rms - wind.rms[ours]) < wind.error[ours])
    assert np.all(wind.error[ours] < 1e-3 * wind.rms[ours])
    # What small waves would add, up to 100/Mpc. Late there is more of it: gas held up by its pressure moves against the
    # dark matter too, which is no wind; hence 3e-3 at z = 10.
    wavenumbers = np.geomspace(10.0, 100.0, 41)
    small = find_wind(evolve(make_scenario(), wavenumbers=wavenumbers, redshifts=redshifts), redshifts)
    added = np.hypot(wind.rms[ours], small.rms) - wind.rms[ours]
    assert added[0] < wind.error[ours][0]
    assert np.all(added < 3e-3 * wind.rms[ours])
    # Negative control: waves up to 0.1/Mpc alone are not enough, and the error knows, as well as one can within an
    # acoustic oscillation.
    cut = find_wind(replace_modes(windy, windy.wavenumber < 0.101), redshifts)
    assert np.all(wind.rms[ours] - cut.rms > 0.05 * wind.rms[ours])
    assert np.all(cut.error > 0.5 * (wind.rms[ours] - cut.rms))


def replace_modes(run, chosen):
    """Return a run of some of its modes."""
    followed = {name: values[chosen] for name, values in vars(run.trace).items() if values is not None}
    trace = replace(run.trace, **followed)
    return replace(run, wavenumber=run.wavenumber[chosen], trace=trace)


@pytest.mark.parametrize("chosen", [slice(None, 4), slice(None, -1), slice(None, None, -1)])
def test_a_run_that_is_no_grid_is_refused(windy, chosen):
    with pytest.raises(ValueError, match="must be an odd number, 5 or more, increasing by equal factors"):
        find_wind(replace_modes(windy, chosen), [100.0])


def test_wind_scales_with_the_primordial_amplitude(windy, wind):
    scenario = replace(windy.scenario, primordial=replace(windy.scenario.primordial, amplitude=4 * 2.1e-9))
    louder = find_wind(replace(windy, scenario=scenario), windy.redshift)
    assert louder.rms == pytest.approx(2.0 * wind.rms, rel=1e-12)


def test_velocity_of_the_dark_matter_is_taken_off(windy, wind):
    # Dark matter that goes half the way with the gas leaves half of the velocity.
    trace = replace(
        windy.trace,
        theta_dark=0.5 * windy.trace.theta_baryon,
        theta_dark_slope=0.5 * windy.trace.theta_baryon_slope,
    )
    moving = replace(windy, trace=trace, theta_dark=0.5 * windy.theta_baryon)
    assert find_wind(moving, windy.redshift).rms == pytest.approx(0.5 * wind.rms, rel=1e-9)


def test_the_wavenumbers_are_a_grid():
    k = wind_wavenumbers()
    assert len(k) % 2 == 1
    assert np.diff(np.log(k)) == pytest.approx(np.log(k[1] / k[0]), rel=1e-9)
