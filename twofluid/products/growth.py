"""How much dark matter, baryons and matter have grown since an epoch, and how fast they grow.

Growth factors are ratios of the contrast to that of the same fluid and scale at the reference epoch; the
growth rate is d ln delta/d ln a. Where a fluid oscillates both can be negative: that is motion, not growth.
"""

from __future__ import annotations

import numpy as np

from twofluid.products.cold_growth import cold_growth
from twofluid.products.matter import FLUIDS, contrasts, contrasts_at, contrasts_of, exists
from twofluid.products.table import column, make_table, sample_columns

REFERENCE_REDSHIFT = 1000.0  # just after the baryons are let go, if the caller names no epoch


def growth_table(history, reference_redshift=REFERENCE_REDSHIFT):
    """Return growth factors, growth rates and mean exponents at every asked wavenumber and redshift.

    Parameters
    ----------
    history : History
        The run.
    reference_redshift : float
        Redshift at which the growth factors are 1, within the run [unitless].

    Returns
    -------
    astropy.table.Table
        One row per mode and redshift, redshift (in the order asked) running fastest: wavenumber [1/Mpc],
        redshift [unitless]; for dark, baryon and matter growth_FLUID, rate_FLUID and exponent_FLUID
        [unitless], the exponent being that of the power of a with the same growth since the reference
        epoch; and suppression [unitless], growth of matter over that of a cold fluid in its place. Without
        dark matter its columns are empty. The header entry `exponent_with_smooth_baryons` is the power of
        a with which dark matter grows in the matter era while baryons stay smooth.

    Raises
    ------
    ValueError
        If the reference redshift lies outside the run.
    """
    reference, _ = contrasts_at(history, reference_redshift)
    now = contrasts_of(history)
    _, slope = contrasts_at(history, history.redshift)
    span = np.log1p(reference_redshift) - np.log1p(history.redshift)
    factors, rates, exponents = {}, {}, {}
    with np.errstate(divide="ignore", invalid="ignore"):  # contrasts at and logarithms of zero become empty
        for fluid in FLUIDS:
            factors[fluid] = now[fluid] / reference[fluid]
            rates[fluid] = slope[fluid] / now[fluid]
            exponents[fluid] = np.where(span == 0.0, rates[fluid], np.log(factors[fluid]) / span)
    free, _ = cold_growth(history.universe, np.append(history.redshift, reference_redshift))
    suppression = factors["matter"] / (free[:-1] / free[-1])

    columns = sample_columns(history)
    for stem, values in (("growth", factors), ("rate", rates), ("exponent", exponents)):
        columns += [
            column(f"{stem}_{fluid}", values[fluid].ravel(), masked=_empty(history, fluid, values[fluid]))
            for fluid in FLUIDS
        ]
    columns.append(column("suppression", suppression.ravel(), masked=_empty(history, "matter", suppression)))
    return make_table(
        history,
        columns,
        reference_redshift=float(reference_redshift),
        exponent_with_smooth_baryons=smooth_baryon_exponent(history.universe),
    )


def smooth_baryon_exponent(universe):
    """Return the power of a with which dark matter grows in the matter era while baryons stay smooth.

    p = [(1 + 24 f_c)^(1/2) - 1]/4, f_c being its share in matter; Bond, Efstathiou & Silk 1980 (PRL 45,
    1980), as in Lesgourgues & Pastor 2006 (Phys. Rep. 429, 307), eqs 131-132.

    Parameters
    ----------
    universe : Universe
        The smooth universe.

    Returns
    -------
    float
        The exponent [unitless].
    """
    share = contrasts(universe, 1.0, 0.0)["matter"]
    return float((np.sqrt(1.0 + 24.0 * share) - 1.0) / 4.0)


def _empty(history, fluid, values):
    """Tell which entries are empty: a fluid this universe lacks, and what is no finite number."""
    return ~np.isfinite(values.ravel()) | (not exists(history, fluid))
