"""A universe like ours, its wind, and patches that feel it."""

import sys
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from twofluid import evolve
from twofluid.streaming import follow_patches, rms_velocity, wind_wavenumbers

sys.path.insert(0, str(Path(__file__).parent))  # the helpers beside the tests

from wind_cases import REDSHIFTS, START, VELOCITIES, WAVENUMBERS, WIND_REDSHIFTS, scenario


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
