"""The scale below which gas pressure has kept the baryons smooth: the filtering scale.

The Jeans scale tells where pressure wins at a moment, the filtering scale what it has done up to then. For a
mode on the large-scale side, to first order in k^2, delta_baryon = (1 - k^2/k_F^2) times what it would be without
pressure, with

    1/k_F^2 = (1/D) int dtau/a int a c_s^2 D dtau

over conformal time. This is the integral of Gnedin & Hui 1998 (MNRAS 296, 44; from memory)

    1/k_F^2 = (1/D) int dt a^2 (D'' + 2 H D')/k_J^2 int dt/a^2,

with its growth equation D'' + 2 H D' = 4 pi G rho D put in (so that k_J drops out and only the pressure is left) and
the order of the integrations exchanged. It holds in any expansion. Here it starts at the drag epoch, since photons
hold the gas before.

Which growth goes in matters. Gnedin & Hui let the gas follow the one growth of all matter from the beginning. Gas
that was held by photons starts far behind and feels little pressure until it has caught up, so the integral over the
baryons' own contrast and pressure gives a larger k_F (Naoz & Barkana 2007, MNRAS 377, 667). Both are computed, and
both can be held against what is read off the run: its ratio delta_baryon/delta_dark, relative to the plateau of that
ratio at smaller wavenumbers.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from twofluid.scenario import ADIABATIC

NODES = 801  # of the integrals, in ln a: trapezoids to 1e-4
ACOUSTIC_END = 5.0  # k over k_D at the drag epoch from where on waves, exp(-25) of what they were, leave no trace
PLATEAU_END = 0.1  # k over k_F up to where the plateau holds: pressure takes a per cent of the ratio there
DROP = 0.02  # of -ln(ratio/plateau), where k_F is read off: deep enough to rise out of the run's own errors
SMOOTHED = 1.0  # of -ln(ratio/plateau), where the gas counts as smoothed out
LEAST_RATIO = 1e-30  # stands for a ratio that is zero or negative


@dataclass(frozen=True)
class Filtering:
    """Filtering wavenumbers of a run, NaN where one cannot be told.

    Attributes
    ----------
    one_growth : array, shape (redshift,)
        The integral with the growth of all matter and the smooth sound speed [1/Mpc].
    two_fluids : array, shape (redshift,)
        The integral with the baryons' own growth and pressure [1/Mpc].
    measured : array, shape (redshift,)
        k_F of exp(-k^2/k_F^2), the k^2 term of the ratio, from where it has fallen by a factor exp(-0.02) below the
        smallest wavenumber on the plateau [1/Mpc].
    smoothed : array, shape (redshift,)
        k at which the ratio has fallen to 1/e of its plateau [1/Mpc].
    reason : str
        Why nothing can be told at any redshift; empty if something can.
    """

    one_growth: np.ndarray
    two_fluids: np.ndarray
    measured: np.ndarray
    smoothed: np.ndarray
    reason: str = ""


def filtering_area(log_scale_factor, hubble_rate, pressure, growth):
    """Evaluate the filtering integral.

    Parameters
    ----------
    log_scale_factor : array, shape (node,)
        Increasing ln a; the integral starts at the first [unitless].
    hubble_rate : array, shape (node,)
        Conformal rate a'/a [1/Mpc].
    pressure : array, shape (node,)
        Pressure contrast over density, c_s^2 D where sound is adiabatic [unitless].
    growth : array, shape (node,)
        Density contrast D of the gas without pressure, in any normalisation shared with `pressure` [unitless].

    Returns
    -------
    array, shape (node,)
        1/k_F^2 [Mpc^2]
    """
    a = np.exp(log_scale_factor)
    momentum = _running(a * pressure / hubble_rate, log_scale_factor)
    return _running(momentum / (a * hubble_rate), log_scale_factor) / growth


def filtering(history, redshift):
    """Find the filtering scale of a run.

    Parameters
    ----------
    history : History
        The run.
    redshift : array, shape (redshift,)
        Redshifts [unitless].

    Returns
    -------
    Filtering
        NaN before the drag epoch, and where the wavenumbers of the run do not reach. The growth is that of the
        smallest wavenumber on the plateau, at least five times k_D at the drag epoch.
    """
    redshift = np.asarray(redshift, dtype=float)
    reference, reason = _reference(history)
    if reference is None:
        return Filtering(*np.full((4, len(redshift)), np.nan), reason)
    one_growth, two_fluids = _integrals(history, reference, redshift)
    lack = _lack(history, reference, redshift)
    # The reference lacks (k/k_F)^2 already.
    beyond = _crossing(history.wavenumber, lack, DROP) ** 2 - history.wavenumber[reference] ** 2
    measured = np.sqrt(beyond / DROP)
    smoothed = _crossing(history.wavenumber, lack, SMOOTHED)
    released = redshift < history.universe.landmarks.drag_redshift
    on_plateau = history.wavenumber[reference] <= PLATEAU_END * np.array([one_growth, two_fluids, measured])
    # Where the reference is not on the plateau the ratio has no plateau either.
    told = released & np.vstack([on_plateau, on_plateau[-1]])
    found = np.where(told, [one_growth, two_fluids, measured, smoothed], np.nan)
    return Filtering(*found)


def _running(integrand, position):
    """Integrate by trapezoids up to each node; zero at the first."""
    pieces = 0.5 * (integrand[1:] + integrand[:-1]) * np.diff(position)
    return np.concatenate([[0.0], np.cumsum(pieces)])


def _reference(history):
    """Return the number of the mode at the lower end of the plateau, or None and the reason."""
    if not history.has_dark_matter:
        return None, "without dark matter there is no growth free of pressure to compare with"
    if history.initial_modes != ADIABATIC:
        return None, "with initial modes beside the adiabatic one the ratio has no plateau even without pressure"
    drag = 1.0 / (1.0 + history.universe.landmarks.drag_redshift)
    least = ACOUSTIC_END * float(history.universe.diffusion_wavenumber(drag))
    candidates = np.where(history.wavenumber >= least, history.wavenumber, np.inf)
    if np.all(np.isinf(candidates)):
        return None, f"no wavenumber of the run is above {least:.3g} 1/Mpc, where acoustic waves have died out"
    return int(np.argmin(candidates)), ""


def _integrals(history, reference, redshift):
    """Return k_F with one growth and with two fluids, shape (redshift,)."""
    universe = history.universe
    log_a = np.linspace(-np.log1p(universe.landmarks.drag_redshift), 0.0, NODES)
    a = np.exp(log_a)
    dark, baryon, warmth = (
        history.at(name, 1.0 / a - 1.0)[reference] for name in ("delta_dark", "delta_baryon", "delta_gas_temperature")
    )
    dark_weight, baryon_weight = (float(universe.gravity(species, 1.0)) for species in ("dark", "baryon"))
    matter = (dark_weight * dark + baryon_weight * baryon) / (dark_weight + baryon_weight)
    rate = universe.conformal_hubble_rate(a)
    adiabatic, isothermal = universe.gas_sound_speed(a) ** 2, universe.isothermal_sound_speed(a) ** 2
    areas = (
        filtering_area(log_a, rate, adiabatic * matter, matter),
        filtering_area(log_a, rate, isothermal * (baryon + warmth), baryon),
    )
    with np.errstate(divide="ignore", invalid="ignore"):  # at the drag epoch nothing has been filtered yet
        return [np.interp(-np.log1p(redshift), log_a, area) ** -0.5 for area in areas]


def _lack(history, reference, redshift):
    """-ln of the ratio over its plateau, shape (mode, redshift); -inf for modes below the plateau."""
    dark, baryon = (history.at(name, redshift) for name in ("delta_dark", "delta_baryon"))
    ratio = baryon / dark
    relative = np.maximum(ratio / ratio[reference], LEAST_RATIO)
    below = history.wavenumber[:, None] < history.wavenumber[reference]
    return np.where(below, -np.inf, -np.log(relative))


def _crossing(wavenumber, lack, drop):
    """Wavenumber at which the lack first reaches a drop, shape (redshift,); NaN where no mode lacks as much.

    Between two modes the lack is taken as straight in k^2, which its first term is.
    """
    order = np.argsort(wavenumber)
    square, lack = wavenumber[order] ** 2, lack[order]
    reached = lack >= drop
    upper = np.argmax(reached, axis=0)
    lower, columns = np.maximum(upper - 1, 0), np.arange(lack.shape[1])
    low, high = lack[lower, columns], lack[upper, columns]
    usable = reached.any(axis=0) & np.isfinite(low) & (high > low)
    low, high = np.where(usable, low, np.nan), np.where(usable, high, np.nan)
    share = (drop - low) / (high - low)
    return np.sqrt(square[lower] + share * (square[upper] - square[lower]))
