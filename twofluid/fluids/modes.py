"""The initial modes beside the adiabatic one, as power series about the beginning, to any order.

Outside the horizon, deep in the radiation era, a universe of photons, fast neutrinos, baryons and dark
matter has six regular solutions in the frame of `kinetic` (Bucher, Moodley & Turok 2000, PRD 62, 083508; from
memory). One is adiabatic, and gauge takes up none of the others:

==================  =========================================================  ============================
mode                at the beginning                                           unit
==================  =========================================================  ============================
baryon              baryons denser, all else uniform                           delta_b - 3/4 delta_gamma = 1
dark_matter         dark matter denser, all else uniform                       delta_c - 3/4 delta_gamma = 1
compensated         baryons denser, dark matter thinner, matter uniform        delta_b - 3/4 delta_gamma = 1
neutrino_density    neutrinos denser, photons thinner, radiation uniform,      3/4 (delta_nu - delta_gamma) = 1
                    matter uniform
neutrino_velocity   neutrinos stream through the plasma, momenta cancel        (theta_nu - theta_gamma)/k = 1
==================  =========================================================  ============================

Compensated is baryon less the share of dark matter that keeps matter uniform, g_b/g_c times. All have no
curvature at the beginning.

The series follow from the equations of the kinetic closure with photons and baryons tied together, no gas
pressure and nothing but matter and radiation, by equating powers. With s the conformal time over that of the
start, x = k tau and y = omega tau there, omega fixed by the expansion a ~ tau (1 + omega tau/4), R_gamma and R_nu
shares in radiation, f_b and f_c in matter, e = y/4, rho = 3 f_b y/(4 R_gamma), M = tau h' and m = f_b delta_b +
f_c delta_c, the coefficients of s^n are

    (n + 2) M_n = n A_n - 4 x (R_gamma v + R_nu w)_(n-1)
            A_n = 2 x^2 (eta_(n-2) + 2 e eta_(n-3) + e^2 eta_(n-4)) + 3 y (m_(n-1) + e m_(n-2))
                  - 3 e M_(n-1) - 2 e^2 M_(n-2)
      n delta_n = -(1 + p/rho) (x v_(n-1) + M_n/2)                                    every fluid, its own v
        v_(n+1) = x delta_gamma,n/(4 (n + 1)) - rho (v_n + e v_(n-1))                 theta/k of the plasma
        w_(n+1) = x (delta_nu,n/4 - N_2,n/2)/(n + 1)                                  theta/k of neutrinos
        n eta_n = q_n/(2 (n + 1)) - E_n - R_nu N_2,n/(n + 1)
            q_n = R_gamma delta_gamma,n + R_nu delta_nu,n
            E_n = 2 e (n - 1) eta_(n-1) + e^2 (n - 2) eta_(n-2)
        n N_2,n = x (8/15 w - 3/5 N_3)_(n-1) + 4/15 M_n + 8/5 n eta_n
        n N_l,n = x (l N_(l-1) - (l + 1) N_(l+1))_(n-1)/(2 l + 1)                     l > 2

The trace rate M is taken from the energy constraint here, so that no adiabatic mode creeps in: waves much
longer than the horizon at equality need several orders in y for that, since x^2 is smaller still at their start.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from ..universe import Conditions, Universe

ORDERS = 8  # of the series, in the conformal time: what is left out is below round-off at any start
LAST_MOMENT = 6  # of the neutrinos; higher ones start with higher powers of k tau
_BEYOND = f"neutrino_{LAST_MOMENT + 1}"  # stays zero


@dataclass(frozen=True)
class _Shares:
    """What the modes begin with: shares of the fluids in radiation and in matter, arrays of shape (mode,)."""

    photon: np.ndarray
    neutrino: np.ndarray
    baryon: np.ndarray
    dark: np.ndarray


#: What is not zero at the beginning, by the name of the mode: contrasts, and velocities over k.
BEGINNINGS: dict[str, Callable[[_Shares], Mapping[str, object]]] = {
    "baryon": lambda share: {"delta_baryon": 1.0},
    "dark_matter": lambda share: {"delta_dark": 1.0},
    "compensated": lambda share: {"delta_baryon": 1.0, "delta_dark": -share.baryon / share.dark},
    "neutrino_density": lambda share: {
        "delta_neutrino": 4 / 3 * share.photon, "delta_photon": -4 / 3 * share.neutrino,
    },
    "neutrino_velocity": lambda share: {"theta_neutrino": share.photon, "theta_baryon": -share.neutrino},
}  # fmt: skip


def isocurvature(mode: str, universe: Universe, wavenumber: np.ndarray, time: np.ndarray) -> dict[str, np.ndarray]:
    """Evaluate the series of a mode at the start; unknowns that do not appear start at zero.

    Parameters
    ----------
    mode : str
        One of `BEGINNINGS`.
    universe : Universe
        With whatever the mode needs: dark matter, neutrinos.
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    time : array, shape (mode,)
        Conformal time of the start [Mpc].

    Returns
    -------
    dict of str to array, shape (mode,)
        Unknowns of the kinetic closure [unitless].
    """
    now = universe.conditions(time)
    neutrino = neutrino_gravity(universe, now)
    share = _shares(now, neutrino)
    beginning = BEGINNINGS[mode](share)
    phase = wavenumber * time
    series = _series(beginning, share, phase, _matter(now, neutrino))
    sums = {name: terms.sum(axis=0) for name, terms in series.items() if name != _BEYOND}
    sums["metric_rate"] = sums.pop("trace") / phase
    sums["delta_gas_temperature"] = sums["delta_photon"] / 4.0  # Compton heating holds it
    return sums


def neutrino_gravity(universe: Universe, now: Conditions) -> np.ndarray:
    """8 pi G a^2 rho of all neutrinos, which at the start are as fast as light with mass or without [1/Mpc^2]."""
    return now.gravity_neutrino + universe.gravity("massive_neutrino", now.scale_factor)


def _shares(now: Conditions, neutrino: np.ndarray) -> _Shares:
    radiation, matter = now.gravity_photon + neutrino, now.gravity_baryon + now.gravity_dark
    return _Shares(
        photon=now.gravity_photon / radiation,
        neutrino=neutrino / radiation,
        baryon=now.gravity_baryon / matter,
        dark=now.gravity_dark / matter,
    )


def _matter(now: Conditions, neutrino: np.ndarray) -> np.ndarray:
    """Solve y (1 + y/4) = matter over radiation for y."""
    ratio = (now.gravity_baryon + now.gravity_dark) / (now.gravity_photon + neutrino)
    return 2.0 * ratio / (1.0 + np.sqrt(1.0 + ratio))


def _series(beginning: Mapping, share: _Shares, x: np.ndarray, y: np.ndarray) -> dict[str, np.ndarray]:
    """Terms of every unknown at s = 1, shape (order, mode); see the module's text, whose letters these are."""
    moments = [f"neutrino_{moment}" for moment in range(2, LAST_MOMENT + 1)] + [_BEYOND]
    densities = {"delta_dark": 1.0, "delta_baryon": 1.0, "delta_photon": 4 / 3, "delta_neutrino": 4 / 3}  # 1 + p/rho
    names = ("trace", "curvature", "theta_baryon", "theta_neutrino", *densities, *moments)
    # Rows of zeros stand after the last order: there the indices -1 to -3 find the terms of negative order.
    terms = {name: np.zeros((ORDERS + 4, len(x))) for name in names}
    for name, value in beginning.items():
        terms[name][0] = value
    M, eta, v, w = (terms[name] for name in ("trace", "curvature", "theta_baryon", "theta_neutrino"))
    velocity = {"delta_dark": np.zeros_like(v), "delta_baryon": v, "delta_photon": v, "delta_neutrino": w}
    photon, neutrino, shear = terms["delta_photon"], terms["delta_neutrino"], terms["neutrino_2"]
    e, rho = y / 4.0, 0.75 * share.baryon * y / share.photon

    def matter(n: int) -> np.ndarray:
        return share.baryon * terms["delta_baryon"][n] + share.dark * terms["delta_dark"][n]

    for n in range(ORDERS):
        if n > 0:
            A = 2.0 * x**2 * (eta[n - 2] + 2.0 * e * eta[n - 3] + e**2 * eta[n - 4])
            A += 3.0 * y * (matter(n - 1) + e * matter(n - 2)) - 3.0 * e * M[n - 1] - 2.0 * e**2 * M[n - 2]
            M[n] = (n * A - 4.0 * x * (share.photon * v[n - 1] + share.neutrino * w[n - 1])) / (n + 2)
            for name, weight in densities.items():
                terms[name][n] = -weight * (x * velocity[name][n - 1] + M[n] / 2.0) / n
            for moment, (below, here, above) in enumerate(zip(moments, moments[1:], moments[2:], strict=False), 3):
                streaming = moment * terms[below][n - 1] - (moment + 1) * terms[above][n - 1]
                terms[here][n] = x * streaming / (2 * moment + 1) / n
            E = 2.0 * e * (n - 1) * eta[n - 1] + e**2 * (n - 2) * eta[n - 2]
            Q = (share.photon * photon[n] + share.neutrino * neutrino[n]) / (2 * (n + 1)) - E
            stream = x * (8 / 15 * w[n - 1] - 3 / 5 * terms["neutrino_3"][n - 1])
            shear[n] = (stream + 4 / 15 * M[n] + 8 / 5 * Q) / (n + 8 / 5 * share.neutrino / (n + 1))
            eta[n] = (Q - share.neutrino * shear[n] / (n + 1)) / n
        v[n + 1] = x * photon[n] / (4 * (n + 1)) - rho * (v[n] + e * v[n - 1])
        w[n + 1] = x * (neutrino[n] / 4.0 - shear[n] / 2.0) / (n + 1)
    return terms
