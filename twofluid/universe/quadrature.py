"""Running integrals of smooth functions, to near machine precision."""

import numpy as np

_POINTS = 6  # Gauss-Legendre points a panel
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(_POINTS)
_PARTS = 64  # into which a bracket is divided at once; all their ends are looked at together
_DIVISIONS = 10  # of one bracket: below the spacing of double precision


class RunningIntegral:
    """Integral of a smooth function from a fixed start to any point of a range.

    Whole panels are summed once; the rest of the last panel is integrated on demand, so a value costs
    one panel wherever it is asked.

    Parameters
    ----------
    integrand : callable
        Function of an array of any shape, returning an array of that shape.
    start, stop : float
        The range.
    panels : int
        Number of equal panels; each is integrated with 6 Gauss-Legendre points.
    initial : float
        Value of the integral at `start`.

    Attributes
    ----------
    edges, sums : array, shape (panel + 1,)
        Ends of the panels, and the integral up to each.
    """

    def __init__(self, integrand, start, stop, panels, initial=0.0):
        self._integrand = integrand
        self.edges = np.linspace(start, stop, panels + 1)
        pieces = self._panel(self.edges[:-1], self.edges[1:])
        self.sums = initial + np.concatenate(([0.0], np.cumsum(pieces)))

    def _panel(self, low, high):
        half = 0.5 * (high - low)
        points = (0.5 * (high + low))[..., None] + half[..., None] * _NODES
        return half * (self._integrand(points) @ _WEIGHTS)

    def __call__(self, point):
        """Integral up to `point`, an array of any shape within the range."""
        point = np.asarray(point, dtype=float)
        panel = np.clip(np.searchsorted(self.edges, point, side="right") - 1, 0, len(self.edges) - 2)
        return self.sums[panel] + self._panel(self.edges[panel], point)

    @property
    def total(self):
        """Integral over the whole range."""
        return self.sums[-1]

    def reaches(self, value):
        """Point where a growing integral attains `value`, a float between its end values."""
        panel = int(np.clip(np.searchsorted(self.sums, value) - 1, 0, len(self.edges) - 2))
        low, high = self.edges[panel], self.edges[panel + 1]
        return bisect(lambda point: self(point) - value, low, high)


def bisect(function, low, high):
    """Root of a function of arrays that grows from below zero at `low` to above zero at `high`."""
    for _ in range(_DIVISIONS):
        points = np.linspace(low, high, _PARTS + 1)
        part = int(np.count_nonzero(function(points[1:-1]) < 0.0))
        low, high = points[part], points[part + 1]
    return 0.5 * (low + high)
