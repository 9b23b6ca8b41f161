"""The lengths and masses a universe offers its waves, against redshift."""

from __future__ import annotations

import numpy as np

from twofluid.products.filtering import filtering
from twofluid.products.jeans import HALF_WAVELENGTH, dark_jeans_wavenumber, in_plasma, jeans_wavenumber, matter_mass
from twofluid.products.table import column, make_table
from twofluid.universe.constants import SPEED_OF_LIGHT

MAP_START = 1e4  # highest redshift of the map of verdicts, if the caller says nothing
MAP_ROWS_PER_DECADE = 50  # of the map, in 1 + z: a row is thinner than a line of the figure

DARK_PRESSURE = (
    "has pressure: where it is smoother than the gas the ratio read off the run says nothing about the gas, and the "
    "integrals hold where the smallest wavenumber on the plateau is well below dark_jeans_wavenumber"
)
KILOMETRES_PER_SECOND = SPEED_OF_LIGHT / 1e3  # of the speed of light


def map_redshifts(map_from=MAP_START):
    """Return the redshifts of the map of verdicts: equally spaced in ln(1 + z), from `map_from` to 0.

    Parameters
    ----------
    map_from : float
        Where the map starts, above 0 [unitless].

    Returns
    -------
    array, shape (redshift,)
        Decreasing; both ends included [unitless].
    """
    rows = 2 + int(MAP_ROWS_PER_DECADE * np.log10(1.0 + map_from))
    return np.concatenate([np.expm1(np.linspace(np.log1p(map_from), 0.0, rows))[:-1], [0.0]])


def scales_table(history, redshift=None, mass_radius=HALF_WAVELENGTH):
    """Return the scales of a universe, and of a run, at every redshift.

    What belongs to the plasma (its sound speed, diffusion) is empty after the drag epoch, what belongs to free gas
    (filtering) before it; the Jeans scale is that of the plasma before and of the gas after. The filtering scales,
    explained in `twofluid.products.filtering`, need dark matter and wavenumbers that reach them.

    Parameters
    ----------
    history : History
        The run.
    redshift : array, shape (redshift,), optional
        Redshifts within the run [unitless]; those asked of the run if left out.
    mass_radius : float
        Radius of the sphere whose mass is told, in wavelengths 2 pi/k: 1/2 or, for eight times the mass, 1 [unitless].

    Returns
    -------
    astropy.table.Table
        One row per redshift: redshift [unitless]; hubble_radius, particle_horizon, sound_horizon [Mpc, comoving];
        plasma_sound_speed, gas_sound_speed [km/s]; gas_temperature [K]; silk_wavenumber, jeans_wavenumber [1/Mpc],
        jeans_length [Mpc], jeans_mass [solMass]; filtering_wavenumber, filtering_wavenumber_two_fluids,
        filtering_wavenumber_measured, smoothed_wavenumber [1/Mpc], and filtering_mass,
        filtering_mass_two_fluids, filtering_mass_measured [solMass]. Where the dark matter has pressure also
        dark_sound_speed [km/s] and dark_jeans_wavenumber [1/Mpc], and a caution in the header.
    """
    redshift = history.redshift if redshift is None else np.asarray(redshift, dtype=float)
    filtered = filtering(history, redshift)
    columns = [
        column("redshift", redshift),
        *_smooth_columns(history.universe, redshift, mass_radius),
        *_filtering_columns(history.universe, filtered, mass_radius),
    ]
    reason = {"filtering": f"empty: {filtered.reason}"} if filtered.reason else {}
    if history.theta_dark is not None:
        columns += _dark_columns(history.universe, redshift)
        reason["dark_matter"] = DARK_PRESSURE
    return make_table(history, columns, mass_radius=mass_radius, **reason)


def _smooth_columns(universe, redshift, mass_radius):
    a = 1.0 / (1.0 + redshift)
    drag = 1.0 / (1.0 + universe.landmarks.drag_redshift)
    released = ~in_plasma(universe, redshift)
    jeans = jeans_wavenumber(universe, redshift)
    return [
        column("hubble_radius", 1.0 / universe.conformal_hubble_rate(a)),
        column("particle_horizon", universe.conformal_time(a)),
        column("sound_horizon", universe.sound_horizon(np.minimum(a, drag))),
        column("plasma_sound_speed", universe.plasma_sound_speed(a) * KILOMETRES_PER_SECOND, masked=released),
        column("gas_sound_speed", universe.gas_sound_speed(a) * KILOMETRES_PER_SECOND),
        column("gas_temperature", universe.gas_temperature(a)),
        column("silk_wavenumber", universe.diffusion_wavenumber(a), masked=released),
        column("jeans_wavenumber", jeans),
        column("jeans_length", 2.0 * np.pi / jeans),
        column("jeans_mass", matter_mass(universe, jeans, mass_radius)),
    ]


def _dark_columns(universe, redshift):
    speed = universe.dark_sound_speed(1.0 / (1.0 + redshift))
    return [
        column("dark_sound_speed", speed * KILOMETRES_PER_SECOND),
        column("dark_jeans_wavenumber", dark_jeans_wavenumber(universe, redshift)),
    ]


def _filtering_columns(universe, filtered, mass_radius):
    sorts = {"": filtered.one_growth, "_two_fluids": filtered.two_fluids, "_measured": filtered.measured}
    smoothed = filtered.smoothed
    return [
        *(column(f"filtering_wavenumber{sort}", k, masked=np.isnan(k)) for sort, k in sorts.items()),
        column("smoothed_wavenumber", smoothed, masked=np.isnan(smoothed)),
        *(
            column(f"filtering_mass{sort}", matter_mass(universe, k, mass_radius), masked=np.isnan(k))
            for sort, k in sorts.items()
        ),
    ]
