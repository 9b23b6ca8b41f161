"""Pictures: functions from tables to matplotlib axes."""

from twofluid.drawing.lag import draw_catchup, draw_ratio, lag_figure
from twofluid.drawing.scales import draw_map, draw_masses, scales_figure
from twofluid.drawing.style import journal_style

__all__ = ["draw_catchup", "draw_map", "draw_masses", "draw_ratio", "journal_style", "lag_figure", "scales_figure"]
