"""What is asked: scenario files to frozen dataclasses, with units, limits and errors that name the line."""

from .errors import ScenarioError
from .manual import key_table_markdown, scenario_template
from .reader import parse_scenario, read_scenario, scenario_from_mapping
from .request import Cosmology, Method, Neutrinos, Primordial, Reionization, Sampling, Scenario, ThermalTable
from .thermal import thermal_sentence

__all__ = [
    "Cosmology",
    "Method",
    "Neutrinos",
    "Primordial",
    "Reionization",
    "Sampling",
    "Scenario",
    "ScenarioError",
    "ThermalTable",
    "key_table_markdown",
    "parse_scenario",
    "read_scenario",
    "scenario_from_mapping",
    "scenario_template",
    "thermal_sentence",
]
