"""The certificate: honest about the error, noticing what is broken, within its budget."""

from dataclasses import fields, replace
from types import SimpleNamespace

import numpy as np
import pytest
from brute_force import DELTA_BARYON, DELTA_DARK, REDSHIFTS, WAVENUMBERS
from test_evolve_accuracy import scenario

from twofluid import SolverFailure, certify, evolve, load_history
from twofluid.certificate import Certificate
from twofluid.certification import BUDGET, FIXED_COST, contrast_errors
from twofluid.fluids import ACCURACIES, ChainLengths, KineticSystem, Resolution, resolution_for
from twofluid.products import lag_table
from twofluid.scenario import Method

FLOOR = 3e-6  # what the independent integration itself is good to, as far as agreement with our finest runs shows


def run(accuracy="standard", wavenumbers=WAVENUMBERS, redshifts=REDSHIFTS, resolution=None, **changes):
    asked = replace(scenario(**changes), method=Method(accuracy=accuracy))
    return evolve(asked, wavenumbers=wavenumbers, redshifts=redshifts, resolution=resolution)


@pytest.mark.parametrize("accuracy", ["draft", "standard"])
def test_estimate_brackets_the_true_error(accuracy):
    # Independent brute-force integration (see brute_force.py).
    history = certify(run(accuracy), modes=np.arange(len(WAVENUMBERS)))
    true_dark = np.abs(history.delta_dark / DELTA_DARK - 1.0)
    true_ratio = np.abs(history.delta_baryon / history.delta_dark - DELTA_BARYON / DELTA_DARK)
    for true, estimate in ((true_dark, history.certificate.dark_error), (true_ratio, history.certificate.ratio_error)):
        known = true > FLOOR
        assert known.sum() > 3
        factor = estimate[known] / true[known]
        assert np.mean((factor > 0.2) & (factor < 5.0)) > 0.95
        assert np.all(estimate[~known] < 5.0 * FLOOR)


@pytest.mark.parametrize("accuracy", ACCURACIES)
def test_promise_is_kept(accuracy):
    wavenumbers = np.geomspace(1e-3, 1e3, 13)
    history = certify(run(accuracy, wavenumbers), modes=np.arange(0, 13, 2))
    assert history.certificate.kept
    assert history.certificate.promise == ACCURACIES[accuracy].promise


def test_error_of_the_ratio_where_the_dark_matter_passes_through_zero():
    # Contrasts of one mode at four redshifts, the dark matter negative at the third; worked out by hand.
    def made_up(dark, baryon):
        redshift = np.array([100.0, 50.0, 20.0, 10.0])
        return SimpleNamespace(
            delta_dark=np.array([dark]), delta_baryon=np.array([baryon]), redshift=redshift,
            has_dark_matter=True, theta_dark=None,
        )  # fmt: skip

    finer = made_up([2.0, 1.0, -1e-3, 4.0], [1.0, 3.0, 5.0, 2.0])
    dark, ratio = contrast_errors(made_up([2.0, 1.01, 0.001, 4.0], [1.002, 3.0, 5.0, 2.0]), finer)
    np.testing.assert_allclose(dark[0], [0.0, 0.01, 0.002 / 0.2, 0.0], atol=1e-15)  # a tenth of the largest so far
    # 0.002 / 2; 0.01 x 3 over the larger, 3; 0.002 x 5 / 0.2 over the larger, 5; nothing
    np.testing.assert_allclose(ratio[0], [0.001, 0.01, 0.01, 0.0], atol=1e-15)


def test_accuracies_differ_as_promised():
    errors = [np.abs(run(name).delta_dark / DELTA_DARK - 1.0).max() for name in ACCURACIES]
    assert errors[0] > 3.0 * errors[1] > 3.0 * errors[2]
    assert errors[2] < 2e-5  # the independent integration's own error


def test_a_short_chain_is_noticed():
    standard = resolution_for(run(wavenumbers=[1.0]).universe)
    history = certify(run(resolution=Resolution(standard.stepping, ChainLengths(5, 5, 5))), modes=[1, 4])
    assert not history.certificate.kept
    assert "EXCEEDS the promised" in history.certificate.sentence()


def test_long_steps_are_noticed():
    standard = resolution_for(run(wavenumbers=[1.0]).universe)
    long = {part.name: 3.0 * getattr(standard.stepping, part.name) for part in fields(standard.stepping)[:5]}
    coarse = replace(standard.stepping, **long, felt_phase=30.0)
    wavenumbers = [0.03, 0.1, 0.3]
    history = certify(run(wavenumbers=wavenumbers, resolution=Resolution(coarse, standard.chains)), modes=[0, 1, 2])
    assert not history.certificate.kept


def test_a_wrong_coefficient_is_noticed_by_the_constraint(monkeypatch):
    original = KineticSystem.step_rates

    def wrong(self, modes, time, step):
        rates = original(self, modes, time, step)
        entry = (self.unknowns.index("metric_rate"), self.unknowns.index("delta_dark"))
        rates.entries[entry] = 1.03 * rates.entries[entry]
        return rates

    right = certify(run(wavenumbers=[0.05, 0.5]), modes=[0])
    monkeypatch.setattr(KineticSystem, "step_rates", wrong)
    with pytest.raises(SolverFailure, match="Einstein constraint drifts"):
        run(wavenumbers=[0.05, 0.5])
    monkeypatch.setattr("twofluid.evolution.CONSTRAINT_LIMIT", 1.0)
    history = certify(run(wavenumbers=[0.05, 0.5]), modes=[0])
    assert history.certificate.kept  # finer steps do not help against a wrong equation
    assert history.certificate.constraint > 1e3 * right.certificate.constraint


@pytest.mark.parametrize("count", [8, 60, 256])
def test_spread_stays_within_its_budget(count):
    # By counts: steps of the finer run, and what each step costs whatever the number of modes.
    wavenumbers = np.geomspace(1e-3, 1e4, count)
    history = run(wavenumbers=wavenumbers, redshifts=[1000.0, 10.0])
    certificate = certify(history).certificate
    finer = evolve(
        history.scenario,
        wavenumbers=certificate.wavenumber,
        redshifts=[1000.0, 10.0],
        resolution=resolution_for(history.universe).refined(),
    )
    spent = finer.counts["lanes"] + 100 * (np.diff(finer.trace.log_scale_factor) > 0).sum(axis=1).max()
    allowed = BUDGET * (FIXED_COST + history.counts["steps"] + 100 * 250)
    assert spent < 1.5 * allowed  # the estimate of the finer run's cost is rough
    assert certificate.wavenumber[0] == wavenumbers[0]
    assert certificate.wavenumber[-1] == wavenumbers[-1]


def test_dear_modes_are_left_out_and_the_sentence_says_how_many_were_checked():
    history = run(wavenumbers=np.geomspace(0.01, 30.0, 16), redshifts=[100.0], dark_matter_density=0.0)
    certificate = certify(history).certificate
    assert 3 <= len(certificate.wavenumber) < 16
    assert f"{len(certificate.wavenumber)} modes solved again" in certificate.sentence()


def test_sentence_names_the_worst_place():
    history = certify(run("draft"), modes=np.arange(7))
    error = history.certificate.ratio_error
    mode, epoch = np.unravel_index(error.argmax(), error.shape)
    sentence = history.certificate.sentence()
    expected = f"numerical error of the lag ratio: {error.max():.0e}, largest at k = {WAVENUMBERS[mode]:.3g}/Mpc"
    assert sentence.startswith(f"{expected}, z = {REDSHIFTS[epoch]:g};")


def test_header_carries_the_certificate_or_says_there_is_none():
    history = run(wavenumbers=[0.1, 1.0])
    assert lag_table(history).meta["certificate"].startswith("none: the numerical error")
    certified = certify(history, modes=[0])
    assert lag_table(certified).meta["certificate"] == certified.certificate.sentence()


def test_certificate_is_saved(tmp_path):
    history = certify(run(wavenumbers=[0.1, 1.0]), modes=[0, 1])
    history.save(tmp_path / "run.npz")
    loaded = load_history(tmp_path / "run.npz").certificate
    for part in fields(Certificate):
        np.testing.assert_array_equal(getattr(loaded, part.name), getattr(history.certificate, part.name))
    assert loaded.sentence() == history.certificate.sentence()
