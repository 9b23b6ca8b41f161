"""The clock: when each mode takes its steps.

Every mode has its own clock, laid out before the integration from a density of steps (how many
steps the solution wants per unit of log time). All modes are then advanced in lockstep; the clock of
a mode with fewer steps than others ends with steps of zero length, which leave it as it is.
"""

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Clock:
    """Step boundaries of every mode.

    Attributes
    ----------
    boundaries : array, shape (boundary, mode)
        Log time of the step boundaries, non-decreasing, the last one repeated as padding.
    mark_index : array, shape (mark, mode)
        Boundary at which each mark is met exactly.
    steps : array, shape (mode,)
        Steps of non-zero length of each mode.
    """

    boundaries: np.ndarray
    mark_index: np.ndarray
    steps: np.ndarray


def lay_out(grid: np.ndarray, density: np.ndarray, start: np.ndarray, marks: np.ndarray) -> Clock:
    """Place the steps of every mode so that each holds an equal share of the density.

    Between two marks the share is at most one, so the density asked for is never undercut.

    Parameters
    ----------
    grid : array, shape (node,)
        Increasing log times on which the density is given, linear in between.
    density : array, shape (mode, node)
        Steps wanted per unit of log time, positive.
    start : array, shape (mode,)
        Log time at which each mode starts, within the grid and before the first mark.
    marks : array, shape (mark,)
        Increasing log times every mode has to meet exactly; the last is the end.

    Returns
    -------
    Clock

    Raises
    ------
    ValueError
        If a start lies outside the grid or not before the first mark.
    """
    if start.min() < grid[0] or marks[-1] > grid[-1] or start.max() >= marks[0]:
        raise ValueError("each mode must start on the grid, before the first mark, and end on the grid")
    total = np.zeros_like(density)  # counted back from the end, so that it does not depend on where the grid begins
    pieces = 0.5 * (density[:, 1:] + density[:, :-1]) * np.diff(grid)
    np.negative(np.cumsum(pieces[:, ::-1], axis=1), out=total[:, -2::-1])

    stops = np.concatenate([start[:, None], np.broadcast_to(marks, (len(start), len(marks)))], axis=1)
    share = _on_grid(grid, total, stops)
    pieces = np.ceil(np.diff(share, axis=1) * (1.0 - 1e-12)).astype(int).clip(min=1)  # guard a share of 1 + round-off
    reached = np.concatenate([np.zeros((len(start), 1), int), np.cumsum(pieces, axis=1)], axis=1)

    count = np.arange(reached[:, -1].max() + 1)
    boundaries = np.empty((len(start), len(count)))
    for row, places, shares, totals in zip(boundaries, reached, share, total, strict=True):
        row[:] = np.interp(np.interp(count, places, shares), totals, grid)
    boundaries[np.arange(len(start))[:, None], reached] = stops
    boundaries = np.where(count > reached[:, -1:], stops[:, -1:], boundaries)
    return Clock(np.ascontiguousarray(boundaries.T), reached[:, 1:].T, reached[:, -1])


def _on_grid(grid: np.ndarray, values: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Interpolate rows of values on one common grid at points of shape (row, point)."""
    right = np.clip(np.searchsorted(grid, points), 1, len(grid) - 1)
    rows = np.arange(len(values))[:, None]
    fraction = (points - grid[right - 1]) / (grid[right] - grid[right - 1])
    return values[rows, right - 1] + fraction * (values[rows, right] - values[rows, right - 1])
