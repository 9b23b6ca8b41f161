"""Pictures: functions from tables to matplotlib axes."""

from twofluid.drawing.comparison import (
    difference_figure,
    evolution_comparison_figure,
    lag_comparison_figure,
    matter_comparison_figure,
)
from twofluid.drawing.growth import draw_growth_rate, draw_suppression, growth_figure
from twofluid.drawing.lag import draw_catchup, draw_ratio, lag_figure
from twofluid.drawing.scales import draw_map, draw_masses, scales_figure
from twofluid.drawing.shortfall import draw_at_decoupling, draw_at_target, shortfall_figure
from twofluid.drawing.spheres import draw_baryon_share, draw_spheres, spheres_figure
from twofluid.drawing.streaming import draw_streaming_power, draw_velocity_spectrum, streaming_figure
from twofluid.drawing.style import journal_style

__all__ = [
    "difference_figure",
    "draw_at_decoupling",
    "draw_at_target",
    "draw_baryon_share",
    "draw_catchup",
    "draw_growth_rate",
    "draw_map",
    "draw_masses",
    "draw_ratio",
    "draw_spheres",
    "draw_streaming_power",
    "draw_suppression",
    "draw_velocity_spectrum",
    "evolution_comparison_figure",
    "growth_figure",
    "journal_style",
    "lag_comparison_figure",
    "lag_figure",
    "matter_comparison_figure",
    "scales_figure",
    "shortfall_figure",
    "spheres_figure",
    "streaming_figure",
]
