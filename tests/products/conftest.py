"""Histories with known closed forms, shaped like a real one."""

from dataclasses import make_dataclass, replace
from types import SimpleNamespace

import numpy as np
import pytest

from twofluid import evolve
from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario

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
        return SimpleNamespace(
            scenario=SimpleNamespace(
                to_mapping=lambda: {"title": "Saltmarsh test"},
                assumptions=lambda: ("primordial.tilt = 0.965",),
                method=SimpleNamespace(closure="kinetic"),
                cosmology=SimpleNamespace(thermal=None, reionization=None),
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
            has_dark_matter=has_dark_matter,
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


def standard_scenario(**changes):
    """Saltmarsh's universe, parameters by name changed."""
    cosmology = replace(Cosmology(67.5, baryon_density=0.0223, dark_matter_density=0.1195), **changes)
    return Scenario("Saltmarsh test", cosmology, Primordial(), Sampling([0.1], [0.0]))


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
