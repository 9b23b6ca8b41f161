"""Expansion of the smooth universe: species, conformal rate, conformal time, age, distance."""

import numpy as np

from .constants import (
    CRITICAL_DENSITY_UNIT,
    HUBBLE_UNIT,
    MEGAYEAR_PER_MEGAPARSEC,
    NEUTRINO_PHOTON_RATIO,
    RADIATION_CONSTANT,
    SPEED_OF_LIGHT,
)
from .contents import SPECIES, Contents
from .errors import UniverseError
from .interpolation import HermiteCubic
from .quadrature import RunningIntegral

EARLIEST_SCALE_FACTOR = 1.0e-16  # start of the running integrals; below it radiation is all there is
PANEL_WIDTH = 0.05  # of the running integrals, in ln a: enough for the most sluggish expansion let through
CLOSURE_TOLERANCE = 1.0e-6  # fractions given in full must sum to one this closely
LEAST_NET_DENSITY = 1.0e-3  # H^2 over the sum of its terms' sizes; below it the expansion all but stops
HOTTEST_PHOTONS = 1.0e3  # temperature today up to which recombination is over by now [K]
ROUNDING = 1.0e-12  # relative slack at the ends of a range, which may arrive rounded
_CHECK_NODES = 4001  # in ln a, where the expansion is seen to go on: a dip between two is shallower than 1e-4
_INVERSION_STEPS = 3  # Newton steps allowed for a(conformal time): one suffices unless the expansion all but stops
_INVERTED = 1.0e-6  # last Newton change of ln a; the one it spares would be about its square


class Expansion:
    """The expansion history a cosmology implies.

    Parameters
    ----------
    cosmology : Cosmology
        Densities and rate today.

    Raises
    ------
    UniverseError
        If an ingredient is impossible, a neutrino has mass, the fractions given do not sum to one, or the
        expansion stops somewhere between the beginning and today.

    Notes
    -----
    Every species enters through `contents`; the conformal rate follows from their sum.
    """

    def __init__(self, cosmology):
        self.contents = _contents(cosmology)
        self._check_expanding()
        self._time = self.running_integral(lambda a: 1.0 / self.conformal_hubble_rate(a), power=1)
        self._age = self.running_integral(lambda a: a / self.conformal_hubble_rate(a), power=2)
        log_a, time = self._time.edges, self._time.sums
        self._guess = HermiteCubic(np.log(time), log_a, time * self.conformal_hubble_rate(np.exp(log_a)))

    def _check_expanding(self):
        a = np.geomspace(EARLIEST_SCALE_FACTOR, 1.0, _CHECK_NODES)
        terms = [self.gravity(species, a) for species in SPECIES]
        net = sum(terms) / sum(np.abs(term) for term in terms)
        if net.min() < LEAST_NET_DENSITY:
            redshift = 1.0 / a[np.argmin(net)] - 1.0
            raise UniverseError(
                "this universe does not expand from a hot beginning all the way to today: H^2 is negative or "
                f"all but zero near redshift {redshift:.4g}, with a curvature fraction of "
                f"{self.density_fraction('curvature', 1.0):.6g} and a cosmological constant fraction of "
                f"{self.density_fraction('constant', 1.0):.6g}"
            )

    def gravity(self, species, scale_factor):
        """8 pi G a^2 rho of one species.

        Parameters
        ----------
        species : str
            "photon", "neutrino", "baryon", "dark", "curvature" or "constant" (cosmological constant).
        scale_factor : float or array, any shape
            Scale factor, 1 today [unitless].

        Returns
        -------
        float or array, same shape
            [1/Mpc^2]
        """
        return self.contents.gravity(species, scale_factor)

    def density_fraction(self, species, scale_factor):
        """Share of a species in the critical density of its time, shape as `scale_factor` [unitless]."""
        critical = 3.0 * self.conformal_hubble_rate(scale_factor) ** 2
        return self.gravity(species, scale_factor) / critical

    def conformal_hubble_rate(self, scale_factor):
        """Conformal rate a'/a = a H, shape as `scale_factor` [1/Mpc]."""
        return self.contents.conformal_hubble_rate(scale_factor)

    def running_integral(self, integrand, power):
        """Build a running integral over conformal time, kept as a function of ln a.

        Parameters
        ----------
        integrand : callable
            Integrand times d(conformal time)/d ln a, a function of the scale factor that grows as a
            power of it at first.
        power : int
            That power; it supplies the part before the range in closed form.
        """
        start = np.log(EARLIEST_SCALE_FACTOR)
        return RunningIntegral(
            lambda log_a: integrand(np.exp(log_a)),
            start,
            0.0,
            panels=int(np.ceil(-start / PANEL_WIDTH)),
            initial=integrand(EARLIEST_SCALE_FACTOR) / power,
        )

    def conformal_time(self, scale_factor):
        """Conformal time since the beginning, shape as `scale_factor` [Mpc]."""
        return self._time(log_scale_factor(scale_factor))

    def age(self, scale_factor):
        """Cosmic time since the beginning, shape as `scale_factor` [Myr]."""
        return self._age(log_scale_factor(scale_factor)) * MEGAYEAR_PER_MEGAPARSEC

    def comoving_distance(self, redshift):
        """Radial comoving distance from today, shape as `redshift` [Mpc]."""
        return self._time.total - self.conformal_time(1.0 / (1.0 + np.asarray(redshift, dtype=float)))

    def scale_factor(self, conformal_time):
        """Scale factor at a conformal time [Mpc], shape as `conformal_time` [unitless].

        Raises
        ------
        ValueError
            If a time is not positive, or lies before the scale factor 1e-16 or in the future.
        """
        time = np.asarray(conformal_time, dtype=float)
        earliest, latest = self._time.sums[0], self._time.total
        if not np.all((time >= earliest * (1.0 - ROUNDING)) & (time <= latest * (1.0 + ROUNDING))):
            raise ValueError(f"conformal times must lie between {earliest:.4g} and {latest:.8g} Mpc")
        log_a = np.minimum(self._guess(np.log(time)), 0.0)
        for _ in range(_INVERSION_STEPS):
            now = self._time(log_a)
            change = np.log(time / now) * self.conformal_hubble_rate(np.exp(log_a)) * now
            log_a = np.minimum(log_a + change, 0.0)
            if np.max(np.abs(change), initial=0.0) < _INVERTED:
                break
        return np.exp(log_a)


def log_scale_factor(scale_factor):
    """Natural logarithm of scale factors after checking their range.

    Raises
    ------
    ValueError
        If one is outside [1e-16, 1].
    """
    a = np.asarray(scale_factor, dtype=float)
    if not np.all((a >= EARLIEST_SCALE_FACTOR * (1.0 - ROUNDING)) & (a <= 1.0 + ROUNDING)):
        raise ValueError(f"scale factors must lie between {EARLIEST_SCALE_FACTOR:g} and 1")
    return np.log(a)


def photon_density(temperature):
    """Omega h^2 of black-body photons of a temperature [K] today [unitless]."""
    return RADIATION_CONSTANT * temperature**4 / SPEED_OF_LIGHT**2 / CRITICAL_DENSITY_UNIT


def _check_ingredients(cosmology):
    """Refuse what no universe can hold; the limits of a scenario file are narrower."""
    positive = ("hubble_constant", "baryon_density", "photon_temperature")
    for name in (*positive, "dark_matter_density", "helium_mass_fraction"):
        value = getattr(cosmology, name)
        if not (np.isfinite(value) and value >= 0.0) or (name in positive and value == 0.0):
            rule = "positive" if name in positive else "zero or positive"
            raise UniverseError(f"{name} = {value} must be finite and {rule}")
    if cosmology.photon_temperature > HOTTEST_PHOTONS:
        raise UniverseError(
            f"photon_temperature = {cosmology.photon_temperature} K must be at most {HOTTEST_PHOTONS:g} K: "
            "above it nothing has recombined by today"
        )
    if cosmology.helium_mass_fraction >= 1.0:
        raise UniverseError(
            f"helium_mass_fraction = {cosmology.helium_mass_fraction} must be less than 1: without hydrogen "
            "nothing recombines here"
        )
    effective_number = cosmology.neutrinos.effective_number
    if not (np.isfinite(effective_number) and effective_number >= 0.0):
        raise UniverseError(
            f"neutrinos.effective_number = {effective_number} must be finite and zero or positive"
        )
    if any(cosmology.neutrinos.masses):
        raise UniverseError(
            f"neutrino masses {tuple(cosmology.neutrinos.masses)} eV were given, but every neutrino is "
            "treated as massless: leave the masses empty"
        )


def _contents(cosmology):
    """Every species today, with what the densities leave open filled in."""
    _check_ingredients(cosmology)
    photon = photon_density(cosmology.photon_temperature)
    density = {
        "photon": photon,
        "neutrino": photon * NEUTRINO_PHOTON_RATIO * cosmology.neutrinos.effective_number,
        "baryon": cosmology.baryon_density,
        "dark": cosmology.dark_matter_density,
    }
    h_squared = (cosmology.hubble_constant / 100.0) ** 2
    fraction = {species: value / h_squared for species, value in density.items()}
    fraction["curvature"], fraction["constant"] = _fill(cosmology, sum(fraction.values()))
    return Contents(**{species: 3.0 * value * h_squared * HUBBLE_UNIT**2 for species, value in fraction.items()})


def _fill(cosmology, others):
    """Fractions of curvature and cosmological constant, the open one (or the constant) closing the sum."""
    curvature, constant = cosmology.curvature_fraction, cosmology.cosmological_constant_fraction
    if constant is None:
        curvature = 0.0 if curvature is None else curvature
        return curvature, 1.0 - others - curvature
    if curvature is None:
        return 1.0 - others - constant, constant
    total = others + curvature + constant
    if abs(total - 1.0) > CLOSURE_TOLERANCE:
        raise UniverseError(
            f"the fractions sum to {total:.8g}, not 1: matter and radiation {others:.8g}, curvature_fraction "
            f"{curvature:.8g}, cosmological_constant_fraction {constant:.8g}; leave one of the last two out"
        )
    return curvature, constant
