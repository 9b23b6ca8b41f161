"""The late history of the gas where a table or reionization shapes it.

Below a redshift the table's temperature and electron fraction take the place of the computed ones: piecewise
cubics through its rows in ln(1 + z), monotonic wherever the rows are (Fritsch & Carlson 1980), of ln T and ln x_e;
one history passes into the other by a weight with two continuous derivatives. Reionization ionizes a share
(1 + tanh((z_re - z)/w))/2 of the hydrogen, and the first electron of as much of the helium, and the mean
temperature is that of the two parts together. Without a temperature of its own the ionized gas is heated by
nothing but Compton scattering.
"""

import numpy as np

from ..scenario.thermal import thermal_fault
from .collocation import solve_stiff
from .errors import UniverseError
from .expansion import log_scale_factor
from .interpolation import UniformCubic, slopes_per_step

STEP = 2.0e-3  # of the table in ln a: a tenth of the sharpest step of reionization
ONSET = 15.0  # widths above its redshift where reionization begins: a share of 1e-13


class HeatedGas:
    """Electron fraction and gas temperature, computed at first and then as a cosmology asks for.

    Has the methods of `Ionization`.

    Parameters
    ----------
    expansion : Expansion
    baryons : Baryons
    computed : Ionization
        The history without.
    cosmology : Cosmology
        Holds the table, the step, or both.

    Attributes
    ----------
    start : float
        Scale factor up to which the computed history holds [unitless].

    Raises
    ------
    UniverseError
        If the table or the step breaks a rule.
    """

    def __init__(self, expansion, baryons, computed, cosmology):
        fault = thermal_fault(cosmology)
        if fault is not None:
            raise UniverseError(fault.sentence())
        self._expansion, self._baryons, self._computed = expansion, baryons, computed
        table, step = cosmology.thermal, cosmology.reionization
        above = [table.below_redshift] if table else []
        above += [step.redshift + ONSET * step.width] if step else []
        self.start = 1.0 / (1.0 + max(above))
        begin = np.log(self.start)
        log_a = np.linspace(begin, 0.0, int(np.ceil(-begin / STEP)) + 1)
        electrons, lag = computed.state(np.exp(log_a))
        if table:
            electrons, lag = self._joined(table, log_a, electrons, lag)
        if step:
            electrons, lag = self._ionized(step, log_a, electrons, lag, bool(table))
        spacing = -begin / (len(log_a) - 1)
        slope = slopes_per_step(lag[None])[0] / spacing
        heating = 1.0 - slope - self._compton(log_a, electrons) * np.expm1(lag)
        self._table = UniformCubic(begin, spacing, np.stack([np.log(electrons), lag, heating]))

    def _joined(self, table, log_a, electrons, lag):
        """Pass from the computed history into the table's."""
        from scipy.interpolate import PchipInterpolator  # slow to import, and most universes have no table

        x = np.minimum(-log_a, np.log1p(table.redshift[-1]))  # ln(1 + z); the first node may lie above by rounding
        nodes = np.log1p(table.redshift)
        weight = _weight((np.log1p(table.below_redshift) - x) / table.joining_width)
        columns = table.electron_fraction, table.gas_temperature
        own = [PchipInterpolator(nodes, np.log(column))(x) for column in columns]
        own_lag = np.log(self._baryons.photon_temperature) + x - own[1]
        mixed = np.exp((1.0 - weight) * np.log(electrons) + weight * own[0])
        return mixed, (1.0 - weight) * lag + weight * own_lag

    def _ionized(self, step, log_a, electrons, lag, has_table):
        """Ionize what stands before."""
        share = 0.5 * (1.0 + np.tanh((step.redshift - np.expm1(-log_a)) / step.width))
        ionized = np.maximum(electrons, 1.0 + self._baryons.helium_per_hydrogen)
        electrons = electrons + (ionized - electrons) * share
        if step.gas_temperature is not None:
            photon = self._baryons.photon_temperature * np.exp(-log_a)
            temperature = photon * np.exp(-lag)
            return electrons, np.log(photon / (temperature + (step.gas_temperature - temperature) * share))
        return electrons, lag if has_table else self._compton_heated(log_a, electrons, lag[0])

    def _compton_heated(self, log_a, electrons, lag):
        """ln(T_gamma/T) under Compton heating and expansion with these electrons."""
        rows = UniformCubic(log_a[0], log_a[1] - log_a[0], np.log(electrons)[None])

        def slopes(point, state):
            return 1.0 - self._compton(point, np.exp(rows.fields(point)[0])) * np.expm1(state)

        return solve_stiff(slopes, log_a, np.array([lag]))[0]

    def _compton(self, log_a, electrons):
        """Compton over expansion rate."""
        a = np.exp(log_a)
        return self._baryons.compton_rate(a, electrons) / self._expansion.conformal_hubble_rate(a)

    def electron_fraction(self, scale_factor):
        """Free electrons per hydrogen nucleus, shape as `scale_factor` [unitless]."""
        return self.state(scale_factor)[0]

    def temperature_lag(self, scale_factor):
        """ln(T_gamma/T), photon over gas temperature, shape as `scale_factor` [unitless]."""
        return self.state(scale_factor)[1]

    def state(self, scale_factor):
        """Electron fraction and ln(T_gamma/T), each shaped as `scale_factor`."""
        electrons, lag = self._computed.state(scale_factor)
        log_a = log_scale_factor(scale_factor)
        late = log_a >= self._table.start
        log_electrons, own_lag, _ = self._table.fields(np.maximum(log_a, self._table.start))
        return np.where(late, np.exp(log_electrons), electrons), np.where(late, own_lag, lag)

    def heating(self, scale_factor):
        """Rate at which the gas is heated beside Compton scattering, over its thermal energy and the expansion rate.

        d ln T/d ln a is this plus what Compton heating and expansion give; shape as `scale_factor` [unitless].
        """
        log_a = log_scale_factor(scale_factor)
        heating = self._table.fields(np.maximum(log_a, self._table.start))[2]
        return np.where(log_a >= self._table.start, heating, 0.0)


def _weight(place):
    """Rise from 0 at 0 to 1 at 1 with two continuous derivatives."""
    s = np.clip(place, 0.0, 1.0)
    return s * s * s * (10.0 + s * (6.0 * s - 15.0))
