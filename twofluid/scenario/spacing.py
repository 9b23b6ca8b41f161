"""Wavenumbers equally spaced in the logarithm, and the way back from a list to its range."""

from math import log10

MOST_DIGITS = 17  # significant digits that tell any two double-precision numbers apart


def intervals(low, high, per_decade):
    """Count the intervals of a range: the nearest whole number, at least one.

    Parameters
    ----------
    low, high : float
        Ends of the range, low < high [1/Mpc].
    per_decade : float
        Points a factor of ten [unitless].

    Returns
    -------
    int
        Number of intervals, one less than the number of points.
    """
    return max(1, round(per_decade * (log10(high) - log10(low))))


def spaced_wavenumbers(low, high, per_decade):
    """Space wavenumbers equally in the logarithm, both ends included exactly.

    Parameters
    ----------
    low, high : float
        Ends of the range, low < high [1/Mpc].
    per_decade : float
        Points a factor of ten [unitless].

    Returns
    -------
    tuple of float
        Increasing wavenumbers, shape (mode,) [1/Mpc].
    """
    number = intervals(low, high, per_decade)
    first, decades = log10(low), log10(high) - log10(low)
    inner = (10 ** (first + decades * step / number) for step in range(1, number))
    return (low, *inner, high)


def range_of(wavenumbers):
    """Find the range that gives exactly these wavenumbers.

    Parameters
    ----------
    wavenumbers : sequence of float
        shape (mode,) [1/Mpc].

    Returns
    -------
    tuple of float or None
        The arguments of `spaced_wavenumbers`, with the shortest `per_decade` that serves; None if
        the wavenumbers are not such a range.
    """
    if len(wavenumbers) < 3 or not 0 < wavenumbers[0] < wavenumbers[-1] < float("inf"):
        return None
    low, high, number = wavenumbers[0], wavenumbers[-1], len(wavenumbers) - 1
    exact = number / (log10(high) - log10(low))
    for digits in range(1, MOST_DIGITS + 1):
        per_decade = float(f"{exact:.{digits}g}")
        if intervals(low, high, per_decade) == number:
            found = spaced_wavenumbers(low, high, per_decade) == tuple(wavenumbers)
            return (low, high, per_decade) if found else None
    return None
