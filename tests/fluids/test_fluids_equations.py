"""The rates against an independent writing of the equations, and the clock's rules."""

from dataclasses import replace

import numpy as np
import pytest
from courses import FINE, cosmology, course
from scipy.integrate import solve_ivp

from twofluid.fluids import ChainLengths, KineticSystem, Resolution, clock, resolution_for, start_time
from twofluid.fluids.kinetic import ConstrainedKineticSystem
from twofluid.fluids.stepping import oscillation_matters
from twofluid.scenario import DarkMatter, Neutrinos
from twofluid.solver import NODES, integrate, rate_matrix
from twofluid.solver.collocation import INVERSE_WEIGHTS, STATE_LOAD
from twofluid.universe import Universe

PHOTON, NEUTRINO = 6, 7  # highest moments of the comparison


def published_rates(universe, k):
    """Write the equations as published: theta_baryon and theta_photon, and h' from the energy constraint.

    Ma & Bertschinger 1995, eqs 21 a, 21 b, 42, 49, 63, 64, 66 (numbers from memory), with the same absorbing layer.
    Rows: eta, delta_c, delta_b, theta_b, delta_T, photon F_0..., polarization G_0..., neutrinos N_0..., theta_c of
    dark matter with pressure.
    """
    from twofluid.fluids.kinetic import NEUTRINO_LAYER, PHOTON_LAYER

    def chain(F, kappa, layer):
        last = len(F) - 1
        moment = np.arange(last + 1)
        up = np.append(F[1:], 0.0)
        down = np.insert(F[:-1], 0, 0.0)
        absorbed = np.where(moment >= 3, layer[0] * (moment / last) ** layer[1] * k, 0.0)
        return k / (2 * moment + 1) * (moment * down - (moment + 1) * up) - (kappa + absorbed) * F

    def rates(tau, y):
        now = universe.conditions(np.array([tau]))
        g = {name: getattr(now, f"gravity_{name}")[0] for name in ("photon", "neutrino", "baryon", "dark")}
        H, kappa, r = now.hubble_rate[0], now.scattering_rate[0], now.photon_baryon_ratio[0]
        sound, gamma = now.isothermal_sound_speed_squared[0], now.compton_rate[0]
        warmth = now.photon_gas_temperature_ratio[0]
        eta, dark, baryon, theta, warm = y[:5]
        F, G, N = np.split(y[5:-1], [PHOTON + 1, 2 * PHOTON + 2])
        theta_dark, speed = y[-1], universe.dark_sound_speed(now.scale_factor[0])
        theta_photon, theta_neutrino = 0.75 * k * F[1], 0.75 * k * N[1]
        energy = g["dark"] * dark + g["baryon"] * baryon + g["photon"] * F[0] + g["neutrino"] * N[0]
        metric = (2 * k**2 * eta + energy) / H
        momentum = g["baryon"] * theta + g["dark"] * theta_dark
        momentum += 4 / 3 * (g["photon"] * theta_photon + g["neutrino"] * theta_neutrino)
        eta_rate = momentum / (2 * k**2)
        baryon_rate = -theta - metric / 2
        theta_rate = -H * theta + k**2 * sound * (baryon + warm) + r * kappa * (theta_photon - theta)
        warm_rate = 2 / 3 * baryon_rate + gamma * (warmth * (1.25 * F[0] - warm) - F[0])
        dF, dG = chain(F, kappa, PHOTON_LAYER), chain(G, kappa, PHOTON_LAYER)
        dN = chain(N, 0.0, NEUTRINO_LAYER)
        source = F[2] + G[0] + G[2]
        dF[0] += kappa * F[0] - 2 / 3 * metric
        dF[1] += 4 / 3 * kappa * theta / k
        dF[2] += 4 / 15 * metric + 8 / 5 * eta_rate + kappa * source / 10
        dG[0] += kappa * source / 2
        dG[2] += kappa * source / 10
        dN[0] -= 2 / 3 * metric
        dN[2] += 4 / 15 * metric + 8 / 5 * eta_rate
        dark_rate, push = -theta_dark - metric / 2, -H * theta_dark + (k * speed) ** 2 * dark
        return np.concatenate([[eta_rate, dark_rate, baryon_rate, theta_rate, warm_rate], dF, dG, dN, [push]])

    return rates


@pytest.mark.parametrize(("k", "law"), [(0.03, DarkMatter()), (0.4, DarkMatter()), (0.4, DarkMatter(50.0, 0.0, 0.5))])
def test_same_solution_as_a_general_solver_on_the_published_equations(k, law):
    # General library: scipy.integrate.solve_ivp (Radau, tight tolerance) on equations written independently.
    resolution = Resolution(FINE.stepping, ChainLengths(PHOTON, PHOTON, NEUTRINO))
    end = 1 / 401.0
    run = course(cosmology(dark_matter=law), k, end=end, resolution=resolution)
    universe = run.universe
    neutrino = 5 + 2 * (PHOTON + 1)
    y = np.zeros(neutrino + NEUTRINO + 2)
    # h' from k^2 eta loses digits as (k tau)^2 far outside the horizon: the general solver takes over at k tau = 0.3.
    first = int(np.searchsorted(run.x, 0.3))
    for place, name in ((0, "curvature"), (1, "delta_dark"), (2, "delta_baryon"), (4, "delta_gas_temperature")):
        y[place] = getattr(run, name)[first]
    y[3] = k * run.theta_baryon[first]
    y[5:7] = run.delta_photon[first], 4 / 3 * (run.theta_baryon[first] - run.slip[first])
    y[7 : 5 + PHOTON + 1] = [getattr(run, f"photon_{m}")[first] for m in range(2, PHOTON + 1)]
    y[5 + PHOTON + 1 : neutrino] = [getattr(run, f"polarization_{m}")[first] for m in range(PHOTON + 1)]
    y[neutrino : neutrino + 2] = run.delta_neutrino[first], 4 / 3 * run.theta_neutrino[first]
    y[neutrino + 2 : -1] = [getattr(run, f"neutrino_{m}")[first] for m in range(2, NEUTRINO + 1)]
    y[-1] = k * run.theta_dark[first] if universe.has_dark_pressure else 0.0
    rates = published_rates(universe, k)
    general = solve_ivp(rates, run.tau[[first, -1]], y, method="Radau", rtol=1e-7, atol=1e-9)
    assert general.success
    expected = general.y[:, -1]
    # 5e-5: the constraint's leftover from the start, (k tau)^2 of the series, enters one and not the other.
    assert run.delta_dark[-1] == pytest.approx(expected[1], rel=5e-5)
    assert run.delta_baryon[-1] == pytest.approx(expected[2], rel=2e-4)
    assert run.delta_gas_temperature[-1] == pytest.approx(expected[4], abs=2e-4 * abs(expected[2]))
    if universe.has_dark_pressure:
        assert k * run.theta_dark[-1] == pytest.approx(expected[-1], rel=2e-4)
        assert abs(expected[-1]) > 0.1 * run.now.hubble_rate[-1] * abs(expected[1])  # it does something


@pytest.mark.parametrize("time", [1.0, 280.0, 3000.0])  # [Mpc]: tied plasma, recombination, free streaming
@pytest.mark.parametrize(
    ("asked", "system_class", "fluctuations"),
    [
        (cosmology(), KineticSystem, False),
        (cosmology(dark_matter=DarkMatter(50.0, 0.0, 0.5)), KineticSystem, True),
        (replace(cosmology(), neutrinos=Neutrinos(3.046, (0.06, 0.3))), ConstrainedKineticSystem, False),
    ],
    ids=["plain", "pressure and electrons", "massive, held to the constraint"],
)
def test_one_step_against_the_whole_matrix(asked, system_class, fluctuations, time):
    # General library: numpy.linalg.solve on the stage equations with every entry written out, tails included.
    universe = Universe(asked)
    system = system_class(universe, np.array([0.3]), ChainLengths(9, 7, 8, 8, 3), fluctuations)
    count, step = len(system.unknowns), 0.3 * time
    state = np.random.default_rng(1).normal(size=(count, 1))
    found = integrate(system, np.array([[time], [time + step]]), state, system.unknowns).observed[:, 1, 0]
    matrix = np.kron(INVERSE_WEIGHTS, np.eye(count))  # stage by stage
    for stage, node in enumerate(NODES):
        here = slice(stage * count, (stage + 1) * count)
        matrix[here, here] -= step * rate_matrix(system, 0, time + node * step)
    expected = np.linalg.solve(matrix, np.kron(STATE_LOAD, state[:, 0]))[-count:]
    np.testing.assert_allclose(found, expected, rtol=1e-8, atol=1e-10 * np.abs(expected).max())


def test_constraint_notices_a_wrong_coefficient():
    # The Einstein energy constraint (Ma & Bertschinger 1995, eq. 21 a) ties metric, densities and velocities together.
    class Wrong(KineticSystem):
        def step_rates(self, modes, time, step):
            rates = super().step_rates(modes, time, step)
            entry = (self.unknowns.index("metric_rate"), self.unknowns.index("delta_baryon"))
            rates.entries[entry] = 1.02 * rates.entries[entry]
            return rates

    def drift(system_class):
        run = course(cosmology(), 0.2, system_class=system_class)
        k, now = 0.2, run.now
        densities = sum(
            getattr(now, f"gravity_{name}") / k**2 * getattr(run, f"delta_{name}") / 2
            for name in ("photon", "neutrino", "baryon", "dark")
        )
        constraint = run.curvature - now.hubble_rate / k * run.metric_rate / 2 + densities
        return np.abs(np.diff(constraint)).sum() / np.abs(run.curvature[-1])

    assert drift(KineticSystem) < 1e-5
    assert drift(Wrong) > 1e-3


def test_photon_and_polarization_chains_share_their_rates():
    universe = Universe(cosmology())
    system = KineticSystem(universe, np.array([0.1]), ChainLengths(8, 8, 10))
    rates = system.step_rates(np.array([0]), np.full((3, 1), 200.0), np.ones(1))
    photon, polarization, neutrino = rates.tails
    assert photon is polarization and photon is not neutrino
    assert system.tails[0].like(system.tails[1]) and not system.tails[0].like(system.tails[2])


def test_unknowns_of_unequal_chains():
    system = KineticSystem(Universe(cosmology()), np.array([0.1]), ChainLengths(5, 7, 6))
    assert len(system.unknowns) == len(set(system.unknowns)) == 1 + (3 + 5 + 4) + 4 + 10
    assert np.all(np.any(rate_matrix(system, 0, 300.0) != 0.0, axis=1))  # every unknown has an equation


def laid_out(asked, k):
    universe = Universe(asked)
    k = np.atleast_1d(k)
    start = start_time(universe, k)
    stepping = resolution_for(universe).stepping
    marks = universe.conformal_time(np.array([1e-3, 1.0]))
    return universe, stepping, clock(universe, k, start, marks, stepping)


def test_start_is_early_enough():
    universe = Universe(cosmology())
    k = np.array([1e-4, 0.01, 1.0, 1e3, 1e5])
    start = start_time(universe, k)
    assert np.all(k * start <= 0.01 * (1 + 1e-12))
    assert start.max() < 1e-3  # long waves once started at 0.05 Mpc: that cost 1e-4


def test_oscillation_is_resolved_while_it_matters():
    universe, stepping, plan = laid_out(cosmology(), 0.3)
    tau = np.exp(plan.boundaries[: plan.steps[0] + 1, 0])
    matters = oscillation_matters(universe, np.array([0.3]), tau, stepping, tau[-1:])[0][0]
    phase = 0.3 * np.diff(tau)
    assert np.all(phase[matters[1:]] <= stepping.phase_step * 1.02)  # density interpolated on its grid
    assert phase[~matters[1:] & (tau[1:] > 1000.0)].min() > stepping.phase_step


@pytest.mark.parametrize(("dark", "baryon"), [(0.12, 0.02237), (0.08, 0.06), (0.0, 0.14)])
def test_oscillation_matters_longer_without_dark_matter(dark, baryon):
    universe, stepping, _ = laid_out(cosmology(dark_matter_density=dark, baryon_density=baryon), 20.0)
    tau = universe.conformal_time(np.geomspace(1e-8, 1.0, 400))
    last = 20.0 * tau[oscillation_matters(universe, np.array([20.0]), tau, stepping, tau[-1:])[0][0]].max()
    if dark == 0.0:
        exponent = (20.0 / universe.diffusion_wavenumber(universe.scale_factor(last / 20.0))) ** 2
        assert exponent > 0.8 * stepping.diffusion_exponent
    else:
        assert last == pytest.approx(stepping.felt_phase / (dark / (dark + baryon)), rel=0.06)


def test_oscillation_is_resolved_up_to_a_redshift_asked_for():
    universe, stepping, _ = laid_out(cosmology(), 1.5)
    tau = universe.conformal_time(np.geomspace(1e-8, 1.0, 400))
    early = universe.conformal_time(np.array([1 / 2001.0, 1.0]))
    plain, seen = (found[0] for found in oscillation_matters(universe, np.array([1.5]), tau, stepping, tau[-1:]))
    asked, asked_seen = (found[0] for found in oscillation_matters(universe, np.array([1.5]), tau, stepping, early))
    assert not seen.any() and np.all(asked_seen[asked])
    assert tau[plain].max() < 0.8 * early[0]  # its gravity is no longer felt, and it will be damped
    assert tau[asked].max() == pytest.approx(early[0], rel=0.03)  # but here somebody looks


def test_steps_a_mode_takes_are_bounded():
    # Cost is guarded by counts: measured 186 at the most (k = 0.6), 99 on average in a standard universe.
    _, _, plan = laid_out(cosmology(), np.geomspace(1e-4, 1e4, 60))
    assert plan.steps.max() <= 190
    assert plan.steps.mean() <= 105
    smallest, acoustic = (laid_out(cosmology(), k)[2].steps[0] for k in (1e4, 0.1))
    assert smallest <= 1.2 * acoustic  # short waves are born early, in steps that are long for that


def test_resolution_follows_the_universe():
    ruled = resolution_for(Universe(cosmology()))
    alone = resolution_for(Universe(cosmology(dark_matter_density=0.0)))
    assert alone.stepping.phase_step < ruled.stepping.phase_step
    assert alone.chains.photon > ruled.chains.photon
