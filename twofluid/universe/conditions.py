"""Quick look-up of the smooth universe at many conformal times."""

from dataclasses import dataclass
from math import prod

import numpy as np

from .expansion import ROUNDING
from .interpolation import UniformCubic, evaluate_rows
from .members import SideBySide

EARLIEST_TABLE_SCALE_FACTOR = 1.0e-14  # start of the table
TABLE_INTERVALS = 8192  # 0.0035 in ln a: the helium steps to 1e-6, see the tests
_BLOCK = 8192  # times handled together, so that the intermediate arrays stay in the cache


@dataclass(frozen=True)
class Conditions:
    """What the perturbation equations need of the smooth universe, each field shaped as the times asked.

    Parameters
    ----------
    scale_factor : array
        Scale factor, 1 today [unitless].
    hubble_rate : array
        Conformal rate a'/a [1/Mpc].
    gravity_photon, gravity_neutrino, gravity_baryon, gravity_dark : array
        8 pi G a^2 rho of each species [1/Mpc^2].
    scattering_rate : array
        Conformal Thomson rate a n_e sigma_T [1/Mpc].
    photon_baryon_ratio : array
        4 rho_gamma/(3 rho_b) [unitless].
    isothermal_sound_speed_squared : array
        k T/(mu m_H c^2) [unitless].
    compton_rate : array
        Conformal rate at which the gas temperature approaches the photons' [1/Mpc].
    photon_gas_temperature_ratio : array
        T_gamma/T [unitless].
    """

    scale_factor: np.ndarray
    hubble_rate: np.ndarray
    gravity_photon: np.ndarray
    gravity_neutrino: np.ndarray
    gravity_baryon: np.ndarray
    gravity_dark: np.ndarray
    scattering_rate: np.ndarray
    photon_baryon_ratio: np.ndarray
    isothermal_sound_speed_squared: np.ndarray
    compton_rate: np.ndarray
    photon_gas_temperature_ratio: np.ndarray


FIELDS = tuple(Conditions.__dataclass_fields__)


@dataclass(frozen=True)
class _Frame:
    """Where a table begins and what it tabulates: numbers of one universe, or arrays with one entry a column."""

    earliest: float  # conformal time of the first node [Mpc]
    latest: float  # and of the last [Mpc]
    start: float  # ln(conformal time) of the first node
    per_step: float  # one over the spacing in ln(conformal time)


class ConditionsTable:
    """Table of ln a, ln x_e and ln(T_gamma/T) against ln(conformal time); all else follows from them.

    Parameters
    ----------
    expansion : Expansion
    ionization : Ionization or HeatedGas
    baryons : Baryons

    Attributes
    ----------
    scale_factor : array, shape (node,)
        At the nodes of the table [unitless].
    """

    PARTS = ("frame", "contents", "baryons")  # attributes that hold its numbers

    def __init__(self, expansion, ionization, baryons):
        self.contents, self.baryons = expansion.contents, baryons
        earliest = float(expansion.conformal_time(EARLIEST_TABLE_SCALE_FACTOR))
        latest = float(expansion.conformal_time(1.0))
        log_time = np.linspace(np.log(earliest), np.log(latest), TABLE_INTERVALS + 1)
        self.scale_factor = a = expansion.scale_factor(np.minimum(np.exp(log_time), latest))
        electrons, lag = ionization.state(a)
        step = (log_time[-1] - log_time[0]) / TABLE_INTERVALS
        self.rows = UniformCubic(log_time[0], step, np.stack([np.log(a), np.log(electrons), lag])).rows
        self.frame = _Frame(earliest, latest, log_time[0], 1.0 / step)

    def __call__(self, conformal_time):
        """Conditions at `conformal_time`, an array of any shape.

        Raises
        ------
        ValueError
            If a time lies outside the table.
        """
        return _look_up(conformal_time, (), self.rows, 0, self.frame, self.contents, self.baryons)


class ConditionsStack:
    """The tables of several universes, looked up together.

    Parameters
    ----------
    tables : sequence of ConditionsTable
    """

    def __init__(self, tables):
        self._rows = np.concatenate([table.rows for table in tables])
        self._parts = SideBySide(*([getattr(table, part) for table in tables] for part in ConditionsTable.PARTS))

    def of(self, owner):
        """Conditions as a function of conformal times, shape (..., column), each column in the universe that owns it.

        The function raises ValueError if a time lies outside the table of its universe.
        """
        first_row, parts = owner * TABLE_INTERVALS, self._parts.pick(owner)
        return lambda conformal_time: _look_up(conformal_time, owner.shape, self._rows, first_row, *parts)


class FurtherFields:
    """Further functions on the nodes of the tables of one universe or several, for what few ask for.

    Parameters
    ----------
    tables : sequence of ConditionsTable
    values : sequence of array, shape (field, node)
        The functions, one array a table.
    """

    def __init__(self, tables, values):
        self._rows = np.concatenate([UniformCubic(0.0, 1.0, one).rows for one in values])
        self._frames = SideBySide([table.frame for table in tables])

    def __call__(self, conformal_time, owner=0):
        """Values at `conformal_time`, any shape, its last axis one column for each `owner`: a list of arrays.

        Times have to lie in the table of their universe.
        """
        (frame,) = self._frames.pick(owner)
        place = (np.log(conformal_time) - frame.start) * frame.per_step
        return evaluate_rows(self._rows, place, TABLE_INTERVALS, owner * TABLE_INTERVALS)


def _look_up(conformal_time, columns, rows, first_row, frame, contents, baryons):
    """Conditions in one universe (`columns` is the empty shape) or in that of each column."""
    time = np.asarray(conformal_time, dtype=float)
    lines = time.reshape(-1, *columns)
    # least and greatest of each column; not a number fails both tests
    first, last = lines.min(axis=0, initial=np.inf), lines.max(axis=0, initial=-np.inf)
    if not np.all((first >= frame.earliest * (1.0 - ROUNDING)) & (last <= frame.latest * (1.0 + ROUNDING))):
        _refuse(first, last, frame)
    out = np.empty((len(FIELDS), *lines.shape))
    block = max(1, _BLOCK // max(1, prod(columns)))
    for begin in range(0, len(lines), block):
        here = slice(begin, begin + block)
        place = (np.log(lines[here]) - frame.start) * frame.per_step
        _fill(evaluate_rows(rows, place, TABLE_INTERVALS, first_row), out[:, here], contents, baryons)
    return Conditions(**dict(zip(FIELDS, out.reshape((len(FIELDS), *time.shape)), strict=True)))


def _refuse(first, last, frame):
    """Say which times the universe of the first offending column has."""
    outside = ~((first >= frame.earliest * (1.0 - ROUNDING)) & (last <= frame.latest * (1.0 + ROUNDING)))
    column = int(np.argmax(outside))
    earliest, latest = (np.ravel(end)[column] for end in (frame.earliest, frame.latest))
    raise ValueError(
        f"conformal times must lie between {earliest:.4g} Mpc (scale factor {EARLIEST_TABLE_SCALE_FACTOR:g}) "
        f"and {latest:.8g} Mpc (today)"
    )


def _fill(logarithms, out, contents, baryons):
    """Fill in all fields from ln a, ln x_e and ln(T_gamma/T)."""
    a, electrons, ratio = map(np.exp, logarithms)
    out[0] = a
    out[1] = contents.conformal_hubble_rate(a)
    for field, species in enumerate(("photon", "neutrino", "baryon", "dark"), start=2):
        out[field] = contents.gravity(species, a)
    out[6] = baryons.scattering_rate(a, electrons)
    out[7] = 4.0 / 3.0 * out[2] / out[4]
    out[8] = baryons.isothermal_sound_speed_squared(baryons.photon_temperature / (a * ratio), electrons)
    out[9] = baryons.compton_rate(a, electrons)
    out[10] = ratio
