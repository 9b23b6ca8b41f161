"""Baryons and dark matter followed as coupled linear fluids from the radiation era to today."""

from .certify import certify
from .evolve import evolve, evolve_many
from .history import History, load_history
from .scenario import Scenario, ScenarioError, parse_scenario, read_scenario
from .solver import SolverFailure
from .universe import Universe, UniverseError

__version__ = "0.1.0"

__all__ = [
    "History",
    "Scenario",
    "ScenarioError",
    "SolverFailure",
    "Universe",
    "UniverseError",
    "__version__",
    "certify",
    "evolve",
    "evolve_many",
    "load_history",
    "parse_scenario",
    "read_scenario",
]
