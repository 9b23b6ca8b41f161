"""The amplitudes themselves, one row per wavenumber and redshift."""

from __future__ import annotations

import numpy as np

from twofluid.products.table import column, make_table, sample_columns


def evolution_table(history):
    """Return the amplitudes of a run.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    astropy.table.Table
        One row per mode and redshift, redshift (in the order asked) running fastest: wavenumber [1/Mpc],
        redshift [unitless], delta_dark [unitless], delta_baryon [unitless], theta_baryon [1/Mpc],
        delta_gas_temperature [unitless], and theta_dark [1/Mpc] where the dark matter has pressure.
        Without dark matter delta_dark is empty. Velocities are relative to the frame the header names.
    """
    no_dark_matter = np.full(history.delta_dark.size, not history.has_dark_matter)
    columns = [
        *sample_columns(history),
        column("delta_dark", history.delta_dark.ravel(), masked=no_dark_matter),
        *(
            column(name, getattr(history, name).ravel())
            for name in history.evolved[1:]
        ),
    ]
    return make_table(history, columns)
