"""Many universes: built together, and looked up as if they were one."""

from functools import cached_property

import numpy as np

from .background import solve_backgrounds
from .conditions import ConditionsStack, FurtherFields
from .errors import UniverseError
from .members import SideBySide
from .response import Response
from .universe import Universe

_GROUP = 32  # universes solved together, so that the intermediate arrays stay in the cache


def build_universes(cosmologies):
    """Universe of each cosmology, quicker than one by one; none depends on the others.

    Parameters
    ----------
    cosmologies : iterable of Cosmology

    Returns
    -------
    list of Universe

    Raises
    ------
    UniverseError
        As for `Universe`; `index` tells which cosmology is at fault, and a note says it in the traceback.
    """
    cosmologies = list(cosmologies)
    universes = []
    for begin in range(0, len(cosmologies), _GROUP):
        group = cosmologies[begin : begin + _GROUP]
        try:
            backgrounds = solve_backgrounds(group)
        except UniverseError as error:
            error.index += begin
            error.add_note(f"this is number {error.index} of {len(cosmologies)} cosmologies, counted from 0")
            raise
        universes += [Universe(*parts) for parts in zip(group, backgrounds, strict=True)]
    return universes


class UniverseStack:
    """Several universes, each column (the last axis of what is asked) in one of them.

    Parameters
    ----------
    universes : sequence of Universe
    owner : array of int, shape (column,)
        Which universe each column is in.

    Attributes
    ----------
    universes : tuple of Universe
    owner : array of int, shape (column,)

    Raises
    ------
    ValueError
        If there is no universe, or an owner is none of them.
    """

    def __init__(self, universes, owner):
        self.universes, self.owner = tuple(universes), np.array(owner)
        if self.owner.ndim != 1 or not np.issubdtype(self.owner.dtype, np.integer):
            raise ValueError(f"owner must be a list of whole numbers, got {owner}")
        if np.any((self.owner < 0) | (self.owner >= len(self.universes))):
            raise ValueError(f"owner must name universes from 0 to {len(self.universes) - 1}, got {self.owner}")

    def gravity(self, species, scale_factor, columns=None):
        """8 pi G a^2 rho of a species, named as for `Universe.gravity` [1/Mpc^2].

        Parameters
        ----------
        species : str
        scale_factor : float or array
            Broadcasts against the columns, which are its last axis [unitless].
        columns : index of `owner`, optional
            The columns that are meant; all if left out.
        """
        (contents,) = self._contents.pick(self._owner(columns))
        return contents.gravity(species, scale_factor)

    @cached_property
    def contents(self):
        """8 pi G rho of every species today, a `Contents` of arrays of shape (column,) [1/Mpc^2]."""
        return self._contents.pick(self.owner)[0]

    def conditions(self, conformal_time, columns=None):
        """Conditions at conformal times [Mpc], as `Universe.conditions` finds them for each column.

        Parameters
        ----------
        conformal_time : array, shape (..., column)
        columns : index of `owner`, optional
            The columns that are meant; all if left out.

        Raises
        ------
        ValueError
            If a time lies outside.
        """
        look_up = self._all_columns if columns is None else self._tables.of(self.owner[columns])
        return look_up(conformal_time)

    @property
    def has_dark_pressure(self):
        """Whether the dark matter of any of the universes is not cold."""
        return any(universe.has_dark_pressure for universe in self.universes)

    def dark_sound_speed(self, scale_factor, columns=None):
        """Sound speed of the dark matter [c]; arguments as in `gravity`."""
        (sound,) = self._dark_sounds.pick(self._owner(columns))
        return sound.speed(scale_factor)

    @cached_property
    def _contents(self):
        return SideBySide([universe.contents for universe in self.universes])

    @cached_property
    def _all_columns(self):
        return self._tables.of(self.owner)

    @cached_property
    def _dark_sounds(self):
        return SideBySide([universe.dark_sound for universe in self.universes])

    @cached_property
    def _tables(self):
        return ConditionsStack([universe.conditions_table for universe in self.universes])

    def _owner(self, columns):
        return self.owner if columns is None else self.owner[columns]

    @property
    def heated_from(self):
        """Scale factor from which on any of the universes is heated as in `Universe.heated_from`; None: never."""
        return min((universe.heated_from for universe in self.universes if universe.heated_from), default=None)

    def heating_rate(self, conformal_time, columns=None):
        """Rate of heating as `Universe.heating_rate`, times and columns as in `conditions` [1/Mpc]."""
        return self._heating(conformal_time, self._owner(columns))[0]

    def response(self, conformal_time, columns=None):
        """Response of the electrons as `Universe.response`, times and columns as in `conditions`."""
        return Response(*self._response(conformal_time, self._owner(columns)))

    @cached_property
    def _heating(self):
        tables = [universe.conditions_table for universe in self.universes]
        return FurtherFields(tables, [universe.heating_values for universe in self.universes])

    @cached_property
    def _response(self):
        tables = [universe.conditions_table for universe in self.universes]
        return FurtherFields(tables, [universe.response_values for universe in self.universes])
