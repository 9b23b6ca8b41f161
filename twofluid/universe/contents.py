"""What a universe is made of, how each species thins out, and the expansion rate that follows."""

from dataclasses import dataclass

import numpy as np

# How 8 pi G a^2 rho changes with the scale factor, relative to today
_DILUTION = {
    "radiation": lambda a: 1.0 / (a * a),
    "matter": lambda a: 1.0 / a,
    "curvature": np.ones_like,
    "constant": lambda a: a * a,
}
_KIND = {
    "photon": "radiation",
    "neutrino": "radiation",
    "baryon": "matter",
    "dark": "matter",
    "curvature": "curvature",
    "constant": "constant",
}
SPECIES = tuple(_KIND)


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
        return getattr(self, species) * _DILUTION[_KIND[species]](scale_factor)

    def gravities(self, scale_factor):
        """8 pi G a^2 rho of every species, by name [1/Mpc^2]."""
        diluted = {kind: law(scale_factor) for kind, law in _DILUTION.items()}
        return {species: getattr(self, species) * diluted[kind] for species, kind in _KIND.items()}

    def conformal_hubble_rate(self, scale_factor):
        """Conformal rate a'/a [1/Mpc]."""
        return friedmann(self.gravities(scale_factor))


def friedmann(gravities):
    """Conformal rate a'/a [1/Mpc]: 3 (a'/a)^2 is the sum of 8 pi G a^2 rho over the species [1/Mpc^2]."""
    total, *others = gravities.values()
    for gravity in others:
        total = total + gravity
    return np.sqrt(total / 3.0)
