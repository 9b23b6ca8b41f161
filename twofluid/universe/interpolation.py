"""Interpolation of tables: cubic with given or estimated slopes, and of high order for smooth solutions."""

from math import factorial

import numpy as np

# Fourth-order differences per grid step: at the first node, and beside it
_AT_END = np.array([-25.0, 48.0, -36.0, 16.0, -3.0]) / 12.0
_BESIDE_END = np.array([-3.0, -10.0, 18.0, -6.0, 1.0]) / 12.0
_LAGRANGE_NODES = 8  # about each point: the order of `interpolate_smooth`


def slopes_per_step(values):
    """Return the derivative per grid step along the last axis, to fourth order everywhere."""
    slope = np.empty_like(values)
    slope[..., 2:-2] = (
        8.0 * (values[..., 3:-1] - values[..., 1:-3]) - (values[..., 4:] - values[..., :-4])
    ) / 12.0
    head, tail = values[..., :5], values[..., :-6:-1]
    slope[..., 0], slope[..., 1] = head @ _AT_END, head @ _BESIDE_END
    slope[..., -1], slope[..., -2] = -(tail @ _AT_END), -(tail @ _BESIDE_END)
    return slope


def _powers(values, first, last):
    """Coefficients of 1, x, x^2, x^3 in each interval, x from 0 to 1, from the slopes by x at its ends."""
    rise = np.diff(values, axis=-1)
    return values[..., :-1], first, 3.0 * rise - 2.0 * first - last, first + last - 2.0 * rise


class UniformCubic:
    """Piecewise cubic through values on a uniform grid, with continuous slope.

    Parameters
    ----------
    start, step : float
        First node and spacing.
    values : array, shape (field, node)
        The tabulated functions.

    Attributes
    ----------
    rows : array, shape (interval, 4 field)
        Coefficients of the powers 0 to 3, each of all fields: what one look-up needs lies together.
    """

    def __init__(self, start, step, values):
        values = np.asarray(values, dtype=float)
        slope = slopes_per_step(values)
        self.start, self.step, self.intervals = start, step, values.shape[-1] - 1
        self.rows = np.empty((self.intervals, 4 * len(values)))
        self.rows.reshape(self.intervals, 4, -1)[:] = np.array(
            _powers(values, slope[:, :-1], slope[:, 1:])
        ).transpose(2, 0, 1)

    def __call__(self, point):
        """Values at `point`, shape (point,) -> shape (point, field); the ends' cubics continue outside."""
        return np.stack(self.fields(point), axis=-1)

    def fields(self, point):
        """Values at `point`, any shape: a list of arrays of that shape, one a field."""
        return evaluate_rows(self.rows, (point - self.start) / self.step, self.intervals)


def evaluate_rows(rows, place, intervals, first_row=0):
    """Values of every field at places in a table.

    Parameters
    ----------
    rows : array, shape (interval, 4 field)
        As in `UniformCubic`; tables of the same length may follow one another.
    place : array, any shape
        Distance from the first node in grid steps.
    intervals : int
        Length of one table.
    first_row : int or array
        Where its table begins, for each place; broadcasts against `place`.

    Returns
    -------
    list of array, each shaped as `place`
    """
    interval = np.minimum(np.maximum(place.astype(np.int64), 0), intervals - 1)
    offset = place - interval
    found = rows.take(interval + first_row, axis=0)
    fields = found.shape[-1] // 4
    values = []
    for field in range(fields):
        constant, linear, square, cube = (found[..., field + power * fields] for power in range(4))
        value = cube * offset
        value += square
        value *= offset
        value += linear
        value *= offset
        value += constant
        values.append(value)
    return values


class HermiteCubic:
    """Piecewise cubic through values and slopes on any growing grid.

    Parameters
    ----------
    nodes, values, slopes : array, shape (node,)
    """

    def __init__(self, nodes, values, slopes):
        self._nodes = nodes
        self._widths = np.diff(nodes)
        self._powers = _powers(values, slopes[:-1] * self._widths, slopes[1:] * self._widths)

    def __call__(self, point):
        """Values at `point`, any shape; the ends' cubics continue outside."""
        interval = np.clip(np.searchsorted(self._nodes, point, side="right") - 1, 0, len(self._widths) - 1)
        offset = (point - self._nodes[interval]) / self._widths[interval]
        constant, linear, square, cube = (power[interval] for power in self._powers)
        return constant + offset * (linear + offset * (square + offset * cube))


def interpolate_smooth(values, place):
    """Eighth-order interpolation of smooth functions on a uniform grid.

    Parameters
    ----------
    values : array, shape (field, node)
        At eight nodes or more.
    place : array, shape (point,)
        Distance from the first node in grid steps.

    Returns
    -------
    array, shape (field, point)
        The polynomial through the eight nodes about each point, or nearest the end.
    """
    count = _LAGRANGE_NODES
    first = np.clip(place.astype(np.int64) - (count // 2 - 1), 0, values.shape[-1] - count)
    distance = place - first - np.arange(count)[:, None]
    found = np.zeros((len(values), len(place)))
    for node in range(count):
        others = np.prod(np.delete(distance, node, axis=0), axis=0)
        scale = (-1) ** (count - 1 - node) * factorial(node) * factorial(count - 1 - node)
        found += others / scale * values[:, first + node]
    return found
