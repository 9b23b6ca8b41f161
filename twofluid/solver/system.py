"""What the integrator asks of a linear system ``dy/dt = A(t) y``, one system a mode."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

Entry = tuple[int, int]


@dataclass(frozen=True, eq=False)
class Tail:
    """Unknowns that meet the others at one end and go among themselves by one constant matrix.

    With z the members, ``z' = pace (matrix z + entrance driver) - damping z``, the driver being the sum of `sources`;
    the rate of the sink gets ``pace exit z``. Pace and damping may depend on time; see `TailRates`.

    Attributes
    ----------
    rows : tuple of int
        Members; tails follow the other unknowns, one after the other.
    matrix : array, shape (member, member)
        [unitless]
    entrance, exit : array, shape (member,)
        [unitless]
    sources : mapping of int to float
        Other unknowns that drive the tail, and their weights.
    sink : int
        The other unknown that it acts on.
    """

    rows: tuple[int, ...]
    matrix: np.ndarray
    entrance: np.ndarray
    exit: np.ndarray
    sources: Mapping[int, float]
    sink: int

    def like(self, other: "Tail") -> bool:
        """Whether both are built alike: only who drives them, whom they act on and how fast may differ."""
        parts = ("matrix", "entrance", "exit")
        alike = all(np.array_equal(getattr(self, part), getattr(other, part)) for part in parts)
        return alike and len(self.sources) == len(other.sources)


@dataclass(frozen=True, eq=False)
class TailRates:
    """Step times rate of a tail. Tails with the very same rates (the same object) cost hardly more than one.

    Attributes
    ----------
    pace, damping : array, shape (lane,) or (stage, lane); the damping may be 0.0
        [unitless]
    """

    pace: np.ndarray
    damping: np.ndarray | float = 0.0


@dataclass(frozen=True, eq=False)
class StepRates:
    """Step times rate of a system, a lane for every mode and step asked for.

    Attributes
    ----------
    entries : dict of (row, column) to array
        Every entry of A that is ever non-zero, those within tails left out: shape (lane,) where the rate is the
        same at the three stages, else (stage, lane) [unitless]. Entries that are always equal may be one array: what
        follows from them is then computed once.
    tails : sequence of TailRates
        One for each of the system's tails.
    """

    entries: dict[Entry, np.ndarray]
    tails: Sequence[TailRates] = ()


class LinearSystem(Protocol):
    """What the integrator asks of a linear system.

    1. `unknowns` names the rows of y: first those with entries of their own, in the order in which they are to be
       eliminated, the most coupled last; then the members of the tails.
    2. `tails` tells how the latter hang together; there need not be any.
    3. `step_rates` gives step times rate.
    """

    unknowns: Sequence[str]
    tails: Sequence[Tail]

    def step_rates(self, modes: np.ndarray, time: np.ndarray, step: np.ndarray) -> StepRates:
        """Evaluate step times rate.

        Parameters
        ----------
        modes : array of int, shape (lane,)
            Which mode each lane belongs to.
        time : array, shape (stage, lane)
            Stage times.
        step : array, shape (lane,)
            Step lengths.
        """
        ...


def rate_matrix(system: LinearSystem, mode: int, time: float) -> np.ndarray:
    """Write out the whole matrix A of one mode, tails included.

    Parameters
    ----------
    system : LinearSystem
    mode : int
    time : float

    Returns
    -------
    array, shape (unknown, unknown)
        In the inverse unit of the time.
    """
    rates = system.step_rates(np.array([mode]), np.full((3, 1), float(time)), np.ones(1))
    matrix = np.zeros((len(system.unknowns), len(system.unknowns)))
    for entry, rate in rates.entries.items():
        matrix[entry] = np.ravel(rate)[0]
    for tail, own in zip(system.tails, rates.tails, strict=True):
        pace, damping = np.ravel(own.pace)[0], np.ravel(own.damping)[0]
        rows = list(tail.rows)
        matrix[np.ix_(rows, rows)] += pace * tail.matrix - damping * np.eye(len(rows))
        matrix[tail.sink, rows] += pace * tail.exit
        for source, weight in tail.sources.items():
            matrix[rows, source] += pace * weight * tail.entrance
    return matrix
