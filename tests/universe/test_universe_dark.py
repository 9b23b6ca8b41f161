"""The sound speed of the dark matter: the law as stated, its end, and what is refused."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from twofluid import Universe, UniverseError
from twofluid.scenario import Cosmology, DarkMatter
from twofluid.universe import UniverseStack

SALTMARSH = Cosmology(67.5, baryon_density=0.0223, dark_matter_density=0.1195)
LIGHT = 299792.458  # [km/s], exact


def universe(*law, **changes):
    return Universe(replace(SALTMARSH, dark_matter=DarkMatter(*law), **changes))


@pytest.mark.parametrize(("stated", "at", "scaling"), [(1.0, 0.0, 1.0), (30.0, 999.0, 0.5), (200.0, 9.0, 0.0)])
def test_law_as_stated(stated, at, scaling):
    z = np.array([[0.0, 9.0], [99.0, 999.0]])
    expected = stated * ((1 + z) / (1 + at)) ** scaling / LIGHT
    # 9/4 of the fourth power of the speed is bent off: 1e-7 at 5e-3 c.
    np.testing.assert_allclose(universe(stated, at, scaling).dark_sound_speed(1 / (1 + z)), expected, rtol=2e-7)


def test_law_ends_below_the_sound_speed_of_light():
    warm = universe(100.0, 0.0, 1.0)
    a = np.geomspace(1e-14, 1.0, 200)
    speed = warm.dark_sound_speed(a)
    assert np.all(np.diff(speed) < 1e-15)  # round-off where it stands still
    assert speed[0] == pytest.approx(1 / np.sqrt(3), rel=1e-9)
    law = 100.0 / LIGHT / a
    slow = law < 0.1
    np.testing.assert_allclose(speed[slow], law[slow], rtol=3e-4)  # as the docstring promises
    assert warm.dark_sound.slow_from == pytest.approx(100.0 / LIGHT / 0.1)


def test_cold_by_default_and_without_dark_matter():
    assert not Universe(SALTMARSH).has_dark_pressure
    assert universe(5.0).has_dark_pressure
    none = universe(5.0, dark_matter_density=0.0)
    assert not none.has_dark_pressure
    assert none.dark_sound_speed(np.array([0.1, 1.0])).tolist() == [0.0, 0.0]
    assert universe(5.0, 0.0, 0.0).dark_sound.slow_from == 0.0


@pytest.mark.parametrize("scaling", [0.0, 0.5, 1.0])
def test_way_of_sound_against_quadrature(scaling):
    warm = universe(20.0, 0.0, scaling)

    def integrand(x):
        return float(warm.dark_sound_speed(np.exp(x)) / warm.conformal_hubble_rate(np.exp(x)))

    expected = quad(integrand, np.log(1e-12), 0.0, limit=500, epsrel=1e-8)[0]
    assert float(warm.dark_sound_horizon(1.0)) == pytest.approx(expected, rel=1e-6)


def test_stack_tells_universes_apart():
    laws = [(1.0, 0.0, 1.0), (0.0,), (30.0, 999.0, 0.5)]
    universes = [universe(*law) for law in laws]
    owner = np.array([2, 0, 1, 2])
    stack, a = UniverseStack(universes, owner), np.array([[1e-3, 0.1, 0.3, 1.0]])
    expected = [[float(universes[one].dark_sound_speed(x)) for one, x in zip(owner, a[0], strict=True)]]
    assert stack.has_dark_pressure
    np.testing.assert_allclose(stack.dark_sound_speed(a), expected, rtol=1e-14)
    np.testing.assert_allclose(stack.dark_sound_speed(a[:, :2], np.array([0, 1])), np.array(expected)[:, :2])


@pytest.mark.parametrize(
    ("law", "said"),
    [
        ((-1.0,), "dark_matter.sound_speed = -1.0 km/s"),
        ((4e4,), "dark_matter.sound_speed = 40000.0 km/s"),
        ((float("nan"),), "dark_matter.sound_speed = nan"),
        ((1.0, -0.5), "dark_matter.at_redshift = -0.5"),
        ((1.0, 0.0, -1.0), "dark_matter.scaling = -1.0"),
    ],
)
def test_impossible_laws_are_refused(law, said):
    with pytest.raises(UniverseError, match=said):
        universe(*law)
