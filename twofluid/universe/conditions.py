"""Quick look-up of the smooth universe at many conformal times."""

from dataclasses import dataclass, replace
from math import prod

import numpy as np

from .expansion import ROUNDING
from .interpolation import UniformCubic, evaluate_rows
from .members import pick, side_by_side

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
    first_row: int  # of the table among those stacked


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

    def __init__(self, expansion, ionization, baryons):
        self.contents, self.baryons = expansion.contents, baryons
        earliest = float(expansion.conformal_time(EARLIEST_TABLE_SCALE_FACTOR))
        latest = float(expansion.conformal_time(1.0))
        log_time = np.linspace(np.log(earliest), np.log(latest), TABLE_INTERVALS + 1)
        self.scale_factor = a = expansion.scale_factor(np.minimum(np.exp(log_time), latest))
        electrons, lag = ionization.state(a)
        step = (log_time[-1] - log_time[0]) / TABLE_INTERVALS
        self.rows = UniformCubic(log_time[0], step, np.stack([np.log(a), np.log(electrons), lag])).rows
        self.frame = _Frame(earliest, latest, log_time[0], 1.0 / step, 0)

    def __call__(self, conformal_time):
        """Conditions at `conformal_time`, an array of any shape.

        Raises
        ------
        ValueError
            If a time lies outside the table.
        """
        return _look_up(conformal_time, (), self.rows, self.frame, self.contents, self.baryons)


class ConditionsStack:
    """The tables of several universes, looked up together.

    Parameters
    ----------
    tables : sequence of ConditionsTable
    """

    def __init__(self, tables):
        self._rows = np.concatenate([table.rows for table in tables])
        frames = [replace(table.frame, first_row=n * TABLE_INTERVALS) for n, table in enumerate(tables)]
        self._each = [
            side_by_side(parts)
            for parts in (frames, [table.contents for table in tables], [table.baryons for table in tables])
        ]

    def __call__(self, conformal_time, owner):
        """Conditions at `conformal_time`, shape (..., column), each column in the universe `owner` names.

        Raises
        ------
        ValueError
            If a time lies outside the table of its universe.
        """
        return _look_up(conformal_time, np.shape(owner), self._rows, *(pick(part, owner) for part in self._each))


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
        frames = [replace(table.frame, first_row=n * TABLE_INTERVALS) for n, table in enumerate(tables)]
        self._frames = side_by_side(frames)

    def __call__(self, conformal_time, owner=0):
        """Values at `conformal_time`, any shape, its last axis one column for each `owner`: a list of arrays.

        Times have to lie in the table of their universe.
        """
        frame = pick(self._frames, owner)
        place = (np.log(conformal_time) - frame.start) * frame.per_step
        return evaluate_rows(self._rows, place, TABLE_INTERVALS, frame.first_row)


def _look_up(conformal_time, columns, rows, frame, contents, baryons):
    """Conditions in one universe (`columns` is the empty shape) or in that of each column."""
    time = np.asarray(conformal_time, dtype=float)
    if not np.all((time >= frame.earliest * (1.0 - ROUNDING)) & (time <= frame.latest * (1.0 + ROUNDING))):
        _refuse(time, frame)
    lines = time.reshape(-1, *columns)
    out = np.empty((len(FIELDS), *lines.shape))
    block = max(1, _BLOCK // max(1, prod(columns)))
    for begin in range(0, len(lines), block):
        _fill(lines[begin : begin + block], out[:, begin : begin + block], rows, frame, contents, baryons)
    return Conditions(**dict(zip(FIELDS, out.reshape((len(FIELDS), *time.shape)), strict=True)))


def _refuse(time, frame):
    """Say which times the first universe left has."""
    earliest, latest = np.broadcast_arrays(frame.earliest, frame.latest, time)[:2]
    outside = ~((time >= earliest * (1.0 - ROUNDING)) & (time <= latest * (1.0 + ROUNDING)))
    place = np.unravel_index(np.argmax(outside), time.shape)
    raise ValueError(
        f"conformal times must lie between {earliest[place]:.4g} Mpc (scale factor "
        f"{EARLIEST_TABLE_SCALE_FACTOR:g}) and {latest[place]:.8g} Mpc (today)"
    )


def _fill(time, out, rows, frame, contents, baryons):
    place = np.log(time)
    place -= frame.start
    place *= frame.per_step
    looked_up = evaluate_rows(rows, place, TABLE_INTERVALS, frame.first_row)
    a, electrons, ratio = (np.exp(value, out=value) for value in looked_up)
    out[0] = a
    out[1], out[2:6] = contents.gravities(a, "photon", "neutrino", "baryon", "dark")
    out[6] = baryons.scattering_rate(a, electrons)
    out[7] = 4.0 / 3.0 * contents.photon / contents.baryon / a
    out[8] = baryons.isothermal_sound_speed_squared(baryons.photon_temperature / (a * ratio), electrons)
    out[9] = baryons.compton_rate(a, electrons)
    out[10] = ratio
