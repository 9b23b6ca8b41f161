"""What users take away: functions from a History to tables."""

from twofluid.products.comparison import course_table, difference_table, joined_table
from twofluid.products.evolution import evolution_table
from twofluid.products.lag import catchup_table, lag_table

__all__ = [
    "catchup_table",
    "course_table",
    "difference_table",
    "evolution_table",
    "joined_table",
    "lag_table",
]
