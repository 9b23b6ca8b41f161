"""A universe like ours, its wind, and patches that feel it."""

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from twofluid import evolve
from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario
from twofluid.streaming import follow_patches, rms_velocity, wind_wavenumbers

WIND_REDSHIFTS = (3000.0, 1020.0, 1000.0, 600.0, 300.0, 100.0, 30.0, 10.0, 0.0)
START = 1000.0
WAVENUMBERS = (1.0, 2.0, 4.0, 10.0, 30.0, *np.geomspace(40.0, 1000.0, 15).tolist(), 2e4)
REDSHIFTS = (1020.0, 1000.0, 500.0, 100.0, 40.0, 10.0)
VELOCITIES = (0.0, 1.0, 2.0)


def scenario(**changes):
    cosmology = Cosmology(67.5, baryon_density=0.0223, dark_matter_density=0.1195)
    return Scenario("Saltmarsh test", replace(cosmology, **changes), Primordial(), Sampling([1.0], [0.0]))


@pytest.fixture(scope="session")
def windy():
    """A run of the wavenumbers that make the wind."""
    return evolve(scenario(), wavenumbers=wind_wavenumbers(), redshifts=WIND_REDSHIFTS)


@pytest.fixture(scope="session")
def rms(windy):
    """The rms streaming velocity as a function of the scale factor [c]."""
    return rms_velocity(windy, START)


@pytest.fixture(scope="session")
def start():
    """A run that tells every mode where its patches start."""
    return evolve(scenario(), wavenumbers=WAVENUMBERS, redshifts=[START])


@pytest.fixture(scope="session")
def patches(start, rms):
    """What the wind does to the modes."""
    followed = follow_patches(start, REDSHIFTS, VELOCITIES, rms)
    return SimpleNamespace(
        wavenumber=np.array(WAVENUMBERS), redshift=REDSHIFTS, velocity=VELOCITIES, counts=followed.counts,
        dark=followed.dark, baryon=followed.baryon, matter=followed.matter, error=followed.error,
    )  # fmt: skip


@pytest.fixture(scope="session")
def make_scenario():
    """Return the function that builds the scenario, parameters by name changed."""
    return scenario
