"""What users take away: functions from a History to tables."""

from twofluid.products.comparison import course_table, difference_table, joined_table
from twofluid.products.evolution import evolution_table
from twofluid.products.lag import catchup_table, lag_table
from twofluid.products.scales import map_redshifts, scales_table
from twofluid.products.verdict import verdict_table

__all__ = [
    "catchup_table",
    "course_table",
    "difference_table",
    "evolution_table",
    "joined_table",
    "lag_table",
    "map_redshifts",
    "scales_table",
    "verdict_table",
]
