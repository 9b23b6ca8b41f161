"""Cubic interpolation of tables on a uniform grid."""

import numpy as np

# Fourth-order differences per grid step: at the first node, and beside it
_AT_END = np.array([-25.0, 48.0, -36.0, 16.0, -3.0]) / 12.0
_BESIDE_END = np.array([-3.0, -10.0, 18.0, -6.0, 1.0]) / 12.0


def _slopes(values):
    """Return the derivative per grid step along the last axis, to fourth order everywhere."""
    slope = np.empty_like(values)
    slope[..., 2:-2] = (
        8.0 * (values[..., 3:-1] - values[..., 1:-3]) - (values[..., 4:] - values[..., :-4])
    ) / 12.0
    head, tail = values[..., :5], values[..., :-6:-1]
    slope[..., 0], slope[..., 1] = head @ _AT_END, head @ _BESIDE_END
    slope[..., -1], slope[..., -2] = -(tail @ _AT_END), -(tail @ _BESIDE_END)
    return slope


class UniformCubic:
    """Piecewise cubic through values on a uniform grid, with continuous slope.

    Parameters
    ----------
    start, step : float
        First node and spacing.
    values : array, shape (field, node)
        The tabulated functions.
    """

    def __init__(self, start, step, values):
        values = np.asarray(values, dtype=float)
        slope = _slopes(values)
        rise = np.diff(values, axis=-1)
        first, last = slope[..., :-1], slope[..., 1:]
        self.start, self.step, self.intervals = start, step, values.shape[-1] - 1
        # shape (interval, power, field): what one look-up needs lies together
        self._coefficients = np.ascontiguousarray(
            np.stack(
                [values[..., :-1], first, 3.0 * rise - 2.0 * first - last, first + last - 2.0 * rise]
            ).transpose(2, 0, 1)
        )

    def __call__(self, point):
        """Values at `point`, shape (point,) -> shape (point, field); the ends' cubics continue outside."""
        place = (point - self.start) / self.step
        interval = np.clip(place.astype(np.int64), 0, self.intervals - 1)
        offset = (place - interval)[:, None]
        c = self._coefficients[interval]
        return c[:, 0] + offset * (c[:, 1] + offset * (c[:, 2] + offset * c[:, 3]))
