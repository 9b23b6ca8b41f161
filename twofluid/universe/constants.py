"""Physical constants in SI and the conversions to the internal units (Mpc, c = 1)."""

from math import pi

# Written out rather than imported: loading scipy.constants takes longer than solving a whole universe.

# --- fundamental constants -------------------------------------------------------------------------
SPEED_OF_LIGHT = 299792458.0  # [m/s]; exact
BOLTZMANN = 1.380649e-23  # [J/K]; exact
PLANCK = 6.62607015e-34  # [J s]; exact
ELECTRON_VOLT = 1.602176634e-19  # [J]; exact
GRAVITATION = 6.67430e-11  # [m^3/(kg s^2)]; CODATA 2022
ELECTRON_MASS = 9.1093837139e-31  # [kg]; CODATA 2022
ATOMIC_MASS = 1.66053906892e-27  # [kg]; CODATA 2022
THOMSON_CROSS_SECTION = 6.6524587051e-29  # [m^2]; CODATA 2022
RADIATION_CONSTANT = 8.0 * pi**5 * BOLTZMANN**4 / (15.0 * (PLANCK * SPEED_OF_LIGHT) ** 3)  # a_R [J/(m^3 K^4)]

# --- lengths and times -----------------------------------------------------------------------------
MEGAPARSEC = 648000.0 / pi * 149597870700.0 * 1.0e6  # [m]; IAU 2012 and 2015, exact
SOLAR_MASS_LENGTH = 1.3271244e20 / SPEED_OF_LIGHT**2 / MEGAPARSEC  # G M_sun/c^2 [Mpc]; IAU 2015 B3, nominal
MEGAYEAR = 365.25 * 86400.0 * 1.0e6  # Julian [s]; exact
MEGAYEAR_PER_MEGAPARSEC = MEGAPARSEC / SPEED_OF_LIGHT / MEGAYEAR  # light travel time [Myr/Mpc]
HUBBLE_UNIT = 100.0e3 / SPEED_OF_LIGHT  # 100 km/(s Mpc) over c [1/Mpc]
CRITICAL_DENSITY_UNIT = 3.0 * (100.0e3 / MEGAPARSEC) ** 2 / (8.0 * pi * GRAVITATION)  # for h = 1 [kg/m^3]

# --- atoms -----------------------------------------------------------------------------------------
HYDROGEN_MASS = 1.00782503223 * ATOMIC_MASS  # 1H atom [kg]; standard atomic mass table, from memory
HELIUM_MASS = 4.00260325413 * ATOMIC_MASS  # 4He atom [kg]; standard atomic mass table, from memory
HYDROGEN_IONIZATION = 13.598434599702 * ELECTRON_VOLT  # H I [J]; NIST atomic spectra database
HELIUM_IONIZATION = 24.587389011 * ELECTRON_VOLT  # He I [J]; NIST atomic spectra database
HELIUM_ION_IONIZATION = 54.4177655282 * ELECTRON_VOLT  # He II [J]; NIST atomic spectra database
LYMAN_ALPHA_WAVELENGTH = 121.567e-9  # mean of the H I doublet [m]; NIST
LYMAN_ALPHA_ENERGY = PLANCK * SPEED_OF_LIGHT / LYMAN_ALPHA_WAVELENGTH  # E_21 [J]
TWO_PHOTON_RATE = 8.2245809  # H I 2s-1s [1/s]; Goldman 1989, PRA 40, 1185, from memory

# --- neutrinos -------------------------------------------------------------------------------------
NEUTRINO_SPECIES = 3  # that share the effective number, with mass or without
NEUTRINO_PHOTON_TEMPERATURE = (4.0 / 11.0) ** (1.0 / 3.0)  # instant decoupling
NEUTRINO_PHOTON_RATIO = 7.0 / 8.0 * NEUTRINO_PHOTON_TEMPERATURE**4  # of one species, instant decoupling
