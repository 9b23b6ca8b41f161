"""How finely a universe has to be followed: step settings and chain lengths for each accuracy.

Where dark matter rules, its smooth gravity forgives much. Where it does not, the damped acoustic
oscillation and the free streaming of the radiation are all there is, so both have to be followed
more finely for the same accuracy. Dark matter with pressure does not rule: below its Jeans scale it
is as smooth as they are.
"""

from dataclasses import dataclass, fields, replace
from math import ceil

from ..universe import Universe
from .kinetic import ChainLengths
from .stepping import Stepping

RULING_FRACTION = 0.45  # dark matter over dark matter and baryons, from which on dark matter rules (measured)
HOT_SHARE = 0.2  # of neutrinos with mass in all matter, from which on how they stream shapes everything (measured)
MOMENTA_IF_HOT = 4  # times as many momenta then
LONGER_CHAINS = 1.5  # chains of a refined resolution over those it refines


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

    def refined(self) -> "Resolution":
        """Halve steps, stretch none, follow oscillations longer, chains further, more momenta: it tells the error."""
        stepping = self.stepping
        halved = {
            name: getattr(stepping, name) / 2.0
            for name in ("outside_step", "smooth_step", "free_step", "scattering_change", "phase_step")
        }
        longer = {
            "diffusion_exponent": 1.5 * stepping.diffusion_exponent,
            "felt_phase": 1.5 * stepping.felt_phase,
            "drag_ratio": stepping.drag_ratio / 2.0,
            "gas_swing": stepping.gas_swing / 3.0,
            "radiation_stretch": 0.0,
            "felt_fading": stepping.felt_fading / 2.0,
        }
        chains = {part.name: ceil(LONGER_CHAINS * getattr(self.chains, part.name)) for part in fields(ChainLengths)}
        return Resolution(replace(stepping, **halved, **longer), ChainLengths(**chains))


@dataclass(frozen=True)
class Accuracy:
    """One accuracy a scenario can ask for.

    Attributes
    ----------
    promise : float
        Numerical error that is not exceeded: of the dark-matter contrast, relative, and of the ratio of
        baryon to dark-matter contrast, absolute, relative above 1 [unitless]. Measured; see the guide for developers.
    dark_ruled, baryon_ruled : Resolution
        Settings where dark matter is cold and more of the matter than `RULING_FRACTION`, and where it is not.
    """

    promise: float
    dark_ruled: Resolution
    baryon_ruled: Resolution


def _resolution(chains: tuple[int, ...], **stepping: float) -> Resolution:
    """Chains: photon, polarization, neutrino, neutrino with mass, and momenta of the last."""
    return Resolution(Stepping(**stepping), ChainLengths(*chains))


#: Settings by accuracy: chain lengths, and what `Stepping` says.
ACCURACIES = {
    "draft": Accuracy(
        promise=3e-3,
        dark_ruled=_resolution(
            (7, 7, 9, 8, 4), outside_step=0.8, smooth_step=0.3, free_step=0.4, scattering_change=0.8, phase_step=2.0,
            diffusion_exponent=15.0, felt_phase=120.0, felt_fading=0.7, radiation_stretch=0.5, gas_swing=1e-2,
        ),
        baryon_ruled=_resolution(
            (16, 16, 18, 14, 4), outside_step=0.4, smooth_step=0.15, free_step=0.2, scattering_change=0.8,
            phase_step=1.0, diffusion_exponent=25.0, felt_phase=200.0, gas_swing=1e-2,
        ),
    ),
    "standard": Accuracy(
        promise=3e-4,
        dark_ruled=_resolution(
            (10, 10, 12, 12, 5), outside_step=0.45, smooth_step=0.2, free_step=0.4, scattering_change=0.4,
            phase_step=1.15, diffusion_exponent=20.0, felt_phase=140.0, felt_fading=0.75, radiation_stretch=1.5,
            gas_swing=2e-3,
        ),
        baryon_ruled=_resolution(
            (22, 22, 24, 18, 5), outside_step=0.2, smooth_step=0.05, free_step=0.1, scattering_change=0.5,
            phase_step=0.6, diffusion_exponent=30.0, felt_phase=300.0, gas_swing=2e-3,
        ),
    ),
    "reference": Accuracy(
        promise=5e-5,
        dark_ruled=_resolution(
            (16, 16, 28, 16, 7), outside_step=0.2, smooth_step=0.08, free_step=0.1, scattering_change=0.2,
            phase_step=0.6, diffusion_exponent=30.0, felt_phase=300.0, felt_fading=0.15, radiation_stretch=0.3,
            gas_swing=7e-4,
        ),
        baryon_ruled=_resolution(
            (28, 28, 36, 26, 7), outside_step=0.1, smooth_step=0.03, free_step=0.05, scattering_change=0.25,
            phase_step=0.35, diffusion_exponent=40.0, felt_phase=500.0, gas_swing=7e-4,
        ),
    ),
}  # fmt: skip


def resolution_for(universe: Universe, accuracy: str = "standard") -> Resolution:
    """Choose the resolution a universe asks for.

    Parameters
    ----------
    universe : Universe
    accuracy : str, optional
        One of `ACCURACIES`.

    Returns
    -------
    Resolution
    """
    dark, baryon = universe.gravity("dark", 1.0), universe.gravity("baryon", 1.0)
    settings = ACCURACIES[accuracy]
    rules = dark >= RULING_FRACTION * (dark + baryon) and not universe.has_dark_pressure
    resolution = settings.dark_ruled if rules else settings.baryon_ruled
    mass = universe.masses
    if mass["massive_neutrino"] < HOT_SHARE * sum(mass.values()):
        return resolution
    chains = resolution.chains
    return replace(resolution, chains=replace(chains, momenta=MOMENTA_IF_HOT * chains.momenta))
