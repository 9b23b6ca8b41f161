"""State of the baryonic gas: particle densities, mean weight, sound speeds, exchange with the photons.

The functions of `Baryons` take what they depend on, so that the ionization solution and the tables share
them; nothing here solves anything.
"""

from dataclasses import dataclass, field

from .constants import (
    BOLTZMANN,
    CRITICAL_DENSITY_UNIT,
    ELECTRON_MASS,
    HELIUM_MASS,
    HYDROGEN_MASS,
    MEGAPARSEC,
    RADIATION_CONSTANT,
    SPEED_OF_LIGHT,
    THOMSON_CROSS_SECTION,
)


@dataclass(frozen=True)
class Baryons:
    """Composition of the gas and the photons it meets, today.

    Numbers, or arrays for several universes side by side, which broadcast against what the functions take.

    Parameters
    ----------
    density : float
        Omega h^2 of the baryons [unitless].
    helium_mass_fraction : float
        Share of the baryonic mass in helium-4; the rest is hydrogen [unitless].
    photon_temperature : float
        Of the background today [K].

    Attributes
    ----------
    hydrogen_density : float
        Hydrogen nuclei today [1/m^3].
    helium_per_hydrogen : float
        Helium nuclei per hydrogen nucleus [unitless].
    full_ionization : float
        Electrons per hydrogen nucleus when no electron is bound [unitless].
    """

    density: float
    helium_mass_fraction: float
    photon_temperature: float

    hydrogen_density: float = field(init=False)
    helium_per_hydrogen: float = field(init=False)
    full_ionization: float = field(init=False)
    _present_scattering_rate: float = field(init=False)  # with one electron per hydrogen nucleus [1/Mpc]
    _present_compton_rate: float = field(init=False)  # with electrons alone [1/Mpc]
    _unit_pressure: float = field(init=False)  # c_T^2 of one particle per hydrogen nucleus at 1 K [unitless]

    def __post_init__(self):
        hydrogen = 1.0 - self.helium_mass_fraction
        hydrogen_density = hydrogen * self.density * CRITICAL_DENSITY_UNIT / HYDROGEN_MASS
        helium = self.helium_mass_fraction / hydrogen * HYDROGEN_MASS / HELIUM_MASS
        energy = RADIATION_CONSTANT * self.photon_temperature**4 / (ELECTRON_MASS * SPEED_OF_LIGHT**2)
        vars(self).update(  # the one way into a frozen dataclass
            hydrogen_density=hydrogen_density,
            helium_per_hydrogen=helium,
            full_ionization=1.0 + 2.0 * helium,
            _present_scattering_rate=hydrogen_density * THOMSON_CROSS_SECTION * MEGAPARSEC,
            _present_compton_rate=8.0 / 3.0 * THOMSON_CROSS_SECTION * energy * MEGAPARSEC,
            _unit_pressure=hydrogen * BOLTZMANN / (HYDROGEN_MASS * SPEED_OF_LIGHT**2),
        )

    def scattering_rate(self, scale_factor, electron_fraction):
        """Conformal Thomson rate a n_e sigma_T [1/Mpc]."""
        return self._present_scattering_rate * electron_fraction / (scale_factor * scale_factor)

    def compton_rate(self, scale_factor, electron_fraction):
        """Conformal rate a Gamma at which the gas temperature approaches the photons' [1/Mpc].

        Gamma = 8 sigma_T a_R T_gamma^4 x_e / [3 m_e c (1 + f_He + x_e)]; Weymann 1965, as in Seager,
        Sasselov & Scott 2000, their equation for the matter temperature.
        """
        share = electron_fraction / ((1.0 + self.helium_per_hydrogen) + electron_fraction)
        return self._present_compton_rate * share / (scale_factor * scale_factor * scale_factor)

    def isothermal_sound_speed_squared(self, temperature, electron_fraction):
        """Isothermal c_T^2 = k T/(mu m_H c^2) [unitless]; 1/mu = (1 - Y)(1 + f_He + x_e)."""
        return self._unit_pressure * temperature * ((1.0 + self.helium_per_hydrogen) + electron_fraction)


def plasma_sound_speed(momentum_ratio):
    """Sound speed of photons and baryons tied together, 1/sqrt(3 (1 + R)) [c]; R = 3 rho_b/(4 rho_gamma)."""
    return (3.0 * (1.0 + momentum_ratio)) ** -0.5
