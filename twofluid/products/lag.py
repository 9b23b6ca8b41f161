"""How far the baryons lag the dark matter: in amplitude, in time, and in the redshift of catching up.

The ratio is b = delta_baryon/delta_dark. Both densities are read between the steps of the run as cubic
Hermite pieces in ln a. Where baryons dominate, their waves can carry delta_dark through zero; only signs
relative to it matter below.

Dark matter with pressure can be the one that lags: then b is above 1 and the delay is empty. Its own waves, too, can
carry delta_dark through zero.
"""

from __future__ import annotations

from decimal import Decimal

import numpy as np

from twofluid.products.crossing import last_rise
from twofluid.products.table import column, make_table, sample_columns

FRACTIONS = (0.5, 0.9, 0.95, 0.99)  # of the dark-matter amplitude, if the caller names none


def lag_table(history):
    """Return ratio and delay at every asked wavenumber and redshift.

    The delay is the time since the dark matter last had the amplitude that the baryons have at that
    redshift. It is empty where the baryons are not behind (ratio > 1), where their contrast has the other
    sign or vanishes (ratio <= 0), and where the dark matter did not have that amplitude within the run.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    astropy.table.Table
        One row per mode and redshift, redshift (in the order asked) running fastest: wavenumber [1/Mpc],
        redshift [unitless], ratio [unitless], delay [Myr]. Without dark matter ratio and delay are empty.
    """
    ratio = history.delta_baryon / history.delta_dark
    delay = _delay(history)
    no_dark_matter = np.full(ratio.size, not history.has_dark_matter)
    columns = [
        *sample_columns(history),
        column("ratio", ratio.ravel(), masked=no_dark_matter),
        column("delay", delay.ravel(), masked=no_dark_matter | np.isnan(delay.ravel())),
    ]
    return make_table(history, columns)


def catchup_table(history, fractions=FRACTIONS):
    """Return the redshift at which the ratio last rises through each fraction, mode by mode.

    Before its wave enters the horizon a mode has b = 1. So there are three outcomes: a redshift, where b
    went from below the fraction to it or above (the last time counts, also if b has fallen again since,
    which `ratio_today` shows); empty, never, where b fell below the fraction and has not come back by
    today; and inf, where b has not been below the fraction since the start of the run. A pole of b, where
    delta_dark passes through zero, counts like any other way to come from below the fraction to above.
    (With initial modes beside the adiabatic one b can begin anywhere; the outcomes mean the same.)

    Parameters
    ----------
    history : History
        The run.
    fractions : sequence of float
        Fractions of the dark-matter amplitude, above 0 and at most 1, each once [unitless].

    Returns
    -------
    astropy.table.Table
        One row per mode: wavenumber [1/Mpc], one column per fraction such as redshift_at_50_percent
        [unitless], ratio_today [unitless]. The header entry `fractions` gives the fraction of each column.
        Without dark matter everything but the wavenumber is empty.

    Raises
    ------
    ValueError
        If a fraction lies outside its range or is given twice.
    """
    names = _column_names(fractions)
    trace = history.trace
    no_dark_matter = np.full(history.wavenumber.size, not history.has_dark_matter)
    columns = [column("wavenumber", history.wavenumber)]
    for name, fraction in names.items():
        excess = trace.delta_baryon - fraction * trace.delta_dark
        slope = trace.delta_baryon_slope - fraction * trace.delta_dark_slope
        # b - fraction has the sign of (delta_baryon - fraction delta_dark) delta_dark, without its poles.
        position = last_rise(
            trace.log_scale_factor, (excess, slope), (trace.delta_dark, trace.delta_dark_slope)
        )
        never_below = np.all(excess * trace.delta_dark >= 0, axis=1)
        redshift = np.where(never_below, np.inf, np.expm1(-position))
        masked = no_dark_matter | np.isnan(redshift)
        columns.append(
            column(name, redshift, masked=masked, describe_as="redshift_at_N_percent", N=_percent(fraction))
        )
    today = trace.delta_baryon[:, -1] / trace.delta_dark[:, -1]
    columns.append(column("ratio_today", today, masked=no_dark_matter))
    return make_table(history, columns, fractions=names)


def _delay(history):
    """Delay of the baryons [Myr], shape (mode, redshift); NaN where there is none."""
    trace, age = history.trace, history.universe.age
    delay = np.full(history.delta_baryon.shape, np.nan)
    for row, redshift in enumerate(history.redshift):
        sign = np.sign(history.delta_dark[:, row])
        dark, baryon = sign * history.delta_dark[:, row], sign * history.delta_baryon[:, row]
        excess = sign[:, None] * trace.delta_dark - baryon[:, None]
        now = -np.log1p(redshift)
        then = last_rise(
            trace.log_scale_factor, (excess, sign[:, None] * trace.delta_dark_slope), until=now
        )
        behind = (baryon > 0) & (baryon <= dark) & np.isfinite(then)
        delay[behind, row] = age(np.exp(now)) - age(np.exp(then[behind]))
    return delay


def _column_names(fractions):
    """Return {column name: fraction} in the order given, after checking the fractions."""
    names = {}
    for fraction in fractions:
        if not 0 < fraction <= 1:
            raise ValueError(f"fractions: {fraction!r} is not above 0 and at most 1")
        name = f"redshift_at_{_percent(fraction).replace('.', 'p')}_percent"
        if name in names:
            raise ValueError(f"fractions: {fraction!r} is given twice")
        names[name] = float(fraction)
    return names


def _percent(fraction):
    """Exact decimal per cent of a fraction as the user wrote it: 0.955 gives 95.5, not 95.49999."""
    text = f"{Decimal(repr(float(fraction))) * 100:f}"
    return text.rstrip("0").rstrip(".") if "." in text else text
