"""Baryons and dark matter followed as coupled linear fluids from the radiation era to today."""

from .certification import certify
from .comparison import Comparison, compare
from .evolution import evolve, evolve_many
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
    "certify",
    "compare",
    "evolve",
    "evolve_many",
    "load_history",
    "parse_scenario",
    "read_scenario",
]
