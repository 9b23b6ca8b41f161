"""Tails of moment chains, each taken apart into the eigenvectors of its matrix.

A tail (`twofluid.solver.system.Tail`) goes among itself by a constant matrix times a pace, less a damping that is
the same for all its members. In the coordinates of the eigenvectors every member goes alone, and its stage equations
are one 3 x 3 block each::

    (W - pace d_q + damping) Z_q = W 1 z_q + pace b_q X

with d_q the eigenvalue (complex ones come in pairs, of which one is followed), b_q the share of the entrance, and X
the driver's stages. What the tail does to its sink, ``pace Re sum_q c_q Z_q``, is a block on the driver and a load
from the members' old state; nothing else is needed of them but their new state, which is the last stage. Inverse
blocks are written as adjugate over determinant, both polynomials in d_q with real coefficients: those are worked
out once for all members, and matrix products do the rest.
"""

from collections.abc import Iterator, Sequence

import numpy as np

from .collocation import INVERSE_WEIGHTS, STAGES, STATE_LOAD
from .system import Tail, TailRates

MOST_ROUNDING = 1e10  # condition number of the eigenvectors, beyond which the members lose their digits
_CYCLES = ((0, 1, 2), (1, 2, 0), (2, 0, 1))
LAST = STAGES - 1


class EigenTail:
    """The coordinates of one kind of tail, and its stage equations solved in them.

    Parameters
    ----------
    tail : Tail
        Only its matrix, entrance and exit are used.

    Attributes
    ----------
    size : int
        Number of coordinates: complex numbers, one for each real eigenvalue and each pair.
    inward : array, shape (2 size, member)
        Turns members into coordinates, real parts first and then imaginary ones.
    outward : array, shape (member, 2 size)
        Turns them back.

    Raises
    ------
    ValueError
        If the eigenvectors are too nearly parallel.
    """

    def __init__(self, tail: Tail):
        values, vectors = np.linalg.eig(tail.matrix)
        if np.linalg.cond(vectors) > MOST_ROUNDING:
            raise ValueError(f"a tail of {len(values)} moments is too long: its eigenvectors are nearly parallel")
        inverse = np.linalg.inv(vectors)
        real = np.abs(values.imag) <= 1e-12 * np.abs(values).max()
        kept = real | (values.imag > 0.0)
        weight = np.where(real, 1.0, 2.0)[kept]  # a pair counts twice its real part
        values, vectors, inverse = values[kept], vectors[:, kept] * weight, inverse[kept]
        self.size = len(values)
        self.inward = np.concatenate([inverse.real, inverse.imag])
        self.outward = np.concatenate([vectors.real, -vectors.imag], axis=1)
        entrance, exit_ = inverse @ tail.entrance, tail.exit @ vectors
        powers = values[:, None] ** np.arange(STAGES + 1)
        self._determinant = _real_rows(powers)
        self._own = _real_rows(powers[:, :STAGES])
        self._to_sink = _real_rows(exit_[:, None] * powers[:, :STAGES])
        self._from_driver = _real_rows(entrance[:, None] * powers[:, :STAGES])
        through = (exit_ * entrance)[:, None] * powers[:, :STAGES]
        self._through = np.concatenate([through.real, -through.imag]).T.copy()

    def solve(self, rates: TailRates, share: np.ndarray, turn: np.ndarray, feed: np.ndarray, block: np.ndarray) -> None:
        """Solve the stage equations of all members for many lanes.

        Parameters
        ----------
        rates : TailRates
        share : array, shape (2, size, stage, lane)
            Filled with what the coordinates' old state adds to the sink's load.
        turn : array, shape (2, 2, size, lane)
            Filled with what becomes of their old state by itself.
        feed : array, shape (2, size, stage, lane)
            Filled with what the driver's stages add to that.
        block : array, shape (stage, stage, lane)
            Filled with the rate of the sink by the driver through the tail.
        """
        lanes = block.shape[-1]
        pace = np.broadcast_to(rates.pace, (STAGES, lanes))
        adjugate, determinant = _polynomials(pace, np.diag(INVERSE_WEIGHTS)[:, None] + rates.damping)
        # 1 / determinant, member by member
        inverse = (self._determinant @ determinant).reshape(2, self.size, lanes)
        inverse /= np.einsum("pql,pql->ql", inverse, inverse)
        np.negative(inverse[1], out=inverse[1])

        alone = np.einsum("nijl,j->nil", adjugate, STATE_LOAD)  # what a unit of old state makes of the member
        for coefficients, weights, out in (
            (alone * pace, self._to_sink, share),
            (adjugate[:, LAST] * pace, self._from_driver, feed),
        ):
            numerator = (weights @ coefficients.reshape(STAGES, -1)).reshape(out.shape)
            _multiply(numerator, inverse[:, :, None], out)
        np.negative(share[1], out=share[1])  # the real part of a product is asked of it
        numerator = (self._own @ alone[:, LAST]).reshape(2, self.size, lanes)
        _multiply(numerator, inverse, turn[:, 0])
        np.negative(turn[1, 0], out=turn[0, 1])
        turn[1, 1] = turn[0, 0]

        moments = self._through @ inverse.reshape(2 * self.size, lanes)
        np.einsum("nijl,nl->ijl", adjugate, moments, out=block)
        block *= pace
        block *= pace[:, None]


def _polynomials(pace: np.ndarray, diagonal: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Expand adjugate and determinant of ``W' - pace d`` in powers of d, W' being W with another diagonal.

    Returns arrays of shape (3, stage, stage, lane) and (4, lane).
    """
    W, lanes = INVERSE_WEIGHTS, pace.shape[-1]
    adjugate, determinant = np.zeros((STAGES, STAGES, STAGES, lanes)), np.zeros((STAGES + 1, lanes))
    constant, linear, square = adjugate
    for i, j, k in _CYCLES:
        constant[i, i] = diagonal[j] * diagonal[k] - W[j, k] * W[k, j]
        linear[i, i] = -(diagonal[j] * pace[k] + diagonal[k] * pace[j])
        square[i, i] = pace[j] * pace[k]
        for row, column, other in ((i, j, k), (j, i, k)):
            constant[row, column] = W[row, other] * W[other, column] - W[row, column] * diagonal[other]
            linear[row, column] = W[row, column] * pace[other]
    for power, part in enumerate((constant, linear)):
        determinant[power] = diagonal[0] * part[0, 0] + W[0, 1] * part[1, 0] + W[0, 2] * part[2, 0]
    determinant[2] = diagonal[0] * square[0, 0]
    determinant[1:] -= pace[0] * adjugate[:, 0, 0]
    return adjugate, determinant


def _real_rows(coefficients: np.ndarray) -> np.ndarray:
    """Real parts of all rows, then imaginary ones."""
    return np.concatenate([coefficients.real, coefficients.imag])


def _multiply(first: np.ndarray, second: np.ndarray, out: np.ndarray) -> None:
    """Multiply complex numbers with their parts along the first axis."""
    np.multiply(first[0], second[0], out=out[0])
    out[0] -= first[1] * second[1]
    np.multiply(first[0], second[1], out=out[1])
    out[1] += first[1] * second[0]


class Family:
    """Tails of one kind, which are solved and substituted together.

    Parameters
    ----------
    tails : sequence of Tail
        All alike.
    places : sequence of int
        Where each stands among the tails of the system.
    sample : sequence of TailRates
        Rates of all tails of the system for any steps: those that are one object always are.
    """

    def __init__(self, tails: Sequence[Tail], places: Sequence[int], sample: Sequence[TailRates]):
        self.kind, self.tails = EigenTail(tails[0]), tails
        shared = len({id(sample[place]) for place in places}) == 1
        self._sets = places[:1] if shared else places  # tails whose rates are worked out
        self.set_of = [0] * len(places) if shared else range(len(places))

    def room(self, lanes: int) -> None:
        """Make room for the factors of so many lanes."""
        self.lanes = lanes
        sets, size = len(self._sets), self.kind.size
        self.share, self.feed = np.empty((2, sets, 2, size, STAGES, lanes))
        self.turn = np.empty((sets, 2, 2, size, lanes))
        self.blocks = list(np.empty((sets, STAGES, STAGES, lanes)))  # kept: the elimination knows arrays by identity

    def factor(self, rates: Sequence[TailRates]) -> None:
        """Work out all factors."""
        for place, *parts in zip(self._sets, self.share, self.turn, self.feed, self.blocks, strict=True):
            self.kind.solve(rates[place], *parts)

    def coordinates(self, state: np.ndarray) -> np.ndarray:
        """Take the coordinates from a state, shape (unknown, mode): shape (tail, 2 size, mode)."""
        return np.stack([self.kind.inward @ state[list(tail.rows)] for tail in self.tails])

    def members(self, coordinates: np.ndarray, rows: np.ndarray) -> Iterator[tuple[int, np.ndarray]]:
        """Give the members asked for: place among the rows, and values, shape (mode,)."""
        for tail, own in zip(self.tails, coordinates, strict=True):
            for place, row in enumerate(rows):
                if row in tail.rows:
                    yield place, self.kind.outward[tail.rows.index(row)] @ own


def families(tails: Sequence[Tail], sample: Sequence[TailRates]) -> list[Family]:
    """Put tails of one kind together."""
    kinds: list[list[int]] = []
    for place, tail in enumerate(tails):
        for kind in kinds:
            if tail.like(tails[kind[0]]):
                kind.append(place)
                break
        else:
            kinds.append([place])
    return [Family([tails[place] for place in places], places, sample) for places in kinds]
