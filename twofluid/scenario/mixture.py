"""Mixtures of initial modes: what is asked, and the independent parts it falls into.

Every mode is a Gaussian random field with a power law of its own. The adiabatic mode and, in proportion to its
correlation, every other follow one common field; what is left of each follows a field of its own. Waves do not mix,
so that the evolution of a mixture is the sum of that of its fields, and all that follow one field are one wave with
weights that depend on its wavenumber. A mixture whose correlations are all 1 or -1 is one such wave.
"""

from collections.abc import Mapping
from dataclasses import dataclass, fields

import numpy as np

from .errors import ScenarioError
from .keys import ADIABATIC, INITIAL_MODES, MIXTURE, default_of

_NEEDS_DARK_MATTER = ("dark_matter", "compensated")
_NEEDS_NEUTRINOS = ("neutrino_density", "neutrino_velocity")


def _default(name):
    return default_of(f"{MIXTURE}.{next(iter(INITIAL_MODES))}.{name}")  # the same for every mode


@dataclass(frozen=True)
class Share:
    """One initial mode of a mixture beside the adiabatic one.

    Parameters
    ----------
    ratio : float
        Rms amplitude at the pivot over the square root of `Primordial.amplitude`; 0 leaves the mode out [unitless].
    correlation : float
        With the field of the adiabatic mode, -1 to 1; positive where a denser place of the one is an excess of
        the other [unitless].
    tilt : float or None
        Exponent n of its power, like `Primordial.tilt` and the same if None [unitless].
    """

    ratio: float
    correlation: float = _default("correlation")
    tilt: float | None = None


@dataclass(frozen=True)
class Mixture:
    """Initial modes; the unit of each stands in `twofluid.fluids.modes`.

    Parameters
    ----------
    adiabatic : float
        Rms amplitude of the adiabatic mode over the square root of the primordial power; 0 leaves it out [unitless].
    baryon, dark_matter, compensated, neutrino_density, neutrino_velocity : Share or None
        The other modes; None leaves one out.
    """

    adiabatic: float = default_of(f"{MIXTURE}.{ADIABATIC}")
    baryon: Share | None = None
    dark_matter: Share | None = None
    compensated: Share | None = None
    neutrino_density: Share | None = None
    neutrino_velocity: Share | None = None

    @property
    def shares(self) -> dict[str, Share]:
        """The modes beside the adiabatic one that are there, by name."""
        named = {part.name: getattr(self, part.name) for part in fields(self) if part.name != ADIABATIC}
        return {name: share for name, share in named.items() if share is not None and share.ratio > 0.0}


@dataclass(frozen=True)
class Part:
    """What follows one random field: a wave with definite weights of initial modes.

    Attributes
    ----------
    name : str
        Its modes, joined by plus signs.
    weights : mapping of str to array, shape (mode,)
        Amplitude of each initial mode over the square root of the primordial power [unitless].
    """

    name: str
    weights: Mapping[str, np.ndarray]


def parts(primordial, wavenumber) -> tuple[Part, ...]:
    """Take a mixture apart into independent parts.

    Parameters
    ----------
    primordial : Primordial
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].

    Returns
    -------
    tuple of Part
        The common field first, if anything follows it.
    """
    k = np.asarray(wavenumber, dtype=float)
    mixture = primordial.mixture or Mixture()
    common = {ADIABATIC: np.full(k.shape, mixture.adiabatic)} if mixture.adiabatic > 0.0 else {}
    alone = []
    for name, share in mixture.shares.items():
        tilt = primordial.tilt if share.tilt is None else share.tilt
        amplitude = share.ratio * (k / primordial.pivot) ** ((tilt - primordial.tilt) / 2.0)
        if share.correlation != 0.0:
            common[name] = share.correlation * amplitude
        if abs(share.correlation) < 1.0:
            rest = np.sqrt((1.0 - share.correlation) * (1.0 + share.correlation))
            alone.append({name: rest * amplitude})
    return tuple(Part(" + ".join(weights), weights) for weights in [common, *alone] if weights)


def check_mixture(scenario) -> None:
    """Refuse a mixture that the rest of a scenario cannot serve.

    Parameters
    ----------
    scenario : Scenario

    Raises
    ------
    ScenarioError
        If nothing is left in it, a mode has nothing to live in, or the closure cannot start it.
    """
    mixture = scenario.primordial.mixture
    if mixture is None:
        return
    if not mixture.shares and mixture.adiabatic == 0.0:
        raise ScenarioError("leaves no mode", "give the adiabatic or another mode a ratio above 0", key=MIXTURE)
    cosmology = scenario.cosmology
    for name in mixture.shares:
        key = f"{MIXTURE}.{name}"
        if name in _NEEDS_DARK_MATTER and cosmology.dark_matter_density == 0.0:
            raise ScenarioError("needs dark matter, and cosmology.dark_matter_density is 0", "remove it", key=key)
        if name in _NEEDS_NEUTRINOS and cosmology.neutrinos.effective_number == 0.0:
            raise ScenarioError(
                "needs neutrinos, and cosmology.neutrinos.effective_number is 0", "remove it", key=key
            )
        if scenario.method.closure != "kinetic":
            raise ScenarioError(
                f"is not known to method.closure: {scenario.method.closure}, which ties photons to baryons as in the "
                "adiabatic mode", "remove it, or write closure: kinetic", key=key,
            )  # fmt: skip


def mixture_lines(primordial) -> tuple[str, ...]:
    """Say in words what a mixture consists of.

    Parameters
    ----------
    primordial : Primordial

    Returns
    -------
    tuple of str
        One sentence a mode; empty without a mixture.
    """
    if primordial.mixture is None:
        return ()
    lines = [f"adiabatic: ratio {primordial.mixture.adiabatic:g}"]
    for name, share in primordial.mixture.shares.items():
        tilt = primordial.tilt if share.tilt is None else share.tilt
        lines.append(
            f"{name}: ratio {share.ratio:g} at {primordial.pivot:g} 1/Mpc, tilt {tilt:g}, "
            f"correlation {share.correlation:g}; {INITIAL_MODES[name]}"
        )
    return tuple(lines)
