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

from ..solver.collocation import STAGES, WEIGHTS
from ..universe import Universe
from ..universe.fermi_dirac import momentum_sum

LAYER = (2.0, 6.0)  # absorbing layer, as of massless neutrinos, in units of k v
SHIFT = 8.0 / 5.0  # of the quadrupole, in units of the curvature
FIRST_TAIL = 3  # from this moment on a chain only streams


@dataclass(frozen=True)
class _Chain:
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
        self._chains = [
            _Chain(f"massive_{m}_{n}", q, weight, weight / total, density, mass, density * mass / resting)
            for m, (density, mass) in enumerate(species)
            for n, (q, weight) in enumerate(grid)
        ]
        self.unknowns = tuple(chain.unknown(moment) for moment in range(last, -1, -1) for chain in self._chains)
        self.observed = tuple(chain.unknown(moment) for moment in (0, 1) for chain in self._chains)

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
        for chain in self._chains:
            state[chain.unknown(0)] = massless.get("delta_neutrino", 0.0)
            state[chain.unknown(1)] = 4 / 3 * massless.get("theta_neutrino", 0.0)
            state[chain.unknown(2)] = massless.get("neutrino_2", 0.0) - SHIFT * massless.get("curvature", 0.0)
            for moment in range(FIRST_TAIL, self._last + 1):
                state[chain.unknown(moment)] = massless.get(f"neutrino_{moment}", 0.0)
        return state

    def step_rates(self, scale_factor: np.ndarray, modes: np.ndarray, surroundings) -> dict:
        """Step times rate of everything these neutrinos do and suffer.

        Parameters
        ----------
        scale_factor : array, shape (stage, step, mode)
            At the stage times [unitless].
        modes : array of int, shape (mode,)
            Which modes are asked for.
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
        for chain, energy, gravity in self._at_stages(scale_factor, modes, surroundings):
            rates |= self._streaming(chain, chain.momentum * x / energy)
            rates |= {
                (chain.unknown(0), "metric_rate"): growth,
                (chain.unknown(2), "metric_rate"): source,
                ("metric_rate", chain.unknown(0)): -gravity * (energy + chain.momentum**2 / energy),
                ("curvature", chain.unknown(1)): chain.momentum / 2 * gravity,
            }
            shear = SHIFT / 2 * chain.momentum * gravity
            rates |= {(row, chain.unknown(1)): shear for row in ("photon_2", "neutrino_2")}
        return rates

    def energies(self, scale_factor: np.ndarray, modes: np.ndarray, surroundings) -> dict[str, np.ndarray]:
        """8 pi G a^2 times energy density, times dtau/k, by the unknown that is its contrast, shape (stage, lane)."""
        return {
            chain.unknown(0): gravity * energy
            for chain, energy, gravity in self._at_stages(scale_factor, modes, surroundings)
        }

    def _at_stages(self, scale_factor, modes, surroundings):
        """Yield every chain, its energy and what a unit of energy weighs in the metric, shape (stage, lane)."""
        for chain in self._chains:
            energy = chain.energy(scale_factor, modes).reshape(STAGES, -1)
            weight = (chain.weight * chain.density[modes] / scale_factor**2).reshape(STAGES, -1)
            yield chain, energy, weight * surroundings.inertia

    def _streaming(self, chain: _Chain, flow: np.ndarray) -> dict:
        """Free streaming of one chain, absorbed at its far end; the curvature is there for the shifted quadrupole.

        Among themselves the moments of the tail stream at the mean speed of the step. What only streams has then gone
        the right way at the end of it, and with one rate at all stages the solver is quicker.
        """
        strength, steepness = LAYER
        mean = WEIGHTS[-1] @ flow
        rates = {}
        for moment in range(self._last):
            here, beyond = chain.unknown(moment), chain.unknown(moment + 1)
            speed = (moment + 1) * (mean if moment >= FIRST_TAIL else flow)
            rates[here, beyond] = -speed / (2 * moment + 1)
            rates[beyond, here] = speed / (2 * moment + 3)
        for moment in range(FIRST_TAIL, self._last + 1):
            rates[chain.unknown(moment), chain.unknown(moment)] = -strength * (moment / self._last) ** steepness * mean
        for moment in (1, 3):
            rates[chain.unknown(moment), "curvature"] = SHIFT * rates[chain.unknown(moment), chain.unknown(2)]
        return rates

    def density(self, scale_factor: np.ndarray, y: Mapping[str, np.ndarray]) -> np.ndarray:
        """8 pi G a^2 times the perturbation of their energy density, shape (boundary, mode) [1/Mpc^2]."""
        total = np.zeros_like(scale_factor)
        for chain in self._chains:
            energy = chain.energy(scale_factor, slice(None))
            total += chain.weight * chain.density / scale_factor**2 * energy * y[chain.unknown(0)]
        return total

    def contrast(
        self, scale_factor: np.ndarray, wavenumber: np.ndarray, y: Mapping[str, np.ndarray]
    ) -> tuple[np.ndarray, np.ndarray]:
        """Contrast of their rest mass, and its derivative by conformal time [1/Mpc], each of shape (boundary, mode)."""
        value, change = np.zeros((2, *scale_factor.shape))
        for chain in self._chains:
            number = 0.75 * chain.number * chain.share
            speed = chain.momentum / chain.energy(scale_factor, slice(None))
            value += number * y[chain.unknown(0)]
            change -= number * wavenumber * speed * y[chain.unknown(1)]
        return value, change - 0.5 * wavenumber * y["metric_rate"]

    def __bool__(self) -> bool:
        """Whether there are any."""
        return bool(self._chains)
