"""What a solution says: the quantities users ask for, with their rates, and the Einstein constraint."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from ..universe import Conditions

LOCKED_TEMPERATURE = 1e4  # Compton over expansion rate beyond which the gas contrast follows the photons'


@dataclass(frozen=True)
class Reading:
    """Quantities read off a solution.

    Attributes
    ----------
    quantities : dict of str to array, shape (boundary, mode)
        "log_scale_factor", and for each of delta_dark, delta_baryon, theta_baryon [1/Mpc] and
        delta_gas_temperature its value and, as "NAME_slope", its derivative by ln a; where the dark
        matter is not cold also for theta_dark [1/Mpc], where neutrinos have mass for delta_neutrino.
    constraint_drift : array, shape (step, mode)
        Change of the Einstein energy constraint in each step, relative to its largest term [unitless];
        NaN where the closure has no such constraint.
    """

    quantities: dict[str, np.ndarray]
    constraint_drift: np.ndarray


def read_quantities(now: Conditions, k: np.ndarray, y: Mapping[str, np.ndarray]) -> dict[str, np.ndarray]:
    """Turn unknowns into quantities and their slopes.

    Parameters
    ----------
    now : Conditions
        Smooth universe at every boundary, fields of shape (boundary, mode).
    k : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    y : mapping of str to array, shape (boundary, mode)
        Unknowns of the kinetic closure: metric_rate, theta_baryon and slip divided by k, and the contrasts.

    Returns
    -------
    dict of str to array, shape (boundary, mode)
        As in `Reading.quantities`.
    """
    hubble = now.hubble_rate
    theta, slip = k * y["theta_baryon"], k * y["slip"]
    metric_half = 0.5 * k * y["metric_rate"]
    dark_rate, baryon_rate = -metric_half, -theta - metric_half
    photon_rate = -4 / 3 * (theta - slip + metric_half)
    pressure = k**2 * now.isothermal_sound_speed_squared * (y["delta_baryon"] + y["delta_gas_temperature"])
    theta_rate = -hubble * theta + pressure - now.photon_baryon_ratio * now.scattering_rate * slip
    warmth = now.photon_gas_temperature_ratio
    heating = warmth * (1.25 * y["delta_photon"] - y["delta_gas_temperature"]) - y["delta_photon"]
    free_rate = 2 / 3 * baryon_rate + now.compton_rate * heating
    temperature_rate = np.where(now.compton_rate > LOCKED_TEMPERATURE * hubble, photon_rate / 4, free_rate)
    return {
        "log_scale_factor": np.log(now.scale_factor),
        "delta_dark": y["delta_dark"],
        "delta_baryon": y["delta_baryon"],
        "theta_baryon": theta,
        "delta_gas_temperature": y["delta_gas_temperature"],
        "delta_dark_slope": dark_rate / hubble,
        "delta_baryon_slope": baryon_rate / hubble,
        "theta_baryon_slope": theta_rate / hubble,
        "delta_gas_temperature_slope": temperature_rate / hubble,
    }


def read_moving_dark_matter(
    now: Conditions, k: np.ndarray, y: Mapping[str, np.ndarray], speed: np.ndarray
) -> dict[str, np.ndarray]:
    """Turn unknowns into what differs where the dark matter is not cold.

    Parameters
    ----------
    now, k, y
        As in `read_quantities`, with the unknown "theta_dark" divided by k.
    speed : array, shape (boundary, mode)
        Sound speed of the dark matter [c].

    Returns
    -------
    dict of str to array, shape (boundary, mode)
        "theta_dark" [1/Mpc], and the slopes of it and of delta_dark by ln a.
    """
    theta = k * y["theta_dark"]
    dark_rate = -theta - 0.5 * k * y["metric_rate"]
    theta_rate = -now.hubble_rate * theta + (k * speed) ** 2 * y["delta_dark"]
    return {
        "delta_dark_slope": dark_rate / now.hubble_rate,
        "theta_dark": theta,
        "theta_dark_slope": theta_rate / now.hubble_rate,
    }


def constraint_drift(
    now: Conditions, k: np.ndarray, y: Mapping[str, np.ndarray], others: np.ndarray | None = None
) -> np.ndarray:
    """Tell how much ``k^2 eta - H h'/2 + sum g delta / 2`` changed in each step.

    The Einstein equations keep it at zero (Ma & Bertschinger 1995, eq. 21 a). What the start
    leaves of it stays; its changes, relative to its largest term at the time, are the errors of the steps.

    Parameters
    ----------
    now, k, y
        As in `read_quantities`, with the unknown "curvature".
    others : array, shape (boundary, mode), optional
        8 pi G a^2 times the density perturbation of what else there is [1/Mpc^2].

    Returns
    -------
    array, shape (step, mode)
        [unitless]
    """
    terms = np.stack([
        y["curvature"],
        -0.5 * now.hubble_rate / k * y["metric_rate"],
        0.5 * now.gravity_dark / k**2 * y["delta_dark"],
        0.5 * now.gravity_baryon / k**2 * y["delta_baryon"],
        0.5 * now.gravity_photon / k**2 * y["delta_photon"],
        0.5 * now.gravity_neutrino / k**2 * y["delta_neutrino"],
        *([] if others is None else [0.5 * others / k**2]),
    ])  # fmt: skip
    return np.abs(np.diff(terms.sum(axis=0), axis=0)) / np.abs(terms[:, 1:]).max(axis=0)
