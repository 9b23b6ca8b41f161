"""Tables of several scenarios in one: stacked, with ratios to the first."""

from __future__ import annotations

from collections import Counter

import numpy as np

from twofluid.products.table import column, make_table
from twofluid.quantities import QUANTITIES

AXES = ("wavenumber", "redshift")  # columns that say where a row stands, in any table that has them
COURSE_START = 3000.0  # redshift from which the course of a mode is told: before it nothing is free to fall
DIFFERENCES = ("delta_dark_difference", "delta_baryon_difference", "ratio_difference")


def joined_table(tables, labels, notes=(), *, ratios=True):
    """Stack the tables of several scenarios and set every number in relation to the first.

    Rows are matched by wavenumber and redshift, as far as the tables have these columns; rows that agree in
    them by their order.

    Parameters
    ----------
    tables : sequence of astropy.table.Table
        The same product of each scenario.
    labels : sequence of str
        Name of each scenario.
    notes : sequence of str
        Sentences for the header.
    ratios : bool
        Whether to set the numbers in relation.

    Returns
    -------
    astropy.table.Table
        Scenario after scenario, the rows of each in their order: the column `scenario`, the columns that all of
        the tables have, and for every number X that is no wavenumber or redshift of its row a column X_over_first
        [unitless], empty where there is no ratio. The header holds what all have in common, and under
        `scenarios` what each has for itself.
    """
    from astropy.table import Column, Table

    names = np.concatenate([[label] * len(table) for label, table in zip(labels, tables, strict=True)])
    columns = [Column(names.astype(str), name="scenario", description=QUANTITIES["scenario"].meaning)]
    common = [name for name in tables[0].colnames if all(name in table.colnames for table in tables)]
    columns += [_stacked([table[name] for table in tables]) for name in common]
    if ratios:
        rows = _row_in_first(tables)
        numbers = [name for name in common if tables[0][name].dtype.kind in "fiu" and name not in AXES]
        columns += [_over_first(name, [table[name] for table in tables], rows) for name in numbers]
    return Table(columns, meta=_joined_meta(tables, labels, notes))


def difference_table(evolution):
    """Return how far the amplitudes of each scenario are from those of the first.

    Parameters
    ----------
    evolution : astropy.table.Table
        Evolution tables of several scenarios as `joined_table` stacks them.

    Returns
    -------
    astropy.table.Table
        One row per scenario but the first, mode and redshift: scenario, wavenumber [1/Mpc], redshift
        [unitless], relative differences delta_dark_difference and delta_baryon_difference [unitless],
        difference of the ratio delta_baryon/delta_dark ratio_difference [unitless]. What needs dark matter is
        empty where there is none.
    """
    from astropy.table import Table

    first = evolution["scenario"] == evolution["scenario"][0]
    ratio = np.ma.asarray(evolution["delta_baryon"]) / np.ma.asarray(evolution["delta_dark"])
    values = (
        np.ma.asarray(evolution["delta_dark_over_first"]) - 1.0,
        np.ma.asarray(evolution["delta_baryon_over_first"]) - 1.0,
        (ratio.reshape(-1, np.count_nonzero(first)) - ratio[first]).ravel(),  # the rows of all are the same
    )
    columns = [evolution[name][~first] for name in ("scenario", *AXES)]
    for name, value in zip(DIFFERENCES, values, strict=True):
        columns.append(column(name, value.filled(np.nan)[~first], masked=np.ma.getmaskarray(value)[~first]))
    return Table(columns, meta=evolution.meta)


def course_table(history, mode):
    """Return the course of one mode from redshift 3000 to today, at every step of the run.

    Parameters
    ----------
    history : History
        The run.
    mode : int
        Which of its wavenumbers.

    Returns
    -------
    astropy.table.Table
        One row a step: wavenumber [1/Mpc], redshift [unitless], delta_dark [unitless], delta_baryon
        [unitless]. Without dark matter delta_dark is empty.
    """
    trace = history.trace
    log_a, first = np.unique(trace.log_scale_factor[mode], return_index=True)
    kept = log_a >= -np.log1p(COURSE_START)
    steps = first[kept]
    no_dark_matter = np.full(len(steps), not history.has_dark_matter)
    columns = [
        column("wavenumber", np.full(len(steps), history.wavenumber[mode])),
        column("redshift", np.expm1(-log_a[kept]) + 0.0),  # no -0
        column("delta_dark", trace.delta_dark[mode, steps], masked=no_dark_matter),
        column("delta_baryon", trace.delta_baryon[mode, steps]),
    ]
    return make_table(history, columns)


def _stacked(columns):
    """Return one column of several, masked if any of them is."""
    from astropy.table import Column, MaskedColumn

    labels = {"name": columns[0].name, "unit": columns[0].unit, "description": columns[0].description}
    if any(hasattr(part, "mask") for part in columns):
        return MaskedColumn(np.ma.concatenate([np.ma.asarray(part) for part in columns]), **labels)
    return Column(np.concatenate([np.asarray(part) for part in columns]), **labels)


def _row_in_first(tables):
    """Return for each row of the stacked tables its partner in the first, -1 where there is none."""
    keys = [_keys(table) for table in tables]
    place = {key: row for row, key in enumerate(keys[0])}
    return np.array([place.get(key, -1) for part in keys for key in part], dtype=int)


def _keys(table):
    """Return what tells each row apart: where it stands, and how many before it stand there."""
    axes = [np.ma.asarray(table[name]).tolist() for name in AXES if name in table.colnames]
    seen, keys = Counter(), []
    for place in zip(*axes, strict=True) if axes else [()] * len(table):
        keys.append((place, seen[place]))
        seen[place] += 1
    return keys


def _over_first(name, columns, rows):
    values = [np.ma.filled(np.ma.asarray(part, dtype=float), np.nan) for part in columns]
    reference = np.append(values[0], np.nan)[rows]  # -1, no partner, takes the NaN at the end
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.concatenate(values) / reference
    masked = ~np.isfinite(ratio) | ~np.isfinite(reference)
    return column(f"{name}_over_first", ratio, masked=masked, describe_as="X_over_first", X=name)


def _joined_meta(tables, labels, notes):
    metas = [dict(table.meta) for table in tables]
    common = {name: value for name, value in metas[0].items() if all(m.get(name) == value for m in metas)}
    own = [{name: value for name, value in meta.items() if name not in common} for meta in metas]
    return common | {"notes": list(notes), "scenarios": dict(zip(labels, own, strict=True))}
