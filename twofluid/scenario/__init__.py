"""What is asked: scenario files to frozen dataclasses, with units, limits and errors that name the line."""

from .errors import ScenarioError
from .manual import key_table_markdown, scenario_template
from .reader import parse_scenario, read_scenario, scenario_from_mapping
from .request import Cosmology, DarkMatter, Method, Neutrinos, Primordial, Sampling, Scenario

__all__ = [
    "Cosmology",
    "DarkMatter",
    "Method",
    "Neutrinos",
    "Primordial",
    "Sampling",
    "Scenario",
    "ScenarioError",
    "key_table_markdown",
    "parse_scenario",
    "read_scenario",
    "scenario_from_mapping",
    "scenario_template",
]
