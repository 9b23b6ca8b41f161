"""The universe, wavenumbers, redshifts and velocities of the tests of the wind."""

from dataclasses import replace

import numpy as np

from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario

WIND_REDSHIFTS = (3000.0, 1020.0, 1000.0, 600.0, 300.0, 100.0, 30.0, 10.0, 0.0)
START = 1000.0
WAVENUMBERS = (1.0, 2.0, 4.0, 10.0, 30.0, *np.geomspace(40.0, 1000.0, 15).tolist(), 2e4)
REDSHIFTS = (1020.0, 1000.0, 500.0, 100.0, 40.0, 10.0)
VELOCITIES = (0.0, 1.0, 2.0)


def scenario(**changes):
    cosmology = Cosmology(67.5, baryon_density=0.0223, dark_matter_density=0.1195)
    return Scenario("Saltmarsh test", replace(cosmology, **changes), Primordial(), Sampling([1.0], [0.0]))
