"""A small linear system with a full matrix, to test the solver without any cosmology."""

import numpy as np


class MatrixSystem:
    """``dy/dt = A(t) y`` with A given as a function of time for each mode.

    Parameters
    ----------
    matrices : sequence of callable
        One function a mode: time -> array, shape (unknown, unknown).
    count : int
        Number of unknowns.
    couplings : set of (int, int), optional
        Non-zero entries; all of them if left out.
    """

    def __init__(self, matrices, count, couplings=None):
        self.matrices = matrices
        self.unknowns = [f"y{index}" for index in range(count)]
        every = {(row, column) for row in range(count) for column in range(count)}
        self._couplings = every if couplings is None else couplings

    def step_rates(self, modes, time, step):
        """Step times rate, shape (stage, lane)."""
        rates = {entry: np.empty(time.shape) for entry in self._couplings}
        for place, mode in enumerate(modes):
            for index in np.ndindex(time.shape[:2]):
                matrix = self.matrices[mode](time[*index, place])
                for (row, column), rate in rates.items():
                    rate[*index, place] = matrix[row, column] * step[index[1], place]
        return {entry: rate.reshape(len(time), -1) for entry, rate in rates.items()}


def constant(matrix):
    """Wrap a constant matrix as a function of time."""
    return lambda time: np.asarray(matrix, dtype=float)
