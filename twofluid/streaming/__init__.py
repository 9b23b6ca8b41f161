"""Baryons that stream through the dark matter: how fast, and what that does to growth on small scales."""

from .patches import LARGEST_ERROR, Patches, follow_patches
from .run import Streaming, rms_velocity, stream
from .velocity import COHERENT, LARGEST, SMALLEST, Wind, find_wind, wind_wavenumbers

__all__ = [
    "COHERENT",
    "LARGEST",
    "LARGEST_ERROR",
    "SMALLEST",
    "Patches",
    "Streaming",
    "Wind",
    "find_wind",
    "follow_patches",
    "rms_velocity",
    "stream",
    "wind_wavenumbers",
]
