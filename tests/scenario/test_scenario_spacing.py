"""Ranges of wavenumbers and the way back."""

import numpy
import pytest

from twofluid.scenario.spacing import range_of, spaced_wavenumbers


@pytest.mark.parametrize("per_decade", [0.5, 1, 7, 20, 66.7, 80])
@pytest.mark.parametrize(("low", "high"), [(0.001, 1000.0), (1e-4, 1e5), (0.1, 0.25), (0.0371, 12.9)])
def test_a_range_agrees_with_numpy(low, high, per_decade):
    values = spaced_wavenumbers(low, high, per_decade)
    number = max(1, round(per_decade * numpy.log10(high / low)))
    assert len(values) == number + 1
    # numpy.geomspace is an independent construction; 1e-13 leaves room for round-off in two exponentials.
    assert values == pytest.approx(numpy.geomspace(low, high, number + 1), rel=1e-13)
    assert (values[0], values[-1]) == (low, high)
    assert all(numpy.diff(values) > 0)


def test_whole_decades_are_met_exactly():
    assert spaced_wavenumbers(0.001, 1000.0, 20)[::20] == (0.001, 0.01, 0.1, 1.0, 10.0, 100.0, 1000.0)


@pytest.mark.parametrize(
    ("per_decade", "points"), [(0.001, 2), (0.4, 2), (0.8, 3), (1.0, 3), (1.2, 3), (1.3, 4)]
)
def test_the_number_of_intervals_is_rounded_and_at_least_one(per_decade, points):
    assert len(spaced_wavenumbers(0.1, 10.0, per_decade)) == points  # two decades


@pytest.mark.parametrize("per_decade", [1, 7, 20, 33, 66.7, 80, 4000])
@pytest.mark.parametrize(("low", "high"), [(0.001, 1000.0), (0.1, 0.7), (0.0371, 12.9)])
def test_a_range_is_found_again(low, high, per_decade):
    values = spaced_wavenumbers(low, high, per_decade)
    found = range_of(values)
    assert found is not None or len(values) < 3
    assert found is None or spaced_wavenumbers(*found) == values


def test_a_round_density_is_found_as_such():
    assert range_of(spaced_wavenumbers(0.001, 1000.0, 20)) == (0.001, 1000.0, 20.0)


@pytest.mark.parametrize(
    "values",
    [(), (1.0,), (1.0, 2.0), (1.0, 2.0, 3.0), (10.0, 1.0, 0.1), (0.0, 1.0, 2.0), (-1.0, 1.0, 2.0),
     (1.0, float("nan"), 3.0), (1.0, 2.0, float("inf")), (1.0, 5.0, 1.0)],
)  # fmt: skip
def test_lists_that_are_no_range(values):
    assert range_of(values) is None
