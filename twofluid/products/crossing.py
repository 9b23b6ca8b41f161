"""Where piecewise cubic curves, or products of them, rise through zero; many modes at once."""

from __future__ import annotations

import numpy as np

BISECTIONS = 50  # halvings of one piece: its width times 1e-15, round-off


def last_rise(position, *factors, until=np.inf):
    """Find where a product of curves last goes from below zero to zero or above.

    Each factor is the cubic Hermite interpolant of its knots. A rise is looked for between one knot and
    the next, so two crossings within one piece go unseen.

    Parameters
    ----------
    position : array, shape (mode, step)
        Knots, non-decreasing along a curve; repeated knots are passed over.
    *factors : (array, array), each shape (mode, step)
        A curve and its derivative with respect to position at the knots.
    until : float
        Only what lies at or before this position counts.

    Returns
    -------
    array, shape (mode,)
        Position of the last rise; NaN where there is none.
    """
    width = np.diff(position, axis=1)
    # The part of each piece before `until`, in the local coordinate that runs from 0 to 1.
    upper = np.divide(until - position[:, :-1], width, out=np.ones_like(width), where=width > 0)
    upper = np.clip(upper, 0.0, 1.0)
    pieces = [(v[:, :-1], v[:, 1:], width * slope[:, :-1], width * slope[:, 1:]) for v, slope in factors]
    rises = _below(np.zeros_like(upper), pieces) & ~_below(upper, pieces)
    last = rises.shape[1] - 1 - np.argmax(rises[:, ::-1], axis=1)
    return _root(position, width, pieces, upper, rises, last)


def first_rise(position, *factors):
    """Find where a product of curves first goes from below zero to zero or above.

    Parameters
    ----------
    position, *factors
        As for `last_rise`.

    Returns
    -------
    array, shape (mode,)
        Position of the first rise; NaN where there is none.
    """
    width = np.diff(position, axis=1)
    pieces = [(v[:, :-1], v[:, 1:], width * slope[:, :-1], width * slope[:, 1:]) for v, slope in factors]
    upper = np.ones_like(width)
    rises = _below(np.zeros_like(upper), pieces) & ~_below(upper, pieces)
    return _root(position, width, pieces, upper, rises, np.argmax(rises, axis=1))


def _root(position, width, pieces, upper, rises, chosen):
    """Return the position of the rise in the chosen piece of each mode; NaN where no piece holds a rise."""
    modes = np.arange(len(chosen))
    pieces = [tuple(array[modes, chosen] for array in piece) for piece in pieces]
    root = position[modes, chosen] + width[modes, chosen] * _bisect(upper[modes, chosen], pieces)
    return np.where(rises.any(axis=1), root, np.nan)


def _bisect(upper, pieces):
    """Return the local coordinate of the rise between 0 (below zero) and `upper` (not below)."""
    lower = np.zeros_like(upper)
    for _ in range(BISECTIONS):
        middle = (lower + upper) / 2
        below = _below(middle, pieces)
        lower = np.where(below, middle, lower)
        upper = np.where(below, upper, middle)
    return upper


def _below(s, pieces):
    """Tell whether the product of the pieces at local coordinate s is below zero."""
    return np.prod([np.sign(_cubic(s, *piece)) for piece in pieces], axis=0) < 0


def _cubic(s, left, right, left_slope, right_slope):
    """Cubic Hermite piece at local coordinate s; slopes are with respect to s."""
    rest = 1 - s
    return (
        rest * rest * ((1 + 2 * s) * left + s * left_slope)
        + s * s * ((3 - 2 * s) * right - rest * right_slope)
    )
