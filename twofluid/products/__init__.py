"""What users take away: functions from a History to tables."""

from twofluid.products.comparison import course_table, difference_table, joined_table
from twofluid.products.evolution import evolution_table, parts_table
from twofluid.products.growth import growth_table
from twofluid.products.lag import catchup_table, lag_table
from twofluid.products.requirements import check_products
from twofluid.products.scales import map_redshifts, scales_table
from twofluid.products.shortfall import contrast_table, shortfall_table
from twofluid.products.spheres import sigma_8, spheres_table
from twofluid.products.streaming import streaming_spectrum_table, streaming_table, streaming_velocity_table
from twofluid.products.verdict import verdict_table

__all__ = [
    "catchup_table",
    "check_products",
    "contrast_table",
    "course_table",
    "difference_table",
    "evolution_table",
    "growth_table",
    "joined_table",
    "lag_table",
    "map_redshifts",
    "parts_table",
    "scales_table",
    "shortfall_table",
    "sigma_8",
    "spheres_table",
    "streaming_spectrum_table",
    "streaming_table",
    "streaming_velocity_table",
    "verdict_table",
]
