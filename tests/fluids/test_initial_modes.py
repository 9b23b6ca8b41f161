"""The initial modes beside the adiabatic one: their series, and what becomes of them, against closed forms."""

import numpy as np
import pytest
from courses import FINE, cosmology, course
from scipy.integrate import solve_ivp
from test_fluids_equations import NEUTRINO, PHOTON, published_rates

from twofluid.fluids import ChainLengths, Resolution, isocurvature
from twofluid.fluids.kinetic import ConstrainedKineticSystem
from twofluid.fluids.modes import BEGINNINGS
from twofluid.scenario.keys import INITIAL_MODES
from twofluid.solver import rate_matrix
from twofluid.universe import Universe

TRACE_OF_BARYONS = 1e-5  # baryon density low enough to drop from the dynamics at the level tested


def pure(mode):
    """System that starts from one mode alone."""

    class Pure(ConstrainedKineticSystem):
        def first_state(self, start):
            return super().first_state(start, {mode: np.ones(start.shape)})

    return Pure


def test_a_scenario_knows_every_mode():
    assert tuple(BEGINNINGS) == tuple(INITIAL_MODES)


# --- the series


def beginning(mode, effective_number=3.046, x=1e-3, k=1.0):
    """Unknowns of a mode at k tau = x, and the small numbers of its series: x, y, shares, baryon loading over y."""
    universe = Universe(cosmology(effective_number=effective_number))
    time = np.array([x / k])
    found = {name: values[0] for name, values in isocurvature(mode, universe, np.array([k]), time).items()}
    now = universe.conditions(time)
    radiation = (now.gravity_photon + now.gravity_neutrino)[0]
    matter = (now.gravity_baryon + now.gravity_dark)[0]
    y = 2.0 * (np.sqrt(1.0 + matter / radiation) - 1.0)  # a ~ tau + omega tau^2/4, y = omega tau
    R, G = now.gravity_neutrino[0] / radiation, now.gravity_photon[0] / radiation
    return found, x, y, R, G, now.gravity_baryon[0] / matter


# Bucher, Moodley & Turok 2000, section III (from memory), with Omega tau of theirs f y/4 here, contrasts scaled to
# unit entropy and velocities to unit relative velocity. 1e-4: next orders in x = 1e-3 and y = 8e-6.
CLOSE = {"rel": 1e-4, "abs": 0.0}


@pytest.mark.parametrize(("mode", "own", "other"), [("baryon", "delta_baryon", "delta_dark"),
                                                   ("dark_matter", "delta_dark", "delta_baryon")])  # fmt: skip
def test_matter_isocurvature_begins_as_published(mode, own, other):
    y0, x, y, R, _, share = beginning(mode)
    share = share if mode == "baryon" else 1.0 - share
    assert y0["metric_rate"] * x == pytest.approx(share * y, **CLOSE)
    assert y0["curvature"] == pytest.approx(-share * y / 6, **CLOSE)
    assert y0[own] - 1.0 == pytest.approx(-share * y / 2, rel=1e-3)
    assert y0[other] == pytest.approx(-share * y / 2, **CLOSE)
    assert y0["delta_photon"] == pytest.approx(-2 / 3 * share * y, **CLOSE)
    assert y0["delta_neutrino"] == pytest.approx(-2 / 3 * share * y, **CLOSE)
    assert y0["theta_baryon"] == pytest.approx(-share * y * x / 12, **CLOSE)
    assert y0["theta_neutrino"] == pytest.approx(-share * y * x / 12, **CLOSE)
    assert y0["neutrino_2"] == pytest.approx(-share * y * x**2 / (3 * (2 * R + 15)), **CLOSE)
    assert y0["neutrino_2"] != pytest.approx(-share * y * x**2 / (3 * 15), rel=0.03, abs=0.0)  # control


def test_second_order_of_matter_isocurvature():
    # h = 4 Omega tau - 6 Omega tau^2 there; the second term is measured by what two starts have over the first.
    def second(x):
        y0, x, y, _, _, share = beginning("dark_matter", x=x, k=1e-3)
        return y0["metric_rate"] * x / ((1.0 - share) * y) - 1.0, y

    (first, y1), (later, y2) = second(1e-4), second(1e-3)
    assert first / y1 == pytest.approx(-0.75, rel=0.01)
    assert later / y2 == pytest.approx(-0.75, rel=0.01)


@pytest.mark.parametrize("effective_number", [1.0, 3.046, 8.0])
def test_neutrino_density_begins_as_published(effective_number):
    y0, x, y, R, G, share = beginning("neutrino_density", effective_number)
    unit = 4 / 3 * G  # of their mode, delta_nu = 1
    assert y0["delta_neutrino"] == pytest.approx(unit * (1 - x**2 / 6), rel=1e-9)
    assert y0["delta_photon"] == pytest.approx(unit * R / G * (-1 + x**2 / 6), rel=1e-9)
    assert y0["curvature"] == pytest.approx(-unit * R / (6 * (15 + 4 * R)) * x**2, **CLOSE)
    assert y0["delta_baryon"] == pytest.approx(unit * R / G * x**2 / 8, **CLOSE)
    assert y0["theta_baryon"] == pytest.approx(-unit * R / G * x / 4, **CLOSE)
    assert y0["theta_neutrino"] == pytest.approx(unit * x / 4, **CLOSE)
    assert y0["neutrino_2"] == pytest.approx(unit * x**2 / (15 + 4 * R), **CLOSE)
    # Metric and dark matter: baryons as in the paper, h = Omega_b R/(10 G) k^2 tau^3, only where y >> x.
    y0, x, y, R, G, share = beginning("neutrino_density", effective_number, x=1e-5, k=1e-4)
    unit = 4 / 3 * G
    assert y0["metric_rate"] * x == pytest.approx(3 * unit * share * y / 4 * R / (10 * G) * x**2, rel=0.02)
    assert y0["delta_dark"] == pytest.approx(-unit * share * y / 4 * R / (20 * G) * x**2, rel=0.02)


@pytest.mark.parametrize("effective_number", [1.0, 3.046, 8.0])
def test_neutrino_velocity_begins_as_published(effective_number):
    y0, x, _, R, G, _ = beginning("neutrino_velocity", effective_number)
    unit = G  # of their mode, theta_nu = k
    assert y0["theta_neutrino"] == pytest.approx(unit * (1 - (9 + 4 * R) / (6 * (5 + 4 * R)) * x**2), rel=1e-9)
    assert y0["theta_neutrino"] - y0["theta_baryon"] == pytest.approx(1.0, abs=1e-4)
    assert y0["theta_baryon"] == pytest.approx(-unit * R / G, rel=1e-4)
    assert y0["curvature"] == pytest.approx(-unit * 4 * R / (3 * (5 + 4 * R)) * x, **CLOSE)
    assert y0["delta_baryon"] == pytest.approx(unit * R / G * x, **CLOSE)
    assert y0["delta_photon"] == pytest.approx(4 / 3 * unit * R / G * x, **CLOSE)
    assert y0["delta_neutrino"] == pytest.approx(-4 / 3 * unit * x, **CLOSE)
    assert y0["neutrino_2"] == pytest.approx(unit * 8 * x / (3 * (5 + 4 * R)), **CLOSE)
    assert y0["neutrino_3"] == pytest.approx(unit * 4 * x**2 / (7 * (5 + 4 * R)), **CLOSE)


def test_compensated_is_baryon_less_its_share_of_dark_matter():
    universe = Universe(cosmology())
    k, time = np.array([0.01, 10.0]), np.array([0.5, 5e-4])
    baryon, dark, compensated = (isocurvature(mode, universe, k, time) for mode in
                                 ("baryon", "dark_matter", "compensated"))  # fmt: skip
    weight = 0.02237 / 0.12
    for name, values in compensated.items():
        np.testing.assert_allclose(values, baryon[name] - weight * dark[name], atol=1e-15, err_msg=name)
    assert np.all(compensated["metric_rate"] == pytest.approx(0.0, abs=1e-15))


@pytest.mark.parametrize("mode", BEGINNINGS)
def test_series_solve_the_equations_of_the_closure(mode):
    # Slopes by differences of the series (five points, 4e-10 of the series' own orders) against the closure's rates;
    # plasma momentum and not its two velocities, since the series has no slip.
    universe = Universe(cosmology())
    k, tau = np.array([0.02]), 0.5  # x = 0.01, y = 0.004
    system = ConstrainedKineticSystem(universe, k, ChainLengths(8, 8, 32))  # absorbing layer 1e-7 of N_3
    row = system.unknowns.index

    def state(time):
        return system.first_state(np.array([time]), {mode: np.ones(1)})[:, 0]

    step = 0.02 * tau
    weights = {-2: 1 / 12, -1: -2 / 3, 1: 2 / 3, 2: -1 / 12}
    slope = sum(weight * state(tau + place * step) for place, weight in weights.items()) / step
    matrix = rate_matrix(system, 0, tau)
    y = state(tau)
    expected, largest = matrix @ y, np.abs(matrix * y).max(axis=1)
    loading = 1.0 / universe.conditions(np.array([tau])).photon_baryon_ratio[0]
    momentum = np.zeros(len(y))
    momentum[row("theta_baryon")], momentum[row("slip")] = loading + 1.0, -1.0
    names = ("curvature", "metric_rate", "delta_dark", "delta_baryon", "delta_photon", "delta_neutrino",
             "theta_neutrino", "neutrino_2", "neutrino_3")  # fmt: skip
    followed = [row(name) for name in names]
    for place in followed:
        rounding = 1e-14 * abs(y[place]) / step
        assert slope[place] == pytest.approx(expected[place], abs=1e-7 * largest[place] + rounding), place
    # 1e-5: gas pressure, which the series leaves out.
    assert momentum @ slope == pytest.approx(momentum @ expected, rel=1e-5, abs=1e-11)


# --- what becomes of them


def test_entropies_and_relative_velocity_stay_outside_the_horizon():
    # Fluids that exchange nothing keep delta/(1+w) less that of another (Wands et al. 2000, from memory).
    def run(mode):
        return course(cosmology(), 1e-4, end=1e-3, system_class=pure(mode))  # k tau = 0.03 at the end

    for mode, contrast in (("baryon", "delta_baryon"), ("dark_matter", "delta_dark"), ("compensated", "delta_baryon")):
        found = run(mode)
        np.testing.assert_allclose(getattr(found, contrast) - 0.75 * found.delta_photon, 1.0, atol=3e-4)
    found = run("neutrino_density")
    np.testing.assert_allclose(0.75 * (found.delta_neutrino - found.delta_photon), 1.0, atol=1e-3)
    found = run("neutrino_velocity")
    early = found.x < 1e-3  # later baryons slow the plasma down
    np.testing.assert_allclose((found.theta_neutrino - found.theta_baryon)[early], 1.0, atol=0.02)


def curvature_of_comoving_slices(run):
    """Curvature with the sign of the contrasts: -(eta + H theta/k^2) with theta of all that moves."""
    now, k = run.now, run.x[0] / run.tau[0]
    photon, neutrino = 4 / 3 * now.gravity_photon, 4 / 3 * now.gravity_neutrino
    moving = photon * (run.theta_baryon - run.slip) + neutrino * run.theta_neutrino
    moving += now.gravity_baryon * run.theta_baryon
    theta = moving / (photon + neutrino + now.gravity_baryon + now.gravity_dark)
    return -(run.curvature + now.hubble_rate * theta / k)


def curvature_misfit(mode):
    """Largest departure from zeta = (S/3) 3 rho_m/(4 rho_r + 3 rho_m), over S.

    Wands, Malik, Lyth & Liddle 2000 (from memory): every fluid has a conserved curvature of its own, S/3 for the one
    with the entropy S and nothing for the others, and what all have is their mean with the weights rho + p.
    """
    run = course(cosmology(), 1e-4, 0.01, system_class=pure(mode))  # k tau = 0.1 at the end
    now = run.now
    matter, radiation = now.gravity_baryon + now.gravity_dark, now.gravity_photon + now.gravity_neutrino
    share = (now.gravity_baryon if mode == "baryon" else now.gravity_dark) / matter
    expected = share * matter / (4 * radiation + 3 * matter)
    return np.abs(curvature_of_comoving_slices(run) - expected).max()


@pytest.mark.parametrize(("mode", "share"), [("baryon", 0.157), ("dark_matter", 0.843)])
def test_curvature_of_matter_isocurvature_outside_the_horizon(mode, share):
    # 2e-3 of what it comes to: gradients, (k tau)^2 / 10.
    assert curvature_misfit(mode) < 2e-3 * share / 3


def test_dark_matter_isocurvature_is_the_growing_mode_of_meszaros():
    # Meszaros 1974: far inside the horizon an excess of dark matter at rest grows as 1 + 3 y/2.
    run = course(cosmology(baryon_density=TRACE_OF_BARYONS), 3000.0, end=0.03, system_class=pure("dark_matter"))
    now = run.now
    y = (now.gravity_baryon + now.gravity_dark) / (now.gravity_photon + now.gravity_neutrino)
    np.testing.assert_allclose(run.delta_dark, 1 + 1.5 * y, rtol=4e-4)  # 1e-4 of baryons that stay smooth
    assert np.abs(run.delta_dark / (1 + y) - 1.0).max() > 0.3  # control


def test_compensated_matter_never_moves_where_there_is_no_pressure():
    # No source of gravity: closed form, both contrasts stay.
    run = course(cosmology(), 0.5, system_class=pure("compensated"))
    np.testing.assert_allclose(run.delta_baryon, 1.0, atol=3e-4)  # pressure, (k/k_F)^2 with k_F near 40/Mpc
    np.testing.assert_allclose(run.delta_dark, -0.02237 / 0.12, atol=3e-4)


@pytest.mark.parametrize("mode", BEGINNINGS)
def test_same_solution_as_a_general_solver_on_the_published_equations(mode):
    # General library: scipy.integrate.solve_ivp on equations written independently, from the series at k tau = 0.01.
    k, end = 0.05, 1 / 601.0
    resolution = Resolution(FINE.stepping, ChainLengths(PHOTON, PHOTON, NEUTRINO))
    run = course(cosmology(), k, end, resolution, pure(mode))
    universe = run.universe
    first = int(np.searchsorted(run.x, 0.03))
    start = {name: v[0] for name, v in isocurvature(mode, universe, np.array([k]), run.tau[first : first + 1]).items()}
    neutrino = 5 + 2 * (PHOTON + 1)
    y = np.zeros(neutrino + NEUTRINO + 2)  # the last: cold dark matter stays at rest
    y[0], y[1], y[2] = start["curvature"], start["delta_dark"], start["delta_baryon"]
    y[3], y[4] = k * start["theta_baryon"], start["delta_gas_temperature"]
    y[5:7] = start["delta_photon"], 4 / 3 * start["theta_baryon"]
    y[neutrino : neutrino + 2] = start["delta_neutrino"], 4 / 3 * start["theta_neutrino"]
    y[neutrino + 2 : neutrino + 5] = [start[f"neutrino_{moment}"] for moment in (2, 3, 4)]
    general = solve_ivp(published_rates(universe, k), run.tau[[first, -1]], y, method="Radau", rtol=1e-6, atol=1e-9)
    assert general.success
    size = max(abs(run.delta_dark).max(), abs(run.delta_baryon).max())
    assert run.delta_dark[-1] == pytest.approx(general.y[1, -1], abs=5e-5 * size)
    assert run.delta_baryon[-1] == pytest.approx(general.y[2, -1], abs=2e-4 * size)
