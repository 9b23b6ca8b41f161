"""The smooth universe: expansion, ionization, gas temperature and sound speeds, landmarks."""

from .conditions import Conditions
from .errors import UniverseError
from .landmarks import Landmarks
from .many import UniverseStack, build_universes
from .universe import Universe

__all__ = ["Conditions", "Landmarks", "Universe", "UniverseError", "UniverseStack", "build_universes"]
