"""The streaming of baryons through dark matter as tables: the velocity, its spectrum, and what it does to growth.

All of them take a `twofluid.streaming.Streaming`, what `twofluid.streaming.stream` finds for a run. Without dark matter
their numbers are empty.
"""

from __future__ import annotations

import numpy as np

from twofluid.products.jeans import in_plasma
from twofluid.products.table import column, make_table, sample_columns
from twofluid.streaming import COHERENT, LARGEST, LARGEST_ERROR, SMALLEST, wind_wavenumbers
from twofluid.universe.constants import SPEED_OF_LIGHT

KILOMETRES_PER_SECOND = SPEED_OF_LIGHT / 1e3  # of the speed of light
HALF, MOST = 0.5, 0.9  # of the variance of the velocity
VELOCITY_FRAME = (
    "proper velocity of baryons relative to dark matter, |theta_baryon|/k in the frame at rest with dark matter, "
    f"from wavenumbers of {SMALLEST:g} to {LARGEST:g} 1/Mpc"
)
AVERAGE = "an empty velocity: average over all patches, Maxwellian; every power is an average over directions"


def streaming_velocity_table(streaming):
    """Return how fast baryons stream through dark matter, and over which distance together.

    Parameters
    ----------
    streaming : Streaming
        Of the run.

    Returns
    -------
    astropy.table.Table
        One row per redshift: redshift [unitless], rms_velocity, rms_velocity_error [km/s], mach_number [unitless],
        half_variance_wavenumber, most_variance_wavenumber [1/Mpc], coherence_length [Mpc], streaming_wavenumber
        [1/Mpc].
    """
    history, wind = streaming.history, streaming.wind
    universe, redshift = history.universe, history.redshift
    nothing = np.full(len(redshift), np.nan)
    numbers = dict.fromkeys(_VELOCITY_COLUMNS, nothing)
    if wind is not None:
        a = 1.0 / (1.0 + redshift)
        numbers = {
            "rms_velocity": wind.rms * KILOMETRES_PER_SECOND,
            "rms_velocity_error": wind.error * KILOMETRES_PER_SECOND,
            "mach_number": np.where(in_plasma(universe, redshift), np.nan, wind.rms / universe.gas_sound_speed(a)),
            "half_variance_wavenumber": wind.holding(HALF),
            "most_variance_wavenumber": wind.holding(MOST),
            "coherence_length": wind.coherence_length(),
            "streaming_wavenumber": universe.conformal_hubble_rate(a) / wind.rms,
        }
    columns = [column(name, numbers[name], masked=np.isnan(numbers[name])) for name in _VELOCITY_COLUMNS]
    return make_table(history, [column("redshift", redshift), *columns], velocity=VELOCITY_FRAME, coherent=COHERENT)


_VELOCITY_COLUMNS = (
    "rms_velocity",
    "rms_velocity_error",
    "mach_number",
    "half_variance_wavenumber",
    "most_variance_wavenumber",
    "coherence_length",
    "streaming_wavenumber",
)


def streaming_spectrum_table(streaming):
    """Return the spectrum of the streaming velocity.

    Parameters
    ----------
    streaming : Streaming
        Of the run.

    Returns
    -------
    astropy.table.Table
        One row per wavenumber that makes the wind and redshift, redshift running fastest: wavenumber [1/Mpc],
        redshift [unitless], velocity_spectrum [km/s].
    """
    history, wind = streaming.history, streaming.wind
    wavenumber = wind_wavenumbers()
    spectrum = np.full((len(wavenumber), len(history.redshift)), np.nan)
    if wind is not None:
        spectrum = np.sqrt(wind.spectrum) * KILOMETRES_PER_SECOND
    columns = [
        column("wavenumber", np.repeat(wavenumber, len(history.redshift))),
        column("redshift", np.tile(history.redshift, len(wavenumber))),
        column("velocity_spectrum", spectrum.ravel(), masked=np.isnan(spectrum.ravel())),
    ]
    return make_table(history, columns, velocity=VELOCITY_FRAME)


def streaming_table(streaming):
    """Return the power of each fluid where gas streams, over that where it does not.

    Parameters
    ----------
    streaming : Streaming
        Of the run.

    Returns
    -------
    astropy.table.Table
        One row per mode, redshift and velocity, the velocity running fastest, its average last: wavenumber [1/Mpc],
        redshift, velocity, suppression_dark, suppression_baryon, suppression_matter, error [unitless].
    """
    history, patches = streaming.history, streaming.patches
    velocity = np.append(streaming.velocities, np.nan)
    shape = (len(history.wavenumber), len(history.redshift), len(velocity))
    nothing = np.full(shape, np.nan)
    numbers = {
        "suppression_dark": nothing if patches is None else patches.dark,
        "suppression_baryon": nothing if patches is None else patches.baryon,
        "suppression_matter": nothing if patches is None else patches.matter,
        "error": nothing if patches is None else patches.error,
    }
    place = np.tile(velocity, shape[0] * shape[1])
    columns = [
        *(column(own.name, np.repeat(np.asarray(own), len(velocity))) for own in sample_columns(history)),
        column("velocity", place, masked=np.isnan(place)),
        *(column(name, values.ravel(), masked=np.isnan(values.ravel())) for name, values in numbers.items()),
    ]
    words = {"from_redshift": streaming.from_redshift, "average": AVERAGE, "largest_error_told": LARGEST_ERROR}
    if np.all(history.redshift > streaming.from_redshift):
        words["not_covered"] = f"no redshift of the run is below that where patches start, {streaming.from_redshift:g}"
    return make_table(history, columns, **words)
