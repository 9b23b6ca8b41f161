"""Mixtures of initial modes: their start, their parts, and what the history of several parts says."""

from dataclasses import fields, replace
from functools import cache

import numpy as np
import pytest
from test_evolve_accuracy import scenario

import twofluid.evolution
import twofluid.fluids.modes
import twofluid.fluids.start
from twofluid import SolverFailure, Universe, certify, evolve, evolve_many, load_history
from twofluid.fluids import KineticSystem, resolution_for
from twofluid.history import EVOLVED, Trace
from twofluid.scenario import Mixture, Primordial, ScenarioError, Share
from twofluid.scenario.keys import INITIAL_MODES

WAVENUMBERS = (3e-4, 0.01, 0.2, 50.0)
REDSHIFTS = (1000.0, 100.0, 10.0, 0.0)


smooth = cache(Universe)


def mixed(adiabatic=1.0, shares=None, **changes):
    """Scenario with a mixture."""
    return replace(scenario(**changes), primordial=Primordial(mixture=Mixture(adiabatic, **(shares or {}))))


def run(adiabatic=1.0, shares=None, wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS, resolution=None, **changes):
    asked = mixed(adiabatic, shares, **changes)
    options = {"redshifts": redshifts, "resolution": resolution, "universe": smooth(asked.cosmology)}
    return evolve(asked, wavenumbers=wavenumbers, **options)


def alone(mode, **options):
    return run(0.0, {mode: Share(1.0, correlation=1.0)}, **options)


@cache
def reference(mode):
    """Return the run of one mode, each made once."""
    return alone(mode)


def misfit(one, other):
    """Largest difference of the contrasts, over the larger of them or a tenth of the largest so far."""
    size = np.maximum(np.abs(other.delta_dark), np.abs(other.delta_baryon))
    size = np.maximum(size, 0.1 * np.maximum.accumulate(size, axis=1))
    return max(np.max(np.abs(getattr(one, name) - getattr(other, name)) / size) for name in EVOLVED[:2])


# --- each mode


@pytest.mark.parametrize("mode", INITIAL_MODES)
def test_no_mode_knows_when_it_was_started(mode, monkeypatch):
    ours = reference(mode)
    monkeypatch.setattr(twofluid.fluids.start, "START_PHASE", twofluid.fluids.start.START_PHASE / 5.0)
    monkeypatch.setattr(twofluid.fluids.start, "START_MATTER", twofluid.fluids.start.START_MATTER / 5.0)
    assert misfit(ours, alone(mode)) < 1e-5


@pytest.mark.parametrize("mode", ["baryon", "dark_matter"])
def test_a_start_without_the_response_to_matter_is_noticed(mode, monkeypatch):
    # Control of the two around: contrasts of matter alone, no metric.
    monkeypatch.setattr(twofluid.fluids.modes, "ORDERS", 1)
    with pytest.raises(SolverFailure, match="Einstein constraint drifts"):
        alone(mode)


def test_radiation_not_quite_uniform_at_the_start_is_another_mode(monkeypatch):
    # Control too: a per cent more neutrinos than make up for the photons.
    wrong = {"delta_photon": -4 / 3 * 0.41, "delta_neutrino": 4 / 3 * 0.59 * 1.01}
    monkeypatch.setitem(twofluid.fluids.modes.BEGINNINGS, "neutrino_density", lambda share: wrong)
    assert misfit(alone("neutrino_density"), reference("neutrino_density")) > 0.1


@pytest.mark.parametrize("mode", INITIAL_MODES)
def test_constraint_holds_along_the_run(mode):
    # Change of the Einstein energy constraint, step by step, over its largest term: 4e-4 for matter; for neutrinos,
    # whose waves are large where all other terms are small, 4e-3.
    assert reference(mode).constraint.max() < (1e-2 if "neutrino" in mode else 1e-3)


@pytest.mark.parametrize("mode", INITIAL_MODES)
def test_steps_and_chains_are_fine_enough(mode):
    standard = reference(mode)
    finer = alone(mode, resolution=resolution_for(standard.universe).refined())
    assert misfit(standard, finer) < 3e-4  # what the standard accuracy promises


def test_long_waves_need_the_hold_on_the_constraint(monkeypatch):
    # Control of the one above: errors of h' far outside the horizon are adiabatic modes.
    held = reference("baryon")
    monkeypatch.setitem(twofluid.evolution.MIXTURE_CLOSURES, "kinetic", KineticSystem)
    monkeypatch.setattr("twofluid.fluids.stepping.MIXTURES_OUTSIDE", 1.0)
    assert misfit(alone("baryon"), held) > 3e-4  # held to it 1e-5, see above


def test_compensated_mode_is_the_difference_of_the_other_two():
    baryon, dark, compensated = (reference(mode) for mode in ("baryon", "dark_matter", "compensated"))
    asked = baryon.scenario.cosmology
    weight = asked.baryon_density / asked.dark_matter_density
    for name in EVOLVED[:2]:
        ours, others = getattr(compensated, name), [getattr(history, name) for history in (baryon, dark)]
        # 1e-5 of what cancels.
        np.testing.assert_allclose(ours, others[0] - weight * others[1], atol=1e-5 * np.abs(others[0]).max())
    np.testing.assert_allclose(compensated.delta_baryon[:2], 1.0, atol=1e-6)


# --- sums


def test_without_other_modes_a_mixture_changes_nothing():
    plain = evolve(scenario(), wavenumbers=[0.01, 5.0], redshifts=REDSHIFTS)
    empty, double = run(wavenumbers=[0.01, 5.0]), run(2.0, wavenumbers=[0.01, 5.0])
    for name in EVOLVED:
        np.testing.assert_array_equal(getattr(empty, name), getattr(plain, name))
        np.testing.assert_array_equal(2.0 * getattr(plain, name), getattr(double, name))
    assert empty.counts == plain.counts
    off = run(1.0, {"baryon": Share(0.0, correlation=0.5)}, [0.01, 5.0])
    np.testing.assert_array_equal(off.delta_baryon, plain.delta_baryon)


def test_a_trace_of_another_mode_is_next_to_nothing():
    plain = evolve(scenario(), wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS)
    assert misfit(run(1.0, {"dark_matter": Share(1e-9, correlation=1.0)}), plain) < 1e-4  # other steps


def test_correlated_modes_are_one_wave_with_weights_by_wavenumber():
    share = Share(0.5, correlation=1.0, tilt=1.965)
    both = run(1.0, {"baryon": share})
    minus = run(1.0, {"baryon": replace(share, correlation=-1.0)})
    iso = reference("baryon")
    weight = 0.5 * (np.array(WAVENUMBERS) / 0.05) ** 0.5  # amplitude, half of the excess of the exponents
    for name in EVOLVED:
        difference = (getattr(both, name) - getattr(minus, name)) / 2.0
        size = np.abs(getattr(both, name)).max(axis=1, keepdims=True)
        np.testing.assert_allclose(difference / size, weight[:, None] * getattr(iso, name) / size, atol=1e-9)
    assert both.parts == (both,)
    assert both.initial_modes == "adiabatic + baryon"


@pytest.fixture(scope="module")
def partly():
    return run(1.0, {"baryon": Share(30.0, correlation=-0.6), "neutrino_velocity": Share(2.0, correlation=0.3)})


def test_a_partly_correlated_mixture_has_the_covariance_of_its_modes(partly):
    # By the definition of a correlation: <x y> = sum over pairs of modes of amplitude, correlation and transfer.
    modes = {"adiabatic": run(1.0, {"baryon": Share(1e-12, correlation=1.0)})}
    modes |= {mode: reference(mode) for mode in ("baryon", "neutrino_velocity")}
    amplitude = {"adiabatic": 1.0, "baryon": 30.0, "neutrino_velocity": 2.0}
    common = {"adiabatic": 1.0, "baryon": -0.6, "neutrino_velocity": 0.3}

    def covariance(x, y):
        total = 0.0
        for one in modes:
            for other in modes:
                correlation = 1.0 if one == other else common[one] * common[other]
                weight = amplitude[one] * amplitude[other] * correlation
                total = total + weight * getattr(modes[one], x) * getattr(modes[other], y)
        return total

    dark_power = covariance("delta_dark", "delta_dark")
    np.testing.assert_allclose(partly.delta_dark, np.sqrt(dark_power), rtol=1e-9)
    for name in EVOLVED[1:]:
        expected = covariance(name, "delta_dark") / np.sqrt(dark_power)
        size = np.abs(expected).max(axis=1, keepdims=True)
        np.testing.assert_allclose(getattr(partly, name) / size, expected / size, atol=1e-9, err_msg=name)
    ratio = covariance("delta_baryon", "delta_dark") / dark_power
    np.testing.assert_allclose(partly.delta_baryon / partly.delta_dark, ratio, rtol=1e-9)
    power = sum(part.delta_baryon**2 for part in partly.parts)
    np.testing.assert_allclose(power, covariance("delta_baryon", "delta_baryon"), rtol=1e-9)
    assert np.all(power >= partly.delta_baryon**2)
    assert [part.initial_modes for part in partly.parts] == [
        "adiabatic + baryon + neutrino_velocity", "baryon", "neutrino_velocity",
    ]  # fmt: skip


def test_almost_full_correlation_is_next_to_full_correlation():
    almost, fully = (
        run(1.0, {"dark_matter": Share(5.0, correlation=value)}, [0.01, 5.0]) for value in (1.0 - 1e-10, 1.0)
    )
    assert (len(almost.parts), len(fully.parts)) == (2, 1)
    assert misfit(almost, fully) < 1e-4
    almost, fully = (history.delta_baryon / history.delta_dark for history in (almost, fully))
    np.testing.assert_allclose(almost, fully, atol=1e-4)


@pytest.mark.parametrize("name", EVOLVED)
def test_slopes_of_several_parts_are_those_of_what_they_belong_to(partly, name):
    log_a = -np.log(np.array([300.0, 90.0, 20.0]))
    span = 1e-4
    rows = slice(0, 3)  # the last is a wave left unresolved
    after, before = (partly.at(name, np.expm1(-(log_a + step)))[rows] for step in (span, -span))
    slope = partly.slope_at(name, np.expm1(-log_a))[rows]
    size = np.abs(partly.at(name, np.expm1(-log_a))[rows]) + np.abs(slope)
    np.testing.assert_allclose((after - before) / (2.0 * span) / size, slope / size, atol=2e-3)


def test_interpolation_and_asked_redshifts_agree(partly):
    for name in EVOLVED:
        size = np.abs(getattr(partly, name))
        np.testing.assert_allclose(partly.at(name, REDSHIFTS) / size, getattr(partly, name) / size, rtol=1e-9)


def test_baryons_lead_where_there_is_no_dark_matter():
    history = run(1.0, {"baryon": Share(1.0)}, [0.01, 0.2], dark_matter_density=0.0)
    power = sum(part.delta_baryon**2 for part in history.parts)
    np.testing.assert_allclose(history.delta_baryon, np.sqrt(power), rtol=1e-12)


# --- together with the rest


def test_many_scenarios_in_one_sweep_are_what_each_is_alone(partly):
    plain = scenario()
    asked = [plain, partly.scenario, mixed(0.0, {"compensated": Share(1.0, 1.0)}), scenario(baryon_density=0.03)]
    together = evolve_many(asked, wavenumbers=[0.01, 5.0], redshifts=REDSHIFTS)
    for one, history in zip(asked, together, strict=True):
        single = evolve(one, wavenumbers=[0.01, 5.0], redshifts=REDSHIFTS)
        assert len(history.parts) == len(single.parts)
        assert history.counts["steps"] == single.counts["steps"]
        for name in EVOLVED:
            np.testing.assert_allclose(getattr(history, name), getattr(single, name), rtol=1e-10)


def test_save_and_load_keep_every_part(partly, tmp_path):
    certified = certify(partly, modes=[1, 3])
    certified.save(tmp_path / "run.npz")
    again = load_history(tmp_path / "run.npz")
    assert again.scenario == partly.scenario
    assert again.initial_modes == partly.initial_modes
    for ours, loaded in zip((partly, *partly.parts), (again, *again.parts), strict=True):
        assert loaded.initial_modes == ours.initial_modes
        for name in (*EVOLVED, "constraint", "wavenumber", "redshift"):
            np.testing.assert_array_equal(getattr(loaded, name), getattr(ours, name))
        for part in fields(Trace):
            np.testing.assert_array_equal(getattr(loaded.trace, part.name), getattr(ours.trace, part.name))
    assert again.certificate.sentence() == certified.certificate.sentence()


def test_certificate_of_a_mixture_is_kept():
    shares = {"compensated": Share(10.0, correlation=0.5), "neutrino_density": Share(0.3)}
    assert certify(run(1.0, shares), modes=range(len(WAVENUMBERS))).certificate.kept


@pytest.mark.parametrize(
    ("shares", "changes", "key", "rule"),
    [
        ({"dark_matter": Share(1.0)}, {"dark_matter_density": 0.0}, "dark_matter", "needs dark matter"),
        ({"compensated": Share(1.0)}, {"dark_matter_density": 0.0}, "compensated", "needs dark matter"),
    ],
)
def test_evolve_refuses_what_cannot_be(shares, changes, key, rule):
    with pytest.raises(ScenarioError, match=rule) as caught:
        run(1.0, shares, **changes)
    assert caught.value.key == f"primordial.mixture.{key}"
