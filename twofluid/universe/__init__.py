"""The smooth universe: expansion, ionization, gas temperature and sound speeds, landmarks."""

from .conditions import Conditions
from .errors import UniverseError
from .landmarks import Landmarks
from .many import UniverseStack, build_universes
from .response import Response
from .universe import Universe

__all__ = ["Conditions", "Landmarks", "Response", "Universe", "UniverseError", "UniverseStack", "build_universes"]
