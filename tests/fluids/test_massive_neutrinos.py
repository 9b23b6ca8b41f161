"""Neutrinos with mass: against equations written independently, closed forms, and their limits."""

from dataclasses import replace

import numpy as np
import pytest
from courses import FINE, cosmology, course
from scipy.integrate import solve_ivp
from scipy.special import roots_laguerre

from twofluid import evolve, evolve_many
from twofluid.fluids import ChainLengths, KineticSystem, resolution_for
from twofluid.scenario import Method, Mixture, Neutrinos, Primordial, Sampling, Scenario, Share
from twofluid.universe import Universe

ZETA_3 = 1.2020569031595942
MOMENT, MOMENTA = 6, 12  # highest moment and momenta of the general solver


def massive(*masses, **changes):
    return replace(cosmology(**changes), neutrinos=Neutrinos(3.046, masses))


def scenario(asked, wavenumbers, redshifts=(0.0,), accuracy="standard", **initial):
    sampling = Sampling(wavenumbers, redshifts)
    return Scenario("Saltmarsh test", asked, Primordial(**initial), sampling, {}, method=Method(accuracy=accuracy))


class Published:
    """The equations of Ma & Bertschinger 1995 as published, eqs 21 a and b, 42, 49 to 58, 63, 64, 66 (from memory).

    Psi of every momentum, h' from the energy constraint, with the same absorbing layers. The momenta are
    Gauss-Laguerre's. Rows: eta, delta_c, delta_b, theta_b, delta_T, photon F_0..., polarization G_0..., neutrinos
    N_0..., and for each momentum Psi_0... The gas is as in `kinetic`.
    """

    def __init__(self, universe, k):
        from twofluid.fluids.kinetic import NEUTRINO_LAYER, PHOTON_LAYER
        from twofluid.fluids.massive import LAYER

        self.layers = PHOTON_LAYER, NEUTRINO_LAYER, LAYER
        self.universe, self.k = universe, k
        self.q, weight = roots_laguerre(MOMENTA)
        self.weight = weight / (1.0 + np.exp(-self.q))  # times f = e^-q/(1 + e^-q)
        self.slope = -self.q / (1.0 + np.exp(-self.q))  # d ln f/d ln q
        (self.mass,), (density,) = universe.contents.mass, universe.contents.massive
        self.density = density / (7.0 * np.pi**4 / 120.0)  # 8 pi G over the fourth power of temperature

    def chain(self, F, speed, kappa, layer):
        last = len(F) - 1
        moment = np.arange(last + 1)[:, None]
        up, down = np.vstack([F[1:], 0.0 * F[:1]]), np.vstack([0.0 * F[:1], F[:-1]])
        absorbed = np.where(moment >= 3, layer[0] * (moment / last) ** layer[1] * speed, 0.0)
        return speed / (2 * moment + 1) * (moment * down - (moment + 1) * up) - (kappa + absorbed) * F

    def __call__(self, tau, y):
        """Rates of states y, shape (row,) or (row, state)."""
        k, now = self.k, self.universe.conditions(np.array([tau]))
        a, H, kappa = now.scale_factor[0], now.hubble_rate[0], now.scattering_rate[0]
        g = {name: getattr(now, f"gravity_{name}")[0] for name in ("photon", "neutrino", "baryon", "dark")}
        r, sound, gamma = (
            getattr(now, name)[0]
            for name in ("photon_baryon_ratio", "isothermal_sound_speed_squared", "compton_rate")
        )
        warmth = now.photon_gas_temperature_ratio[0]
        rows = y.reshape(len(y), -1)
        eta, dark, baryon, theta, warm = rows[:5]
        size = MOMENT + 1
        F, G, N = (rows[5 + part * size : 5 + (part + 1) * size] for part in range(3))
        psi = rows[5 + 3 * size :].reshape(MOMENTA, size, -1)
        energy = np.sqrt(self.q**2 + (a * self.mass) ** 2)
        share = self.density / a**2 * self.weight  # 8 pi G a^2, sums over q
        density = np.einsum("q,qs->s", share * self.q**2 * energy, psi[:, 0])
        momentum = k * np.einsum("q,qs->s", share * self.q**3, psi[:, 1])  # (rho + P) theta
        theta_photon, theta_neutrino = 0.75 * k * F[1], 0.75 * k * N[1]
        density = density + g["dark"] * dark + g["baryon"] * baryon + g["photon"] * F[0] + g["neutrino"] * N[0]
        metric = (2 * k**2 * eta + density) / H
        momentum = momentum + g["baryon"] * theta + 4 / 3 * g["photon"] * theta_photon
        momentum = momentum + 4 / 3 * g["neutrino"] * theta_neutrino
        eta_rate = momentum / (2 * k**2)
        baryon_rate = -theta - metric / 2
        theta_rate = -H * theta + k**2 * sound * (baryon + warm) + r * kappa * (theta_photon - theta)
        warm_rate = 2 / 3 * baryon_rate + gamma * (warmth * (1.25 * F[0] - warm) - F[0])
        dF, dG = (self.chain(part, k, kappa, self.layers[0]) for part in (F, G))
        dN = self.chain(N, k, 0.0, self.layers[1])
        source = F[2] + G[0] + G[2]
        dF[0] += kappa * F[0] - 2 / 3 * metric
        dF[1] += 4 / 3 * kappa * theta / k
        dF[2] += 4 / 15 * metric + 8 / 5 * eta_rate + kappa * source / 10
        dG[0] += kappa * source / 2
        dG[2] += kappa * source / 10
        dN[0] -= 2 / 3 * metric
        dN[2] += 4 / 15 * metric + 8 / 5 * eta_rate
        rates = [eta_rate, -metric / 2, baryon_rate, theta_rate, warm_rate, *dF, *dG, *dN]
        for q, root, slope, part in zip(self.q, energy, self.slope, psi, strict=True):
            change = self.chain(part, k * q / root, 0.0, self.layers[2])
            change[0] += metric / 6 * slope
            change[2] -= (metric / 15 + 2 / 5 * eta_rate) * slope
            rates += [*change]
        return np.array(rates).reshape(y.shape)

    def jacobian(self, tau, y):
        return self(tau, np.eye(len(y)))


def test_same_solution_as_a_general_solver_on_the_published_equations():
    # General library: scipy.integrate.solve_ivp (Radau, tight tolerance), from k tau = 0.3, where the neutrinos are
    # still fast, to z = 10, where they have been slow since z = 2000; they are a tenth of all matter.
    k, asked = 0.1, massive(1.0, 1.0, 1.0, dark_matter_density=0.09)
    resolution = replace(FINE, chains=ChainLengths(MOMENT, MOMENT, MOMENT, MOMENT, 8))
    run = course(asked, k, end=1 / 11.0, resolution=resolution)
    published = Published(run.universe, k)
    first = int(np.searchsorted(run.x, 0.3))

    def at(name):
        return getattr(run, name)[first]

    size = MOMENT + 1
    y = np.zeros(5 + (3 + MOMENTA) * size)
    y[:5] = at("curvature"), at("delta_dark"), at("delta_baryon"), k * at("theta_baryon"), at("delta_gas_temperature")
    y[5:7] = at("delta_photon"), 4 / 3 * (at("theta_baryon") - at("slip"))
    y[7 : 5 + size] = [at(f"photon_{moment}") for moment in range(2, size)]
    y[5 + size : 5 + 2 * size] = [at(f"polarization_{moment}") for moment in range(size)]
    fast = np.array([at(f"massive_0_4_{moment}") for moment in range(size)])  # at any momentum, as all still are alike
    fast[2] += 8 / 5 * at("curvature")
    y[5 + 3 * size :] = (-published.slope[:, None] / 4 * fast).ravel()
    general = solve_ivp(
        published, run.tau[[first, -1]], y, method="Radau", rtol=1e-5, atol=1e-8, jac=published.jacobian
    )
    assert general.success
    expected = general.y[:, -1]
    # 2e-4: in q the neutrinos are not all alike any more at k tau = 0.3 (a m/T = 0.1 to 0.5), and twelve momenta of
    # Gauss and Laguerre are good to 1e-4.
    assert run.delta_dark[-1] == pytest.approx(expected[1], rel=2e-4)
    assert run.delta_baryon[-1] == pytest.approx(expected[2], rel=2e-4)
    number = published.weight * published.q**2
    contrast = number @ expected[5 + 3 * size :: size] / number.sum()
    ours = sum(weight * getattr(run, f"massive_0_{n}_0")[-1] for n, weight in enumerate(number_weights(8)))
    assert ours == pytest.approx(contrast, rel=1e-3)


def number_weights(momenta):
    """Weights of the contrasts of every momentum in that of the number."""
    from twofluid.universe.fermi_dirac import momentum_sum

    _, weights = momentum_sum(momenta)
    return 0.75 * weights / weights.sum()


def test_without_mass_nothing_is_added():
    k, z = (0.01, 1.0, 100.0), (100.0, 0.0)
    massless, zero = (evolve(scenario(asked, k, z)) for asked in (cosmology(), massive(0.0)))
    assert zero.counts == massless.counts
    assert zero.delta_neutrino is None and zero.evolved == massless.evolved
    for name in zero.evolved:
        assert np.array_equal(getattr(zero, name), getattr(massless, name))
    universe = Universe(massive(0.0))
    system = KineticSystem(universe, np.array(k), ChainLengths(8, 8, 10))
    assert len(system.unknowns) == 1 + (6 + 6 + 8) + 4 + 10  # as counted in the tests of the massless equations
    massive_system = KineticSystem(Universe(massive(0.1, 0.2, 0.1)), np.array(k), ChainLengths(8, 8, 10, 9, 5))
    assert len(massive_system.unknowns) == len(system.unknowns) + 2 * 5 * 10  # equal masses share their momenta


def test_next_to_no_mass_is_no_mass():
    k, z = (0.003, 0.05, 1.0, 100.0), (1000.0, 100.0, 0.0)
    massless, nearly = (evolve(scenario(asked, k, z)) for asked in (cosmology(), massive(1e-8, 1e-8, 1e-8)))
    assert nearly.delta_dark == pytest.approx(massless.delta_dark, rel=1e-7)
    assert nearly.delta_baryon == pytest.approx(massless.delta_baryon, rel=1e-6)


def test_constraint_holds_as_well_as_without_masses():
    k = tuple(np.geomspace(1e-3, 100.0, 12))
    massless, heavy = (evolve(scenario(asked, k)) for asked in (cosmology(), massive(0.06, 0.5)))
    assert heavy.constraint.max() < 1.3 * massless.constraint.max()


@pytest.mark.parametrize("masses", [(0.06,), (0.3, 0.3, 0.3)])
def test_momenta_and_moments_are_enough(masses):
    k = (0.005, 0.02, 0.1, 1.0, 100.0)
    asked = scenario(massive(*masses), k, (100.0, 10.0, 0.0))
    universe = Universe(asked.cosmology)
    standard = resolution_for(universe)

    def run(moment, momenta):
        chains = replace(standard.chains, massive=moment, momenta=momenta)
        return evolve(asked, universe=universe, resolution=replace(standard, chains=chains))

    fine, chosen, poor = run(24, 10), run(standard.chains.massive, standard.chains.momenta), run(5, 2)
    error, worse = (np.abs(other.delta_dark / fine.delta_dark - 1.0).max() for other in (chosen, poor))
    assert error < 3e-5  # a tenth of what the accuracy promises
    assert worse > 3e-4  # negative control
    # What little contrast fast neutrinos have is less exact: it hardly pulls, and no promise is made for it.
    falling = np.array(k) <= 1.0
    assert chosen.delta_neutrino[falling] == pytest.approx(fine.delta_neutrino[falling], rel=1e-2)


def test_refined_resolution_refines_them_too():
    standard = resolution_for(Universe(massive(0.06)))
    refined = standard.refined()
    assert refined.chains.massive == 1.5 * standard.chains.massive
    assert refined.chains.momenta >= 1.5 * standard.chains.momenta


def test_neutrinos_fall_in_where_they_cannot_stream_and_lag_where_they_can():
    k = (0.001, 30.0, 100.0)
    run = evolve(scenario(massive(0.3, 0.3, 0.3), k))
    assert run.delta_neutrino[0, 0] == pytest.approx(run.delta_cold[0, 0], rel=5e-3)
    # Far below the way they stream they stand still in a potential: f(E), so that delta_nu is -<1/v^2> times it;
    # k^2 delta_nu = (1/2) g_m (m/T)^2 <1/q^2> delta_m today, <1/q^2> = ln 2/((3/2) zeta(3)). Derived here.
    universe = run.universe
    gravity, (mass,) = sum(universe.masses.values()), universe.contents.mass
    asymptote = 0.5 * gravity * mass**2 * np.log(2.0) / (1.5 * ZETA_3) / np.array(k) ** 2 * run.delta_matter[:, 0]
    # 4 per cent: the next term in k and, of this average over 1/q^2, what five momenta leave out.
    assert run.delta_neutrino[1:, 0] == pytest.approx(asymptote[1:], rel=0.04)


def power_over_massless(*masses, total=0.12):
    """Power of all matter today over that without masses, at the same matter today, and the neutrinos' share of it."""
    k = (0.01, 0.1, 1.0, 10.0)
    heavy = massive(*masses)
    own = Universe(heavy).masses
    weight = own["massive_neutrino"] / own["baryon"] * heavy.baryon_density
    runs = evolve_many([
        scenario(massive(*masses, dark_matter_density=total - weight), k),
        scenario(massive(dark_matter_density=total), k),
    ])  # fmt: skip
    ratio = (runs[0].delta_matter / runs[1].delta_matter)[:, 0] ** 2
    return ratio, weight / (total + heavy.baryon_density)


def test_suppression_of_small_scales():
    # Power falls by 8 times the neutrinos' share of matter where that is small: Hu, Eisenstein & Tegmark 1998 (PRL 80,
    # 5255), from memory. They looked at one mass for all that have any; -7 to -9 is the range of later work
    # (common practice, no source), the lower masses at the lower end.
    ratio, share = power_over_massless(0.03, 0.03, 0.03)
    assert share == pytest.approx(0.0068, rel=0.01)
    assert np.all((ratio[2:] - 1.0) / share < -7.0)
    assert np.all((ratio[2:] - 1.0) / share > -9.0)


def test_three_lighter_neutrinos_stream_further_and_suppress_less():
    # The same sum, so the same share of matter at last. Three equal ones become slow later: growth is slowed for a
    # shorter time on small scales, and suppression reaches to larger ones. Lesgourgues & Pastor 2006, from memory.
    one, three = power_over_massless(0.3)[0], power_over_massless(0.1, 0.1, 0.1)[0]
    assert three[0] < one[0] - 0.01
    assert np.all(three[2:] > one[2:] + 0.01)


def test_modes_of_universes_with_and_without_masses_in_one_sweep():
    k = (0.02, 3.0)
    universes = (cosmology(), massive(0.06), massive(0.2, 0.2), massive(0.1, 0.3))
    asked = [scenario(one, k, (30.0, 0.0)) for one in universes]
    for together, alone in zip(evolve_many(asked), map(evolve, asked), strict=True):
        assert together.evolved == alone.evolved
        for name in alone.evolved:
            assert getattr(together, name) == pytest.approx(getattr(alone, name), rel=1e-9)


def test_matter_is_what_its_parts_weigh():
    run = evolve(scenario(massive(0.1, 0.2), (0.01, 0.3), (50.0, 0.0)))
    mass = run.universe.masses
    parts = {"dark": run.delta_dark, "baryon": run.delta_baryon, "massive_neutrino": run.delta_neutrino}
    expected = sum(mass[name] * value for name, value in parts.items()) / sum(mass.values())
    assert run.delta_matter == pytest.approx(expected, rel=1e-13)
    assert run.at("delta_matter", 0.0)[:, 0] == pytest.approx(run.delta_matter[:, 1], rel=1e-12)
    # The slope is that of the interpolated contrast: difference quotient over 0.02 in ln a.
    around = run.at("delta_matter", np.expm1(np.log1p(2.0) + np.array([0.01, -0.01])))
    assert run.slope_at("delta_matter", 2.0)[:, 0] == pytest.approx(np.diff(around)[:, 0] / 0.02, rel=1e-4)
    around = run.at("delta_neutrino", np.expm1(np.log1p(2.0) + np.array([0.01, -0.01])))
    assert run.slope_at("delta_neutrino", 2.0)[:, 0] == pytest.approx(np.diff(around)[:, 0] / 0.02, rel=1e-3)


def test_initial_modes_of_neutrinos_include_those_with_mass():
    # While fast they are neutrinos like any others, so next to no mass changes nothing.
    mixture = Mixture(adiabatic=0.0, neutrino_density=Share(1.0))
    massless, nearly = (
        evolve(scenario(asked, (0.003, 0.1), (1000.0, 10.0), mixture=mixture))
        for asked in (cosmology(), massive(1e-8, 1e-8))
    )
    assert nearly.delta_dark == pytest.approx(massless.delta_dark, rel=1e-6)


def test_the_small_model_does_not_know_them():
    asked = replace(scenario(massive(0.06), (0.1,)), method=Method("sound-speed"))
    refusal = r"method\.closure = sound-speed .*neutrinos\.masses = \[0\.06\] eV .* kinetic"
    with pytest.raises(ValueError, match=refusal):
        evolve(asked)


def test_more_momenta_where_neutrinos_are_much_of_the_matter():
    light, hot = (resolution_for(Universe(massive(*[mass] * 3, dark_matter_density=0.0))) for mass in (0.1, 0.5))
    assert (light.chains.momenta, hot.chains.momenta) == (5, 20)


def test_they_help_without_dark_matter():
    # Our own finer run. Neutrinos are two fifths of all matter, and waves near the way they stream turn round: a sum
    # over few momenta is then out of phase with the integral. The promise is missed by a factor of two even so.
    asked = scenario(massive(0.5, 0.5, 0.5, dark_matter_density=0.0), (0.017, 0.03, 0.08), (100.0, 10.0, 0.0))
    universe = Universe(asked.cosmology)
    standard = resolution_for(universe)
    few = replace(standard, chains=replace(standard.chains, momenta=standard.chains.momenta // 4))
    fine, chosen, poor = (
        evolve(asked, universe=universe, resolution=resolution) for resolution in (standard.refined(), standard, few)
    )
    size = np.abs(fine.delta_baryon).max(axis=1, keepdims=True)
    error, worse = (np.abs((run.delta_baryon - fine.delta_baryon) / size).max() for run in (chosen, poor))
    assert error < 1e-3
    assert worse > 3.0 * error
