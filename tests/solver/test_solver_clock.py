"""The clock: step lengths, marks, padding."""

import numpy as np
import pytest

from twofluid.solver import lay_out

GRID = np.linspace(0.0, 10.0, 201)


def test_constant_density_gives_equal_steps():
    clock = lay_out(GRID, np.full((1, 201), 4.0), np.array([2.0]), np.array([7.0]))
    np.testing.assert_allclose(clock.boundaries[:, 0], np.linspace(2.0, 7.0, 21), atol=1e-12)


def test_steps_follow_the_density():
    density = np.where(GRID < 5.0, 2.0, 20.0)[None]
    step = np.diff(lay_out(GRID, density, np.array([0.0]), np.array([10.0])).boundaries[:, 0])
    middle = np.diff(GRID)[0]  # the density is linear between nodes, so the change takes one of them
    assert np.all(step[:9] > 0.45)
    assert step[:9].max() <= 0.5 * (1.0 + 1e-9)
    assert np.all(step[-90:] < 0.05 + middle)


def test_marks_are_met_exactly():
    marks = np.array([3.3, 3.4, 9.99, 10.0])
    start = np.array([0.0, 1.234])
    density = np.array([np.full(201, 3.0), 1.0 + GRID])
    clock = lay_out(GRID, density, start, marks)
    for mode in range(2):
        np.testing.assert_array_equal(clock.boundaries[clock.mark_index[:, mode], mode], marks)
        assert clock.boundaries[0, mode] == start[mode]
        assert np.all(np.diff(clock.boundaries[:, mode])[: clock.steps[mode]] > 0.0)


def test_no_step_holds_more_than_its_share():
    density = (2.0 + np.sin(GRID) ** 2)[None] * np.array([[1.0], [7.0]])
    clock = lay_out(GRID, density, np.array([0.0, 0.5]), np.array([4.0, 10.0]))
    for mode in range(2):
        total = np.concatenate([[0.0], np.cumsum((density[mode, 1:] + density[mode, :-1]) / 2 * np.diff(GRID))])
        share = np.diff(np.interp(clock.boundaries[:, mode], GRID, total))
        assert share.max() <= 1.0 + 1e-9


def test_a_short_clock_is_padded_with_empty_steps():
    clock = lay_out(GRID, np.array([np.full(201, 1.0), np.full(201, 5.0)]), np.zeros(2), np.array([10.0]))
    assert clock.steps.tolist() == [10, 50]
    assert np.all(clock.boundaries[10:, 0] == 10.0)


def test_a_clock_does_not_depend_on_its_companions():
    density = np.array([1.0 + GRID, 30.0 + 0 * GRID, 2.0 + np.cos(GRID)])
    start, marks = np.array([0.1, 0.2, 0.3]), np.array([5.0, 10.0])
    together = lay_out(GRID, density, start, marks)
    for mode in range(3):
        alone = lay_out(GRID, density[[mode]], start[[mode]], marks)
        steps = alone.steps[0]
        # Rows are told apart by an offset in one search: that rounds in the last digits.
        np.testing.assert_allclose(together.boundaries[: steps + 1, mode], alone.boundaries[:, 0], atol=1e-11)


@pytest.mark.parametrize(("start", "marks"), [([-1.0], [5.0]), ([6.0], [5.0]), ([1.0], [5.0, 11.0])])
def test_start_and_marks_must_fit(start, marks):
    with pytest.raises(ValueError, match="start on the grid, before the first mark, and end on the grid"):
        lay_out(GRID, np.ones((1, 201)), np.array(start), np.array(marks))
