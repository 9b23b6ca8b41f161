"""The amplitudes themselves, one row per wavenumber and redshift."""

from __future__ import annotations

import numpy as np

from twofluid.products.table import column, make_table, sample_columns, words_column


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
        delta_gas_temperature [unitless], theta_dark [1/Mpc] where the dark matter has pressure, delta_neutrino
        [unitless] where neutrinos have mass, delta_matter [unitless], and with those neutrinos delta_cold [unitless].
        Without dark matter delta_dark is empty. Velocities are relative to the frame the header names.
    """
    return make_table(history, _amplitude_columns(history))


def parts_table(history):
    """Return the amplitudes of every independent part of a mixture of initial modes.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    astropy.table.Table
        The columns of `evolution_table`, preceded by the name of the part, part after part.
    """
    from astropy.table import vstack

    tables = []
    for part in history.parts:
        columns = _amplitude_columns(part)
        columns.insert(0, words_column("part", [part.initial_modes] * part.delta_dark.size))
        tables.append(make_table(history, columns))
    return vstack(tables, metadata_conflicts="silent")


def _amplitude_columns(history):
    no_dark_matter = np.full(history.delta_dark.size, not history.has_dark_matter)
    together = ("delta_matter", "delta_cold") if history.has_massive_neutrinos else ("delta_matter",)
    return [
        *sample_columns(history),
        column("delta_dark", history.delta_dark.ravel(), masked=no_dark_matter),
        *(
            column(name, getattr(history, name).ravel())
            for name in (*history.evolved[1:], *together)
        ),
    ]
