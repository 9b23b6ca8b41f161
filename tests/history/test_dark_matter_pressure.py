"""Whole runs of dark matter that is not quite cold."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import jv
from test_evolve_accuracy import scenario

from twofluid import certify, evolve, evolve_many, load_history
from twofluid.fluids import ACCURACIES, CLOSURES, ChainLengths, KineticSystem, resolution_for
from twofluid.history import EVOLVED
from twofluid.products import catchup_table, evolution_table, lag_table, scales_table
from twofluid.scenario import DarkMatter, Method
from twofluid.universe import Universe

REDSHIFTS = np.array([1000.0, 100.0, 10.0, 0.0])
WAVENUMBERS = np.geomspace(1e-3, 10.0, 13)


def asked(*law, closure="kinetic", accuracy="standard", **changes):
    """Saltmarsh's test universe, its dark matter with a law (km/s, redshift, scaling)."""
    plain = scenario(**changes)
    cosmology = replace(plain.cosmology, dark_matter=DarkMatter(*law))
    return replace(plain, cosmology=cosmology, method=Method(closure, accuracy))


def run(*law, wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS, resolution=None, **changes):
    return evolve(asked(*law, **changes), wavenumbers=wavenumbers, redshifts=redshifts, resolution=resolution)


@pytest.fixture(scope="module")
def cold():
    return run()


@pytest.fixture(scope="module")
def warm():
    return run(10.0, 0.0, 0.5)


# Closed forms of one fluid with pressure in a matter era, each substituted in its growth equation. Little radiation, a
# trace of baryons, nothing else.


def matter_era(*law, wavenumbers, redshifts):
    plain = asked(*law, effective_number=0.0, photon_temperature=0.5, hubble_constant=100.0)
    cosmology = replace(plain.cosmology, baryon_density=1e-5, dark_matter_density=0.99998)
    history = evolve(replace(plain, cosmology=cosmology), wavenumbers=wavenumbers, redshifts=redshifts)
    gravity = float(history.universe.gravity("dark", 1.0))
    kappa = history.wavenumber * float(history.universe.dark_sound_speed(1.0)) / np.sqrt(gravity / 2)
    return history, kappa


def misfit(history, modes):
    """Largest error of what two modes, shape (2, mode, redshift), say, given two redshifts; of the largest contrast."""
    errors = []
    for delta, pair in zip(history.delta_dark, np.moveaxis(modes, 1, 0), strict=True):
        weights = np.linalg.solve(pair[:, :2].T, delta[:2])
        errors.append(np.abs(weights @ pair - delta).max() / np.abs(delta).max())
    return np.array(errors)


EPOCHS = np.array([100.0, 60.0, 40.0, 25.0, 15.0, 9.0, 4.0, 1.0, 0.0])
# Radiation is 3e-6 of the matter at z = 100; errors of the run over some hundred radians; weights from two epochs.
CLOSED_FORM = 5e-4


def powers(kappa, a):
    """a^n, n = [-1 +- sqrt(25 - 24 kappa^2)]/4, real modes."""
    root = np.sqrt(25 - 24 * kappa[:, None] ** 2 + 0j)
    plus, minus = a ** ((-1 + root) / 4), a ** ((-1 - root) / 4)
    return np.where(root.imag == 0, [plus.real, minus.real], [plus.real, plus.imag])


def bessels(kappa, a):
    """a^(-1/4) J_(+-5/2)(sqrt(6) kappa_0 a^(-1/2))."""
    x = np.sqrt(6) * kappa[:, None] / np.sqrt(a)
    return np.array([a**-0.25 * jv(order, x) for order in (2.5, -2.5)])


@pytest.mark.parametrize(
    ("law", "wavenumbers", "modes", "others"),
    [
        ((300.0, 0.0, 0.5), [0.2, 0.39, 1.0, 2.0, 6.0], powers, bessels),
        ((30.0, 0.0, 1.0), [0.3, 1.0, 2.0, 4.0], bessels, powers),
    ],
)
def test_dark_matter_alone_in_closed_form(law, wavenumbers, modes, others):
    history, kappa = matter_era(*law, wavenumbers=wavenumbers, redshifts=EPOCHS)
    a = 1 / (1 + EPOCHS)
    assert np.all(misfit(history, modes(kappa, a)) < CLOSED_FORM)
    assert np.all(misfit(history, others(kappa, a)) > 10 * CLOSED_FORM)  # control: the other law
    assert np.all(misfit(history, modes(1.05 * kappa, a)) > 2 * CLOSED_FORM)  # control: another Jeans scale


# Cold, to round-off.


def test_vanishing_pressure_is_cold(cold):
    resolution = resolution_for(cold.universe)
    vanishing = run(1e-9, resolution=resolution)
    assert vanishing.universe.has_dark_pressure
    for name in EVOLVED:
        size = np.abs(getattr(cold, name)).max(axis=0)
        assert np.all(np.abs(getattr(vanishing, name) - getattr(cold, name)) < 1e-12 * size), name
    assert np.abs(vanishing.theta_dark).max() < 1e-12


@pytest.mark.parametrize("closure", CLOSURES)
def test_no_pressure_costs_nothing(closure):
    plain, zero, moving = (
        run(*law, closure=closure, wavenumbers=[0.1, 1.0]) for law in ((), (0.0, 50.0, 0.3), (1e-9,))
    )
    for name in EVOLVED:
        np.testing.assert_array_equal(getattr(zero, name), getattr(plain, name))
    assert zero.counts == plain.counts
    assert zero.theta_dark is None is zero.trace.theta_dark_slope
    systems = [
        CLOSURES[closure](history.universe, history.wavenumber, ChainLengths(6, 6, 6)) for history in (zero, moving)
    ]
    assert set(systems[1].unknowns) - set(systems[0].unknowns) == {"theta_dark"}
    assert len(systems[1].unknowns) == len(systems[0].unknowns) + 1


# The equations keep what they have to keep.


def test_constraint_is_kept_and_needs_all_terms_of_one_order(monkeypatch):
    law = (1.5e4, 0.0, 0.0)  # 0.05 c
    assert run(*law, wavenumbers=[1e-3, 0.02]).constraint.max() < 2e-5
    original = KineticSystem.step_rates

    def one_sided(self, modes, time, step):  # the pressure of the dark matter in the source of h'', and nowhere else
        rates = original(self, modes, time, step)
        entry = (self.unknowns.index("metric_rate"), self.unknowns.index("delta_dark"))
        rates.entries[entry] = (1 + 3 * 0.05**2) * rates.entries[entry]
        return rates

    monkeypatch.setattr(KineticSystem, "step_rates", one_sided)
    assert run(*law, wavenumbers=[1e-3, 0.02]).constraint.max() > 1e-3


@pytest.mark.parametrize("name", [*EVOLVED, "theta_dark"])
def test_interpolation_between_the_steps(name, warm):
    between = [987.0, 150.0, 33.0, 2.5]
    exact = getattr(run(10.0, 0.0, 0.5, redshifts=between), name)
    scale = np.maximum(np.abs(exact), 0.01 * np.abs(exact).max(axis=0))
    assert (np.abs(warm.at(name, between) - exact) / scale).max() < 2e-3  # as without pressure


def test_results_do_not_depend_on_companions(warm):
    alone = run(10.0, 0.0, 0.5, wavenumbers=WAVENUMBERS[11])
    for name in warm.evolved:
        np.testing.assert_allclose(getattr(alone, name)[0], getattr(warm, name)[11], rtol=1e-9)


def test_several_scenarios_in_one_sweep():
    wavenumbers = [0.05, 3.0]
    laws = [(10.0, 0.0, 0.5), (), (300.0, 999.0, 0.0)]
    together = evolve_many([asked(*law) for law in laws], wavenumbers=wavenumbers, redshifts=REDSHIFTS)
    for law, history in zip(laws, together, strict=True):
        alone = run(*law, wavenumbers=wavenumbers)
        assert history.evolved == alone.evolved
        for name in alone.evolved:
            np.testing.assert_allclose(getattr(history, name), getattr(alone, name), rtol=1e-9)


# Accuracy.


@pytest.mark.parametrize(
    ("law", "wavenumber", "accuracy"),
    [((1.0, 0.0, 1.0), 5.0, "standard"), ((1.0, 0.0, 1.0), 10.0, "draft"), ((10.0, 0.0, 0.5), 20.0, "standard")],
)
def test_promise_is_kept(law, wavenumber, accuracy):
    history = certify(run(*law, accuracy=accuracy, wavenumbers=[wavenumber]), modes=[0])
    assert history.certificate.kept
    assert history.certificate.promise == ACCURACIES[accuracy].promise


def test_waves_left_unresolved_are_noticed(monkeypatch):
    monkeypatch.setattr("twofluid.fluids.stepping.DARK_PHASE_SHARE", 5.0)
    history = run(10.0, 0.0, 0.5, wavenumbers=[30.0])
    monkeypatch.undo()
    assert not certify(history, modes=[0]).certificate.kept


def test_cost_is_bounded(warm):
    # By counts: measured 808 at the most; the same settings take 786 where pressure vanishes.
    steps = (np.diff(warm.trace.log_scale_factor, axis=1) > 0).sum(axis=1)
    assert steps.max() < 1000


# What it does.


def test_small_scales_are_smoothed_and_large_ones_are_not(cold, warm):
    share = warm.delta_dark[:, -1] / cold.delta_dark[:, -1]
    jeans = np.sqrt(0.5 * (warm.universe.gravity("dark", 1.0) + warm.universe.gravity("baryon", 1.0)))
    jeans /= warm.universe.dark_sound_speed(1.0)
    assert np.all(np.abs(share[WAVENUMBERS < 0.02 * jeans] - 1) < 5e-3)
    assert np.all(np.abs(share[WAVENUMBERS > 2 * jeans]) < 0.2)


def test_baryons_are_ahead_of_dark_matter_that_is_held_up(warm):
    lag = lag_table(warm)
    ahead = np.asarray(lag["ratio"]) > 1.02
    assert ahead.sum() > 3
    assert np.all(lag["delay"].mask[ahead])
    assert np.max(lag["ratio"]) > 10
    assert np.all(np.isfinite(catchup_table(warm)["ratio_today"]))


def test_sound_speed_closure_agrees(warm):
    simple = run(10.0, 0.0, 0.5, closure="sound-speed")
    # Within what that closure promises of cold dark matter, 4 per cent; of the largest so far, since it waves.
    size = np.maximum.accumulate(np.abs(warm.delta_dark), axis=1)
    assert (np.abs(simple.delta_dark - warm.delta_dark) / size).max() < 0.04
    velocity = np.maximum.accumulate(np.abs(warm.theta_dark), axis=1)
    assert (np.abs(simple.theta_dark - warm.theta_dark) / velocity).max() < 0.05


# What a run says.


def test_velocity_is_carried_only_where_there_is_one(cold, warm, tmp_path):
    table = evolution_table(warm)
    assert table.colnames[-2:] == ["theta_dark", "delta_matter"]
    assert str(table["theta_dark"].unit) == "1 / Mpc"
    np.testing.assert_array_equal(table["theta_dark"], warm.theta_dark.ravel())
    assert table.meta["frame"].startswith("synchronous, carried by cold dust without mass")
    assert "theta_dark" not in evolution_table(cold).colnames
    assert evolution_table(cold).meta["frame"].startswith("synchronous, at rest with the dark matter")
    with pytest.raises(ValueError, match="no quantity is named 'theta_dark'"):
        cold.at("theta_dark", [1.0])
    for name, history in (("warm", warm), ("cold", cold)):
        history.save(tmp_path / name)
        again = load_history(tmp_path / name)
        assert again.scenario == history.scenario
        assert again.evolved == history.evolved
        for quantity in history.evolved:
            np.testing.assert_array_equal(again.at(quantity, [3.0]), history.at(quantity, [3.0]))


def test_scales_tell_sound_and_jeans_scale_of_the_dark_matter(cold, warm):
    table = scales_table(warm)
    assert table["dark_sound_speed"] == pytest.approx(10 * np.sqrt(1 + REDSHIFTS), rel=1e-6)
    matter = 0.14237 * (100 / 299792.458) ** 2 * (1 + REDSHIFTS)  # (2/3) 4 pi G rho a^2 of this universe
    speed = 10 * np.sqrt(1 + REDSHIFTS) / 299792.458
    assert table["dark_jeans_wavenumber"] == pytest.approx(np.sqrt(1.5 * matter) / speed, rel=1e-4)
    assert "has pressure" in table.meta["dark_matter"]
    assert "dark_sound_speed" not in scales_table(cold).colnames


def test_waves_that_were_fast_are_warned_of(warm):
    assert warm.warnings == ()
    history = run(1.0, 0.0, 1.0, wavenumbers=[0.01, 1.0, 2.0], redshifts=[0.0])
    assert history.warnings == (
        "2 of 3 wavenumbers were inside the horizon before redshift 3e+04, while the sound speed of the dark matter "
        "was above 0.1 c: it is followed as slow matter also there",
    )


def test_sound_speed_of_nothing_is_told():
    history = run(10.0, wavenumbers=[0.01], redshifts=[0.0], dark_matter_density=0.0)
    assert history.warnings == ("a sound speed of the dark matter was given, but there is no dark matter to have it",)
    assert history.theta_dark is None


def test_too_many_waves_are_refused():
    with pytest.raises(ValueError, match=r"at k = 30 1/Mpc .* radians by today, and 1000 are .* up to 16\.\d 1/Mpc"):
        run(10.0, 0.0, 1.0, wavenumbers=[0.1, 30.0])
    limit = 1000.0 / float(Universe(asked(10.0, 0.0, 1.0).cosmology).dark_sound_horizon(1.0))
    assert 16 < limit < 17
