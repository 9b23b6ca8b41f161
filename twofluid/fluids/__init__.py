"""The linear physics: which quantity stands in which row, its rates, its start and its pace."""

from .kinetic import ChainLengths, KineticSystem
from .resolution import Resolution, resolution_for
from .start import adiabatic, start_time
from .stepping import Stepping, clock

__all__ = [
    "ChainLengths",
    "KineticSystem",
    "Resolution",
    "Stepping",
    "adiabatic",
    "clock",
    "resolution_for",
    "start_time",
]
