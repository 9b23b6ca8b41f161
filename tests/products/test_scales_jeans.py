"""Horizon, sound and Jeans scales, against published figures and arithmetic by hand."""

import astropy.constants as const
import astropy.units as u
import numpy as np
import pytest

from twofluid.products import map_redshifts, scales_table
from twofluid.products.jeans import jeans_wavenumber, matter_mass

OMEGA_B, OMEGA_M = 0.0223, 0.0223 + 0.1195  # of the run


def jeans_mass(universe, redshift):
    return matter_mass(universe, jeans_wavenumber(universe, np.atleast_1d(redshift)))[0]


def test_jeans_mass_while_photons_set_the_temperature(standard_run):
    # Barkana & Loeb 2001 (Phys. Rep. 349, 125), from memory: 1.35e5 (omega_m/0.15)^(-1/2) with isothermal sound.
    # Here c_s^2 is greater by 4/3 where T ~ 1/a, the mass by (4/3)^(3/2). At z = 500 T already falls a little
    # faster, and their number is rounded upward by 6 per cent.
    published = 1.35e5 * (OMEGA_M / 0.15) ** -0.5 * (4 / 3) ** 1.5
    assert jeans_mass(standard_run.universe, 500.0) == pytest.approx(published, rel=0.1)


@pytest.mark.parametrize("redshift", [7.0, 10.0, 20.0])
def test_jeans_mass_after_thermal_decoupling(standard_run, redshift):
    # Barkana & Loeb 2001, from memory: 5.73e3 (omega_m/0.15)^(-1/2) (omega_b/0.022)^(-3/5) [(1+z)/10]^(3/2).
    # The fit is theirs to about 6 per cent.
    published = 5.73e3 * (OMEGA_M / 0.15) ** -0.5 * (OMEGA_B / 0.022) ** -0.6 * ((1 + redshift) / 10) ** 1.5
    assert jeans_mass(standard_run.universe, redshift) == pytest.approx(published, rel=0.1)


def test_published_jeans_mass_notices_the_other_mass_convention(standard_run):
    # Negative control for the two above.
    universe = standard_run.universe
    wide = matter_mass(universe, jeans_wavenumber(universe, np.array([10.0])), radius=1.0)[0]
    assert wide == pytest.approx(8 * jeans_mass(universe, 10.0), rel=1e-14)
    assert wide > 5 * 5.73e3


def test_from_kelvin_to_solar_masses_to_comoving_length(standard_run):
    # By hand in SI: neutral primordial gas of weight 1.22 hydrogen masses, cooling as a^-2, so 5/3.
    redshift = 10.0
    row = scales_table(standard_run, [redshift])[0]
    temperature = row["gas_temperature"] * u.K
    sound = np.sqrt(5 / 3 * const.k_B * temperature / (1.22 * 1.00783 * const.u)).to("km/s")
    hubble = 100 * u.km / u.s / u.Mpc
    density = (OMEGA_M * 3 * hubble**2 / (8 * np.pi * const.G) * (1 + redshift) ** 3).to("kg/m3")
    length = np.sqrt(np.pi / (const.G * density)) * sound  # proper
    mass = (4 / 3 * np.pi * density * (length / 2) ** 3).to("solMass")
    # The weight has three digits and the slope is -1.99: half a per cent in c_s, three times that in the mass.
    assert row["gas_sound_speed"] == pytest.approx(sound.value, rel=5e-3)
    assert row["jeans_length"] == pytest.approx((length * (1 + redshift)).to_value("Mpc"), rel=5e-3)
    assert row["jeans_mass"] == pytest.approx(mass.value, rel=1.5e-2)
    assert row["jeans_wavenumber"] * row["jeans_length"] == pytest.approx(2 * np.pi, rel=1e-14)


def test_sound_speed_just_after_decoupling(standard_run):
    # "About 2e-5 c", 6 km/s, near z = 1020: Tseliakhovich & Hirata 2010 (arXiv:1005.2416), abstract; one digit.
    speed = scales_table(standard_run, [1020.0])["gas_sound_speed"][0]
    assert speed == pytest.approx(6.0, rel=0.2)


def test_jeans_length_of_the_radiation_plasma_exceeds_the_horizon(standard_run):
    # Common practice, no source: so it oscillates instead of growing. With c_s = 1/sqrt(3) and
    # 3 (a'/a)^2 = 8 pi G a^2 rho the length is 2 pi sqrt(2)/3 Hubble radii; R is 6e-5 here.
    row = scales_table(standard_run, [1e7])[0]
    assert row["jeans_length"] / row["hubble_radius"] == pytest.approx(2 * np.pi * np.sqrt(2) / 3, rel=1e-4)
    assert row["jeans_length"] > row["particle_horizon"]
    assert row["plasma_sound_speed"] == pytest.approx(299792.458 / np.sqrt(3), rel=1e-4)


def test_planck_scales_stand_in_the_table(standard_run):
    # Planck 2018 VI, Table 2: r_drag = 147.09 Mpc, k_D = 0.14087/Mpc at z = 1089.92. The densities of this run are
    # within 0.5 per cent of theirs; their k_D is weighted by visibility.
    table = scales_table(standard_run, [1089.92, 1059.94, 10.0])
    assert table["silk_wavenumber"][0] == pytest.approx(0.14087, rel=1e-2)
    assert table["sound_horizon"][1] == pytest.approx(147.09, rel=3e-3)
    assert table["sound_horizon"][2] == standard_run.universe.landmarks.drag_sound_horizon


def test_what_belongs_to_the_plasma_ends_at_the_drag_epoch(standard_run):
    table = scales_table(standard_run)
    after = standard_run.redshift < standard_run.universe.landmarks.drag_redshift
    for name in ("plasma_sound_speed", "silk_wavenumber"):
        assert table[name].mask.tolist() == after.tolist()
    for name in ("filtering_wavenumber", "filtering_wavenumber_two_fluids", "filtering_mass_measured"):
        assert table[name].mask.tolist() == (~after).tolist()
    # Photons are gone: the Jeans mass falls by ten orders of magnitude and more.
    around = jeans_wavenumber(standard_run.universe, standard_run.universe.landmarks.drag_redshift + np.array([1, -1]))
    assert (around[1] / around[0]) ** 3 > 1e10


def test_mass_radius_multiplies_every_mass(standard_run):
    half, whole = scales_table(standard_run), scales_table(standard_run, mass_radius=1.0)
    assert (half.meta["mass_radius"], whole.meta["mass_radius"]) == (0.5, 1.0)
    for name in ("jeans_mass", "filtering_mass", "filtering_mass_two_fluids", "filtering_mass_measured"):
        assert np.ma.allclose(whole[name], 8 * half[name], rtol=1e-13)


def test_redshifts_of_the_map_fall_to_zero():
    redshift = map_redshifts(1e4)
    assert redshift[0] == pytest.approx(1e4, rel=1e-12)
    assert redshift[-1] == 0.0
    steps = np.diff(np.log1p(redshift))
    assert steps == pytest.approx(np.full(len(steps), steps[0]), rel=1e-9)
    assert len(redshift) > 150
