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

from .collocation import INVERSE_WEIGHTS, LAST, STAGES, STATE_LOAD
from .system import Tail, TailRates

MOST_ROUNDING = 1e10  # condition number of the eigenvectors, beyond which the members lose their digits
_CYCLES = ((0, 1, 2), (1, 2, 0), (2, 0, 1))


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

    def solve(self, rates: TailRates, factors: "TailFactors", number: int) -> None:
        """Solve the stage equations of all members for many lanes.

        Parameters
        ----------
        rates : TailRates
        factors : TailFactors
            Set `number` of them is filled.
        number : int
        """
        room, block = factors.room, factors.blocks[number]
        pace = np.broadcast_to(rates.pace, block.shape[1:])
        adjugate, determinant = room.adjugate, room.determinant
        _expand(pace, np.diag(INVERSE_WEIGHTS)[:, None] + rates.damping, adjugate, determinant)
        inverse = np.matmul(self._determinant, determinant, out=room.inverse).reshape(2, self.size, -1)
        inverse /= np.einsum("pql,pql->ql", inverse, inverse, out=room.scratch[:, 0])
        np.negative(inverse[1], out=inverse[1])

        alone = np.einsum("nijl,j->nil", adjugate, STATE_LOAD, out=room.alone)  # of a unit of old state
        share, feed, turn = factors.share[number], factors.feed[number], factors.turn[number]
        for coefficients, weights, out in (
            (alone, self._to_sink, share),
            (adjugate[:, LAST], self._from_driver, feed),
        ):
            paced = np.multiply(coefficients, pace, out=room.paced).reshape(STAGES, -1)
            numerator = np.matmul(weights, paced, out=room.numerator).reshape(out.shape)
            _multiply(numerator, inverse[:, :, None], out, room.scratch)
        np.negative(share[1], out=share[1])  # the real part of a product is asked of it
        numerator = (self._own @ alone[:, LAST]).reshape(inverse.shape)
        _multiply(numerator, inverse, turn[:, 0], room.scratch[:, 0])
        np.negative(turn[1, 0], out=turn[0, 1])
        turn[1, 1] = turn[0, 0]

        moments = self._through @ room.inverse
        np.einsum("nijl,nl->ijl", adjugate, moments, out=block)
        block *= pace
        block *= pace[:, None]


def _expand(pace: np.ndarray, diagonal: np.ndarray, adjugate: np.ndarray, determinant: np.ndarray) -> None:
    """Expand adjugate and determinant of ``W' - pace d`` in powers of d, W' being W with another diagonal.

    Fills arrays of shape (3, stage, stage, lane), whose last power has a diagonal only, and (4, lane).
    """
    W = INVERSE_WEIGHTS
    constant, linear, square = adjugate
    for i, j, k in _CYCLES:
        np.multiply(diagonal[j], diagonal[k], out=constant[i, i])
        constant[i, i] -= W[j, k] * W[k, j]
        np.multiply(diagonal[j], pace[k], out=linear[i, i])
        linear[i, i] += diagonal[k] * pace[j]
        np.negative(linear[i, i], out=linear[i, i])
        np.multiply(pace[j], pace[k], out=square[i, i])
        for row, column, other in ((i, j, k), (j, i, k)):
            np.multiply(diagonal[other], -W[row, column], out=constant[row, column])
            constant[row, column] += W[row, other] * W[other, column]
            np.multiply(pace[other], W[row, column], out=linear[row, column])
    for power, part in enumerate((constant, linear)):
        np.multiply(diagonal[0], part[0, 0], out=determinant[power])
        determinant[power] += W[0, 1] * part[1, 0] + W[0, 2] * part[2, 0]
    np.multiply(diagonal[0], square[0, 0], out=determinant[2])
    determinant[3] = 0.0
    determinant[1:] -= pace[0] * adjugate[:, 0, 0]


def _real_rows(coefficients: np.ndarray) -> np.ndarray:
    """Real parts of all rows, then imaginary ones."""
    return np.concatenate([coefficients.real, coefficients.imag])


def _multiply(first: np.ndarray, second: np.ndarray, out: np.ndarray, scratch: np.ndarray) -> None:
    """Multiply complex numbers with their parts along the first axis."""
    np.multiply(first[0], second[0], out=out[0])
    out[0] -= np.multiply(first[1], second[1], out=scratch)
    np.multiply(first[0], second[1], out=out[1])
    out[1] += np.multiply(first[1], second[0], out=scratch)


class _Room:
    """Room for what is worked out on the way to the factors of one tail, for one number of lanes."""

    def __init__(self, size: int, lanes: int):
        self.adjugate = np.zeros((STAGES, STAGES, STAGES, lanes))
        self.determinant = np.empty((STAGES + 1, lanes))
        self.inverse = np.empty((2 * size, lanes))
        self.alone, self.paced = np.empty((2, STAGES, STAGES, lanes))
        self.numerator = np.empty((2 * size, STAGES * lanes))
        self.scratch = np.empty((size, STAGES, lanes))


class TailFactors:
    """What elimination and substitution need of the tails of one kind, set by set, for one number of lanes.

    Attributes
    ----------
    share : array, shape (set, 2, size, stage, lane)
        What the coordinates' old state adds to the sink's load.
    turn : array, shape (set, 2, 2, size, lane)
        What becomes of their old state by itself.
    feed : array, shape (set, 2, size, stage, lane)
        What the driver's stages add to that.
    blocks : list of array, shape (stage, stage, lane)
        Rate of the sink by the driver through the tail.
    """

    def __init__(self, sets: int, size: int, lanes: int):
        self.lanes, self.room = lanes, _Room(size, lanes)
        self.share, self.feed = np.empty((2, sets, 2, size, STAGES, lanes))
        self.turn = np.empty((sets, 2, 2, size, lanes))
        self.blocks = list(np.empty((sets, STAGES, STAGES, lanes)))  # kept: the elimination knows arrays by identity


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

    Attributes
    ----------
    set_of : sequence of int
        Which set of factors each tail has.
    factors : TailFactors
        Of the last stretch; before the first, of one lane.
    """

    def __init__(self, tails: Sequence[Tail], places: Sequence[int], sample: Sequence[TailRates]):
        self.kind, self.tails = EigenTail(tails[0]), tails
        shared = len({id(sample[place]) for place in places}) == 1
        self._sets = places[:1] if shared else places  # tails whose rates are worked out
        self.set_of = [0] * len(places) if shared else range(len(places))
        self.factors = self._room_for(1)

    def _room_for(self, lanes: int) -> TailFactors:
        return TailFactors(len(self._sets), self.kind.size, lanes)

    def factor(self, rates: Sequence[TailRates], lanes: int) -> None:
        """Work out all factors for so many lanes."""
        if self.factors.lanes != lanes:
            self.factors = self._room_for(lanes)
        for number, place in enumerate(self._sets):
            self.kind.solve(rates[place], self.factors, number)

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
    """Put tails of one kind together, those that act on one sink apart."""
    kinds: list[list[int]] = []
    for place, tail in enumerate(tails):
        for kind in kinds:
            if tail.like(tails[kind[0]]) and tail.sink not in [tails[other].sink for other in kind]:
                kind.append(place)
                break
        else:
            kinds.append([place])
    return [Family([tails[place] for place in places], places, sample) for places in kinds]
