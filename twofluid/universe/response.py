"""How the gas of a universe answers to contrasts: where heat is given to it, and how its electrons respond."""

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Response:
    """Response of the electrons that recombination leaves, each field shaped as the times asked.

    Their relative contrast obeys delta_x' = -r (delta_x - n delta_b - t delta_T - h delta_rate), by conformal
    time, with the contrast delta_rate of the local expansion.

    Attributes
    ----------
    relaxation : array
        r [1/Mpc].
    by_density, by_temperature, by_expansion : array
        n, t, h: the contrast to which the electrons would settle, per unit contrast of each [unitless].
    particles, compton : array
        Contrasts per unit delta_x of the number of particles, electrons, atoms and ions, and of the Compton rate,
        which goes with the electrons' share of them. What a table or reionization adds is spread evenly [unitless].
    """

    relaxation: np.ndarray
    by_density: np.ndarray
    by_temperature: np.ndarray
    by_expansion: np.ndarray
    particles: np.ndarray
    compton: np.ndarray

    def __post_init__(self):
        object.__setattr__(self, "relaxation", np.exp(self.relaxation))  # tabulated by its logarithm


def heating_values(scale_factor, expansion, ionization):
    """Heating beside Compton's at the nodes of a table, shape (1, node) [1/Mpc]."""
    heating = np.maximum(ionization.heating(scale_factor), 0.0)
    return (heating * expansion.conformal_hubble_rate(scale_factor))[None]


def response_values(scale_factor, expansion, baryons, computed, ionization):
    """Return ln r and the other fields of `Response` at the nodes of a table, shape (6, node)."""
    relaxation, *answers = computed.response(scale_factor)
    # Before the electrons respond any fast rate keeps their contrast at zero.
    relaxation = np.where(relaxation > 0.0, relaxation, relaxation[np.argmax(relaxation > 0.0)])
    rate = np.log(relaxation * expansion.conformal_hubble_rate(scale_factor))
    electrons = ionization.electron_fraction(scale_factor)
    atoms = 1.0 + baryons.helium_per_hydrogen
    particles = computed.electron_fraction(scale_factor) / (atoms + electrons)
    return np.stack([rate, *answers, particles, particles * atoms / electrons])
