"""Pictures: functions from tables to matplotlib axes."""

from twofluid.drawing.comparison import difference_figure, evolution_comparison_figure, lag_comparison_figure
from twofluid.drawing.lag import draw_catchup, draw_ratio, lag_figure
from twofluid.drawing.scales import draw_map, draw_masses, scales_figure
from twofluid.drawing.style import journal_style

__all__ = [
    "difference_figure",
    "draw_catchup",
    "draw_map",
    "draw_masses",
    "draw_ratio",
    "evolution_comparison_figure",
    "journal_style",
    "lag_comparison_figure",
    "lag_figure",
    "scales_figure",
]
