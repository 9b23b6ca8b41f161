"""The linear physics: which quantity stands in which row, its rates, its start and its pace."""

from .closures import CLOSURES, MIXTURE_CLOSURES, check_closure
from .kinetic import ChainLengths, KineticSystem
from .modes import isocurvature
from .patch import PatchSystem
from .resolution import ACCURACIES, Resolution, resolution_for
from .sound_speed import SoundSpeedSystem
from .start import adiabatic, mixed, start_time
from .stepping import Stepping, check_dark_waves, clock

__all__ = [
    "ACCURACIES",
    "CLOSURES",
    "MIXTURE_CLOSURES",
    "ChainLengths",
    "KineticSystem",
    "PatchSystem",
    "Resolution",
    "SoundSpeedSystem",
    "Stepping",
    "adiabatic",
    "check_closure",
    "check_dark_waves",
    "clock",
    "isocurvature",
    "mixed",
    "resolution_for",
    "start_time",
]
