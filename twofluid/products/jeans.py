"""The Jeans scale: where pressure and gravity are equal, and how much matter that scale holds."""

from __future__ import annotations

import numpy as np

from twofluid.universe.constants import SOLAR_MASS_LENGTH

HALF_WAVELENGTH = 0.5  # radius of the sphere whose mass is told, in wavelengths, if the caller says nothing


def in_plasma(universe, redshift):
    """Tell which redshifts lie before the drag epoch, shape as `redshift`."""
    return np.asarray(redshift, dtype=float) > universe.landmarks.drag_redshift


def jeans_wavenumber(universe, redshift):
    """Comoving Jeans wavenumber k_J = (a/c_s) sqrt(4 pi G rho).

    Before the drag epoch c_s is that of the plasma, 1/sqrt(3 (1 + R)), and rho the density of everything that
    clusters: photons, neutrinos, baryons, dark matter. After it c_s is that of the gas,
    c_s^2 = (k T/(mu m_H)) (1 - (1/3) d ln T/d ln a), and rho the density of baryons and dark matter.

    Parameters
    ----------
    universe : Universe
        The smooth universe.
    redshift : array, shape (redshift,)
        Redshifts [unitless].

    Returns
    -------
    array, shape (redshift,)
        [1/Mpc]
    """
    a = 1.0 / (1.0 + np.asarray(redshift, dtype=float))
    plasma = in_plasma(universe, redshift)
    matter = universe.gravity("baryon", a) + universe.gravity("dark", a)
    radiation = sum(universe.gravity(species, a) for species in ("photon", "neutrino", "massive_neutrino"))
    speed = np.where(plasma, universe.plasma_sound_speed(a), universe.gas_sound_speed(a))
    return np.sqrt(0.5 * (matter + np.where(plasma, radiation, 0.0))) / speed


def dark_jeans_wavenumber(universe, redshift):
    """Comoving Jeans wavenumber (a/c_s) sqrt(4 pi G rho) of dark matter with pressure, rho of it and the baryons.

    Parameters
    ----------
    universe : Universe
        The smooth universe.
    redshift : array, shape (redshift,)
        Redshifts [unitless].

    Returns
    -------
    array, shape (redshift,)
        [1/Mpc]
    """
    a = 1.0 / (1.0 + np.asarray(redshift, dtype=float))
    matter = universe.gravity("baryon", a) + universe.gravity("dark", a)
    return np.sqrt(0.5 * matter) / universe.dark_sound_speed(a)


def matter_mass(universe, wavenumber, radius=HALF_WAVELENGTH):
    """Mass of baryons and dark matter, at their mean density, in a sphere that belongs to a wavenumber.

    Parameters
    ----------
    universe : Universe
        The smooth universe.
    wavenumber : array, any shape
        Comoving wavenumbers [1/Mpc].
    radius : float
        Radius of the sphere in wavelengths 2 pi/k: 1/2 as in Barkana & Loeb 2001 (Phys. Rep. 349, 125) and Naoz &
        Barkana 2005, 1 as in Gnedin 2000 (eight times the mass); all from memory [unitless].

    Returns
    -------
    array, same shape
        [solMass]
    """
    density = (universe.gravity("baryon", 1.0) + universe.gravity("dark", 1.0)) / (8.0 * np.pi)  # G rho/c^2 [1/Mpc^2]
    return 4.0 / 3.0 * np.pi * density * (2.0 * np.pi * radius / wavenumber) ** 3 / SOLAR_MASS_LENGTH
