"""The full ("kinetic") closure: every fluid, moment chains and metric as one linear system.

Synchronous frame at rest with the dark matter, unit primordial curvature, signs such that
densities grow positive. With no dark matter the frame is carried by massless dust, whose contrast
stands in the row of the dark matter.

Dark matter with pressure moves against the frame, which cold dust without mass then carries, and has an
equation of its own, as the baryons do::

    delta_c' = -theta_c - h'/2,        theta_c' = -H theta_c + k^2 c_s^2 delta_c

As for the baryons, pressure counts where the wavenumber multiplies it and nowhere else: terms of order c_s^2 without
k (the share w of pressure in the weight, 3 c_s^2 delta_c in the source of h'', -3 H (c_s^2 - w) delta_c in the
continuity) are all left out. One of them without the others would break the constraint between the metric and the
densities; so they keep it exactly. The dust needs no unknown: its contrast is -h/2, and cold dark matter is that.

The metric's trace rate and all velocities are divided by the wavenumber k, and time enters as
k tau, so that the rates stay near one. The plasma is followed by the velocity of the baryons and the
slip ``u = theta_baryon - theta_photon``. However fast Thomson scattering is, the drag
``-r kappa' u`` with ``r = 4 rho_photon / (3 rho_baryon)`` then is no difference of large numbers,
since the slip has an equation of its own: there is no tight-coupling approximation. And however
slow it is, the gas is not touched by the round-off of photons that stream through it.

Two things a scenario can ask for change the equations of the gas. Heat that a table or reionization brings is
given alike to every atom, so that it evens out the contrast of the temperature: ``-q delta_T`` with the heating q
over thermal energy (cooling they may ask for goes with the temperature, and evens nothing out). And the electrons
that recombination leaves may have a contrast delta_x of their own, which follows density, temperature and the
local expansion as the recombination rate does (`twofluid.universe.Response`). It enters the Compton heating of
the gas, by the share of the electrons among its particles, and its pressure, by their number. The drag
``kappa' (theta_photon - theta_baryon)`` is of first order already since nothing moves in the smooth universe, so
that a contrast of kappa' in it is of second order; the same holds for all scattering of photons. The temperature
equation counts, as in the smooth universe, no energy that electrons take along when they are caught.

References
----------
Ma, C.-P. & Bertschinger, E. 1995, ApJ 455, 7: eqs 42, 49-58, 63, 64 (numbers from memory).
Naoz, S. & Barkana, R. 2005, MNRAS 362, 1047: the gas-temperature contrast (from memory).
Lewis, A. 2007, PRD 76, 063001: contrasts of the electron fraction (from memory).
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from ..solver import StepRates, TailRates
from ..universe import Conditions, Response, Universe
from .chain import Chain
from .massive import MassiveNeutrinos
from .readout import Reading, constraint_drift, read_moving_dark_matter, read_quantities
from .start import mixed

# Absorbing layer: rate at the last moment in units of k, and the power of l / L with which it fades to low moments.
# Chosen by measurement on several universes; weaker and broader for photons, whose chain ends in scattering at first.
PHOTON_LAYER = (1.0, 5.0)
NEUTRINO_LAYER = (2.0, 6.0)
ELECTRONS = "delta_electron"  # the unknown that only a run with ionization fluctuations has
CONSTRAINT_PULL = 3.0  # over the expansion rate; errors are the same at 10, a few times larger at 1 (measured)


@dataclass(frozen=True)
class ChainLengths:
    """Highest moment of each chain.

    Attributes
    ----------
    photon, polarization, neutrino, massive : int
        Highest multipole followed [unitless], 3 or more; of massive neutrinos, if there are any.
    momenta : int
        Momenta at which massive neutrinos of one mass are followed [unitless].
    """

    photon: int
    polarization: int
    neutrino: int
    massive: int = 12
    momenta: int = 5


class KineticSystem:
    """The rates of the kinetic closure, for all modes of one universe.

    Implements `twofluid.solver.LinearSystem`; its time is the conformal time [Mpc].

    Parameters
    ----------
    universe : Universe or UniverseStack
        One universe, or several with the modes of each.
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    chains : ChainLengths
    ionization_fluctuations : bool, optional
        Whether the electrons have a contrast of their own, one more unknown.
    """

    observed = (
        "metric_rate", "curvature", "delta_dark", "delta_baryon", "delta_photon", "delta_neutrino",
        "delta_gas_temperature", "theta_baryon", "slip",
    )  # fmt: skip
    neutrinos_may_have_mass = True
    held_to_constraint = False
    stackable = True  # modes of several universes may stand side by side
    switches = ()  # one set of equations from first step to last
    cautions = ()

    def __init__(
        self, universe: Universe, wavenumber: np.ndarray, chains: ChainLengths, ionization_fluctuations: bool = False
    ):
        self.universe = universe
        self.wavenumber = np.asarray(wavenumber, dtype=float)
        self.chains = chains
        curvature = -np.asarray(universe.gravity("curvature", 1.0)) / 3.0
        self._curvature = np.broadcast_to(curvature, self.wavenumber.shape)  # of space [1/Mpc^2]
        self.ionization_fluctuations = ionization_fluctuations
        self.dark_pressure = universe.has_dark_pressure
        self._massive = MassiveNeutrinos(universe, self.wavenumber, chains.momenta, chains.massive)
        self.unknowns = (*self._massive.unknowns, *_elimination_order(self.dark_pressure))
        self.observed = (*type(self).observed, *self._massive.observed)
        if self.dark_pressure:
            self.observed = (*self.observed, "theta_dark")
        if ionization_fluctuations:
            place = self.unknowns.index("delta_gas_temperature")
            self.unknowns = (*self.unknowns[:place], ELECTRONS, *self.unknowns[place:])
            self.observed = (*self.observed, ELECTRONS)
        chains = (*_chains(self.chains), *self._massive.chains)
        self.unknowns = (*self.unknowns, *(name for chain in chains for name in chain.members))
        self._row = {name: row for row, name in enumerate(self.unknowns)}
        self.tails = tuple(chain.tail(self._row) for chain in chains)

    def first_state(self, start: np.ndarray, weights: Mapping[str, np.ndarray] | None = None) -> np.ndarray:
        """State of every mode at its start.

        Parameters
        ----------
        start : array, shape (mode,)
            Conformal time of each start [Mpc].
        weights : mapping of str to array, shape (mode,), optional
            How much of each initial mode; the adiabatic one alone if left out [unitless].

        Returns
        -------
        array, shape (unknown, mode)
        """
        state = np.zeros((len(self.unknowns), len(self.wavenumber)))
        first = mixed(self.universe, self.wavenumber, start, weights)
        for name, values in (first | self._massive.first_state(first)).items():
            if name in self._row:  # a short chain lacks the high moments
                state[self._row[name]] = values
        return state

    def read_off(self, times: np.ndarray, observed: np.ndarray) -> Reading:
        """Turn what was observed into quantities.

        Parameters
        ----------
        times : array, shape (boundary, mode)
            Conformal times [Mpc].
        observed : array, shape (unknown, boundary, mode)
            The unknowns named in `observed`.

        Returns
        -------
        Reading
        """
        now = self.universe.conditions(times)
        y = dict(zip(self.observed, observed, strict=True))
        quantities = read_quantities(now, self.wavenumber, y)
        for added in self._gas_options(now, times, self.wavenumber, slice(None), 1.0):
            for (row, column), rate in added.items():
                if (name := f"{row}_slope") in quantities:
                    scale = self.wavenumber if row == "theta_baryon" else 1.0
                    quantities[name] = quantities[name] + scale * rate / now.hubble_rate * y[column]
        if self.dark_pressure:
            speed = self.universe.dark_sound_speed(now.scale_factor)
            quantities |= read_moving_dark_matter(now, self.wavenumber, y, speed)
        others = None
        if self._massive:
            contrast, change = self._massive.contrast(now.scale_factor, self.wavenumber, y)
            quantities |= {"delta_neutrino": contrast, "delta_neutrino_slope": change / now.hubble_rate}
            others = self._massive.density(now.scale_factor, y)
        return Reading(quantities, constraint_drift(now, self.wavenumber, y, others))

    def step_rates(self, modes: np.ndarray, time: np.ndarray, step: np.ndarray) -> StepRates:
        """Evaluate step times rate; see `twofluid.solver.LinearSystem`."""
        now = self.universe.conditions(time, modes)
        surroundings = _Surroundings(now, self.wavenumber[modes], self._curvature[modes], step)
        named = {
            **_gravity(surroundings),
            **_densities(surroundings),
            **_velocities(surroundings),
            **_gas_temperature(surroundings),
            **_quadrupoles(surroundings),
            **_polarization(surroundings),
            **self._massive.step_rates(now.scale_factor, modes, surroundings),
        }
        for added in self._gas_options(now, time, self.wavenumber[modes], modes, step):
            for entry, rate in added.items():
                named[entry] = named.get(entry, 0.0) + rate
        if self.dark_pressure:
            named |= _dark_pressure(surroundings, self.universe.dark_sound_speed(now.scale_factor, modes))
        if self.held_to_constraint:
            energies = self._massive.energies(now.scale_factor, modes, surroundings)
            for entry, rate in _constraint(surroundings, self.wavenumber[modes] * time, energies).items():
                named[entry] = named.get(entry, 0.0) + rate
        entries = {(self._row[row], self._row[column]): rate for (row, column), rate in named.items()}
        plasma = TailRates(surroundings.x, surroundings.scattering)
        streams = self._massive.tail_rates(now.scale_factor, modes, surroundings)
        return StepRates(entries, (plasma, plasma, TailRates(surroundings.x), *streams))

    def _gas_options(self, now: Conditions, time: np.ndarray, wavenumber: np.ndarray, modes, step) -> list:
        """Entries of what a scenario can ask of the gas, times step, shaped as `time`."""
        added = []
        if self.universe.heated_from:
            heating = self.universe.heating_rate(time, modes) * step
            added.append({("delta_gas_temperature", "delta_gas_temperature"): -heating})
        if self.ionization_fluctuations:
            added.append(_electrons(now, self.universe.response(time, modes), wavenumber, step))
        return added


def _electrons(now: Conditions, response: Response, wavenumber: np.ndarray, step) -> dict:
    """Contrast of the electrons that recombination leaves, and what it does to temperature and pressure of the gas."""
    relaxation = response.relaxation * step
    expansion = relaxation * response.by_expansion * wavenumber / (3.0 * now.hubble_rate)  # of (theta_b + h'/2)/(3 a H)
    compton = now.compton_rate * step * (now.photon_gas_temperature_ratio - 1.0)
    pressure = now.isothermal_sound_speed_squared * wavenumber * step * response.particles
    return {
        (ELECTRONS, ELECTRONS): -relaxation,
        (ELECTRONS, "delta_baryon"): relaxation * response.by_density,
        (ELECTRONS, "delta_gas_temperature"): relaxation * response.by_temperature,
        (ELECTRONS, "theta_baryon"): expansion,
        (ELECTRONS, "metric_rate"): expansion / 2.0,
        ("delta_gas_temperature", ELECTRONS): compton * response.compton,
        ("theta_baryon", ELECTRONS): pressure,
        ("slip", ELECTRONS): pressure,
    }


class ConstrainedKineticSystem(KineticSystem):
    """The kinetic closure for initial modes without curvature, its trace rate held to the energy constraint.

    Waves longer than the horizon with contrasts of matter or radiation among themselves have a curvature of order
    y (k tau)^0 while h' is of order y/(k tau)^2 of it, y being matter over radiation: an error of h' that nobody would
    notice is a whole adiabatic mode. Held to the constraint h' has the digits of the curvature.
    """

    held_to_constraint = True


def _elimination_order(dark_pressure: bool) -> tuple[str, ...]:
    """Put what only gravity and one velocity touch first, the most coupled unknowns last."""
    densities = ["delta_dark", "delta_baryon", "delta_photon", "delta_neutrino"]
    densities += ["theta_dark"] if dark_pressure else []
    core = ["polarization_1", "delta_gas_temperature", "neutrino_2", "theta_neutrino", "polarization_0",
            "polarization_2", "photon_2", "slip", "theta_baryon", "metric_rate"]  # fmt: skip
    return ("curvature", *densities, *core)


def _chains(lengths: ChainLengths) -> tuple[Chain, ...]:
    """Free streaming and scattering of the higher moments, absorbed at the far end (eqs 49, 63, 64)."""
    return (
        Chain("photon", lengths.photon, PHOTON_LAYER),
        Chain("polarization", lengths.polarization, PHOTON_LAYER),
        Chain("neutrino", lengths.neutrino, NEUTRINO_LAYER),
    )


class _Surroundings:
    """What the smooth universe contributes to the rates, each already times step.

    Uniform quantities have shape (lane,), the others (stage, lane).
    """

    def __init__(self, now: Conditions, wavenumber: np.ndarray, curvature: np.ndarray, step: np.ndarray):
        self.x = step * wavenumber  # k dtau
        self.hubble = now.hubble_rate * step
        self.scattering = now.scattering_rate * step
        self.compton = now.compton_rate * step
        self.inertia = step / wavenumber  # g_i / k^2 times k dtau
        self.gravity_photon = now.gravity_photon * self.inertia
        self.gravity_neutrino = now.gravity_neutrino * self.inertia
        self.gravity_baryon = now.gravity_baryon * self.inertia
        self.gravity_dark = now.gravity_dark * self.inertia
        self.curvature = curvature * self.inertia
        self.drag = now.photon_baryon_ratio * self.scattering
        self.pressure = now.isothermal_sound_speed_squared * self.x
        self.warmth = now.photon_gas_temperature_ratio


def _gravity(s: _Surroundings) -> dict:
    """Trace rate of the metric (Ma & Bertschinger 1995, eq. 21 a and c combined) and the curvature it must match.

    Space's own curvature enters the latter only (it keeps the constraint exact); the modes feel it
    through the expansion alone.
    """
    return {
        ("metric_rate", "metric_rate"): -s.hubble,
        ("metric_rate", "delta_dark"): -s.gravity_dark,
        ("metric_rate", "delta_baryon"): -s.gravity_baryon,
        ("metric_rate", "delta_photon"): -2.0 * s.gravity_photon,
        ("metric_rate", "delta_neutrino"): -2.0 * s.gravity_neutrino,
        ("curvature", "metric_rate"): s.curvature / 2,
        ("curvature", "theta_baryon"): 2 / 3 * s.gravity_photon + s.gravity_baryon / 2,
        ("curvature", "slip"): -2 / 3 * s.gravity_photon,
        ("curvature", "theta_neutrino"): 2 / 3 * s.gravity_neutrino,
    }


def _constraint(s: _Surroundings, phase: np.ndarray, massive: Mapping[str, np.ndarray]) -> dict:
    """Pull of the trace rate towards what the energy constraint makes of curvature and densities (eq. 21 a).

    It is zero for a solution of the equations. The rate is that of the expansion times `CONSTRAINT_PULL`, fading
    inside the horizon, where the curvature is a small difference of large terms.
    """
    pull = CONSTRAINT_PULL / (1.0 + phase**4)
    return {
        ("metric_rate", "metric_rate"): -pull * s.hubble,
        ("metric_rate", "curvature"): 2.0 * pull * s.x,
        ("metric_rate", "delta_dark"): pull * s.gravity_dark,
        ("metric_rate", "delta_baryon"): pull * s.gravity_baryon,
        ("metric_rate", "delta_photon"): pull * s.gravity_photon,
        ("metric_rate", "delta_neutrino"): pull * s.gravity_neutrino,
        **{("metric_rate", unknown): pull * energy for unknown, energy in massive.items()},
    }


def _densities(s: _Surroundings) -> dict:
    """Continuity of the four fluids (Ma & Bertschinger 1995, eqs 42, 49, 63, 66)."""
    return {
        ("delta_dark", "metric_rate"): -s.x / 2,
        ("delta_baryon", "metric_rate"): -s.x / 2,
        ("delta_baryon", "theta_baryon"): -s.x,
        ("delta_photon", "metric_rate"): -2 / 3 * s.x,
        ("delta_photon", "theta_baryon"): -4 / 3 * s.x,
        ("delta_photon", "slip"): 4 / 3 * s.x,
        ("delta_neutrino", "metric_rate"): -2 / 3 * s.x,
        ("delta_neutrino", "theta_neutrino"): -4 / 3 * s.x,
    }


def _velocities(s: _Surroundings) -> dict:
    """Velocities of baryons and neutrinos, slip of the plasma (Ma & Bertschinger 1995, eqs 49, 63, 66 and 67)."""
    return {
        ("theta_baryon", "theta_baryon"): -s.hubble,
        ("theta_baryon", "slip"): -s.drag,
        ("theta_baryon", "delta_baryon"): s.pressure,
        ("theta_baryon", "delta_gas_temperature"): s.pressure,
        ("slip", "theta_baryon"): -s.hubble,
        ("slip", "slip"): -s.drag - s.scattering,
        ("slip", "delta_baryon"): s.pressure,
        ("slip", "delta_gas_temperature"): s.pressure,
        ("slip", "delta_photon"): -s.x / 4,
        ("slip", "photon_2"): s.x / 2,
        ("theta_neutrino", "delta_neutrino"): s.x / 4,
        ("theta_neutrino", "neutrino_2"): -s.x / 2,
    }


def _dark_pressure(s: _Surroundings, speed: np.ndarray) -> dict:
    """Velocity of dark matter with pressure, and what it does to metric and shears; see the module's text."""
    shear = 4 / 5 * s.gravity_dark
    return {
        ("delta_dark", "theta_dark"): -s.x,
        ("theta_dark", "theta_dark"): -s.hubble,
        ("theta_dark", "delta_dark"): speed**2 * s.x,
        ("curvature", "theta_dark"): s.gravity_dark / 2,
        ("photon_2", "theta_dark"): shear,
        ("neutrino_2", "theta_dark"): shear,
    }


def _gas_temperature(s: _Surroundings) -> dict:
    """Adiabatic and Compton heating of the gas contrast (Naoz & Barkana 2005)."""
    return {
        ("delta_gas_temperature", "theta_baryon"): -2 / 3 * s.x,
        ("delta_gas_temperature", "metric_rate"): -s.x / 3,
        ("delta_gas_temperature", "delta_photon"): s.compton * (1.25 * s.warmth - 1.0),
        ("delta_gas_temperature", "delta_gas_temperature"): -s.compton * s.warmth,
    }


def _quadrupoles(s: _Surroundings) -> dict:
    """Second moments of photons and neutrinos, with the shear of the metric (eqs 49, 63)."""
    shear_photon, shear_neutrino = 16 / 15 * s.gravity_photon, 16 / 15 * s.gravity_neutrino
    shear_plasma = shear_photon + 4 / 5 * s.gravity_baryon
    metric = 4 / 15 * s.x
    return {
        ("photon_2", "metric_rate"): metric,
        ("photon_2", "theta_baryon"): 8 / 15 * s.x + shear_plasma,
        ("photon_2", "slip"): -8 / 15 * s.x - shear_photon,
        ("photon_2", "theta_neutrino"): shear_neutrino,
        ("photon_2", "photon_2"): -0.9 * s.scattering,
        ("photon_2", "polarization_0"): 0.1 * s.scattering,
        ("photon_2", "polarization_2"): 0.1 * s.scattering,
        ("neutrino_2", "metric_rate"): metric,
        ("neutrino_2", "theta_baryon"): shear_plasma,
        ("neutrino_2", "slip"): -shear_photon,
        ("neutrino_2", "theta_neutrino"): 8 / 15 * s.x + shear_neutrino,
    }


def _polarization(s: _Surroundings) -> dict:
    """First moments of the polarization, fed by the quadrupole (eq. 64)."""
    half, tenth = 0.5 * s.scattering, 0.1 * s.scattering
    return {
        ("polarization_0", "polarization_1"): -s.x,
        ("polarization_0", "polarization_0"): -half,
        ("polarization_0", "polarization_2"): half,
        ("polarization_0", "photon_2"): half,
        ("polarization_1", "polarization_0"): s.x / 3,
        ("polarization_1", "polarization_2"): -2 / 3 * s.x,
        ("polarization_1", "polarization_1"): -s.scattering,
        ("polarization_2", "polarization_1"): 2 / 5 * s.x,
        ("polarization_2", "polarization_2"): -9.0 * tenth,
        ("polarization_2", "polarization_0"): tenth,
        ("polarization_2", "photon_2"): tenth,
    }
