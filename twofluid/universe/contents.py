"""What a universe is made of, how each species thins out, and the expansion rate that follows."""

from dataclasses import dataclass

import numpy as np

from . import fermi_dirac

# 8 pi G a^4 rho grows as this power of the scale factor
_POWER = {"photon": 0, "neutrino": 0, "baryon": 1, "dark": 1, "curvature": 2, "constant": 4}
MASSIVE = "massive_neutrino"  # all neutrinos with mass; they thin out by no power
SPECIES = (*_POWER, MASSIVE)
# 8 pi G a^2 rho relative to today, by the same power
_DILUTION = {
    0: lambda a: 1.0 / (a * a),
    1: lambda a: 1.0 / a,
    2: np.ones_like,
    4: lambda a: a * a,
}
_ALIKE = {power: [name for name in _POWER if _POWER[name] == power] for power in _DILUTION}


@dataclass(frozen=True)
class Contents:
    """8 pi G rho of every species today [1/Mpc^2]: floats, or arrays for several universes side by side.

    Curvature counts as a species: as far as the expansion goes, it is one. Arrays broadcast against the
    scale factors given to the methods.

    Neutrinos without mass are `neutrino`; those with mass are kept apart by it, those of the same mass together:
    `massive` is what 8 pi G rho of each were without mass, `mass` its mass over its temperature today [unitless].
    """

    photon: float
    neutrino: float
    baryon: float
    dark: float
    curvature: float
    constant: float
    massive: tuple[float, ...] = ()
    mass: tuple[float, ...] = ()

    def gravity(self, species, scale_factor):
        """8 pi G a^2 rho of one species [1/Mpc^2]."""
        if species == MASSIVE:
            return self._massive_sum(fermi_dirac.energy, scale_factor) / (scale_factor * scale_factor)
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
        if self.massive:
            total += self._massive_sum(fermi_dirac.energy, scale_factor)
        total /= 3.0
        total = np.sqrt(total)
        total /= scale_factor
        return total

    def massive_pressure(self, scale_factor):
        """8 pi G a^2 times the pressure of the neutrinos with mass [1/Mpc^2]."""
        return self._massive_sum(fermi_dirac.pressure, scale_factor) / (3.0 * scale_factor * scale_factor)

    @property
    def resting(self):
        """8 pi G rho today of the neutrinos with mass if they were at rest: their number times their mass."""
        return sum(density * mass for density, mass in zip(self.massive, self.mass, strict=True)) * fermi_dirac.REST

    def _massive_sum(self, law, scale_factor):
        """Sum over the massive of 8 pi G a^4 rho, or the like, from its law against mass over temperature."""
        total = np.zeros_like(scale_factor, dtype=float)
        for density, mass in zip(self.massive, self.mass, strict=True):
            total = total + density * law(scale_factor * mass)
        return total

    def _sum(self, power):
        first, *others = (getattr(self, name) for name in _ALIKE[power])
        return sum(others, first)
