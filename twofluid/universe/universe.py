"""The smooth universe of one cosmology: everything that has no wavenumber."""

from dataclasses import replace
from functools import cached_property

import numpy as np

from . import gas
from .background import Background, solve_backgrounds
from .conditions import ConditionsTable, FurtherFields
from .dark import dark_sound
from .errors import UniverseError
from .expansion import log_scale_factor
from .landmarks import find_landmarks, reionization_depth
from .response import Response, heating_values, response_values

_POLARIZED_SCATTERING = 16.0 / 15.0  # photon viscosity with polarization; Kaiser 1983, from memory


class Universe:
    """Expansion, ionization, gas and landmarks of one cosmology.

    All functions of the scale factor (1 today) take a float or an array of any shape, from 1e-16 to 1, and
    return an array of the same shape; outside that range they raise ValueError.

    Parameters
    ----------
    cosmology : Cosmology
        Densities, temperature, helium and rate today.
    background : Background, optional
        Its solution, if it was found together with others'; see `build_universes`.

    Raises
    ------
    UniverseError
        If the cosmology contradicts itself or never expands from a hot beginning to today.
    """

    def __init__(self, cosmology, background=None):
        self.cosmology = cosmology
        background = background or solve_backgrounds([cosmology])[0]
        self._expansion = background.expansion
        self._baryons = background.baryons
        self.dark_sound = dark_sound(cosmology)
        self._ionization = background.ionization
        self._computed = background.computed

    # --- expansion ---------------------------------------------------------------------------------
    def gravity(self, species, scale_factor, columns=None):
        """8 pi G a^2 rho of a species [1/Mpc^2].

        The species are "photon", "neutrino" (without mass), "massive_neutrino", "baryon", "dark", "curvature" and
        "constant" (cosmological constant). `columns` is there for a `UniverseStack`, as in `conditions`.
        """
        return self._expansion.gravity(species, scale_factor)

    @property
    def contents(self):
        """8 pi G rho of every species today, a `Contents` [1/Mpc^2]."""
        return self._expansion.contents

    def density_fraction(self, species, scale_factor):
        """Share of a species (named as for `gravity`) in the critical density of its time [unitless]."""
        return self._expansion.density_fraction(species, scale_factor)

    @property
    def masses(self):
        """8 pi G times the density of rest mass today, of "dark", "baryon" and "massive_neutrino" [1/Mpc^2].

        It thins out as a^-3 at all times; of the neutrinos it is all of their energy once they are slow.
        """
        contents = self.contents
        return {"dark": contents.dark, "baryon": contents.baryon, "massive_neutrino": contents.resting}

    def massive_neutrino_pressure(self, scale_factor):
        """8 pi G a^2 times the pressure of the neutrinos with mass [1/Mpc^2]."""
        return self.contents.massive_pressure(scale_factor)

    def conformal_hubble_rate(self, scale_factor):
        """Conformal rate a'/a [1/Mpc]."""
        return self._expansion.conformal_hubble_rate(scale_factor)

    def conformal_time(self, scale_factor):
        """Conformal time since the beginning [Mpc]."""
        return self._expansion.conformal_time(scale_factor)

    def scale_factor(self, conformal_time):
        """Scale factor at a conformal time [Mpc]; the inverse of `conformal_time` [unitless]."""
        return self._expansion.scale_factor(conformal_time)

    def age(self, scale_factor):
        """Cosmic time since the beginning [Myr]."""
        return self._expansion.age(scale_factor)

    def comoving_distance(self, redshift):
        """Radial comoving distance from today to a redshift [Mpc]."""
        return self._expansion.comoving_distance(redshift)

    # --- electrons and photons ---------------------------------------------------------------------
    def electron_fraction(self, scale_factor):
        """Free electrons per hydrogen nucleus [unitless]."""
        return self._ionization.electron_fraction(scale_factor)

    def scattering_rate(self, scale_factor):
        """Conformal Thomson rate a n_e sigma_T [1/Mpc]."""
        return self._baryons.scattering_rate(scale_factor, self.electron_fraction(scale_factor))

    def momentum_ratio(self, scale_factor):
        """R = 3 rho_b/(4 rho_gamma) [unitless]."""
        return 0.75 * self.gravity("baryon", scale_factor) / self.gravity("photon", scale_factor)

    def drag_rate(self, scale_factor):
        """Conformal rate at which photons drag the baryons along, a n_e sigma_T/R [1/Mpc]."""
        return self.scattering_rate(scale_factor) / self.momentum_ratio(scale_factor)

    # --- gas ---------------------------------------------------------------------------------------
    def photon_temperature(self, scale_factor):
        """Temperature of the background photons [K]."""
        return self._baryons.photon_temperature / np.asarray(scale_factor, dtype=float)

    def gas_temperature(self, scale_factor):
        """Temperature of the baryonic gas [K]."""
        lag = self._ionization.temperature_lag(scale_factor)
        return self.photon_temperature(scale_factor) * np.exp(-lag)

    def compton_rate(self, scale_factor):
        """Conformal rate at which the gas temperature approaches the photons' [1/Mpc]."""
        return self._baryons.compton_rate(scale_factor, self.electron_fraction(scale_factor))

    def gas_temperature_slope(self, scale_factor):
        """Temperature slope of the gas, d ln T/d ln a [unitless]."""
        lag = self._ionization.temperature_lag(scale_factor)
        heating = self.compton_rate(scale_factor) / self.conformal_hubble_rate(scale_factor)
        return heating * np.expm1(lag) - 2.0 + self._ionization.heating(scale_factor)

    def gas_stiffness(self, scale_factor):
        """Contrast of the gas temperature over that of the density, as for slow waves in the gas [unitless].

        -(1/3) d ln T/d ln a where Compton scattering and expansion make the temperature. Where a table or
        reionization does, that would say that gas cools when squeezed while it is being heated; there it is
        (2/3)/(3 + d ln T/d ln a + Compton over expansion rate), the answer of gas that is given its heat alike
        everywhere to a contrast that grows as a, and 2/3 at most.
        """
        slope = self.gas_temperature_slope(scale_factor)
        if not self.heated_from:
            return -slope / 3.0
        compton = self.compton_rate(scale_factor) / self.conformal_hubble_rate(scale_factor)
        given = 2.0 / 3.0 / np.maximum(3.0 + slope + compton, 1.0)
        return np.where(np.asarray(scale_factor) >= self.heated_from, given, -slope / 3.0)

    @property
    def heated_from(self):
        """Scale factor from which on a table or reionization shapes the gas; None: never [unitless]."""
        return getattr(self._ionization, "start", None)

    @cached_property
    def unheated(self):
        """The same universe without table and reionization: itself if it has neither."""
        if self.heated_from is None:
            return self
        background = Background(self._expansion, self._baryons, self._computed, self._computed)
        return Universe(replace(self.cosmology, thermal=None, reionization=None), background)

    def isothermal_sound_speed(self, scale_factor):
        """Sound speed of the gas at fixed temperature, (k T/(mu m_H))^(1/2) [c]."""
        electrons = self.electron_fraction(scale_factor)
        return np.sqrt(
            self._baryons.isothermal_sound_speed_squared(self.gas_temperature(scale_factor), electrons)
        )

    def gas_sound_speed(self, scale_factor):
        """Sound speed of the gas, c_s^2 = (k T/(mu m_H)) (1 + stiffness), see `gas_stiffness` [c]."""
        return self.isothermal_sound_speed(scale_factor) * np.sqrt(1.0 + self.gas_stiffness(scale_factor))

    # --- dark matter -------------------------------------------------------------------------------
    @property
    def has_dark_pressure(self):
        """Whether there is dark matter, and it is not cold."""
        return self.dark_sound.today > 0.0

    def dark_sound_speed(self, scale_factor, columns=None):
        """Sound speed of the dark matter, 0 if it is cold [c].

        `columns` is there for a `UniverseStack`, as in `conditions`.
        """
        return self.dark_sound.speed(np.asarray(scale_factor, dtype=float))

    def dark_sound_horizon(self, scale_factor):
        """Comoving way of sound in the dark matter since the beginning [Mpc]."""
        return self._dark_sound_way(log_scale_factor(scale_factor))

    # --- plasma ------------------------------------------------------------------------------------
    def plasma_sound_speed(self, scale_factor):
        """Sound speed of photons and baryons tied together, 1/sqrt(3 (1 + R)) [c]."""
        return gas.plasma_sound_speed(self.momentum_ratio(scale_factor))

    def sound_horizon(self, scale_factor):
        """Comoving way of sound in the plasma since the beginning [Mpc]."""
        return self._sound_way(log_scale_factor(scale_factor))

    def diffusion_wavenumber(self, scale_factor):
        """k_D of photon diffusion, waves being damped by exp[-(k/k_D)^2] [1/Mpc].

        1/k_D^2 is the integral over conformal time of [R^2 + (16/15)(1 + R)]/[6 a n_e sigma_T (1 + R)^2];
        Kaiser 1983, Hu & White 1997, from memory.
        """
        return self._diffusion_area(log_scale_factor(scale_factor)) ** -0.5

    @cached_property
    def _sound_way(self):
        return self._expansion.running_integral(
            lambda a: self.plasma_sound_speed(a) / self.conformal_hubble_rate(a), power=1
        )

    @cached_property
    def _dark_sound_way(self):
        return self._expansion.running_integral(
            lambda a: self.dark_sound_speed(a) / self.conformal_hubble_rate(a), power=1
        )

    @cached_property
    def _diffusion_area(self):
        def integrand(a):
            ratio = self.momentum_ratio(a)
            weight = (ratio**2 + _POLARIZED_SCATTERING * (1.0 + ratio)) / (6.0 * (1.0 + ratio) ** 2)
            return weight / self.scattering_rate(a) / self.conformal_hubble_rate(a)

        return self._expansion.running_integral(integrand, power=3)

    @cached_property
    def equality(self):
        """Scale factor at which baryons and dark matter equal photons and neutrinos, all as if massless [unitless].

        Raises
        ------
        UniverseError
            If there is none.
        """
        radiation = self.gravity("photon", 1.0) + self.gravity("neutrino", 1.0) + sum(self.contents.massive)
        matter = self.gravity("baryon", 1.0) + self.gravity("dark", 1.0)
        if radiation >= matter:
            raise UniverseError("this universe has no equality: its radiation outweighs its matter to this day")
        return radiation / matter

    # --- taken together ----------------------------------------------------------------------------
    @cached_property
    def landmarks(self):
        """Landmark epochs and scales, those of the gas left unheated; UniverseError names one that is not there."""
        if self.heated_from is None:
            return find_landmarks(self)
        depth = reionization_depth(self, self.unheated)
        return replace(self.unheated.landmarks, reionization_optical_depth=depth)

    def conditions(self, conformal_time, columns=None):
        """Conditions at conformal times [Mpc] from the scale factor 1e-14 to today, by table look-up.

        `columns` is there for a `UniverseStack`, which one universe stands in for: all columns are in it.

        Raises
        ------
        ValueError
            If a time lies outside.
        """
        return self.conditions_table(conformal_time)

    @cached_property
    def conditions_table(self):
        """The table behind `conditions`."""
        return ConditionsTable(self._expansion, self._ionization, self._baryons)

    def heating_rate(self, conformal_time, columns=None):
        """Rate at which the gas is given heat beside Compton's, over its thermal energy [1/Mpc]; `conditions` has more.

        Where the history of the gas asks for cooling this is zero.
        """
        return self._heating(conformal_time)[0]

    def response(self, conformal_time, columns=None):
        """Response of the electrons at conformal times [Mpc], a `Response`; times and columns as in `conditions`."""
        return Response(*self._response(conformal_time))

    @cached_property
    def _heating(self):
        return FurtherFields([self.conditions_table], [self.heating_values])

    @cached_property
    def _response(self):
        return FurtherFields([self.conditions_table], [self.response_values])

    @cached_property
    def heating_values(self):
        """What `heating_rate` looks up, shape (field, node)."""
        return heating_values(self.conditions_table.scale_factor, self._expansion, self._ionization)

    @cached_property
    def response_values(self):
        """What `response` looks up, shape (field, node)."""
        return response_values(
            self.conditions_table.scale_factor, self._expansion, self._baryons, self._computed, self._ionization
        )
