"""The history: shapes, interpolation, saving, refusals."""

from dataclasses import fields, replace

import numpy as np
import pytest
from astropy import units
from test_evolve_accuracy import scenario

from twofluid import SolverFailure, evolve, load_history
from twofluid.history import EVOLVED, Trace

REDSHIFTS = [10.0, 1000.0, 0.0, 300.0]


@pytest.fixture(scope="module")
def history():
    return evolve(scenario(), wavenumbers=np.geomspace(0.01, 30.0, 49), redshifts=REDSHIFTS)


def test_axes_are_mode_and_redshift_as_asked(history):
    assert history.redshift.tolist() == REDSHIFTS
    for name in EVOLVED:
        assert getattr(history, name).shape == (49, 4)
    np.testing.assert_array_less(history.delta_dark[:, 1], history.delta_dark[:, 3])
    np.testing.assert_array_less(history.delta_dark[:, 0], history.delta_dark[:, 2])


def test_history_tells_what_was_asked_of_evolve(history):
    assert history.scenario.sampling.redshifts == tuple(REDSHIFTS)
    assert len(history.scenario.sampling.wavenumbers) == 49


def test_sampling_of_the_scenario_is_the_default():
    history = evolve(scenario())
    assert history.wavenumber.tolist() == [0.1]
    assert history.redshift.tolist() == [0.0]


def test_asked_redshifts_do_not_change_the_answer(history):
    fewer = evolve(scenario(), wavenumbers=history.wavenumber, redshifts=[10.0])
    # Other marks, other steps: within the error of the steps.
    np.testing.assert_allclose(fewer.delta_baryon[:, 0], history.delta_baryon[:, 0], rtol=3e-5)


def test_wavenumbers_with_units_are_converted():
    asked = np.array([1.0, 2.0]) / units.kpc
    found = evolve(scenario(), wavenumbers=asked, redshifts=[0.0]).wavenumber
    assert found == pytest.approx([1000.0, 2000.0], rel=1e-12)


@pytest.mark.parametrize("name", EVOLVED)
def test_interpolation_in_redshift(history, name):
    between = [987.0, 640.0, 150.0, 33.0, 2.5]
    exact = evolve(scenario(), wavenumbers=history.wavenumber, redshifts=between)
    scale = np.abs(getattr(exact, name)).max(axis=0)
    if name == "delta_gas_temperature":  # while the photons still set it, it is tiny beside the density
        scale = np.maximum(scale, np.abs(exact.delta_baryon).max(axis=0))
    error = np.abs(history.at(name, between) - getattr(exact, name)) / scale
    # Cubic Hermite over steps of up to 1.2 in k dtau: 4e-4 of an oscillation that is small beside the largest mode.
    assert error.max() < 3e-4


def test_interpolation_meets_the_asked_redshifts(history):
    for name in EVOLVED:
        np.testing.assert_allclose(history.at(name, REDSHIFTS), getattr(history, name), rtol=1e-9)


def test_interpolation_in_wavenumber(history):
    between = np.sqrt(history.wavenumber[1:] * history.wavenumber[:-1])[20:]
    exact = evolve(scenario(), wavenumbers=between, redshifts=[100.0])
    found = history.at("delta_dark", 100.0, wavenumber=between)
    np.testing.assert_allclose(found, exact.delta_dark, rtol=1e-3)  # 14 modes a decade, spline in ln k


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("delta_gas", 10.0), "no quantity is named 'delta_gas': choose one of delta_dark"),
        (("delta_dark", -0.5), "redshifts must lie within the run, 0 to"),
        (("delta_dark", 1e12), "redshifts must lie within the run, 0 to"),
        (("delta_dark", 10.0, 100.0), "wavenumbers must lie within the run, 0.01 to 30 1/Mpc"),
    ],
)
def test_interpolation_refuses_what_lies_outside(history, arguments, message):
    with pytest.raises(ValueError, match=message):
        history.at(*arguments)


def test_save_and_load_without_loss(history, tmp_path):
    history.save(tmp_path / "run.npz")
    loaded = load_history(tmp_path / "run.npz")
    assert loaded.scenario == history.scenario
    assert loaded.scenario.assumed == history.scenario.assumed
    assert (loaded.counts, loaded.warnings) == (history.counts, history.warnings)
    for name in (*EVOLVED, "wavenumber", "redshift", "constraint"):
        np.testing.assert_array_equal(getattr(loaded, name), getattr(history, name))
    for part in fields(Trace):
        np.testing.assert_array_equal(getattr(loaded.trace, part.name), getattr(history.trace, part.name))
    assert loaded.universe.landmarks == history.universe.landmarks
    assert list(tmp_path.iterdir()) == [tmp_path / "run.npz"]


def test_loading_something_else_is_refused(tmp_path):
    (tmp_path / "other.npz").write_text("no archive")
    with pytest.raises(ValueError, match="is not a saved history"):
        load_history(tmp_path / "other.npz")


def test_loading_another_layout_is_refused(history, tmp_path, monkeypatch):
    monkeypatch.setattr("twofluid.history._FORMAT", 0)
    history.save(tmp_path / "old.npz")
    monkeypatch.undo()
    with pytest.raises(ValueError, match="has layout 0, this version reads layout 1"):
        load_history(tmp_path / "old.npz")


@pytest.mark.parametrize(
    ("sampling", "message"),
    [
        ({"wavenumbers": [1e-5]}, "from 0.0001 to 100000 1/Mpc"),
        ({"wavenumbers": [np.nan]}, "from 0.0001 to 100000 1/Mpc"),
        ({"wavenumbers": []}, "one or more numbers"),
        ({"redshifts": [-1.0]}, "from 0 to 1e"),
        ({"redshifts": [2e6]}, "from 0 to 1e"),
    ],
)
def test_evolve_refuses_what_is_out_of_range(sampling, message):
    with pytest.raises(ValueError, match=message):
        evolve(scenario(), **({"wavenumbers": [1.0], "redshifts": [0.0]} | sampling))


def test_a_broken_run_names_wavenumber_and_redshift(monkeypatch):
    from twofluid.fluids.kinetic import KineticSystem

    original = KineticSystem.step_rates

    def poisoned(self, modes, time, step):
        rates = original(self, modes, time, step)
        late = (time > 500.0) & (self.wavenumber[modes] == 2.0)
        entry = (self.unknowns.index("delta_dark"), self.unknowns.index("metric_rate"))
        rates.entries[entry] = np.where(late, np.nan, rates.entries[entry])
        return rates

    monkeypatch.setattr(KineticSystem, "step_rates", poisoned)
    with pytest.raises(SolverFailure, match=r"failed at k = 2 1/Mpc, z = \d+\.\d+: the solution is no longer finite"):
        evolve(scenario(), wavenumbers=[0.5, 2.0], redshifts=[0.0])


def test_a_broken_constraint_stops_the_run(monkeypatch):
    from twofluid.fluids.kinetic import KineticSystem

    original = KineticSystem.step_rates

    def wrong(self, modes, time, step):
        rates = original(self, modes, time, step)
        entry = (self.unknowns.index("metric_rate"), self.unknowns.index("delta_dark"))
        rates.entries[entry] = 1.05 * rates.entries[entry]
        return rates

    monkeypatch.setattr(KineticSystem, "step_rates", wrong)
    with pytest.raises(SolverFailure, match=r"k = 0.5 1/Mpc, z = .*the Einstein constraint drifts by"):
        evolve(scenario(), wavenumbers=[0.5, 2.0], redshifts=[0.0])


def test_has_dark_matter(history):
    assert history.has_dark_matter
    none = replace(history.scenario.cosmology, dark_matter_density=0.0)
    assert not replace(history, scenario=replace(history.scenario, cosmology=none)).has_dark_matter
