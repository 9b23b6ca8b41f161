"""Gas histories from a table and from reionization, in the smooth universe."""

from dataclasses import asdict

import numpy as np
import pytest
from scipy.integrate import simpson, solve_ivp

from twofluid.scenario import Reionization, ThermalTable
from twofluid.universe import Universe, UniverseStack, build_universes

ROWS = np.array(
    [
        [0.0, 7000.0, 1.08], [0.6, 8500.0, 1.08], [1.5, 1.1e4, 1.08], [3.0, 1.2e4, 1.08], [5.0, 1.1e4, 1.05],
        [6.5, 9000.0, 0.7], [8.0, 2500.0, 0.2], [10.0, 400.0, 0.01], [14.0, 90.0, 1e-3], [20.0, 18.0, 3e-4],
        [26.0, 15.5, 2.4e-4], [34.0, 25.0, 2.2e-4],
    ]
)  # fmt: skip
TABLE = ThermalTable(*ROWS.T, below_redshift=30.0, joining_width=0.15)
STEP = Reionization(7.68, 0.5, 1e4)


@pytest.fixture(scope="module")
def heated(make_universe):
    return make_universe(thermal=TABLE)


@pytest.fixture(scope="module")
def reionized(make_universe):
    return make_universe(reionization=STEP)


# --- the table


def test_below_the_joining_the_rows_are_met(heated):
    z, temperature, electrons = ROWS[ROWS[:, 0] <= np.exp(np.log(31.0) - 0.15) - 1.0].T
    # 1e-5: the universe tabulates between the rows, which have kinks
    np.testing.assert_allclose(heated.gas_temperature(1.0 / (1.0 + z)), temperature, rtol=1e-5)
    np.testing.assert_allclose(heated.electron_fraction(1.0 / (1.0 + z)), electrons, rtol=1e-5)


def test_between_rows_nothing_overshoots(heated):
    for high, low in zip(ROWS[1:-2], ROWS[:-3], strict=True):
        a = 1.0 / (1.0 + np.linspace(low[0], high[0], 50))
        for found, ends in ((heated.gas_temperature(a), (low[1], high[1])),
                            (heated.electron_fraction(a), (low[2], high[2]))):  # fmt: skip
            assert found.min() >= min(ends) * (1.0 - 1e-5)
            assert found.max() <= max(ends) * (1.0 + 1e-5)


def test_above_its_redshift_nothing_changes(heated, planck):
    a = np.geomspace(1e-10, 0.9999 / 31.0, 2000)
    for name in ("electron_fraction", "gas_temperature", "gas_temperature_slope", "gas_sound_speed", "compton_rate"):
        np.testing.assert_array_equal(getattr(heated, name)(a), getattr(planck, name)(a))


def test_histories_join_smoothly(heated, planck):
    # Over the joining the temperature stays between the two, and its slope has no jump: the largest difference
    # between neighbours shrinks with their distance.
    jumps = []
    for count in (200, 400):
        a = np.exp(np.linspace(-np.log(31.5), -np.log(25.0), count))
        jumps.append(np.abs(np.diff(heated.gas_temperature_slope(a))).max())
    assert jumps[1] < 0.6 * jumps[0]
    a = 1.0 / (1.0 + 28.5)
    both = sorted([float(planck.gas_temperature(a)), np.exp(np.interp(29.5, [27.0, 35.0], np.log([15.5, 25.0])))])
    assert both[0] * 0.9 < heated.gas_temperature(a) < both[1] * 1.1


@pytest.mark.parametrize("name", ["heated", "reionized"])
def test_temperature_slope_is_the_slope(name, request):
    # Against central differences of the temperature itself
    universe, step = request.getfixturevalue(name), 2e-4
    a = np.geomspace(1e-3, 0.99, 300)
    ahead, behind = universe.gas_temperature(a * np.exp(step)), universe.gas_temperature(a * np.exp(-step))
    slope = np.log(ahead / behind) / (2.0 * step)
    assert slope.max() > 5.0  # there is something to get wrong
    # 0.1: kinks of the curvature at rows, against slopes of 40 where light ionizes the gas
    np.testing.assert_allclose(universe.gas_temperature_slope(a), slope, atol=0.1)


def test_stiffness_stays_that_of_a_gas(heated, reionized):
    a = np.geomspace(1e-3, 1.0, 2000)
    for universe in (heated, reionized):
        assert np.all((universe.gas_stiffness(a) > 0.0) & (universe.gas_stiffness(a) <= 2.0 / 3.0))
        assert np.all(np.isfinite(universe.gas_sound_speed(a)))


# --- reionization


def test_step_ionizes_hydrogen_and_the_first_electron_of_helium(reionized, planck):
    helium = 0.08188  # n_He/n_H for Y = 0.2454, from the atomic masses
    residual = planck.electron_fraction(1.0 / 8.68)
    assert reionized.electron_fraction(1.0 / 8.68) == pytest.approx(0.5 * (1.0 + helium + residual), rel=1e-4)
    assert reionized.electron_fraction(1.0) == pytest.approx(1.0 + helium, rel=1e-5)
    # (1 + tanh)/2 one width above: 1/(1 + e^2)
    share = 1.0 / (1.0 + np.exp(2.0))
    expected = share * (1.0 + helium) + (1.0 - share) * planck.electron_fraction(1.0 / 9.18)
    assert reionized.electron_fraction(1.0 / 9.18) == pytest.approx(expected, rel=1e-4)
    assert reionized.gas_temperature(1.0 / 3.0) == pytest.approx(1e4, rel=1e-6)


def test_without_a_temperature_the_gas_has_compton_heating_alone(make_universe):
    universe = make_universe(reionization=Reionization(9.0, 0.6))
    # Independent integration of dT/d ln a = -2 T + (Compton/expansion)(T_gamma - T) by a general solver

    def slope(log_a, temperature):
        a = np.exp(log_a)
        compton = universe.compton_rate(a) / universe.conformal_hubble_rate(a)
        return -2.0 * temperature + compton * (2.7255 / a - temperature)

    begin = -np.log(40.0)
    found = solve_ivp(slope, (begin, 0.0), [float(universe.gas_temperature(np.exp(begin)))], method="LSODA",
                      rtol=1e-9, atol=1e-12, dense_output=True)  # fmt: skip
    log_a = np.linspace(begin, 0.0, 30)
    np.testing.assert_allclose(universe.gas_temperature(np.exp(log_a)), found.sol(log_a)[0], rtol=1e-5)


def test_optical_depth_of_planck(make_universe):
    # Planck 2018 VI, Table 1, best fit: tau = 0.0543 for z_re = 7.68. There helium loses its second electron
    # near z = 3.5, which is left out here and added by its own integral; and the step is a tanh in (1 + z)^(3/2)
    # of width 0.5 in z, which changes tau by less than 1e-4. z_re is rounded to 0.1 per cent: 3e-4.
    universe = make_universe(
        hubble_constant=67.32, baryon_density=0.022383, dark_matter_density=0.12011, reionization=STEP
    )
    z = np.linspace(0.0, 3.5, 2001)
    a = 1.0 / (1.0 + z)
    per_electron = universe.scattering_rate(a) / universe.electron_fraction(a) / universe.conformal_hubble_rate(a) * a
    second = 0.08188 * simpson(per_electron, x=z)
    depth = universe.landmarks.reionization_optical_depth
    assert depth + second == pytest.approx(0.0543, abs=4e-4)
    assert depth == pytest.approx(0.0543, abs=2e-3)  # as it stands, without the second electron


def test_optical_depth_of_a_step_in_closed_form(make_universe):
    # Sharp step in a universe of matter and constant: tau = n sigma (2/(3 Omega_m H_0)) [E(z) - 1]; radiation, 0.3
    # per cent of H^2 at z = 10, is left out: 2e-3. The width smears z_re evenly.
    universe = make_universe(reionization=Reionization(10.0, 0.22))
    matter = 0.14237 / 0.6736**2
    electrons = universe.scattering_rate(1.0) / universe.conformal_hubble_rate(1.0)
    expected = electrons * 2.0 / (3.0 * matter) * (np.sqrt(matter * 11.0**3 + 1.0 - matter) - 1.0)
    assert universe.landmarks.reionization_optical_depth == pytest.approx(expected, rel=2e-3)


@pytest.mark.parametrize("changes", [{"thermal": TABLE}, {"reionization": STEP}, {"reionization": Reionization(9, 1)}])
def test_the_other_landmarks_are_those_without(changes, make_universe, planck):
    # Last scattering and drag are defined without reionization (published tables leave it out)
    landmarks, without = asdict(make_universe(**changes).landmarks), asdict(planck.landmarks)
    assert landmarks.pop("reionization_optical_depth") > 0.03
    assert without.pop("reionization_optical_depth") is None
    assert landmarks == without


def test_a_step_acts_on_what_the_table_gives(make_universe):
    warm = ThermalTable(ROWS[:, 0], ROWS[:, 1], np.full(len(ROWS), 3e-4), 30.0)
    universe = make_universe(thermal=warm, reionization=Reionization(7.68, 0.5))
    np.testing.assert_allclose(universe.gas_temperature(1.0 / 4.0), 1.2e4, rtol=1e-5)  # the table's
    assert universe.electron_fraction(1.0 / 4.0) == pytest.approx(1.08188, rel=1e-5)


# --- looked up


@pytest.mark.parametrize("name", ["heated", "reionized"])
def test_look_up_agrees_with_direct_functions(name, request):
    universe = request.getfixturevalue(name)
    a = np.random.default_rng(5).uniform(1.0 / 40.0, 1.0, 5000)
    now = universe.conditions(universe.conformal_time(a))
    # 2e-4: the look-up's nodes are 0.0035 apart in ln a, and rows make kinks
    np.testing.assert_allclose(now.scattering_rate, universe.scattering_rate(a), rtol=2e-4)
    np.testing.assert_allclose(now.compton_rate, universe.compton_rate(a), rtol=2e-4)
    np.testing.assert_allclose(now.isothermal_sound_speed_squared, universe.isothermal_sound_speed(a) ** 2, rtol=2e-4)


def test_heating_closes_the_balance_of_the_gas(reionized):
    # At constant temperature: heat makes up for expansion, 2, and for what scattering takes, Compton/H (1 - T_gamma/T)
    a = 1.0 / np.array([6.0, 4.0, 2.0, 1.001])
    time = reionized.conformal_time(a)
    rate = reionized.conformal_hubble_rate(a)
    taken = reionized.compton_rate(a) / rate * (1.0 - 2.7255 / a / 1e4)
    np.testing.assert_allclose(reionized.heating_rate(time) / rate, 2.0 + taken, rtol=1e-3)
    assert np.all(reionized.heating_rate(reionized.conformal_time(np.geomspace(1e-8, 0.05, 50))) == 0.0)


def test_many_are_built_and_looked_up_as_one_by_one(make_cosmology, planck):
    cosmologies = [make_cosmology(), make_cosmology(thermal=TABLE), make_cosmology(reionization=STEP)]
    together, alone = build_universes(cosmologies), [Universe(one) for one in cosmologies]
    a = np.geomspace(1e-4, 1.0, 500)
    for one, other in zip(together, alone, strict=True):
        np.testing.assert_array_equal(one.gas_temperature(a), other.gas_temperature(a))
        np.testing.assert_array_equal(one.electron_fraction(a), other.electron_fraction(a))
    stack = UniverseStack(together, [2, 0, 1])
    time = together[0].conformal_time(np.array([[0.02], [0.2], [0.9]])) * np.ones(3)
    for column, owner in enumerate((2, 0, 1)):
        universe = together[owner]
        assert stack.heated_from and bool(universe.heated_from) == (owner > 0)
        np.testing.assert_array_equal(stack.heating_rate(time)[:, column], universe.heating_rate(time[:, column]))
        for name, values in asdict(stack.conditions(time)).items():
            expected = getattr(universe.conditions(time[:, column]), name)
            np.testing.assert_allclose(values[:, column], expected, rtol=1e-14, err_msg=name)
        for name, values in asdict(stack.response(time)).items():
            np.testing.assert_allclose(values[:, column], getattr(universe.response(time[:, column]), name), rtol=1e-14)


# --- how recombination responds


def test_electrons_respond_as_saha_has_it_while_equilibrium_holds(planck):
    # Saha: x^2/(1 - x) = S(T)/n, so (2 - x) d ln x/(1 - x) = -d ln n + (3/2 + chi/kT) d ln T. The three-level atom
    # follows it while recombination is quick; at z = 1700 its lag and the last of the helium make 3 per cent.
    a = 1.0 / 1701.0
    response = planck.response(planck.conformal_time(a))
    x = 1.0 - _neutral(planck, a)
    weight = (1.0 - x) / (2.0 - x)
    binding = 157887.51 / (2.7255 / a)  # 13.598434 eV over k T_gamma
    assert response.by_density / weight == pytest.approx(-1.0, abs=0.03)
    assert response.by_temperature / weight == pytest.approx(1.5 + binding, rel=0.03)
    assert abs(response.by_expansion) < 0.03 * abs(response.by_density)


def _neutral(universe, a):
    """Neutral hydrogen by Saha's equation, independent of the program."""
    temperature = 2.7255 / a
    density = 0.02237 * (1.0 - 0.2454) * 11.2337 / a**3  # 1/m^3: 1.87834e-26 kg/m^3 over the mass of hydrogen
    saha = 2.4146830e21 * temperature**1.5 / density * np.exp(-157887.51 / temperature)
    x = 0.5 * (np.sqrt(saha * saha + 4.0 * saha) - saha)
    return 1.0 - min(x, 1.0)


def test_electrons_respond_as_plain_capture_has_it_late(planck):
    # x' = -alpha n x^2: d(ln x)'/d ln x = d(ln x)'/d ln n = -alpha n x, and d ln alpha/d ln T of the case-B fit
    # of Pequignot et al. 1991 (from memory) at T = 50 K by difference; the escape of photons no longer counts.
    a = 1.0 / np.array([301.0, 101.0, 31.0])
    response = planck.response(planck.conformal_time(a))
    np.testing.assert_allclose(response.by_density, -1.0, atol=1e-3)
    np.testing.assert_allclose(response.by_expansion, 0.0, atol=1e-3)

    def coefficient(temperature):
        t = temperature / 1e4
        return 1.125 * 4.309e-19 * t**-0.6166 / (1.0 + 0.6703 * t**0.5300)

    temperature = planck.gas_temperature(a)
    power = -np.log(coefficient(1.01 * temperature) / coefficient(temperature / 1.01)) / (2.0 * np.log(1.01))
    np.testing.assert_allclose(response.by_temperature, power, rtol=2e-3)
    density = 0.02237 * (1.0 - 0.2454) * 11.2337 / a**3
    seconds = 1.02927e14  # a megaparsec at the speed of light
    captures = coefficient(temperature) * density * planck.electron_fraction(a) * seconds * a
    np.testing.assert_allclose(response.relaxation, captures, rtol=2e-3)


def test_slopes_of_the_history_follow_from_the_response(planck, make_universe):
    # The response is linear: a universe with one per cent more baryons at the same photons and expansion has
    # d delta_x/d ln a = -r (delta_x - n 0.01 - t delta_T) all along; both sides from the histories themselves.
    more = make_universe(baryon_density=0.02237 * 1.01, dark_matter_density=0.12 - 0.02237 * 0.01)
    log_a = np.linspace(-np.log(1301.0), -np.log(301.0), 400)
    a = np.exp(log_a)
    contrast = np.log(more.electron_fraction(a) / planck.electron_fraction(a))
    warmth = np.log(more.gas_temperature(a) / planck.gas_temperature(a))
    response = planck.response(planck.conformal_time(a))
    relaxation = response.relaxation / planck.conformal_hubble_rate(a)
    goal = response.by_density * np.log(1.01) + response.by_temperature * warmth
    expected, found = -relaxation * (contrast - goal), np.gradient(contrast, log_a)
    # second order in the one per cent, and in the step of the differences
    np.testing.assert_allclose(found[2:-2], expected[2:-2], atol=0.02 * np.abs(expected).max())
