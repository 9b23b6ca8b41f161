"""How fast sound runs in the dark matter: the law a cosmology states for it."""

from dataclasses import dataclass

import numpy as np

from .constants import SPEED_OF_LIGHT
from .errors import UniverseError

SLOW = 0.1  # largest sound speed taken for that of matter [c]: motion adds some per cent to its weight
_METRES_PER_KILOMETRE = 1e3


@dataclass(frozen=True)
class DarkSound:
    """Power law in 1 + z: numbers of one universe, or arrays for several side by side.

    Parameters
    ----------
    today : float
        Sound speed the law gives today, 0 for cold dark matter [c].
    scaling : float
        Power of 1 + z [unitless].
    """

    today: float
    scaling: float

    def speed(self, scale_factor):
        """Sound speed [c]: the law, bent so that it stays below 1/sqrt(3) where it would no longer be that of matter.

        Below 0.1 c the bend takes less than 3 parts in 10^4, and the share falls with the fourth power.
        """
        square = (self.today * scale_factor**-self.scaling) ** 2
        return np.sqrt(square / np.sqrt(1.0 + 9.0 * square * square))

    @property
    def slow_from(self):
        """Scale factor from which on the law stays below 0.1 c; 0 if it always does [unitless]."""
        return (self.today / SLOW) ** (1.0 / self.scaling) if self.today and self.scaling else 0.0


def dark_sound(cosmology):
    """Sound speed law of a cosmology; without dark matter that of nothing, 0.

    Raises
    ------
    UniverseError
        If the law is no number, or not that of matter.
    """
    asked = cosmology.dark_matter
    stated = asked.sound_speed * _METRES_PER_KILOMETRE / SPEED_OF_LIGHT
    if not 0.0 <= stated <= SLOW:
        raise UniverseError(f"dark_matter.sound_speed = {asked.sound_speed} km/s must be from 0 to a tenth of c")
    if not (np.isfinite(asked.scaling) and asked.scaling >= 0.0):
        raise UniverseError(f"dark_matter.scaling = {asked.scaling} must be finite and zero or positive")
    if not (np.isfinite(asked.at_redshift) and asked.at_redshift >= 0.0):
        raise UniverseError(f"dark_matter.at_redshift = {asked.at_redshift} must be finite and zero or positive")
    if cosmology.dark_matter_density == 0.0:
        stated = 0.0
    return DarkSound(stated * (1.0 + asked.at_redshift) ** -asked.scaling, asked.scaling)
