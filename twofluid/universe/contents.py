"""What a universe is made of, how each species thins out, and the expansion rate that follows."""

from dataclasses import dataclass

import numpy as np

# 8 pi G a^4 rho grows as this power of the scale factor
_POWER = {"photon": 0, "neutrino": 0, "baryon": 1, "dark": 1, "curvature": 2, "constant": 4}
SPECIES = tuple(_POWER)
# 8 pi G a^2 rho relative to today, by the same power
_DILUTION = {
    0: lambda a: 1.0 / (a * a),
    1: lambda a: 1.0 / a,
    2: np.ones_like,
    4: lambda a: a * a,
}
_ALIKE = {power: [name for name in SPECIES if _POWER[name] == power] for power in _DILUTION}


@dataclass(frozen=True)
class Contents:
    """8 pi G rho of every species today [1/Mpc^2]: floats, or arrays for several universes side by side.

    Curvature counts as a species: as far as the expansion goes, it is one. Arrays broadcast against the
    scale factors given to the methods.
    """

    photon: float
    neutrino: float
    baryon: float
    dark: float
    curvature: float
    constant: float

    def gravity(self, species, scale_factor):
        """8 pi G a^2 rho of one species [1/Mpc^2]."""
        return getattr(self, species) * _DILUTION[_POWER[species]](scale_factor)

    def conformal_hubble_rate(self, scale_factor):
        """Conformal rate a'/a [1/Mpc]; Friedmann: 3 (a'/a)^2 is the sum of 8 pi G a^2 rho over the species.

        The sum times a^2 is a polynomial, evaluated in place: no function of the package is called more often.
        """
        highest, *powers = sorted(_ALIKE, reverse=True)
        total = self._sum(highest) * scale_factor
        for power in range(highest - 1, 0, -1):
            if power in powers:
                total += self._sum(power)
            total *= scale_factor
        total += self._sum(0)
        total /= 3.0
        total = np.sqrt(total)
        total /= scale_factor
        return total

    def _sum(self, power):
        first, *others = (getattr(self, name) for name in _ALIKE[power])
        return sum(others, first)
