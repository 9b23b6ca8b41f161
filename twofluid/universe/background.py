"""What makes up the smooth universe of a cosmology, solved for one or for several at once."""

from dataclasses import dataclass

from .errors import UniverseError
from .expansion import Expansion
from .gas import Baryons
from .ionization import Ionization


@dataclass(frozen=True)
class Background:
    """The parts of one smooth universe.

    Parameters
    ----------
    expansion : Expansion
    baryons : Baryons
    ionization : Ionization
    """

    expansion: Expansion
    baryons: Baryons
    ionization: Ionization


def solve_backgrounds(cosmologies):
    """Background of each cosmology, the ionization histories solved together.

    Raises
    ------
    UniverseError
        If one contradicts itself or cannot be solved; its `index` tells which.
    """
    expansions = []
    for index, cosmology in enumerate(cosmologies):
        try:
            expansions.append(Expansion(cosmology))
        except UniverseError as error:
            error.index = index
            raise
    baryons = [
        Baryons(
            density=cosmology.baryon_density,
            helium_mass_fraction=cosmology.helium_mass_fraction,
            photon_temperature=cosmology.photon_temperature,
        )
        for cosmology in cosmologies
    ]
    ionizations = Ionization.together(expansions, baryons)
    return [Background(*parts) for parts in zip(expansions, baryons, ionizations, strict=True)]
