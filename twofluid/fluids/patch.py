"""A patch of the universe in which the gas streams through the dark matter.

On scales far below those that make the streaming (see `twofluid.streaming.velocity`) it is a uniform wind. The
equations are those of the kinetic closure on scales far inside the horizon, after photon diffusion has
smoothed the photons: baryons and dark matter pull, radiation takes part in the expansion only. In the frame
of the dark matter, with the wind ``w`` along the wavevector (by conformal time, in units of c: no further
factor of the scale factor), ``D = d/dtau + i k w``, ``g = 8 pi G a^2 rho``::

    delta_c' = -theta_c                     theta_c' = -H theta_c - (g_c delta_c + g_b delta_b)/2 + k^2 c_c^2 delta_c
    D delta_b = -theta_b                    D theta_b = -H theta_b - (g_c delta_c + g_b delta_b)/2
                                                        + k^2 c_T^2 (delta_b + delta_T) - r kappa' theta_b
    D delta_T = -(2/3) theta_b - a Gamma (T_gamma/T) delta_T

with the sound speed ``c_c`` of the dark matter, 0 if it is cold. Velocities here are relative to the mean motion of
their fluid; the photons' is the baryons' on these scales, so that Thomson drag acts on theta_b whole. Only ``w``
enters, the product of speed and direction cosine: whatever is averaged over directions or patches is an average
over ``w``.

Amplitudes are complex. Every unknown is a pair of rows, its real and its imaginary part; velocities are
divided by the expansion rate at the start of the patch, so that the rates stay near one.

References
----------
Tseliakhovich, D. & Hirata, C. 2010, PRD 82, 083520: the two fluids with a wind (from memory; there in the frame of the
baryons, with a wind that decays as 1/a). Naoz, S. & Barkana, R. 2005, MNRAS 362, 1047: gas temperature (from memory).
"""

from collections.abc import Callable

import numpy as np

from ..solver import Clock, StepRates, lay_out
from ..universe import Conditions, Universe

PARTS = ("real", "imaginary")
FIELDS = ("delta_gas_temperature", "delta_dark", "delta_baryon", "velocity_dark", "velocity_baryon")
NODES_PER_UNIT = 100  # nodes of the step density per unit of log conformal time
DRIFT_FOLLOWED = 60.0  # k w over the expansion rate: gas blown past faster neither feels the dark matter nor is felt


class PatchSystem:
    """The rates in patches of one universe; a lane is a wavenumber in a patch.

    Implements `twofluid.solver.LinearSystem`; its time is the conformal time [Mpc].

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (lane,)
        Comoving wavenumbers [1/Mpc].
    component : array, shape (lane,)
        Streaming velocity along the wavevector, in units of the rms velocity [unitless].
    rms_velocity : callable
        Function of the scale factor: rms streaming velocity [c].
    start : float
        Conformal time at which the patches start [Mpc].
    """

    unknowns = tuple(f"{field}_{part}" for field in FIELDS for part in PARTS)
    observed = tuple(f"{field}_{part}" for field in ("delta_dark", "delta_baryon") for part in PARTS)
    tails = ()

    def __init__(
        self,
        universe: Universe,
        wavenumber: np.ndarray,
        component: np.ndarray,
        rms_velocity: Callable[[np.ndarray], np.ndarray],
        start: float,
    ):
        self.universe = universe
        self.wavenumber = np.asarray(wavenumber, dtype=float)
        self.component = np.asarray(component, dtype=float)
        self.rms_velocity = rms_velocity
        self.start = start
        self._rate = float(universe.conditions(np.array(start)).hubble_rate)  # unit of velocities
        self._row = {name: row for row, name in enumerate(self.unknowns)}

    def first_state(self, delta_dark, delta_baryon, delta_gas_temperature, theta_dark, theta_baryon) -> np.ndarray:
        """State of every lane at its start, all of it real.

        Parameters
        ----------
        delta_dark, delta_baryon, delta_gas_temperature : array, shape (lane,)
            Contrasts [unitless].
        theta_dark, theta_baryon : array, shape (lane,)
            Velocity divergences by conformal time, relative to the uniform expansion [1/Mpc].

        Returns
        -------
        array, shape (unknown, lane)
        """
        values = {
            "delta_dark": delta_dark,
            "delta_baryon": delta_baryon,
            "delta_gas_temperature": delta_gas_temperature,
            "velocity_dark": theta_dark / self._rate,
            "velocity_baryon": theta_baryon / self._rate,
        }
        state = np.zeros((len(self.unknowns), len(self.wavenumber)))
        for name, value in values.items():
            state[self._row[f"{name}_real"]] = value
        return state

    def step_rates(self, modes: np.ndarray, time: np.ndarray, step: np.ndarray) -> StepRates:
        """Evaluate step times rate; see `twofluid.solver.LinearSystem`."""
        now = self.universe.conditions(time)
        wavenumber = self.wavenumber[modes]
        drift = wavenumber * self.component[modes] * self.rms_velocity(now.scale_factor)
        blown = drift * step
        rates = {}
        for (row, column), rate in self._rates(now, wavenumber).items():
            shared = rate * step  # the same array for both parts: what follows is computed once
            for part in PARTS:
                rates[self._row[f"{row}_{part}"], self._row[f"{column}_{part}"]] = shared
        for field in ("delta_gas_temperature", "delta_baryon", "velocity_baryon"):
            real, imaginary = (self._row[f"{field}_{part}"] for part in PARTS)
            rates[real, imaginary], rates[imaginary, real] = blown, -blown
        return StepRates(rates)

    def _rates(self, now: Conditions, wavenumber: np.ndarray) -> dict:
        """Write the equations of the module's text, the wind left out, as rates [1/Mpc]."""
        unit = np.full_like(now.hubble_rate, self._rate)
        pressure = wavenumber**2 * now.isothermal_sound_speed_squared / self._rate
        dark_pressure = (wavenumber * self.universe.dark_sound_speed(now.scale_factor)) ** 2 / self._rate
        dark, baryon = now.gravity_dark / (2.0 * self._rate), now.gravity_baryon / (2.0 * self._rate)
        drag = now.photon_baryon_ratio * now.scattering_rate
        return {
            ("delta_dark", "velocity_dark"): -unit,
            ("velocity_dark", "velocity_dark"): -now.hubble_rate,
            ("velocity_dark", "delta_dark"): dark_pressure - dark,
            ("velocity_dark", "delta_baryon"): -baryon,
            ("delta_baryon", "velocity_baryon"): -unit,
            ("velocity_baryon", "velocity_baryon"): -now.hubble_rate - drag,
            ("velocity_baryon", "delta_dark"): -dark,
            ("velocity_baryon", "delta_baryon"): pressure - baryon,
            ("velocity_baryon", "delta_gas_temperature"): pressure,
            ("delta_gas_temperature", "velocity_baryon"): -2.0 / 3.0 * unit,
            ("delta_gas_temperature", "delta_gas_temperature"): -now.compton_rate * now.photon_gas_temperature_ratio,
        }

    def clock(self, marks: np.ndarray, smooth_step: float, phase_step: float) -> Clock:
        """Lay out the steps of every lane, in log conformal time.

        Parameters
        ----------
        marks : array, shape (mark,)
            Increasing conformal times to be met exactly, the last one is the end [Mpc].
        smooth_step : float
            Longest step in ln a [unitless].
        phase_step : float
            Longest way in a step of the wind and of sound, in gas and dark matter, times the wavenumber [unitless].

        Returns
        -------
        Clock
        """
        first, last = np.log(self.start), np.log(marks[-1])
        grid = np.linspace(first, last, 2 + int(NODES_PER_UNIT * (last - first)))
        time = np.clip(np.exp(grid), self.start, marks[-1])
        now = self.universe.conditions(time)
        expansion, k = now.hubble_rate * time, self.wavenumber[:, None] * time
        drift = k * self.component[:, None] * self.rms_velocity(now.scale_factor)
        sound = k * np.sqrt(now.isothermal_sound_speed_squared)
        phase = np.minimum(drift + sound, DRIFT_FOLLOWED * expansion)
        phase = phase + k * self.universe.dark_sound_speed(now.scale_factor)
        density = np.hypot(expansion / smooth_step, phase / phase_step)
        starts = np.full(len(self.wavenumber), first)
        return lay_out(grid, density, starts, np.log(marks))
