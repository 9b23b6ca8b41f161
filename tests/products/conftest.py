"""Histories with known closed forms, shaped like a real one."""

import sys
from dataclasses import make_dataclass
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from scipy.interpolate import CubicHermiteSpline

from twofluid import Universe, evolve
from twofluid.history import EVOLVED, Trace
from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario

sys.path.insert(0, str(Path(__file__).parent))  # the helpers beside the tests

from standard_universe import standard_scenario

RUN_REDSHIFTS = (10000.0, 3000.0, 1500.0, 1000.0, 500.0, 300.0, 200.0, 100.0, 50.0, 20.0, 10.0, 5.0, 0.0)

Landmarks = make_dataclass("Landmarks", [("drag_redshift", float), ("drag_sound_horizon", float)])

AGE_TODAY = 12_000.0  # [Myr] of the matter-dominated universe below; any number would do


@pytest.fixture
def make_history():
    """Return a function that builds a history from curves of ln a, one per mode.

    Each curve is a pair of functions (value, derivative by ln a).
    """

    def make(dark, baryon, *, redshift=(9.0, 0.0), start=-9.0, step=0.01, has_dark_matter=True):
        knots = np.linspace(start, 0.0, round(-start / step) + 1)
        log_a = -np.log1p(np.asarray(redshift, dtype=float))

        def sampled(curves, part, where):
            return np.array([curve[part](where) for curve in curves], dtype=float)

        at_redshift = [sampled(dark, 0, log_a), sampled(baryon, 0, log_a)]
        history = SimpleNamespace(
            scenario=SimpleNamespace(
                to_mapping=lambda: {"title": "Saltmarsh test"},
                assumptions=lambda: ("primordial.tilt = 0.965",),
                method=SimpleNamespace(closure="kinetic"),
                cosmology=SimpleNamespace(thermal=None, reionization=None),
                primordial=Primordial(),
            ),
            universe=SimpleNamespace(
                age=lambda a: AGE_TODAY * a**1.5,  # Einstein-de Sitter
                landmarks=Landmarks(1060.123456, 147.05),
            ),
            wavenumber=np.arange(1.0, len(dark) + 1),
            redshift=np.asarray(redshift, dtype=float),
            delta_dark=at_redshift[0],
            delta_baryon=at_redshift[1],
            theta_baryon=-at_redshift[1],
            delta_gas_temperature=at_redshift[1] / 2,
            delta_matter=(at_redshift[0] + at_redshift[1]) / 2,
            theta_dark=None,
            evolved=EVOLVED,
            has_dark_matter=has_dark_matter,
            has_massive_neutrinos=False,
            warnings=("a sentence of warning",),
            certificate=None,
            trace=SimpleNamespace(
                log_scale_factor=np.tile(knots, (len(dark), 1)),
                delta_dark=sampled(dark, 0, knots),
                delta_dark_slope=sampled(dark, 1, knots),
                delta_baryon=sampled(baryon, 0, knots),
                delta_baryon_slope=sampled(baryon, 1, knots),
            ),
        )
        history.parts = (history,)
        return history

    return make


def power(exponent, factor=1.0):
    """Curve factor * a^exponent with its derivative."""
    return (lambda x: factor * np.exp(exponent * x), lambda x: factor * exponent * np.exp(exponent * x))


def wave(middle, amplitude, rate, phase):
    """Curve that oscillates in ln a and rises through its middle at ln a = -phase, with its derivative."""
    return (
        lambda x: middle + amplitude * np.sin(rate * (x + phase)),
        lambda x: amplitude * rate * np.cos(rate * (x + phase)),
    )


@pytest.fixture
def curves():
    """Return the curve makers."""
    return SimpleNamespace(power=power, wave=wave, age_today=AGE_TODAY)


@pytest.fixture(scope="session")
def standard_run():
    """A run from beyond the horizon to far below the Jeans scale."""
    return evolve(standard_scenario(), wavenumbers=np.geomspace(1e-4, 1e4, 97), redshifts=RUN_REDSHIFTS)


@pytest.fixture(scope="session")
def bare_run():
    """The same without dark matter."""
    scenario = standard_scenario(dark_matter_density=0.0)
    return evolve(scenario, wavenumbers=np.geomspace(1e-4, 150.0, 12), redshifts=RUN_REDSHIFTS)


@pytest.fixture(scope="session")
def make_run():
    """Return a function that runs wavenumbers of the standard universe."""
    return lambda wavenumbers, redshifts: evolve(
        standard_scenario(), wavenumbers=wavenumbers, redshifts=redshifts
    )


def planck_like(**changes):
    """Scenario with Planck 2018 VI, Table 2 means, every neutrino massless; changes go to the cosmology."""
    values = {"hubble_constant": 67.36, "baryon_density": 0.02237, "dark_matter_density": 0.12} | changes
    primordial = Primordial(amplitude=2.1e-9, tilt=0.9649, pivot=0.05)
    return Scenario("Saltmarsh test", Cosmology(**values), primordial, Sampling((0.1,), (0.0,)), {})


@pytest.fixture(scope="session")
def scenario_with():
    return planck_like


@pytest.fixture(scope="session")
def standard():
    """A run over eight decades in wavenumber."""
    return evolve(planck_like(), wavenumbers=np.geomspace(1e-4, 1e4, 161), redshifts=[1000.0, 100.0, 10.0, 0.0])


@pytest.fixture(scope="session")
def baryons_alone():
    """The same baryons without dark matter."""
    asked = planck_like(dark_matter_density=0.0)
    return evolve(asked, wavenumbers=np.geomspace(1e-3, 2.0, 60), redshifts=[1000.0, 100.0, 7.5, 0.0])


@pytest.fixture(scope="session")
def make_up_run():
    """Return a function that builds a history of made-up curves of ln a, in a real universe.

    Each curve is a pair of functions (value, derivative by ln a), one a mode.
    """

    def make(dark, baryon, redshift=(9.0, 0.0), *, wavenumber=None, start=-14.0, step=0.02, **cosmology):
        scenario = planck_like(**cosmology)
        knots = np.linspace(start, 0.0, round(-start / step) + 1)

        def sampled(curves, part, where):
            return np.array([curve[part](where) + 0.0 * where for curve in curves])

        nothing = np.zeros((len(dark), len(knots)))
        trace = Trace(
            log_scale_factor=np.tile(knots, (len(dark), 1)),
            delta_dark=sampled(dark, 0, knots), delta_dark_slope=sampled(dark, 1, knots),
            delta_baryon=sampled(baryon, 0, knots), delta_baryon_slope=sampled(baryon, 1, knots),
            theta_baryon=nothing, theta_baryon_slope=nothing,
            delta_gas_temperature=nothing, delta_gas_temperature_slope=nothing,
        )  # fmt: skip
        log_a = -np.log1p(np.asarray(redshift, dtype=float))
        history = SimpleNamespace(
            theta_dark=None,
            evolved=EVOLVED,
            scenario=scenario,
            universe=Universe(scenario.cosmology),
            wavenumber=np.arange(1.0, len(dark) + 1) if wavenumber is None else np.asarray(wavenumber),
            redshift=np.asarray(redshift, dtype=float),
            delta_dark=sampled(dark, 0, log_a),
            delta_baryon=sampled(baryon, 0, log_a),
            has_dark_matter=scenario.cosmology.dark_matter_density > 0.0,
            has_massive_neutrinos=False,
            warnings=(),
            certificate=None,
            constraint=np.full(len(dark), 1.5e-5),
            trace=trace,
            at=lambda name, z: between(trace, name, z)[0],
            slope_at=lambda name, z: between(trace, name, z)[1],
        )
        history.parts = (history,)
        return history

    def between(trace, name, redshift):
        """Value and slope by an interpolation that is not ours."""
        log_a = -np.log1p(np.atleast_1d(np.asarray(redshift, dtype=float)))
        knots, values, slopes = trace.log_scale_factor[0], getattr(trace, name), getattr(trace, name + "_slope")
        curve = CubicHermiteSpline(knots, values, slopes, axis=1, extrapolate=False)
        return curve(log_a), curve(log_a, 1)

    return make
