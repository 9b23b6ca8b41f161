"""What users take away: functions from a History to tables."""

from twofluid.products.evolution import evolution_table
from twofluid.products.growth import growth_table
from twofluid.products.lag import catchup_table, lag_table
from twofluid.products.requirements import check_products
from twofluid.products.shortfall import contrast_table, shortfall_table
from twofluid.products.spheres import sigma_8, spheres_table

__all__ = [
    "catchup_table",
    "check_products",
    "contrast_table",
    "evolution_table",
    "growth_table",
    "lag_table",
    "shortfall_table",
    "sigma_8",
    "spheres_table",
]
