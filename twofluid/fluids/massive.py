"""Neutrinos with mass: chains of moments at a few momenta, for every mass.

A neutrino of comoving momentum q (over temperature) streams at v = q/(q^2 + y^2)^(1/2), y = a m c^2/(k T_0). The
moments N_l of each momentum are scaled such that they are those of massless neutrinos while v = 1: Ma &
Bertschinger 1995 have Psi_l = -(1/4) (d ln f/d ln q) N_l in eqs 55 to 58 (numbers from memory). Hence they start as
those do, and the equations are theirs with k v in place of k. Which momenta stand for all is said in
`twofluid.universe.fermi_dirac`.

The quadrupole is followed as ``N_2 - (8/5) eta``: then nothing but the trace rate of the metric and its curvature eta
acts on a chain, whatever the number of chains, and the solver can take one after the other out of the equations.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from ..solver import TailRates
from ..universe import Universe
from ..universe.fermi_dirac import momentum_sum
from .chain import QUADRUPOLE, Chain

LAYER = (2.0, 6.0)  # absorbing layer, as of massless neutrinos, in units of k v
SHIFT = 8.0 / 5.0  # of the quadrupole, in units of the curvature


@dataclass(frozen=True)
class _Stream:
    """Neutrinos of one mass and one momentum.

    Attributes
    ----------
    name : str
        What its unknowns begin with.
    momentum, weight, number : float
        q, and its weights in the sums over momenta of energy and of number [unitless].
    density, mass : array, shape (mode,)
        8 pi G rho today without mass [1/Mpc^2], and mass over temperature today [unitless].
    share : array, shape (mode,)
        Of this mass in the rest mass of all [unitless].
    """

    name: str
    momentum: float
    weight: float
    number: float
    density: np.ndarray
    mass: np.ndarray
    share: np.ndarray

    def unknown(self, moment: int) -> str:
        """Name of a moment."""
        return f"{self.name}_{moment}"

    def energy(self, scale_factor: np.ndarray, modes) -> np.ndarray:
        """Energy of a particle over temperature, (q^2 + y^2)^(1/2), shape as `scale_factor`, (..., mode)."""
        return np.sqrt(self.momentum**2 + (scale_factor * self.mass[modes]) ** 2)


class MassiveNeutrinos:
    """All neutrinos with mass of one universe, or of several side by side; there need not be any.

    Parameters
    ----------
    universe : Universe or UniverseStack
        As for `KineticSystem`.
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    momenta, last : int
        Momenta for each mass, and the highest moment of each [unitless].
    """

    def __init__(self, universe: Universe, wavenumber: np.ndarray, momenta: int, last: int):
        self._last = last
        contents = universe.contents
        species = [
            tuple(np.broadcast_to(value, wavenumber.shape) for value in pair)
            for pair in zip(contents.massive, contents.mass, strict=True)
        ]
        resting = sum(density * mass for density, mass in species)
        grid = tuple(zip(*momentum_sum(momenta), strict=True))
        total = sum(weight for _, weight in grid)
        self._streams = [
            _Stream(f"massive_{m}_{n}", q, weight, weight / total, density, mass, density * mass / resting)
            for m, (density, mass) in enumerate(species)
            for n, (q, weight) in enumerate(grid)
        ]
        self.unknowns = tuple(stream.unknown(moment) for moment in (0, QUADRUPOLE, 1) for stream in self._streams)
        self.chains = tuple(Chain(stream.name, last, LAYER, {"curvature": SHIFT}) for stream in self._streams)
        self.observed = tuple(stream.unknown(moment) for moment in (0, 1) for stream in self._streams)

    def first_state(self, massless: Mapping[str, np.ndarray]) -> dict[str, np.ndarray]:
        """Start like the massless neutrinos: they are as fast.

        Parameters
        ----------
        massless : mapping of str to array, shape (mode,)
            Unknowns of the kinetic closure, which do not appear where they start at zero.

        Returns
        -------
        dict of str to array, shape (mode,)
        """
        state = {}
        for stream in self._streams:
            state[stream.unknown(0)] = massless.get("delta_neutrino", 0.0)
            state[stream.unknown(1)] = 4 / 3 * massless.get("theta_neutrino", 0.0)
            state[stream.unknown(2)] = massless.get("neutrino_2", 0.0) - SHIFT * massless.get("curvature", 0.0)
            for moment in range(QUADRUPOLE + 1, self._last + 1):
                state[stream.unknown(moment)] = massless.get(f"neutrino_{moment}", 0.0)
        return state

    def step_rates(self, scale_factor: np.ndarray, modes: np.ndarray, surroundings) -> dict:
        """Step times rate of everything these neutrinos do and suffer, their chains beyond the quadrupole left out.

        Parameters
        ----------
        scale_factor : array, shape (stage, lane)
            At the stage times [unitless].
        modes : array of int, shape (lane,)
            Which mode each lane belongs to.
        surroundings : object
            What `KineticSystem` has at hand: `x`, k dtau [unitless], `inertia`, dtau/k [Mpc^2], and `curvature`, of
            space times the latter [unitless], each an array of shape (lane,).

        Returns
        -------
        dict of (row, column) to array, shape (lane,) or (stage, lane)
        """
        rates = {}
        x = surroundings.x
        source, growth = 4 / 15 * x - SHIFT / 2 * surroundings.curvature, -2 / 3 * x
        for stream, energy, gravity in self._at_stages(scale_factor, modes, surroundings):
            rates |= self._streaming(stream, stream.momentum * x / energy)
            rates |= {
                (stream.unknown(0), "metric_rate"): growth,
                (stream.unknown(2), "metric_rate"): source,
                ("metric_rate", stream.unknown(0)): -gravity * (energy + stream.momentum**2 / energy),
                ("curvature", stream.unknown(1)): stream.momentum / 2 * gravity,
            }
            shear = SHIFT / 2 * stream.momentum * gravity
            rates |= {(row, stream.unknown(1)): shear for row in ("photon_2", "neutrino_2")}
        return rates

    def energies(self, scale_factor: np.ndarray, modes: np.ndarray, surroundings) -> dict[str, np.ndarray]:
        """8 pi G a^2 times energy density, times dtau/k, by the unknown that is its contrast, shape (stage, lane)."""
        return {
            stream.unknown(0): gravity * energy
            for stream, energy, gravity in self._at_stages(scale_factor, modes, surroundings)
        }

    def _at_stages(self, scale_factor, modes, surroundings):
        """Yield every chain, its energy and what a unit of energy weighs in the metric, shape (stage, lane)."""
        for stream in self._streams:
            weight = stream.weight * stream.density[modes] / scale_factor**2
            yield stream, stream.energy(scale_factor, modes), weight * surroundings.inertia

    def tail_rates(self, scale_factor: np.ndarray, modes: np.ndarray, surroundings) -> list[TailRates]:
        """Step times rate of the chains beyond the quadrupole; parameters as in `step_rates`."""
        return [
            TailRates(stream.momentum * surroundings.x / stream.energy(scale_factor, modes)) for stream in self._streams
        ]

    @staticmethod
    def _streaming(stream: _Stream, flow: np.ndarray) -> dict:
        """Free streaming of the first moments of one chain; the curvature is there for the shifted quadrupole."""
        rates = {}
        for moment in range(QUADRUPOLE):
            here, beyond = stream.unknown(moment), stream.unknown(moment + 1)
            rates[here, beyond] = -(moment + 1) / (2 * moment + 1) * flow
            rates[beyond, here] = (moment + 1) / (2 * moment + 3) * flow
        rates[stream.unknown(1), "curvature"] = SHIFT * rates[stream.unknown(1), stream.unknown(QUADRUPOLE)]
        return rates

    def density(self, scale_factor: np.ndarray, y: Mapping[str, np.ndarray]) -> np.ndarray:
        """8 pi G a^2 times the perturbation of their energy density, shape (boundary, mode) [1/Mpc^2]."""
        total = np.zeros_like(scale_factor)
        for stream in self._streams:
            energy = stream.energy(scale_factor, slice(None))
            total += stream.weight * stream.density / scale_factor**2 * energy * y[stream.unknown(0)]
        return total

    def contrast(
        self, scale_factor: np.ndarray, wavenumber: np.ndarray, y: Mapping[str, np.ndarray]
    ) -> tuple[np.ndarray, np.ndarray]:
        """Contrast of their rest mass, and its derivative by conformal time [1/Mpc], each of shape (boundary, mode)."""
        value, change = np.zeros((2, *scale_factor.shape))
        for stream in self._streams:
            number = 0.75 * stream.number * stream.share
            speed = stream.momentum / stream.energy(scale_factor, slice(None))
            value += number * y[stream.unknown(0)]
            change -= number * wavenumber * speed * y[stream.unknown(1)]
        return value, change - 0.5 * wavenumber * y["metric_rate"]

    def __bool__(self) -> bool:
        """Whether there are any."""
        return bool(self._streams)
