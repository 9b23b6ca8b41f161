"""Baryons that stream through the dark matter: how fast, and what that does to growth on small scales."""

from .patches import Patches, follow_patches
from .run import Streaming, stream
from .velocity import Wind, find_wind

__all__ = ["Patches", "Streaming", "Wind", "find_wind", "follow_patches", "stream"]
