"""Stiff ordinary differential equations on a prescribed grid, all steps and several systems at once.

Radau IIA with three stages, order 5 (Hairer & Wanner 1996, Solving Ordinary Differential Equations II,
sec. IV.5). A sequential pass of the second-order backward differentiation formula (ibid., sec. V.1) on a
coarser grid supplies the first guess; Newton's method then works on every step of the grid together, so that
the equations are always evaluated on whole arrays and only a 2 x 2 (unknown x unknown) recursion remains
sequential. Further systems of the same equations share each evaluation and each turn of the recursion.
"""

import numpy as np

from ..solver.collocation import NODES, STAGES, WEIGHTS

_COARSENING = 2  # grid steps to one step of the first guess: spares one Newton step of three against 4
_DIFFERENCE = 1.0e-7  # increment of the difference quotients; only the speed of convergence depends on it
_CONVERGED = 3.0e-6  # last Newton change, absolute; the one it spares would be about its square
_ITERATIONS = 25  # Newton steps allowed; 3 are usual


class NotConvergedError(ArithmeticError):
    """Newton's method did not settle.

    Attributes
    ----------
    system : int
        Which of the systems failed.
    """

    def __init__(self, message, system):
        super().__init__(message)
        self.system = system


@np.errstate(over="ignore", divide="ignore", invalid="ignore")  # astray iterates end as NotConvergedError
def solve_stiff(slopes, grid, initial):
    """Solve dy/dt = f(t, y) on a uniform grid, for one system or several that do not know of each other.

    Parameters
    ----------
    slopes : callable
        f(t, y) with t of shape (point,) and y of shape (unknown, ..., point); returns the shape of y. The axes
        between are those of `initial` after the first, last, and others before them to broadcast over.
    grid : array, shape (node,)
        Uniform, growing.
    initial : array, shape (unknown,) or (unknown, system)
        Values at the first node.

    Returns
    -------
    array, shape (unknown, node) or (unknown, system, node)

    Raises
    ------
    NotConvergedError
        If 25 Newton steps do not bring the change of a system below 3e-6.
    """
    initial = np.asarray(initial, dtype=float)
    step = (grid[-1] - grid[0]) / (len(grid) - 1)
    times = grid[:-1, None] + step * NODES  # shape (step, stage)
    stages = _first_guess(slopes, grid, initial, times)
    moving = np.ones(initial.shape[1:], dtype=bool)  # a system that has settled is left alone
    for _ in range(_ITERATIONS):
        change = _newton_change(slopes, times, step, initial, stages)
        size = np.max(np.abs(change), axis=(0, -2, -1))
        stages = stages + np.where(moving[..., None, None], change, 0.0)
        failed = moving & ~np.isfinite(size)
        moving = moving & ~(size < _CONVERGED)
        if not moving.any():
            return np.concatenate([initial[..., None], stages[..., -1]], axis=-1)
        if failed.any():
            break  # a failure is told once, below
    system = int(np.argmax(failed if failed.any() else moving))
    raise NotConvergedError(f"the last change was {size.flat[system]:.3g}", system)


def _linearize(slopes, times, values):
    """Return f and df/dy of values (unknown, ..., point), shapes (unknown, ..., point) and (unknown, *values.shape).

    The derivative comes as df[i]/dy[j] at index [i, j].
    """
    unknowns = len(values)
    moves = _DIFFERENCE * np.column_stack([np.zeros(unknowns), np.eye(unknowns)])
    found = slopes(times, values[:, None] + moves.reshape(unknowns, -1, *[1] * (values.ndim - 1)))
    here = found[:, 0]
    return here, (found[:, 1:] - here[:, None]) / _DIFFERENCE


def _first_guess(slopes, grid, initial, times):
    """Stage values at `times` on the straight lines through a solution on a coarser grid."""
    coarse = np.append(grid[:-1:_COARSENING], grid[-1])
    values = _backward_differences(slopes, coarse, initial)
    node = np.clip(np.searchsorted(coarse, times, side="right") - 1, 0, len(coarse) - 2)
    share = (times - coarse[node]) / (coarse[node + 1] - coarse[node])
    return (1.0 - share) * values[..., node] + share * values[..., node + 1]


def _backward_differences(slopes, grid, initial):
    """One Newton step of the two-step formula a node, from the straight continuation of the last two."""
    values = np.empty((*initial.shape, len(grid)))
    values[..., 0] = before = initial
    identity, ratio = np.eye(len(initial)), 0.0  # without a step before, this is the implicit Euler method
    steps = np.diff(grid)
    for node, step in enumerate(steps):
        now = values[..., node]
        guess = now + ratio * (now - before)
        here, jacobian = _linearize(slopes, grid[node + 1 : node + 2], guess[..., None])
        reach = step * (1.0 + ratio) / (1.0 + 2.0 * ratio)
        base = now + ratio**2 / (1.0 + 2.0 * ratio) * (now - before)
        residual = base + reach * here[..., 0] - guess
        matrix = identity - reach * np.moveaxis(jacobian[..., 0], (0, 1), (-2, -1))
        change = np.linalg.solve(matrix, np.moveaxis(residual, 0, -1)[..., None])[..., 0]
        values[..., node + 1] = guess + np.moveaxis(change, -1, 0)
        before, ratio = now, steps[min(node + 1, len(steps) - 1)] / step
    return values


def _newton_change(slopes, times, step, initial, stages):
    """Newton change of all stage values, shape (unknown, ..., step, stage)."""
    unknowns, steps = len(initial), len(times)
    flat = (*initial.shape, steps * STAGES)
    here, jacobian = _linearize(slopes, times.ravel(), stages.reshape(flat))
    here, jacobian = here.reshape(stages.shape), jacobian.reshape(unknowns, *stages.shape)
    begin = np.concatenate([initial[..., None], stages[..., :-1, -1]], axis=-1)  # at the start of each step
    residual = begin[..., None] + step * here @ WEIGHTS.T - stages
    # unknowns (stage, unknown) of one step; right sides: the residual, and a unit change of each begin value
    size = STAGES * unknowns
    shape = (*stages.shape[1:-1], size)
    matrix = np.eye(size) - step * np.einsum("ij,uv...j->...iujv", WEIGHTS, jacobian).reshape(*shape, size)
    right = np.empty((*shape, 1 + unknowns))
    right[..., 0] = np.moveaxis(residual, 0, -1).reshape(shape)
    right[..., 1:] = np.tile(np.eye(unknowns), (STAGES, 1))
    solved = np.linalg.solve(matrix, right)
    own, carried = solved[..., :1], solved[..., 1:]
    start = _sweep(own[..., -unknowns:, :], carried[..., -unknowns:, :])
    change = (own + carried @ start).reshape(*stages.shape[1:], unknowns)
    return np.moveaxis(change, -1, 0)


def _sweep(own, carried):
    """Solve d[n + 1] = own[n] + carried[n] d[n], d[0] = 0, for the changes d at the start of each step.

    Shapes (..., step, unknown, 1) and (..., step, unknown, unknown).
    """
    change = np.zeros_like(own)
    own, carried, result = (np.moveaxis(array, -3, 0) for array in (own, carried, change))
    for n in range(len(own) - 1):
        result[n + 1] = own[n] + carried[n] @ result[n]
    return change
