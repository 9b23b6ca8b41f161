"""What users take away: functions from a History to tables."""

from twofluid.products.evolution import evolution_table
from twofluid.products.lag import catchup_table, lag_table

__all__ = ["catchup_table", "evolution_table", "lag_table"]
