"""Finding room for words on a map: inside areas, beside curves, on nothing else."""

from __future__ import annotations

import itertools

import numpy as np

from twofluid.drawing.style import LABEL_SIZE

COLUMNS, ROWS = 240, 180  # cells of the raster laid over the axes
LETTER = 0.58  # width of a letter, generous [font sizes]
LINE = 1.5  # height of a line, generous [font sizes]
SIZES = (3.0, 2.5, 2.0, 1.6, 1.3, 1.0)  # boxes tried, in sizes of the words: the roomiest wins
MARGIN = 3  # cells kept free at the edge of the axes
CLEARANCE = 1  # cells kept free about a curve
POINTS = 2000  # of a curve, to mark the cells it runs through
OFFSETS = (1, 4, 8, 12)  # between a curve and words beside it, over the clearance [cells]
LEVELNESS = 0.15  # weight of a place near the curve's middle against one far from other curves
NEARNESS = 1.5  # weight of a place near the curve against one far from others
LEAST_AREA = 0.002  # of the axes, that is worth a word
FAR = 40.0  # from other curves, beyond which words are as good as can be [cells]


class Room:
    """Which cells of the axes hold which area, and which are taken by curves and words.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Axes with final limits.
    edges : (array, array), shapes (mode + 1,) and (redshift + 1,)
        Increasing edges of the cells of the map: ln k and ln(1 + z).
    codes : masked array of int, shape (mode, redshift)
        The area each cell belongs to.
    curves : list of (array, array), each shape (point,)
        Wavenumber and redshift of the curves.
    """

    def __init__(self, axes, edges, codes, curves):
        box = axes.get_window_extent()
        self._font = LABEL_SIZE / 72 * axes.figure.dpi / np.array([box.width, box.height])
        self._to_fraction = axes.transData + axes.transAxes.inverted()
        across, up = ((np.arange(number) + 0.5) / number for number in (COLUMNS, ROWS))
        mode = _cells(edges[0], across)
        level = _cells(edges[1], up)
        self._area = codes.filled(-1)[np.ix_(mode, level)]
        self._taken = np.ones((COLUMNS, ROWS), dtype=bool)
        self._taken[MARGIN:-MARGIN, MARGIN:-MARGIN] = False
        self._curves = [self._cells_of(x, y) for x, y in curves]
        for column, row in itertools.chain(*self._curves):
            near = np.maximum([column - CLEARANCE, row - CLEARANCE], 0)
            self._taken[near[0] : column + CLEARANCE + 1, near[1] : row + CLEARANCE + 1] = True

    def inside(self, code, words):
        """Find a place for words inside an area, and take it.

        Parameters
        ----------
        code : int
            The area.
        words : str
            What is to be written; lines end in a newline.

        Returns
        -------
        (float, float) or None
            Centre of the words [fraction of the axes]; None if there is no room.
        """
        free = (self._area == code) & ~self._taken
        for size in SIZES:
            places = _places(free, size * self._box(words))
            if len(places):
                middle = places[np.argmin(np.linalg.norm(places - places.mean(axis=0), axis=1))]
                return self._take(middle, words)
        return None

    def middle(self, code):
        """Find the cell of an area nearest to its middle, and take what is above it for a line from there.

        Parameters
        ----------
        code : int
            The area.

        Returns
        -------
        (float, float) or None
            [fraction of the axes]; None if the area is too small to be told of.
        """
        places = np.argwhere((self._area == code) & ~self._taken)
        if len(places) < LEAST_AREA * self._area.size:
            return None
        nearest = places[np.argmin(np.linalg.norm(places - places.mean(axis=0), axis=1))]
        self._taken[max(nearest[0] - CLEARANCE, 0) : nearest[0] + CLEARANCE + 1, nearest[1] :] = True
        return tuple((nearest + 0.5) / (COLUMNS, ROWS))

    def beside(self, number, words):
        """Find a place for words beside a curve, far from the others and near its middle, and take it.

        Parameters
        ----------
        number : int
            Number of the curve.
        words : str
            One line.

        Returns
        -------
        (float, float) or None
            Centre of the words [fraction of the axes]; None if there is no room.
        """
        points = self._curves[number]
        if not len(points):
            return None
        half = 0.5 * self._box(words)[0] + CLEARANCE
        shifts = [side * (half + offset) for offset in OFFSETS for side in (1, -1)]
        places = np.concatenate([points + np.round([shift, 0]).astype(int) for shift in shifts])
        detour = NEARNESS * np.repeat(np.abs(shifts), len(points))
        free = np.zeros(self._taken.shape, dtype=bool)
        free[tuple(_places(~self._taken, self._box(words)).T)] = True
        within = np.all((places >= 0) & (places < free.shape), axis=1)
        places, detour = places[within], detour[within]
        fits = free[tuple(places.T)]
        places, detour = places[fits], detour[fits]
        if not len(places):
            return None
        others = [cells for other, cells in enumerate(self._curves) if other != number and len(cells)]
        space = np.minimum(_distance(places, np.concatenate(others)), FAR) if others else 0.0
        off_middle = np.linalg.norm(places - points[len(points) // 2], axis=1)
        return self._take(places[np.argmax(space - LEVELNESS * off_middle - detour)], words)

    def _box(self, words):
        """Width and height of words [cells]."""
        lines = words.split("\n")
        return np.array([max(map(len, lines)) * LETTER, len(lines) * LINE]) * self._font * (COLUMNS, ROWS)

    def _take(self, place, words):
        low = np.maximum(np.floor(place - self._box(words) / 2).astype(int), 0)
        high = np.ceil(place + self._box(words) / 2).astype(int)
        self._taken[low[0] : high[0] + 1, low[1] : high[1] + 1] = True
        return tuple((place + 0.5) / (COLUMNS, ROWS))

    def _cells_of(self, x, y):
        """Cells a curve runs through, in its order, shape (cell, 2)."""
        kept = np.isfinite(x) & np.isfinite(y)
        if not kept.any():
            return np.empty((0, 2), dtype=int)
        corners = self._to_fraction.transform(np.column_stack([x[kept], y[kept]]))
        along = np.linspace(0, len(corners) - 1, POINTS)
        dense = np.column_stack([np.interp(along, np.arange(len(corners)), part) for part in corners.T])
        cells = np.floor(dense * (COLUMNS, ROWS)).astype(int)
        return cells[np.all((cells >= 0) & (cells < (COLUMNS, ROWS)), axis=1)]


def _cells(edges, fraction):
    """Cell of the map at fractions of its span."""
    position = edges[0] + fraction * (edges[-1] - edges[0])
    return np.clip(np.searchsorted(edges, position) - 1, 0, len(edges) - 2)


def _places(free, box):
    """Centres of boxes [cells] that lie in free cells alone, shape (place, 2)."""
    width, height = np.ceil(box).astype(int)
    if width > free.shape[0] or height > free.shape[1]:
        return np.empty((0, 2), dtype=int)
    total = np.pad(np.cumsum(np.cumsum(~free, axis=0), axis=1), ((1, 0), (1, 0)))
    taken = total[width:, height:] - total[:-width, height:] - total[width:, :-height] + total[:-width, :-height]
    return np.argwhere(taken == 0) + np.array([width // 2, height // 2])


def _distance(places, cells):
    """Distance of each place from the nearest of the cells."""
    return np.min(np.linalg.norm(places[:, None] - np.unique(cells, axis=0), axis=-1), axis=1)
