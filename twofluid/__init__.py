"""Baryons and dark matter followed as coupled linear fluids from the radiation era to today."""

from .comparison import Comparison, compare
from .evolve import evolve
from .history import History, load_history
from .scenario import Scenario, ScenarioError, parse_scenario, read_scenario
from .solver import SolverFailure
from .universe import Universe, UniverseError

__version__ = "0.1.0"

__all__ = [
    "Comparison",
    "History",
    "Scenario",
    "ScenarioError",
    "SolverFailure",
    "Universe",
    "UniverseError",
    "__version__",
    "compare",
    "evolve",
    "load_history",
    "parse_scenario",
    "read_scenario",
]
