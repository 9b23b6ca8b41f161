"""What makes up the smooth universe of a cosmology, solved for one or for several at once."""

from dataclasses import dataclass

from .errors import UniverseError
from .expansion import Expansion
from .gas import Baryons
from .ionization import Ionization
from .thermal import HeatedGas


@dataclass(frozen=True)
class Background:
    """The parts of one smooth universe.

    Parameters
    ----------
    expansion : Expansion
    baryons : Baryons
    computed : Ionization
        As recombination and Compton scattering make it.
    ionization : Ionization or HeatedGas
        The same, changed as the cosmology asks for.
    """

    expansion: Expansion
    baryons: Baryons
    computed: Ionization
    ionization: Ionization | HeatedGas


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
    parts = zip(cosmologies, expansions, baryons, ionizations, strict=True)
    return [_background(index, *one) for index, one in enumerate(parts)]


def _background(index, cosmology, expansion, baryons, computed):
    if cosmology.thermal is None and cosmology.reionization is None:
        return Background(expansion, baryons, computed, computed)
    try:
        return Background(expansion, baryons, computed, HeatedGas(expansion, baryons, computed, cosmology))
    except UniverseError as error:
        error.index = index
        raise
