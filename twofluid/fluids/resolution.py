"""How finely a universe has to be followed: step settings and chain lengths.

Where dark matter rules, its smooth gravity forgives much. Where it does not, the damped acoustic
oscillation and the free streaming of the radiation are all there is, so both have to be followed
more finely for the same accuracy.
"""

from dataclasses import dataclass

from ..universe import Universe
from .kinetic import ChainLengths
from .stepping import Stepping

RULING_FRACTION = 0.25  # dark matter over dark matter and baryons, from which on dark matter rules (measured)


@dataclass(frozen=True)
class Resolution:
    """Step settings and chain lengths of a run.

    Attributes
    ----------
    stepping : Stepping
    chains : ChainLengths
    """

    stepping: Stepping
    chains: ChainLengths


DARK_RULED = Resolution(
    Stepping(
        outside_step=0.6,
        smooth_step=0.2,
        free_step=0.3,
        scattering_change=0.4,
        phase_step=1.3,
        diffusion_exponent=20.0,
        felt_phase=120.0,
    ),
    ChainLengths(photon=10, polarization=10, neutrino=12),
)
BARYON_RULED = Resolution(
    Stepping(
        outside_step=0.2,
        smooth_step=0.05,
        free_step=0.1,
        scattering_change=0.5,
        phase_step=0.6,
        diffusion_exponent=30.0,
        felt_phase=300.0,
    ),
    ChainLengths(photon=16, polarization=16, neutrino=24),
)


def resolution_for(universe: Universe) -> Resolution:
    """Choose the resolution a universe asks for.

    Parameters
    ----------
    universe : Universe

    Returns
    -------
    Resolution
    """
    dark, baryon = universe.gravity("dark", 1.0), universe.gravity("baryon", 1.0)
    return DARK_RULED if dark >= RULING_FRACTION * (dark + baryon) else BARYON_RULED
