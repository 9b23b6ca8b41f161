"""The effective-sound-speed closure: dark matter, one baryonic fluid, and radiation that streams.

Frame, normalisation and units are those of the kinetic closure (`kinetic`), and so is the start; six
unknowns a mode replace its forty. With ``h`` the trace and ``eta`` the curvature of the metric,
``g = 8 pi G a^2 rho`` and primes for conformal time::

    delta_c' = -h'/2
    delta_b' = -theta_b - h'/2
    theta_b' = -R/(1+R) H theta_b + k^2 c_s^2 delta_b - 2 k^2 (d k_D^-2/dtau) S_b     the plasma
    theta_b' = -H theta_b + k^2 c_gas^2 delta_b                                       the gas, released
    delta_s' = -(4/3) theta_s - (2/3) h'
    theta_s' = k^2 delta_s/4 - nu S_s,         1/nu = 15/(2 k^2 tau) + 1/(n k)        what streams
    h''      = -H h' - g_c delta_c - g_b delta_b - 2 g_gamma delta_gamma - 2 g_nu delta_s
    S_f      = theta_f + h'/2 + 3 eta',        eta' = sum of g (1 + w) theta/(2 k^2)

Plasma
    Baryons and photons move as one fluid, ``c_s^2 = 1/(3(1+R))`` with ``R = 3 rho_b/(4 rho_gamma)`` and
    ``delta_gamma = (4/3) delta_b``. Diffusion works against its compression S, the velocity divergence
    relative to the uniform expansion: the theta of this frame is relative to the dark matter, so damping
    theta itself would make baryons fall along with the dark matter where photons hold them at rest.
Release
    A sharp switch at the drag epoch, on a step boundary of every clock. From there the gas has the sound
    speed of `Universe.gas_sound_speed`, in a compression as in the mean expansion
    ``delta_T = -(1/3) (d ln T/d ln a) delta_b``, which is delta_gamma/4 where Compton heating holds the
    temperature, and so it is taken in the plasma. (The kinetic closure follows the temperature: while
    heating holds, waves much shorter than the horizon are isothermal. Pressure is overrated here by up
    to a third until z of about 150.)
Streaming radiation
    Neutrinos, and photons once released, share one contrast. Its viscosity is exact outside the horizon,
    where shear has built up since the beginning, sigma = (2/15) tau S, and makes the contrast smooth
    inside, with the rate ``n k``. Photons do not remember their waves in the plasma.

Dark matter
    With pressure it moves against the frame: ``-theta_c`` is added to delta_c', the velocity follows
    ``theta_c' = -H theta_c + k^2 c_s^2 delta_c`` and adds to eta', as in the kinetic closure.

The energy constraint of Einstein's equations is no check on this closure: photons change over from one
fluid to the other, and the shear of what streams is prescribed.

References
----------
Ma, C.-P. & Bertschinger, E. 1995, ApJ 455, 7: continuity, Euler and Einstein equations (eqs 21, 29, 30;
numbers from memory). Kaiser, N. 1983, MNRAS 202, 1169 and Hu, W. & White, M. 1997, ApJ 479, 568: diffusion
(from memory).
"""

from collections.abc import Mapping

import numpy as np

from ..solver import StepRates
from ..universe import Universe
from ..universe.gas import plasma_sound_speed
from .kinetic import ChainLengths
from .readout import Reading
from .start import mixed

STREAMING_LIMIT = 0.5  # n: rate at which streaming smooths well inside the horizon, over k; dark matter within 4 %
LOCKED_STIFFNESS = 1 / 3  # delta_T over delta_b in the plasma
MEASURED_WITH_DARK_MATTER = (
    "in a standard universe delta_dark is within 4 per cent, delta_baryon/delta_dark within 0.07 from redshift 500 on"
)
MEASURED_WITHOUT = (
    "in a universe of baryons alone contrasts are within 5 per cent for k below 0.01 1/Mpc, acoustic waves within "
    "40 per cent of their amplitude below 0.1 1/Mpc from redshift 500 on, shorter waves are not to be trusted"
)
SLOPE_SPAN = 1e-3  # in ln a, to either side: difference quotient of the gas stiffness


class SoundSpeedSystem:
    """The rates of the effective-sound-speed closure, for all modes of one universe.

    Implements `twofluid.solver.LinearSystem`; its time is the conformal time [Mpc]. Velocities and the trace
    rate of the metric are divided by the wavenumber.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    chains : ChainLengths, optional
        Taken so that all closures are built alike; no moments are followed here.
    """

    unknowns = ("delta_stream", "delta_dark", "delta_baryon", "theta_stream", "theta_baryon", "metric_rate")
    observed = unknowns
    tails = ()
    neutrinos_may_have_mass = False
    stackable = False  # the release belongs to one universe

    def __init__(self, universe: Universe, wavenumber: np.ndarray, chains: ChainLengths | None = None):
        self.universe = universe
        self.wavenumber = np.asarray(wavenumber, dtype=float)
        self.release = float(universe.conformal_time(1.0 / (1.0 + universe.landmarks.drag_redshift)))
        self.switches = (self.release,)
        self.dark_pressure = universe.has_dark_pressure
        if self.dark_pressure:
            self.unknowns = self.observed = ("theta_dark", *type(self).unknowns)
        self._row = {name: row for row, name in enumerate(self.unknowns)}

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a user of this closure has to know."""
        has_dark_matter = self.universe.cosmology.dark_matter_density > 0.0
        measured = MEASURED_WITH_DARK_MATTER if has_dark_matter else MEASURED_WITHOUT
        return (f"closure sound-speed is a small model; against the kinetic closure {measured}",)

    def first_state(self, start: np.ndarray, weights: Mapping[str, np.ndarray] | None = None) -> np.ndarray:
        """State of every mode at its start.

        Parameters
        ----------
        start : array, shape (mode,)
            Conformal time of each start [Mpc].
        weights : mapping of str to array, shape (mode,), optional
            How much of each initial mode; only the adiabatic one keeps photons to baryons as this closure has
            them [unitless].

        Returns
        -------
        array, shape (unknown, mode)
        """
        first = mixed(self.universe, self.wavenumber, start, weights)
        first |= {"delta_stream": first["delta_neutrino"], "theta_stream": first["theta_neutrino"]}
        return np.stack([first.get(name, np.zeros(len(start))) for name in self.unknowns])

    def step_rates(self, modes: np.ndarray, time: np.ndarray, step: np.ndarray) -> StepRates:
        """Evaluate step times rate; see `twofluid.solver.LinearSystem`."""
        in_plasma = time[:1] < self.release  # the first stage tells: no step lies on both sides
        rates = self._rates(self.wavenumber[modes], time, in_plasma)
        return StepRates({
            (self._row[row], self._row[column]): np.broadcast_to(rate * step, time.shape)
            for (row, column), rate in rates.items()
        })

    def _rates(self, k: np.ndarray, time: np.ndarray, in_plasma: np.ndarray) -> dict:
        """Write the equations of the module's text as rates [1/Mpc]."""
        now = self.universe.conditions(time)
        hubble, r = now.hubble_rate, now.photon_baryon_ratio  # r = 1/R
        held = np.where(in_plasma, now.gravity_photon, 0.0)
        streaming = now.gravity_neutrino + now.gravity_photon - held
        gas_speed = self.universe.gas_sound_speed(np.minimum(now.scale_factor, 1.0))
        speed = np.where(in_plasma, plasma_sound_speed(1.0 / r), gas_speed)
        diffusion = (1.0 + 16 / 15 * r * (1.0 + r)) / (6.0 * now.scattering_rate * (1.0 + r) ** 2)  # d k_D^-2/dtau
        viscosity = k / (7.5 / (k * time) + 1.0 / STREAMING_LIMIT)
        rates = {
            ("delta_dark", "metric_rate"): -k / 2,
            ("delta_baryon", "theta_baryon"): -k,
            ("delta_baryon", "metric_rate"): -k / 2,
            ("delta_stream", "theta_stream"): -4 / 3 * k,
            ("delta_stream", "metric_rate"): -2 / 3 * k,
            ("theta_baryon", "theta_baryon"): -hubble * np.where(in_plasma, 1.0 / (1.0 + r), 1.0),
            ("theta_baryon", "delta_baryon"): k * speed**2,
            ("theta_stream", "delta_stream"): k / 4,
            ("metric_rate", "metric_rate"): -hubble,
            ("metric_rate", "delta_dark"): -now.gravity_dark / k,
            ("metric_rate", "delta_baryon"): -(now.gravity_baryon + 8 / 3 * held) / k,
            ("metric_rate", "delta_stream"): -2.0 * streaming / k,
        }
        expansion = {  # h'/2 + 3 eta'
            "metric_rate": 0.5,
            "theta_baryon": 1.5 * (now.gravity_baryon + 4 / 3 * held) / k**2,
            "theta_stream": 2.0 * streaming / k**2,
        }
        if self.dark_pressure:
            rates |= {
                ("delta_dark", "theta_dark"): -k,
                ("theta_dark", "theta_dark"): -hubble,
                ("theta_dark", "delta_dark"): k * self.universe.dark_sound_speed(now.scale_factor) ** 2,
            }
            expansion["theta_dark"] = 1.5 * now.gravity_dark / k**2
        resistance = {"theta_baryon": np.where(in_plasma, 2.0 * k**2 * diffusion, 0.0), "theta_stream": viscosity}
        for fluid, rate in resistance.items():
            for name, share in expansion.items():
                rates[fluid, name] = rates.get((fluid, name), 0.0) - rate * (share + (name == fluid))
        return rates

    def read_off(self, times: np.ndarray, observed: np.ndarray) -> Reading:
        """Turn what was observed into quantities.

        Parameters
        ----------
        times : array, shape (boundary, mode)
            Conformal times [Mpc].
        observed : array, shape (unknown, boundary, mode)
            The unknowns named in `observed`.

        Returns
        -------
        Reading
            Its constraint drift is NaN: this closure has no such check.
        """
        now = self.universe.conditions(times)
        in_plasma = times < self.release
        y = dict(zip(self.observed, observed, strict=True))
        slope = {name: np.zeros(times.shape) for name in self.unknowns}
        for (row, column), rate in self._rates(self.wavenumber, times, in_plasma).items():
            slope[row] += rate / now.hubble_rate * y[column]
        stiffness, change = _gas_stiffness(self.universe, now.scale_factor, in_plasma)
        quantities = {
            "log_scale_factor": np.log(now.scale_factor),
            "delta_dark": y["delta_dark"],
            "delta_baryon": y["delta_baryon"],
            "theta_baryon": self.wavenumber * y["theta_baryon"],
            "delta_gas_temperature": stiffness * y["delta_baryon"],
            "delta_dark_slope": slope["delta_dark"],
            "delta_baryon_slope": slope["delta_baryon"],
            "theta_baryon_slope": self.wavenumber * slope["theta_baryon"],
            "delta_gas_temperature_slope": stiffness * slope["delta_baryon"] + change * y["delta_baryon"],
        }
        if self.dark_pressure:
            velocity = {"theta_dark": y["theta_dark"], "theta_dark_slope": slope["theta_dark"]}
            quantities |= {name: self.wavenumber * value for name, value in velocity.items()}
        return Reading(quantities, np.full((len(times) - 1, times.shape[1]), np.nan))


def _gas_stiffness(universe: Universe, scale_factor: np.ndarray, in_plasma: np.ndarray) -> tuple:
    """Stiffness delta_T / delta_b [unitless] and its derivative by ln a."""

    def stiffness(log_a: np.ndarray) -> np.ndarray:
        return np.where(in_plasma, LOCKED_STIFFNESS, universe.gas_stiffness(np.exp(log_a)))

    log_a = np.minimum(np.log(scale_factor), 0.0)
    before, after = log_a - SLOPE_SPAN, np.minimum(log_a + SLOPE_SPAN, 0.0)
    return stiffness(log_a), (stiffness(after) - stiffness(before)) / (after - before)
