"""Quick look-up of the smooth universe at many conformal times."""

from dataclasses import dataclass

import numpy as np

from .expansion import ROUNDING
from .interpolation import UniformCubic

EARLIEST_TABLE_SCALE_FACTOR = 1.0e-14  # start of the table
TABLE_INTERVALS = 8192  # 0.0035 in ln a: the helium steps to 1e-6, see the tests
_BLOCK = 8192  # times handled together, so that the intermediate arrays stay in the cache


@dataclass(frozen=True)
class Conditions:
    """What the perturbation equations need of the smooth universe, each field shaped as the times asked.

    Parameters
    ----------
    scale_factor : array
        Scale factor, 1 today [unitless].
    hubble_rate : array
        Conformal rate a'/a [1/Mpc].
    gravity_photon, gravity_neutrino, gravity_baryon, gravity_dark : array
        8 pi G a^2 rho of each species [1/Mpc^2].
    scattering_rate : array
        Conformal Thomson rate a n_e sigma_T [1/Mpc].
    photon_baryon_ratio : array
        4 rho_gamma/(3 rho_b) [unitless].
    isothermal_sound_speed_squared : array
        k T/(mu m_H c^2) [unitless].
    compton_rate : array
        Conformal rate at which the gas temperature approaches the photons' [1/Mpc].
    photon_gas_temperature_ratio : array
        T_gamma/T [unitless].
    """

    scale_factor: np.ndarray
    hubble_rate: np.ndarray
    gravity_photon: np.ndarray
    gravity_neutrino: np.ndarray
    gravity_baryon: np.ndarray
    gravity_dark: np.ndarray
    scattering_rate: np.ndarray
    photon_baryon_ratio: np.ndarray
    isothermal_sound_speed_squared: np.ndarray
    compton_rate: np.ndarray
    photon_gas_temperature_ratio: np.ndarray


FIELDS = tuple(Conditions.__dataclass_fields__)


class ConditionsTable:
    """Table of ln a, ln x_e and ln(T_gamma/T) against ln(conformal time); all else follows from them.

    Parameters
    ----------
    expansion : Expansion
    ionization : Ionization
    baryons : Baryons
    """

    def __init__(self, expansion, ionization, baryons):
        self._expansion, self._baryons = expansion, baryons
        self.earliest = float(expansion.conformal_time(EARLIEST_TABLE_SCALE_FACTOR))
        self.latest = float(expansion.conformal_time(1.0))
        log_time = np.linspace(np.log(self.earliest), np.log(self.latest), TABLE_INTERVALS + 1)
        a = expansion.scale_factor(np.minimum(np.exp(log_time), self.latest))
        electrons, lag = ionization.state(a)
        step = (log_time[-1] - log_time[0]) / TABLE_INTERVALS
        self._table = UniformCubic(log_time[0], step, np.stack([np.log(a), np.log(electrons), lag]))

    def __call__(self, conformal_time):
        """Conditions at `conformal_time`, an array of any shape.

        Raises
        ------
        ValueError
            If a time lies outside the table.
        """
        time = np.asarray(conformal_time, dtype=float)
        if not np.all((time >= self.earliest * (1.0 - ROUNDING)) & (time <= self.latest * (1.0 + ROUNDING))):
            raise ValueError(
                f"conformal times must lie between {self.earliest:.4g} Mpc (scale factor "
                f"{EARLIEST_TABLE_SCALE_FACTOR:g}) and {self.latest:.8g} Mpc (today)"
            )
        flat = time.reshape(-1)
        out = np.empty((len(FIELDS), flat.size))
        for begin in range(0, flat.size, _BLOCK):
            self._fill(flat[begin : begin + _BLOCK], out[:, begin : begin + _BLOCK])
        return Conditions(**dict(zip(FIELDS, out.reshape((len(FIELDS), *time.shape)), strict=True)))

    def _fill(self, time, out):
        looked_up = self._table(np.log(time))
        a, electrons, ratio = np.exp(looked_up).T
        expansion, baryons = self._expansion, self._baryons
        present = {species: expansion.gravity(species, 1.0) for species in ("photon", "baryon")}
        gravity = [expansion.gravity(species, a) for species in ("photon", "neutrino", "baryon", "dark")]
        out[0] = a
        out[1] = expansion.conformal_hubble_rate(a)
        out[2:6] = gravity
        out[6] = baryons.scattering_rate(a, electrons)
        out[7] = 4.0 / 3.0 * present["photon"] / present["baryon"] / a
        out[8] = baryons.isothermal_sound_speed_squared(baryons.photon_temperature / (a * ratio), electrons)
        out[9] = baryons.compton_rate(a, electrons)
        out[10] = ratio
