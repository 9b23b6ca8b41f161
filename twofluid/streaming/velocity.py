"""The streaming velocity: how fast baryons move through the dark matter, and over which distance together.

In the frame of a run, at rest with cold dark matter, the velocity of the baryons is the relative one (where dark
matter has pressure and moves, its own is taken off): ``|v| = |theta_baryon|/k`` per unit curvature, by conformal time,
which is the proper peculiar velocity in units of c (comoving way by conformal time and proper way by cosmic time
differ by the same factor a). Its variance is

    sigma^2 = int dlnk P_R(k) |theta_baryon/k|^2,    P_R the power of the primordial curvature in ln k.

It comes from wavenumbers of 0.01 to 1/Mpc, where photons held the baryons until decoupling while the dark matter fell.
The integral ends at 10/Mpc: what varies within less than a megaparsec is no wind to the small scales whose growth it
disturbs, and late in time gas held up by its pressure (k of some 100/Mpc) moves against the dark matter too.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..history import History

SMALLEST, LARGEST = 1e-3, 10.0  # wavenumbers that make the wind [1/Mpc]
PER_DECADE = 40  # of them: 16 to one acoustic oscillation in the spectrum where it peaks, 4 where diffusion ends it
LEAST_SLOPE = 0.5  # with which a spectrum goes on beyond an end at which it rises or stays
LEAST_SPECTRUM = 1e-300  # stands for nothing [c^2]
COHERENT = 0.95  # correlation of the velocities at two places whose distance is the coherence length
LONGEST_DISTANCE = 1000.0  # looked at for the coherence length [Mpc]
DISTANCES_PER_DECADE = 50
SHORTEST_DISTANCE = 0.1  # the same [Mpc]


def wind_wavenumbers() -> np.ndarray:
    """Wavenumbers that make the wind, shape (mode,), an odd number of them [1/Mpc]."""
    return np.geomspace(SMALLEST, LARGEST, 1 + 2 * round(PER_DECADE * np.log10(LARGEST / SMALLEST) / 2))


@dataclass(frozen=True)
class Wind:
    """The velocity of baryons relative to dark matter.

    Attributes
    ----------
    wavenumber : array, shape (mode,)
        Equally spaced in the logarithm [1/Mpc].
    redshift : array, shape (redshift,)
        [unitless]
    spectrum : array, shape (mode, redshift)
        Variance of the velocity per unit of ln k [c^2].
    rms : array, shape (redshift,)
        sigma, of the three components together [c].
    error : array, shape (redshift,)
        Of sigma: what lies beyond either end of the wavenumbers, continued as a power law, and what changes if
        every second one is left out, added up [c].
    """

    wavenumber: np.ndarray
    redshift: np.ndarray
    spectrum: np.ndarray
    rms: np.ndarray
    error: np.ndarray

    def holding(self, share: float) -> np.ndarray:
        """Wavenumber up to which modes hold a share of the variance.

        Parameters
        ----------
        share : float
            Between 0 and 1 [unitless].

        Returns
        -------
        array, shape (redshift,)
            [1/Mpc]
        """
        log_k = np.log(self.wavenumber)
        pieces = 0.5 * (self.spectrum[1:] + self.spectrum[:-1]) * np.diff(log_k)[:, None]
        held = np.concatenate([np.zeros((1, len(self.redshift))), np.cumsum(pieces, axis=0)])
        return np.exp([np.interp(share * column[-1], column, log_k) for column in held.T])

    def correlation(self, distance) -> np.ndarray:
        """Correlation of the velocities at two places, <v(x) v(x + r)>/sigma^2.

        Parameters
        ----------
        distance : array, shape (distance,)
            Comoving distance r [Mpc].

        Returns
        -------
        array, shape (distance, redshift)
            [unitless]
        """
        phase = np.asarray(distance, dtype=float)[:, None] * self.wavenumber
        together = np.sinc(phase / np.pi)[:, :, None] * self.spectrum
        return _integral(self.wavenumber, together, axis=1) / self.rms**2

    def coherence_length(self) -> np.ndarray:
        """Distance over which the velocity stays the same, correlation `COHERENT`, shape (redshift,) [Mpc]."""
        decades = np.log10(LONGEST_DISTANCE / SHORTEST_DISTANCE)
        distance = np.geomspace(SHORTEST_DISTANCE, LONGEST_DISTANCE, round(DISTANCES_PER_DECADE * decades))
        correlation = self.correlation(distance)
        after = np.argmax(correlation < COHERENT, axis=0)
        columns = np.arange(len(self.redshift))
        high, low = correlation[after - 1, columns], correlation[after, columns]
        return distance[after - 1] + (distance[after] - distance[after - 1]) * (high - COHERENT) / (high - low)


def find_wind(run: History, redshift) -> Wind:
    """Work out the streaming velocity of a run.

    Parameters
    ----------
    run : History
        A run of the wavenumbers of `wind_wavenumbers`.
    redshift : array, shape (redshift,)
        Redshifts within the run [unitless].

    Returns
    -------
    Wind

    Raises
    ------
    ValueError
        If the run has other wavenumbers, too few, too coarse or in another order.
    """
    k = run.wavenumber
    if len(k) < 5 or len(k) % 2 == 0 or not np.allclose(np.diff(np.log(k), 2), 0.0, atol=1e-9) or k[1] <= k[0]:
        raise ValueError("the wavenumbers of the wind must be an odd number, 5 or more, increasing by equal factors")
    redshift = np.asarray(redshift, dtype=float)
    primordial = run.scenario.primordial
    power = primordial.amplitude * (k / primordial.pivot) ** (primordial.tilt - 1.0)
    spectrum = power[:, None] * sum((_relative(part, redshift) / k[:, None]) ** 2 for part in run.parts)
    variance = _integral(k, spectrum)
    coarse = _integral(k[::2], spectrum[::2])
    missing = _beyond(k, spectrum, (0, 2)) + _beyond(k, spectrum, (-1, -3)) + np.abs(coarse - variance)
    rms = np.sqrt(variance)
    return Wind(k, redshift, spectrum, rms, missing / (2.0 * rms))


def _relative(run, redshift):
    """Velocity divergence of baryons relative to dark matter, shape (mode, redshift) [1/Mpc]."""
    theta = run.at("theta_baryon", redshift)
    return theta if run.theta_dark is None else theta - run.at("theta_dark", redshift)


def _integral(k, values, axis=0):
    """Integrate over ln k by trapezoids."""
    values = np.moveaxis(values, axis, -1)
    return (0.5 * (values[..., 1:] + values[..., :-1]) * np.diff(np.log(k))).sum(axis=-1)


def _beyond(k, spectrum, ends):
    """Variance beyond an end: the power law through its last two values, but no flatter than the least slope."""
    last, before = (np.maximum(spectrum[end], LEAST_SPECTRUM) for end in ends)
    outward = abs(np.log(k[ends[0]] / k[ends[1]]))
    return last / np.maximum(np.log(before / last) / outward, LEAST_SLOPE)
