"""How every table is put together: described columns, and a header that says where it came from."""

from __future__ import annotations

from dataclasses import asdict

import numpy as np

from twofluid.quantities import QUANTITIES
from twofluid.scenario import mixture_lines, thermal_sentence

FRAME = (
    "synchronous, at rest with the dark matter (without dark matter: carried by massless dust); "
    "amplitudes per unit comoving curvature, signed so that densities grow positive"
)
FRAME_OF_DUST = (
    "synchronous, carried by cold dust without mass: the dark matter, since it has pressure, moves against it as the "
    "baryons do; amplitudes per unit comoving curvature, signed so that densities grow positive"
)
NO_DARK_MATTER = "this universe has no dark matter; whatever is measured against it is empty"
MIXTURE = (
    "initial modes other than the adiabatic one alone: amplitudes are not per unit comoving curvature but per square "
    "root of the primordial power amplitude (k/pivot)^(tilt - 1)"
)
INDEPENDENT = (
    "its parts follow independent random fields: delta_dark is the rms of them all and any other amplitude X is "
    "<X delta_dark>/rms(delta_dark), so that delta_baryon/delta_dark is cross-power over power of the dark matter "
    "(without dark matter the baryons take its place); growth, spheres and shortfall take the rms of each fluid"
)
NO_CERTIFICATE = "none: the numerical error of this run was not estimated"
_BLANKS = {"b": False, "U": ""}  # under the mask of a column of true and false, or of words; NaN for numbers
LANDMARK_DIGITS = 6  # significant, of a landmark in a header; the physics behind is good to four or five


def column(name, values, *, masked=None, describe_as=None, **words):
    """Return one described column.

    Parameters
    ----------
    name : str
        Name of the column.
    values : array, shape (row,)
        Its entries: numbers, words, or true and false.
    masked : array of bool, shape (row,), optional
        Entries to leave empty. Without it the column holds every entry.
    describe_as : str, optional
        Entry of `QUANTITIES` to describe it by, if that is not `name`.
    **words : str
        Words to put in place of others in the description, e.g. ``N="50"``.

    Returns
    -------
    astropy.table.Column or astropy.table.MaskedColumn
        With unit and description.
    """
    from astropy.table import Column, MaskedColumn

    quantity = QUANTITIES[describe_as or name]
    meaning = " ".join(words.get(word, word) for word in quantity.meaning.split(" "))
    labels = {"name": name, "unit": quantity.unit or None, "description": meaning}
    values = np.asarray(values)
    if values.dtype.kind not in _BLANKS:
        values = values.astype(float)
    if masked is None:
        return Column(values, **labels)
    # What lies under the mask is blanked, so that nobody who drops the mask reads a value.
    blank = _BLANKS.get(values.dtype.kind, np.nan)
    return MaskedColumn(np.where(masked, blank, values), mask=masked, **labels)


def words_column(name, words):
    """Return one described column of words.

    Parameters
    ----------
    name : str
        Name of the column, an entry of `QUANTITIES`.
    words : list of str
        Its entries.

    Returns
    -------
    astropy.table.Column
        With description.
    """
    from astropy.table import Column

    return Column(words, name=name, dtype=str, description=QUANTITIES[name].meaning)


def sample_columns(history):
    """Return the wavenumber and redshift columns: one row per mode and redshift, redshift running fastest.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    list of astropy.table.Column
        Wavenumber [1/Mpc] and redshift [unitless], shape (mode x redshift,).
    """
    modes, redshifts = history.delta_baryon.shape
    return [
        column("wavenumber", np.repeat(history.wavenumber, redshifts)),
        column("redshift", np.tile(history.redshift, modes)),
    ]


def make_table(history, columns, **extra):
    """Return a table of these columns whose header holds the whole provenance.

    Parameters
    ----------
    history : History
        The run the columns were computed from.
    columns : list of astropy.table.Column
        The columns.
    **extra
        Further header entries, in plain Python types.

    Returns
    -------
    astropy.table.Table
        The table.
    """
    from astropy.table import Table

    return Table(columns, meta=header(history) | extra)


def header(history):
    """Return the provenance of a run as a plain mapping that YAML can hold.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    dict
        Program and version, scenario, what was assumed, closure, frame, landmarks, certificate, warnings, and
        where there is one the late history of the gas.
    """
    from twofluid import __version__

    landmarks = asdict(history.universe.landmarks)
    provenance = {
        "program": f"twofluid {__version__}",
        "scenario": history.scenario.to_mapping(),
        "assumed": list(history.scenario.assumptions()),
        "closure": history.scenario.method.closure,
        "frame": FRAME if history.theta_dark is None else FRAME_OF_DUST,
        "landmarks": {name: _rounded(name, value) for name, value in landmarks.items() if value is not None},
        "certificate": NO_CERTIFICATE if history.certificate is None else history.certificate.sentence(),
        "warnings": list(history.warnings),
    }
    if sentence := thermal_sentence(history.scenario.cosmology):
        provenance["gas"] = sentence
    if mixture := mixture_lines(history.scenario.primordial):
        independent = [INDEPENDENT] if len(history.parts) > 1 else []
        provenance["mixture"] = [MIXTURE, *independent, *mixture]
    if not history.has_dark_matter:
        provenance["no_dark_matter"] = NO_DARK_MATTER
    return provenance


def _rounded(name, value):
    text, unit = f"{value:.{LANDMARK_DIGITS}g}", QUANTITIES[name].unit
    return f"{text} {unit}" if unit else float(text)
