"""Free electrons and gas temperature through recombination, without reionization.

Hydrogen is the effective three-level atom of Peebles 1968 (ApJ 153, 1) with the factor of Seager, Sasselov
& Scott 2000 (ApJS 128, 407) on its recombination coefficient; helium is in Saha equilibrium; the gas
temperature follows Compton heating and expansion. Electron-positron pairs (above 1e9 K) are not counted.
"""

from dataclasses import dataclass
from math import log, pi, sinh

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
from .interpolation import UniformCubic, interpolate_smooth
from .members import SideBySide

FULLY_IONIZED_TEMPERATURE = 1.0e5  # 1e-12 of helium is not bare there (1e-6 if 1e7 times denser) [K]
STEP = 5.0e-3  # of the table in ln a: good to 1e-7, at the end of helium recombination
SOLUTION_STEPS = 320  # from the departure from Saha equilibrium to today: good to 2e-8, see the tests
EQUILIBRIUM_NEUTRALS = 1.0e-7  # neutral hydrogen up to which Saha stands in: it errs by less than that
RECOMBINATION_FACTOR = 1.125  # on the case-B coefficient; later work with SSS 2000's atom, from memory
RESPONSIVE_NEUTRALS = 1.0e-5  # neutral hydrogen from which on electrons respond: their contrast is smaller before
RESPONSE_STEP = 1.0e-4  # of the logarithms in the difference quotients: good to 1e-8
_GRADING = 3.2  # of the steps: the last is cosh of it, twelve times, as long as the first
_NEWTON_STEPS = 25  # for the Saha charge balance: 6 suffice, unless hydrogen is a trace
_BALANCED = 1.0e-9  # last Newton change of the balance per electron; the one it spares would be about its square

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
    table : UniformCubic, optional
        The solution, if it was found together with others'.

    Raises
    ------
    UniverseError
        If the equations cannot be solved.
    """

    def __init__(self, expansion, baryons, recombination_factor=RECOMBINATION_FACTOR, table=None):
        self._expansion, self._baryons, self._factor = expansion, baryons, recombination_factor
        self._table = table or _solve([expansion], [baryons], recombination_factor)[0]

    @classmethod
    def together(cls, expansions, baryons):
        """Ionization of several universes, solved as arrays: a list of what each would be alone.

        Raises
        ------
        UniverseError
            If the equations of one cannot be solved; its `index` tells which.
        """
        tables = _solve(expansions, baryons, RECOMBINATION_FACTOR)
        return [cls(*parts, table=table) for *parts, table in zip(expansions, baryons, tables, strict=True)]

    def electron_fraction(self, scale_factor):
        """Free electrons per hydrogen nucleus, shape as `scale_factor` [unitless]."""
        return self.state(scale_factor)[0]

    def temperature_lag(self, scale_factor):
        """ln(T_gamma/T), photon over gas temperature, shape as `scale_factor` [unitless]."""
        return self.state(scale_factor)[1]

    def state(self, scale_factor):
        """Electron fraction and ln(T_gamma/T), each shaped as `scale_factor`."""
        log_a = log_scale_factor(scale_factor)
        log_electrons, lag = self._table.fields(log_a)
        electrons = np.exp(log_electrons)
        early = log_a < self._table.start
        if early.any():
            full = self._baryons.full_ionization
            electrons = np.where(early, full, electrons)
            lag = np.where(early, _early_lag(self._expansion, self._baryons, np.exp(log_a), full), lag)
        return electrons, lag

    def heating(self, scale_factor):
        """Heating beside Compton scattering, in units of thermal energy and expansion rate: none [unitless]."""
        return np.zeros(np.shape(scale_factor))

    def response(self, scale_factor):
        """How the electrons respond to what surrounds them, shape as `scale_factor`; see `recombination_response`."""
        a = np.asarray(scale_factor, dtype=float)
        return recombination_response(self._expansion.contents, self._baryons, a, *self.state(a), self._factor)


@dataclass(frozen=True)
class _EarlyGas:
    """The gas while everything is in Saha equilibrium: up to the node where hydrogen departs from it.

    Parameters
    ----------
    log_a : array, shape (node,)
        Nodes of the whole table, up to today.
    electrons, lag : array, shape (early node,)
        Electrons per hydrogen nucleus and ln(T_gamma/T), at the nodes before the departure.
    departure : array, shape (2,)
        The state, as in `_Rates`, at the departure.
    """

    log_a: np.ndarray
    electrons: np.ndarray
    lag: np.ndarray
    departure: np.ndarray

    @property
    def later(self):
        """Nodes from the departure on, shape (later node,)."""
        return self.log_a[len(self.electrons) :]


def _early_gas(expansion, baryons):
    start = log(baryons.photon_temperature / FULLY_IONIZED_TEMPERATURE)
    grid = np.linspace(start, 0.0, int(np.ceil(-start / STEP)) + 1)
    a = np.exp(grid)
    # there is hardly less than one electron until then, so that x/(h + x) has passed the limit where h tells
    h = _saha(_HYDROGEN, baryons.photon_temperature / a, baryons.hydrogen_density / a**3)
    a = a[: int(np.argmax(h < 0.5 / EQUILIBRIUM_NEUTRALS)) + 1]
    electrons, neutrals = _equilibrium(baryons, a)
    first = int(np.argmax(neutrals > EQUILIBRIUM_NEUTRALS))
    lag = _early_lag(expansion, baryons, a, electrons)
    departure = np.array([np.log(neutrals[first] / (1.0 - neutrals[first])), lag[first]])
    return _EarlyGas(grid, electrons[:first], lag[:first], departure)


def _early_lag(expansion, baryons, a, electrons):
    """ln(T_gamma/T) while it is small: 1/(1 + Gamma/H) of T_gamma, good to (H/Gamma)^2 < 1e-9."""
    return np.log1p(expansion.conformal_hubble_rate(a) / baryons.compton_rate(a, electrons))


def _solve(expansions, baryons, recombination_factor):
    """Tables of ln x_e and ln(T_gamma/T) against ln a, one a universe, solved together.

    The time of the solution is s = 0 at the departure from equilibrium and 1 today, in every universe.
    """
    early = [_early_gas(*parts) for parts in zip(expansions, baryons, strict=True)]
    departure = np.array([gas.later[0] for gas in early])[:, None]
    together = SideBySide([expansion.contents for expansion in expansions], baryons)
    rates = _Rates(*together.pick(np.arange(len(early))[:, None]), recombination_factor)

    def slopes(s, state):
        return rates.slopes(_graded(departure, s), state) * _graded_slope(departure, s)

    grid = np.linspace(0.0, 1.0, SOLUTION_STEPS + 1)
    try:
        states = solve_stiff(slopes, grid, np.stack([gas.departure for gas in early], axis=1))
    except NotConvergedError as reason:
        raise UniverseError(
            f"recombination could not be followed in this universe: {reason}", index=reason.system
        ) from reason
    return [
        _table(gas, _Rates(expansion.contents, matter, recombination_factor), state)
        for gas, expansion, matter, state in zip(early, expansions, baryons, states.swapaxes(0, 1), strict=True)
    ]


def _table(gas, rates, state):
    """Table of one universe from its state at the nodes of the solution, shape (2, node)."""
    place = SOLUTION_STEPS * _ungraded(gas.later[0], gas.later)
    later = interpolate_smooth(state, place)
    electrons = np.concatenate([gas.electrons, rates.electrons(gas.later, later)])
    values = np.stack([np.log(electrons), np.concatenate([gas.lag, later[1]])])
    return UniformCubic(gas.log_a[0], -gas.log_a[0] / (len(gas.log_a) - 1), values)


def _graded(departure, s):
    """Map s from 0 to 1 onto ln a from the departure to today, short steps first."""
    return departure * (1.0 - np.sinh(_GRADING * s) / sinh(_GRADING))


def _graded_slope(departure, s):
    """Slope of `_graded`, d ln a/ds."""
    return -departure * _GRADING / sinh(_GRADING) * np.cosh(_GRADING * s)


def _ungraded(departure, log_a):
    """Invert `_graded`."""
    return np.arcsinh((1.0 - log_a / departure) * sinh(_GRADING)) / _GRADING


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
        change = (charge - x) / (1.0 - slope)
        x = x + change
        if np.max(np.abs(change) / x) < _BALANCED:
            break
    return x, x / (h + x)


class _Rates:
    """The equations for ln(neutral over ionized hydrogen) and ln(T_gamma/T), in ln a.

    These two unknowns keep their digits at both ends: while hardly an atom is neutral or the gas hardly lags,
    and when hardly one is ionized. Hydrogen: Peebles 1968; Seager, Sasselov & Scott 1999 (ApJ 523, L1),
    eq. 1; temperature: the same, eq. 2 (equation numbers from memory). All hydrogen coefficients are taken at
    the gas temperature, as there. No He++ is left by the time they are used.
    """

    def __init__(self, contents, baryons, recombination_factor):
        self._contents, self._baryons, self._factor = contents, baryons, recombination_factor

    def slopes(self, log_a, state):
        """Return the derivatives by ln a, shape (2, ..., point) as `state`; `log_a` broadcasts against its rows."""
        a, ratio = np.exp(log_a), np.exp(state[0])
        rate = self._contents.conformal_hubble_rate(a)
        protons = 1.0 / (1.0 + ratio)
        temperature, density = self._gas(a, state[1])
        electrons = self._electrons(protons, temperature, density)
        second = rate / a * (SPEED_OF_LIGHT / MEGAPARSEC)  # expansion rate [1/s]
        hydrogen = self._hydrogen(second, temperature, density, ratio, electrons)
        compton = self._baryons.compton_rate(a, electrons) / rate
        return np.stack([hydrogen, 1.0 - compton * np.expm1(state[1])])

    def _hydrogen(self, second, temperature, density, ratio, electrons):
        """Slope of ln(neutral over ionized) for an expansion rate [1/s], a temperature [K] and a density [1/m^3]."""
        protons, neutrals = 1.0 / (1.0 + ratio), ratio / (1.0 + ratio)
        recombination = self._factor * case_b_coefficient(temperature)
        ionization = recombination * _saha(_HYDROGEN - _LYMAN_ALPHA, temperature, 1.0)  # from the n = 2 level
        # K n_1s: ground-state atoms over the rate at which Lyman-alpha photons are redshifted away [s]
        escape = LYMAN_ALPHA_WAVELENGTH**3 / (8.0 * pi * second) * density * neutrals
        inhibition = (1.0 + escape * TWO_PHOTON_RATE) / (1.0 + escape * (TWO_PHOTON_RATE + ionization))
        captures = recombination * density * electrons / neutrals
        releases = ionization * np.exp(-_LYMAN_ALPHA / temperature) / protons
        return inhibition * (captures - releases) / second

    def electrons(self, log_a, state):
        """Electrons per hydrogen nucleus, with singly ionized helium in Saha equilibrium, shape (point,)."""
        return self._electrons(1.0 / (1.0 + np.exp(state[0])), *self._gas(np.exp(log_a), state[1]))

    def shrinking(self, a, lag, moves, ratio):
        """D ln(proton fraction)/d ln a of gas changed by factors exp(moves) in density, temperature, expansion rate."""
        temperature, density = self._gas(a, lag)
        temperature, density = temperature * np.exp(moves[1]), density * np.exp(moves[0])
        second = self._contents.conformal_hubble_rate(a) / a * (SPEED_OF_LIGHT / MEGAPARSEC)
        electrons = self._electrons(1.0 / (1.0 + ratio), temperature, density)
        hydrogen = self._hydrogen(second * np.exp(moves[2]), temperature, density, ratio, electrons)
        return -ratio / (1.0 + ratio) * hydrogen * np.exp(moves[2])  # per unit of the unchanged expansion

    def _gas(self, a, lag):
        return self._baryons.photon_temperature / a * np.exp(-lag), self._baryons.hydrogen_density / a**3

    def _electrons(self, protons, temperature, density):
        """Positive solution of x = protons + helium he/(he + x)."""
        he = _HELIUM_WEIGHT * _saha(_HELIUM, temperature, density)
        half = 0.5 * (he - protons)
        return np.sqrt(half * half + he * (protons + self._baryons.helium_per_hydrogen)) - half


def recombination_response(contents, baryons, a, electrons, lag, factor=RECOMBINATION_FACTOR):
    """Response of the rate d ln x_e/d ln a to its surroundings, from difference quotients of the rate itself.

    To first order d delta_x/d ln a = -r (delta_x - n delta_density - t delta_temperature - h delta_rate), where
    delta_rate is the relative contrast of the local expansion, which lets Lyman-alpha photons escape. Before
    one atom in 1e5 is neutral hydrogen there is nothing to respond, and n = t = h = 0.

    Parameters
    ----------
    contents : Contents
    baryons : Baryons
    a, electrons, lag : array, any shape
        Scale factor, electrons per hydrogen nucleus and ln(T_gamma/T) [unitless].
    factor : float
        On the case-B coefficient [unitless].

    Returns
    -------
    tuple of array, each that shape
        r, n, t, h [unitless].
    """
    rates = _Rates(contents, baryons, factor)
    temperature, density = rates._gas(a, lag)
    helium = _HELIUM_WEIGHT * _saha(_HELIUM, temperature, density)
    neutrals = 1.0 - (electrons - baryons.helium_per_hydrogen * helium / (helium + electrons))
    # From here on, going back in time, hydrogen is all but ionized.
    settled = np.where(neutrals < RESPONSIVE_NEUTRALS, a, 0.0).max(initial=0.0)
    responsive = a > settled
    ratio = np.where(responsive, neutrals, 0.5) / np.where(responsive, 1.0 - neutrals, 0.5)
    slopes = []
    for direction in range(4):
        move = np.eye(4)[direction] * RESPONSE_STEP
        ends = [rates.shrinking(a, lag, sign * move[:3], ratio * np.exp(sign * move[3])) for sign in (1.0, -1.0)]
        slopes.append((ends[0] - ends[1]) / (2.0 * RESPONSE_STEP))
    by_density, by_temperature, by_rate, by_ratio = slopes
    relaxation = by_ratio * (1.0 + ratio) / ratio  # ln(neutral/ionized) falls by 1/neutrals as ln(ionized) rises
    answers = [np.where(responsive, slope / relaxation, 0.0) for slope in (by_density, by_temperature, by_rate)]
    return np.where(responsive, relaxation, 0.0), *answers


def case_b_coefficient(temperature):
    """Hydrogen recombination coefficient to all levels but the ground, any shape [m^3/s].

    Pequignot, Petitjean & Boisson 1991 (A&A 251, 680), from memory.
    """
    scale, power, weight, bend = _CASE_B
    t = temperature / 1.0e4  # K
    return scale * t**power / (1.0 + weight * t**bend)
