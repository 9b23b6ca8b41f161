"""Universes shared by the tests of the smooth universe."""

from dataclasses import replace

import pytest

from twofluid.scenario import Cosmology, Neutrinos
from twofluid.universe import Universe

# Planck 2018 VI (A&A 641, A6), Table 2, TT,TE,EE+lowE+lensing, means; every neutrino massless
PLANCK = Cosmology(
    hubble_constant=67.36,
    baryon_density=0.02237,
    dark_matter_density=0.12,
    photon_temperature=2.7255,
    helium_mass_fraction=0.2454,
    neutrinos=Neutrinos(effective_number=3.046),
)


@pytest.fixture(scope="session")
def make_cosmology():
    """Planck's cosmology with changes by name."""
    return lambda **changes: replace(PLANCK, **changes)


@pytest.fixture(scope="session")
def make_universe(make_cosmology):
    return lambda **changes: Universe(make_cosmology(**changes))


@pytest.fixture(scope="session")
def planck(make_universe):
    return make_universe()


@pytest.fixture(scope="session")
def matter_and_radiation(make_universe):
    """Flat universe of matter and radiation only: its rate is what its densities ask for."""
    trial = make_universe(hubble_constant=100.0)
    omega = sum(trial.density_fraction(name, 1.0) for name in ("photon", "neutrino", "baryon", "dark"))
    return make_universe(hubble_constant=100.0 * omega**0.5)
