"""Saltmarsh's universe, for the tests of the products."""

from dataclasses import replace

from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario


def standard_scenario(**changes):
    """Saltmarsh's universe, parameters by name changed."""
    cosmology = replace(Cosmology(67.5, baryon_density=0.0223, dark_matter_density=0.1195), **changes)
    return Scenario("Saltmarsh test", cosmology, Primordial(), Sampling([0.1], [0.0]))
