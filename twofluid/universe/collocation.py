"""Stiff ordinary differential equations on a prescribed grid, all steps at once.

Radau IIA with three stages, order 5 (Hairer & Wanner 1996, Solving Ordinary Differential Equations II,
sec. IV.5). A sequential pass of the implicit Euler method on a coarser grid supplies the first guess;
Newton's method then works on every step of the grid together, so that the equations are always evaluated on
whole arrays and only a 2 x 2 (unknown x unknown) recursion remains sequential.
"""

from math import sqrt

import numpy as np

_ROOT = sqrt(6.0)
_ABSCISSAE = np.array([(4.0 - _ROOT) / 10.0, (4.0 + _ROOT) / 10.0, 1.0])
_MATRIX = np.array(
    [
        [(88.0 - 7.0 * _ROOT) / 360.0, (296.0 - 169.0 * _ROOT) / 1800.0, (-2.0 + 3.0 * _ROOT) / 225.0],
        [(296.0 + 169.0 * _ROOT) / 1800.0, (88.0 + 7.0 * _ROOT) / 360.0, (-2.0 - 3.0 * _ROOT) / 225.0],
        [(16.0 - _ROOT) / 36.0, (16.0 + _ROOT) / 36.0, 1.0 / 9.0],
    ]
)
_COARSENING = 4  # grid steps to one step of the first guess
_DIFFERENCE = 1.0e-7  # increment of the difference quotients; only the speed of convergence depends on it
_CONVERGED = 1.0e-7  # last Newton change, absolute; the one it spares would be about its square
_ITERATIONS = 25  # Newton steps allowed; 4 are usual


class NotConvergedError(ArithmeticError):
    """Newton's method did not settle."""


@np.errstate(over="ignore", divide="ignore", invalid="ignore")  # astray iterates end as NotConvergedError
def solve_stiff(slopes, grid, initial):
    """Solve dy/dt = f(t, y) on a uniform grid.

    Parameters
    ----------
    slopes : callable
        f(t, y) with t of shape (point,) and y of shape (unknown, point); returns shape (unknown, point).
    grid : array, shape (node,)
        Uniform, growing.
    initial : array, shape (unknown,)
        Values at the first node.

    Returns
    -------
    array, shape (unknown, node)

    Raises
    ------
    NotConvergedError
        If 25 Newton steps do not bring the change below 1e-7.
    """
    initial = np.asarray(initial, dtype=float)
    step = (grid[-1] - grid[0]) / (len(grid) - 1)
    times = grid[:-1, None] + step * _ABSCISSAE  # shape (step, stage)
    coarse = np.append(grid[:-1:_COARSENING], grid[-1])
    guess = _implicit_euler(slopes, coarse, initial)
    stages = np.stack([np.interp(times, coarse, values) for values in guess])  # shape (unknown, step, stage)
    for _ in range(_ITERATIONS):
        change = _newton_change(slopes, times, step, initial, stages)
        stages = stages + change
        size = np.max(np.abs(change))
        if size < _CONVERGED:
            return np.column_stack([initial, stages[:, :, -1]])
        if not np.isfinite(size):
            break  # a failure is told once, below
    raise NotConvergedError(f"the last change was {size:.3g}")


def _linearize(slopes, times, values):
    """Return f and df/dy, shapes (unknown, point) and (unknown, unknown, point)."""
    unknowns, points = values.shape
    moves = _DIFFERENCE * np.column_stack([np.zeros(unknowns), np.eye(unknowns)])
    moved = (values[:, None, :] + moves[:, :, None]).reshape(unknowns, -1)
    found = slopes(np.tile(times, unknowns + 1), moved).reshape(unknowns, unknowns + 1, points)
    here = found[:, 0]
    return here, (found[:, 1:] - here[:, None]) / _DIFFERENCE


def _implicit_euler(slopes, grid, initial):
    """Take one Newton step of implicit Euler a node, from the straight continuation of the last two."""
    values = np.empty((len(initial), len(grid)))
    values[:, 0] = last = initial
    identity = np.eye(len(initial))
    for node, step in enumerate(np.diff(grid)):
        now = values[:, node]
        guess = 2.0 * now - last
        here, jacobian = _linearize(slopes, grid[node + 1 : node + 2], guess[:, None])
        residual = now + step * here[:, 0] - guess
        values[:, node + 1] = guess + np.linalg.solve(identity - step * jacobian[:, :, 0], residual)
        last = now
    return values


def _newton_change(slopes, times, step, initial, stages):
    """Newton change of all stage values, shape (unknown, step, stage)."""
    unknowns, steps, _ = stages.shape
    here, jacobian = _linearize(slopes, times.ravel(), stages.reshape(unknowns, -1))
    here, jacobian = here.reshape(stages.shape), jacobian.reshape(unknowns, unknowns, steps, -1)
    begin = np.column_stack([initial, stages[:, :-1, -1]])  # at the start of each step
    residual = begin[..., None] + step * here @ _MATRIX.T - stages
    # unknowns (stage, unknown) of one step; right sides: the residual, and a unit change of each begin value
    size = 3 * unknowns
    matrix = np.eye(size) - step * np.einsum("ij,uvnj->niujv", _MATRIX, jacobian).reshape(steps, size, size)
    right = np.empty((steps, size, 1 + unknowns))
    right[:, :, 0] = residual.transpose(1, 2, 0).reshape(steps, size)
    right[:, :, 1:] = np.tile(np.eye(unknowns), (3, 1))
    solved = np.linalg.solve(matrix, right)
    own, carried = solved[:, :, 0], solved[:, :, 1:]
    start = _sweep(own[:, -unknowns:], carried[:, -unknowns:])
    change = own + np.einsum("nij,nj->ni", carried, start)
    return change.reshape(steps, 3, unknowns).transpose(2, 0, 1)


def _sweep(own, carried):
    """Solve d[n + 1] = own[n] + carried[n] d[n], d[0] = 0, for the changes d at the start of each step."""
    change = np.zeros_like(own)
    for n in range(len(own) - 1):
        change[n + 1] = own[n] + carried[n] @ change[n]
    return change
