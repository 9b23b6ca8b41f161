"""Free electrons and gas temperature through recombination, without reionization.

Hydrogen is the effective three-level atom of Peebles 1968 (ApJ 153, 1) with the factor of Seager, Sasselov
& Scott 2000 (ApJS 128, 407) on its recombination coefficient; helium is in Saha equilibrium; the gas
temperature follows Compton heating and expansion. Electron-positron pairs (above 1e9 K) are not counted.
"""

from math import log, pi

import numpy as np

from .collocation import NotConvergedError, solve_stiff
from .constants import (
    BOLTZMANN,
    ELECTRON_MASS,
    HELIUM_ION_IONIZATION,
    HELIUM_IONIZATION,
    HYDROGEN_IONIZATION,
    LYMAN_ALPHA_ENERGY,
    LYMAN_ALPHA_WAVELENGTH,
    MEGAPARSEC,
    PLANCK,
    SPEED_OF_LIGHT,
    TWO_PHOTON_RATE,
)
from .errors import UniverseError
from .expansion import log_scale_factor
from .interpolation import UniformCubic

FULLY_IONIZED_TEMPERATURE = 1.0e5  # 1e-12 of helium is not bare there (1e-6 if 1e7 times denser) [K]
STEP = 5.0e-3  # of the solution and its table in ln a: good to 1e-7, at the end of helium recombination
EQUILIBRIUM_NEUTRALS = 1.0e-7  # neutral hydrogen up to which Saha stands in: it errs by less than that
RECOMBINATION_FACTOR = 1.125  # on the case-B coefficient; later work with SSS 2000's atom, from memory
_NEWTON_STEPS = 25  # for the Saha charge balance: 5 suffice, unless hydrogen is a trace
_FEWEST_ELECTRONS = 1.0e-30  # per hydrogen nucleus; keeps the balance defined where equilibrium is long over

_CASE_B = (4.309e-19, -0.6166, 0.6703, 0.5300)  # a [m^3/s], b, c, d of a t^b/(1 + c t^d), t = T/1e4 K
# (2 pi m_e k T/h^2)^(3/2) at 1 K [1/m^3]
_QUANTUM_DENSITY = (2.0 * pi * ELECTRON_MASS * BOLTZMANN / PLANCK**2) ** 1.5
_HYDROGEN, _HELIUM, _HELIUM_ION, _LYMAN_ALPHA = (
    energy / BOLTZMANN
    for energy in (HYDROGEN_IONIZATION, HELIUM_IONIZATION, HELIUM_ION_IONIZATION, LYMAN_ALPHA_ENERGY)
)  # [K]
_HELIUM_WEIGHT = 4.0  # 2 g(He+)/g(He); 1 for hydrogen and for He++


class Ionization:
    """Electron fraction and gas temperature of a universe.

    Parameters
    ----------
    expansion : Expansion
    baryons : Baryons
    recombination_factor : float
        Multiplies the case-B coefficient of hydrogen [unitless].

    Raises
    ------
    UniverseError
        If the equations cannot be solved.
    """

    def __init__(self, expansion, baryons, recombination_factor=RECOMBINATION_FACTOR):
        self._expansion, self._baryons = expansion, baryons
        start = log(baryons.photon_temperature / FULLY_IONIZED_TEMPERATURE)
        intervals = int(np.ceil(-start / STEP))
        grid = np.linspace(start, 0.0, intervals + 1)
        electrons, neutrals = _equilibrium(baryons, np.exp(grid))
        lag = self._early_lag(np.exp(grid), electrons)
        first = int(np.argmax(neutrals > EQUILIBRIUM_NEUTRALS))
        rates = _Rates(expansion, baryons, recombination_factor)
        initial = np.log(neutrals[first] / (1.0 - neutrals[first])), lag[first]
        try:
            state = solve_stiff(rates.slopes, grid[first:], initial)
        except NotConvergedError as reason:
            raise UniverseError(f"recombination could not be followed in this universe: {reason}") from reason
        electrons[first:], lag[first:] = rates.electrons(grid[first:], state), state[1]
        self._table = UniformCubic(start, -start / intervals, np.stack([np.log(electrons), lag]))

    def _early_lag(self, a, electrons):
        """ln(T_gamma/T) while it is small: 1/(1 + Gamma/H) of T_gamma, good to (H/Gamma)^2 < 1e-9."""
        return np.log1p(self._expansion.conformal_hubble_rate(a) / self._baryons.compton_rate(a, electrons))

    def electron_fraction(self, scale_factor):
        """Free electrons per hydrogen nucleus, shape as `scale_factor` [unitless]."""
        return self.state(scale_factor)[0]

    def temperature_lag(self, scale_factor):
        """ln(T_gamma/T), photon over gas temperature, shape as `scale_factor` [unitless]."""
        return self.state(scale_factor)[1]

    def state(self, scale_factor):
        """Electron fraction and ln(T_gamma/T), each shaped as `scale_factor`."""
        log_a = log_scale_factor(scale_factor)
        a = np.exp(log_a)
        log_electrons, lag = np.moveaxis(self._table(log_a.ravel()), -1, 0).reshape((2, *log_a.shape))
        early = log_a < self._table.start
        electrons = np.where(early, self._baryons.full_ionization, np.exp(log_electrons))
        return electrons, np.where(early, self._early_lag(a, self._baryons.full_ionization), lag)


def _saha(binding, temperature, density):
    """Ion times electron over atom, in units of the hydrogen density, statistical weights apart."""
    return _QUANTUM_DENSITY * temperature**1.5 / density * np.exp(-binding / temperature)


def _equilibrium(baryons, a):
    """Electrons and neutral hydrogen, each per hydrogen nucleus, with everything in Saha equilibrium."""
    temperature = baryons.photon_temperature / a
    density = baryons.hydrogen_density / a**3
    helium = baryons.helium_per_hydrogen
    h = _saha(_HYDROGEN, temperature, density)
    he = _HELIUM_WEIGHT * _saha(_HELIUM, temperature, density)
    twice = he * _saha(_HELIUM_ION, temperature, density)
    x = np.full_like(a, baryons.full_ionization)
    for _ in range(_NEWTON_STEPS):
        sum_h, sum_he = h + x, x * x + he * x + twice
        charge = h / sum_h + helium * (he * x + 2.0 * twice) / sum_he
        slope = -h / sum_h**2 + helium * (he - (he * x + 2.0 * twice) * (2.0 * x + he) / sum_he) / sum_he
        x = x + (charge - x) / (1.0 - slope)
        x = np.maximum(x, _FEWEST_ELECTRONS)
    return x, x / (h + x)


class _Rates:
    """The equations for ln(neutral over ionized hydrogen) and ln(T_gamma/T), in ln a.

    These two unknowns keep their digits at both ends: while hardly an atom is neutral or the gas hardly lags,
    and when hardly one is ionized. Hydrogen: Peebles 1968; Seager, Sasselov & Scott 1999 (ApJ 523, L1),
    eq. 1; temperature: the same, eq. 2 (equation numbers from memory). All hydrogen coefficients are taken at
    the gas temperature, as there. No He++ is left by the time they are used.
    """

    def __init__(self, expansion, baryons, recombination_factor):
        self._expansion, self._baryons, self._factor = expansion, baryons, recombination_factor

    def slopes(self, log_a, state):
        """Return the derivatives by ln a, shape (2, point) as `state`."""
        a, ratio = np.exp(log_a), np.exp(state[0])
        rate = self._expansion.conformal_hubble_rate(a)
        protons, neutrals = 1.0 / (1.0 + ratio), ratio / (1.0 + ratio)
        temperature, density = self._gas(a, state[1])
        electrons = self._electrons(protons, temperature, density)
        second = rate / a * (SPEED_OF_LIGHT / MEGAPARSEC)  # expansion rate [1/s]
        recombination = self._factor * case_b_coefficient(temperature)
        ionization = recombination * _saha(_HYDROGEN - _LYMAN_ALPHA, temperature, 1.0)  # from the n = 2 level
        # K n_1s: ground-state atoms over the rate at which Lyman-alpha photons are redshifted away [s]
        escape = LYMAN_ALPHA_WAVELENGTH**3 / (8.0 * pi * second) * density * neutrals
        inhibition = (1.0 + escape * TWO_PHOTON_RATE) / (1.0 + escape * (TWO_PHOTON_RATE + ionization))
        captures = recombination * density * electrons / neutrals
        releases = ionization * np.exp(-_LYMAN_ALPHA / temperature) / protons
        compton = self._baryons.compton_rate(a, electrons) / rate
        return np.stack([inhibition * (captures - releases) / second, 1.0 - compton * np.expm1(state[1])])

    def electrons(self, log_a, state):
        """Electrons per hydrogen nucleus, with singly ionized helium in Saha equilibrium, shape (point,)."""
        return self._electrons(1.0 / (1.0 + np.exp(state[0])), *self._gas(np.exp(log_a), state[1]))

    def _gas(self, a, lag):
        return self._baryons.photon_temperature / a * np.exp(-lag), self._baryons.hydrogen_density / a**3

    def _electrons(self, protons, temperature, density):
        """Positive solution of x = protons + helium he/(he + x)."""
        he = _HELIUM_WEIGHT * _saha(_HELIUM, temperature, density)
        half = 0.5 * (he - protons)
        return np.sqrt(half * half + he * (protons + self._baryons.helium_per_hydrogen)) - half


def case_b_coefficient(temperature):
    """Hydrogen recombination coefficient to all levels but the ground, any shape [m^3/s].

    Pequignot, Petitjean & Boisson 1991 (A&A 251, 680), from memory.
    """
    scale, power, weight, bend = _CASE_B
    t = temperature / 1.0e4  # K
    return scale * t**power / (1.0 + weight * t**bend)
