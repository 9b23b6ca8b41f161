"""Follow every unknown of a universe, to test the equations in limits with closed forms."""

from types import SimpleNamespace

import numpy as np

from twofluid.fluids import ChainLengths, KineticSystem, Resolution, Stepping, clock, start_time
from twofluid.scenario import Cosmology, Neutrinos
from twofluid.solver import integrate
from twofluid.universe import Universe

FINE = Resolution(
    Stepping(
        outside_step=0.1,
        smooth_step=0.05,
        free_step=0.05,
        scattering_change=0.5,
        phase_step=0.4,
        diffusion_exponent=40.0,
        felt_phase=400.0,
    ),
    ChainLengths(photon=12, polarization=12, neutrino=16),
)


def cosmology(effective_number=3.046, **changes):
    """Parameters of the independent brute-force integration, with changes."""
    values = {"hubble_constant": 67.36, "baryon_density": 0.02237, "dark_matter_density": 0.12}
    values |= {"photon_temperature": 2.7255, "helium_mass_fraction": 0.2454}
    return Cosmology(**(values | changes), neutrinos=Neutrinos(effective_number=effective_number))


def course(asked, wavenumber, end=1.0, resolution=FINE, system_class=KineticSystem):
    """Integrate one mode to a scale factor `end`.

    Returns a namespace of arrays, shape (boundary,): every unknown by name, `tau`, `x` = k tau, `now`
    (conditions), `universe`.
    """
    universe = Universe(asked)
    k = np.array([wavenumber])
    start = start_time(universe, k)
    system = system_class(universe, k, resolution.chains)
    last = float(universe.conformal_time(end))
    marks = np.array([*(time for time in system.switches if time < last), last])
    times = np.exp(clock(universe, k, start, marks, resolution.stepping).boundaries)
    observed = integrate(system, times, system.first_state(start), system.unknowns).observed[..., 0]
    tau = times[:, 0]
    rows = dict(zip(system.unknowns, observed, strict=True))
    return SimpleNamespace(**rows, tau=tau, x=wavenumber * tau, now=universe.conditions(tau), universe=universe)


def radiation_potential(run):
    """Potential phi of the conformal Newtonian gauge, from the synchronous amplitudes.

    Ma & Bertschinger 1995, eq. 18 b (number from memory): phi = eta - H alpha, k^2 alpha = (h' + 6 eta') / 2.
    """
    return -(run.curvature - run.now.hubble_rate * metric_shift(run))


def metric_shift(run):
    """Shift alpha between the synchronous and the Newtonian gauge [Mpc], per unit curvature."""
    k = run.x[0] / run.tau[0]
    now = run.now
    momentum = now.gravity_photon * (run.theta_baryon - run.slip) + now.gravity_neutrino * run.theta_neutrino
    curvature_rate = (2.0 / 3.0 * momentum + now.gravity_baryon * run.theta_baryon / 2.0) / k
    return (k * run.metric_rate + 6.0 * curvature_rate) / (2.0 * k**2)
