"""A small linear system with a full matrix, to test the solver without any cosmology."""

import numpy as np

from twofluid.solver import StepRates


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

    tails = ()

    def step_rates(self, modes, time, step):
        """Step times rate, shape (stage, lane)."""
        rates = {entry: np.empty(time.shape) for entry in self._couplings}
        for stage, lane in np.ndindex(time.shape):
            matrix = self.matrices[modes[lane]](time[stage, lane])
            for (row, column), rate in rates.items():
                rate[stage, lane] = matrix[row, column] * step[lane]
        return StepRates(rates)


def constant(matrix):
    """Wrap a constant matrix as a function of time."""
    return lambda time: np.asarray(matrix, dtype=float)
