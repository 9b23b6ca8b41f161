"""A stand-in universe of nothing but matter, any pressure in it, for the limits that have closed forms."""

from functools import cache
from itertools import pairwise

import numpy as np
from courses import cosmology

from twofluid.fluids import ChainLengths, KineticSystem
from twofluid.solver import integrate
from twofluid.universe import Conditions, Universe
from twofluid.universe.background import solve_backgrounds
from twofluid.universe.conditions import FIELDS

SHORT = ChainLengths(photon=4, polarization=4, neutrino=4)  # of what has no weight here
TWO_ATOMS = 5 / 3  # adiabatic over isothermal sound speed squared of a gas that is not heated


@cache
def _some_cosmology():
    """What the class below is built from and then has no use for."""
    asked = cosmology(effective_number=0.0)
    return asked, solve_backgrounds([asked])[0]


class MatterEra(Universe):
    """Einstein-de Sitter: a = tau^2, a'/a = 2/tau, nothing but dark matter and gas.

    `dark` and `gas` are functions of the scale factor that give the sound speed squared, or None; `gas_share` is the
    gas in the matter; `heated` gas is held at its mean temperature by Compton scattering, other is adiabatic.
    """

    def __init__(self, *, dark=None, gas=None, gas_share=0.0, heated=False):
        super().__init__(*_some_cosmology())
        self.dark, self.gas, self.gas_share, self.heated = dark, gas, gas_share, heated

    def conditions(self, conformal_time, columns=None):
        tau = np.asarray(conformal_time, dtype=float)
        a, rate, nothing = tau**2, 2.0 / tau, np.zeros(tau.shape)
        stiffness = 1.0 if self.heated else TWO_ATOMS
        given = {
            "scale_factor": a,
            "hubble_rate": rate,
            "gravity_baryon": 3.0 * self.gas_share * rate**2,
            "gravity_dark": 3.0 * (1.0 - self.gas_share) * rate**2,
            "isothermal_sound_speed_squared": nothing if self.gas is None else self.gas(a) / stiffness,
            "compton_rate": 1e6 * rate if self.heated else nothing,
            "photon_gas_temperature_ratio": nothing + 1.0,
        }
        return Conditions(**(dict.fromkeys(FIELDS, nothing) | given))

    @property
    def has_dark_pressure(self):
        return self.dark is not None

    def dark_sound_speed(self, scale_factor, columns=None):
        return np.sqrt(self.dark(np.asarray(scale_factor, dtype=float)))


def pressure(kappa, wavenumber, power):
    """Sound speed squared of which the Jeans wavenumber is wavenumber a^(power/2)/kappa: kappa^2 (3/2) H^2/k^2."""
    return lambda a: kappa**2 * a**-power * 6.0 / a / wavenumber**2


def run(universe, wavenumber, scale_factors, *, step=0.01, **first):
    """Integrate from given contrasts and rates by ln a, to the scale factors, increasing, the first the start.

    `first` has delta_dark, dark_slope, delta_baryon, baryon_slope; whichever has no weight of its own may be left out.
    The metric follows from the fluid that is at rest. Returns delta_dark and delta_baryon, shape (scale factor, mode).
    """
    wavenumber = np.atleast_1d(np.asarray(wavenumber, dtype=float))
    marks = np.sqrt(scale_factors)
    pieces = [
        np.geomspace(begin, end, max(2, 1 + int(np.ceil(2.0 * np.log(end / begin) / step))))
        for begin, end in pairwise(marks)
    ]
    times = np.concatenate([[marks[0]], *(piece[1:] for piece in pieces)])
    index = np.concatenate([[0], np.cumsum([len(piece) - 1 for piece in pieces])])
    system = KineticSystem(universe, wavenumber, SHORT)
    rate = 2.0 / marks[0]
    state = np.zeros((len(system.unknowns), len(wavenumber)))

    def put(name, value):
        state[system.unknowns.index(name)] = value

    dark_slope, baryon_slope = first.get("dark_slope", 0.0), first.get("baryon_slope", 0.0)
    still = dark_slope if "delta_dark" in first else baryon_slope  # delta' = -h'/2
    put("metric_rate", -2.0 * rate * still / wavenumber)
    put("delta_dark", first.get("delta_dark", 0.0))
    put("delta_baryon", first.get("delta_baryon", 0.0))
    put("theta_baryon", rate * (still - baryon_slope) / wavenumber)
    put("delta_gas_temperature", 0.0 if universe.heated else 2 / 3 * np.asarray(first.get("delta_baryon", 0.0)))
    clock = np.tile(times[:, None], len(wavenumber))
    observed = integrate(system, clock, state, ["delta_dark", "delta_baryon"]).observed
    return observed[0, index], observed[1, index]
