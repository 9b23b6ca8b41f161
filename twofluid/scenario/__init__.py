"""What is asked: scenario files to frozen dataclasses, with units, limits and errors that name the line."""

from .errors import ScenarioError
from .keys import ADIABATIC
from .manual import key_table_markdown, scenario_template
from .mixture import Mixture, Part, Share, check_mixture, mixture_lines, parts
from .reader import parse_scenario, read_scenario, scenario_from_mapping
from .request import (
    Cosmology,
    DarkMatter,
    Method,
    Neutrinos,
    Primordial,
    Reionization,
    Sampling,
    Scenario,
    ThermalTable,
)
from .thermal import thermal_sentence

__all__ = [
    "ADIABATIC",
    "Cosmology",
    "DarkMatter",
    "Method",
    "Mixture",
    "Neutrinos",
    "Part",
    "Primordial",
    "Reionization",
    "Sampling",
    "Scenario",
    "ScenarioError",
    "Share",
    "ThermalTable",
    "check_mixture",
    "key_table_markdown",
    "mixture_lines",
    "parse_scenario",
    "parts",
    "read_scenario",
    "scenario_from_mapping",
    "scenario_template",
    "thermal_sentence",
]
