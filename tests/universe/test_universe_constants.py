"""Constants against SciPy's CODATA tables and astropy."""

import pytest
from astropy import constants as astropy_constants
from astropy import units
from scipy import constants as codata

from twofluid.universe import constants


@pytest.mark.parametrize(
    ("ours", "theirs"),
    [
        (constants.SPEED_OF_LIGHT, codata.c),
        (constants.BOLTZMANN, codata.k),
        (constants.PLANCK, codata.h),
        (constants.ELECTRON_VOLT, codata.e),
        (constants.GRAVITATION, codata.G),
        (constants.ELECTRON_MASS, codata.m_e),
        (constants.ATOMIC_MASS, codata.atomic_mass),
        (constants.THOMSON_CROSS_SECTION, codata.value("Thomson cross section")),
        (constants.RADIATION_CONSTANT, 4.0 * codata.sigma / codata.c),
        (constants.MEGAPARSEC, 1.0e6 * codata.parsec),
        (constants.MEGAYEAR, 1.0e6 * codata.Julian_year),
        (constants.MEGAPARSEC, astropy_constants.pc.to_value(units.m) * 1.0e6),
        (constants.MEGAYEAR_PER_MEGAPARSEC, (1.0 * units.Mpc / astropy_constants.c).to_value(units.Myr)),
    ],
)
def test_constant_agrees_with_the_tables(ours, theirs):
    # SciPy ships CODATA 2018 or 2022 by its version; they differ by less than 1e-8 in all of these
    assert ours == pytest.approx(theirs, rel=1e-8)


def test_hydrogen_binding_from_rydberg_energy():
    # Rydberg energy with the reduced mass of electron and proton; Dirac and Lamb terms change 1e-5
    reduced = codata.m_p / (codata.m_p + codata.m_e)
    rydberg = codata.value("Rydberg constant times hc in J")
    assert pytest.approx(rydberg * reduced, rel=2e-5) == constants.HYDROGEN_IONIZATION
    # Without fine structure the n = 2 level takes 3/4 of it
    assert pytest.approx(0.75 * rydberg * reduced, rel=5e-5) == constants.LYMAN_ALPHA_ENERGY


def test_helium_ion_is_four_times_hydrogen():
    # Z^2 = 4 with helium's heavier nucleus; relativistic terms change 5e-5
    rydberg = codata.value("Rydberg constant times hc in J")
    assert pytest.approx(4.0 * rydberg, rel=2e-4) == constants.HELIUM_ION_IONIZATION
