"""Algebra of many small stage matrices at once, the lanes on the last axis.

A block couples the three stages of one unknown to those of another. It comes in three kinds, and every
operation keeps to the cheapest kind that can hold its result:

=========  ====================  ============================================================
kind       shape                 meaning
=========  ====================  ============================================================
UNIFORM    (lane,)               the same number at the three stages
DIAGONAL   (stage, lane)         one number a stage
FULL       (stage, stage, lane)  stages mix in any way
=========  ====================  ============================================================

A column of numbers, one a stage, is held like a diagonal block. Every operation writes its result into an array
it is given. A block that is the same in all lanes may have one lane only.
"""

from collections.abc import Sequence
from enum import Enum

import numpy as np

from .collocation import INVERSE_WEIGHTS, LAST, STAGES, STATE_LOAD


class Kind(Enum):
    """Kinds of block: shape before the lanes."""

    UNIFORM = ()
    DIAGONAL = (STAGES,)
    FULL = (STAGES, STAGES)

    def empty(self, lanes: int, parts: tuple[int, ...] = ()) -> np.ndarray:
        """Make room for blocks of this kind."""
        return np.empty((*parts, *self.value, lanes))


UNIFORM, DIAGONAL, FULL = Kind


def kind_of(rate: np.ndarray) -> Kind:
    """Tell the kind of a block given from outside."""
    return (UNIFORM, DIAGONAL, FULL)[rate.ndim - 1]


def combined(first: Kind, second: Kind) -> Kind:
    """Give the kind of the sum or product of two blocks."""
    return max(first, second, key=lambda kind: len(kind.value))


def diagonal_of(block: np.ndarray) -> np.ndarray:
    """Give a view of the diagonal of a full block, shape (stage, lane)."""
    return np.einsum("iil->il", block)


def write(block: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Write a block where there may be room for one of a wider kind."""
    if kinds[0] != FULL and out.ndim == 3:
        out[...] = 0.0
        diagonal = diagonal_of(out)
        diagonal[...] = block
    else:
        out[...] = block


def add(first: np.ndarray, second: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Add two blocks; `out` may be one of them if it is of the kind of the result."""
    if FULL not in kinds or kinds[0] == kinds[1]:
        np.add(first, second, out=out)
        return
    full, other = (first, second) if kinds[0] == FULL else (second, first)
    if out is not full:
        out[...] = full
    diagonal = diagonal_of(out)
    diagonal += other


def multiply(left: np.ndarray, right: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Multiply two blocks."""
    if left.ndim == right.ndim == 3:
        np.einsum("ikl,kjl->ijl", left, right, out=out)
    elif left.ndim == 2 and right.ndim == 3:
        np.multiply(left[:, None], right, out=out)
    else:  # uniform anywhere, two of a kind, or full by diagonal (its columns)
        np.multiply(left, right, out=out)


def scale(block: np.ndarray, kinds: Sequence[Kind], out: np.ndarray, *, factor: float) -> None:
    """Multiply a block by a number."""
    np.multiply(block, factor, out=out)


def start_alone(inverse: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Give the stages that a unit of old state makes by itself: a column."""
    np.einsum("ijl,j->il", inverse, STATE_LOAD, out=out)


def last_row(inverse: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Give what each stage adds to the last one: a column."""
    out[...] = inverse[LAST]


class PivotInverse:
    """Inverse of pivots ``W - rate`` by cofactors, with room for one number of lanes."""

    def __init__(self, lanes: int):
        self._weights = np.repeat(INVERSE_WEIGHTS[:, :, None], lanes, axis=2)  # quicker than to stretch it every time
        pivot = np.empty((STAGES, 2 * STAGES - 1, lanes))  # columns repeat: every cofactor becomes a plain slice
        self._core, self._again, self._first = pivot[:, :STAGES], pivot[:, STAGES:], pivot[:, : STAGES - 1]
        pairs = ((1, 2), (2, 0), (0, 1))
        self._slices = [(pivot[a, 1:4], pivot[b, 2:5], pivot[a, 2:5], pivot[b, 1:4]) for a, b in pairs]
        self._product, self._determinant = np.empty((STAGES, lanes)), np.empty(lanes)

    def __call__(self, rate: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
        """Invert ``W - rate``, the rate of any kind."""
        core, product, determinant = self._core, self._product, self._determinant
        if rate.ndim == 3:
            np.subtract(self._weights, rate, out=core)
        else:
            core[...] = self._weights
            diagonal = diagonal_of(core)
            diagonal -= rate
        self._again[...] = self._first
        for column, (a, b, c, d) in enumerate(self._slices):
            cofactors = out[:, column]
            np.multiply(a, b, out=cofactors)
            np.multiply(c, d, out=product)
            np.subtract(cofactors, product, out=cofactors)
        np.einsum("jl,jl->l", core[0], out[:, 0], out=determinant)
        np.reciprocal(determinant, out=determinant)
        np.multiply(out, determinant, out=out)
