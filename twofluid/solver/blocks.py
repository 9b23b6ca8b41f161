"""Algebra of many small stage matrices at once, the lanes on the last axis.

A block couples the three stages of one unknown to those of another. It comes in four kinds, and every
operation keeps to the cheapest kind that can hold its result:

=========  ====================  ============================================================
kind       shape                 meaning
=========  ====================  ============================================================
UNIFORM    (lane,)               the same number at the three stages
SPECTRAL   (2, lane), complex    a function of W: its values at the real and a complex eigenvalue
DIAGONAL   (stage, lane)         one number a stage
FULL       (stage, stage, lane)  stages mix in any way
=========  ====================  ============================================================

Moments that stream freely have the same rate at all stages, so whatever an elimination makes of them
alone is a function of W. Every operation writes its result into an array it is given.
"""

from collections.abc import Sequence
from enum import Enum
from functools import lru_cache

import numpy as np

from .collocation import EIGENVALUES, INVERSE_WEIGHTS, PROJECTORS, STAGES, WEIGHTS


class Kind(Enum):
    """Kinds of block: shape before the lanes, and type of number."""

    UNIFORM = ((), float)
    SPECTRAL = ((2,), complex)
    DIAGONAL = ((STAGES,), float)
    FULL = ((STAGES, STAGES), float)

    def empty(self, lanes: int, parts: tuple[int, ...] = ()) -> np.ndarray:
        """Make room for blocks of this kind."""
        shape, number = self.value
        return np.empty((*parts, *shape, lanes), dtype=number)


UNIFORM, SPECTRAL, DIAGONAL, FULL = Kind


def kind_of(rate: np.ndarray) -> Kind:
    """Tell the kind of a rate given from outside: uniform or diagonal."""
    return UNIFORM if rate.ndim == 1 else DIAGONAL


def combined(first: Kind, second: Kind) -> Kind:
    """Give the kind of the sum or product of two blocks."""
    if first == second:
        return first
    if UNIFORM in (first, second):
        return second if first == UNIFORM else first
    return FULL


def diagonal_of(block: np.ndarray) -> np.ndarray:
    """Give a view of the diagonal of a full block, shape (stage, lane)."""
    return np.einsum("iil->il", block)


# From eigenvalues to full blocks: real parts of projector times value, as one real matrix product.
_FROM_SPECTRUM = np.stack([PROJECTORS.real, -PROJECTORS.imag], axis=1).reshape(-1, STAGES * STAGES).T.copy()


def write_full(block: np.ndarray, kind: Kind, out: np.ndarray) -> None:
    """Write a block of any kind as a full one."""
    if kind == FULL:
        out[...] = block
    elif kind == SPECTRAL:
        parts = np.stack([block.real, block.imag], axis=1).reshape(-1, block.shape[-1])
        np.matmul(_FROM_SPECTRUM, parts, out=out.reshape(STAGES * STAGES, -1))
    else:
        out[...] = 0.0
        diagonal = diagonal_of(out)
        diagonal[...] = block


def add(first: np.ndarray, second: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Add two blocks; `out` may be one of them if it is of the kind of the result."""
    if combined(*kinds) != FULL or kinds[0] == kinds[1]:
        np.add(first, second, out=out)
        return
    operands = [(first, kinds[0]), (second, kinds[1])]
    operands.sort(key=lambda operand: (FULL, SPECTRAL).index(operand[1]) if operand[1] in (FULL, SPECTRAL) else 2)
    (base, base_kind), (other, other_kind) = operands
    if out is not base:
        write_full(base, base_kind, out)
    if other_kind == SPECTRAL:
        out += _full(other, other_kind)
    else:
        diagonal = diagonal_of(out)
        diagonal += other


def multiply(left: np.ndarray, right: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Multiply two blocks."""
    if combined(*kinds) == FULL and SPECTRAL in kinds:
        left, right = (
            _full(block, kind) if kind == SPECTRAL else block for block, kind in zip((left, right), kinds, strict=True)
        )
    if left.ndim == right.ndim == 3:
        np.einsum("ikl,kjl->ijl", left, right, out=out)
    elif left.ndim == 2 and right.ndim == 3:
        np.multiply(left[:, None], right, out=out)
    else:  # uniform anywhere, two of a kind, or full by diagonal (its columns)
        np.multiply(left, right, out=out)


def _full(block: np.ndarray, kind: Kind) -> np.ndarray:
    full = FULL.empty(block.shape[-1])
    write_full(block, kind, full)
    return full


def write_free_inverse(kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Write the inverse of a pivot without a rate of its own: the Butcher matrix."""
    out[...] = WEIGHTS[:, :, None]


def invert_pivot(rate: np.ndarray, kinds: Sequence[Kind], out: np.ndarray) -> None:
    """Invert the pivot ``W - rate``: eigenvalue by eigenvalue if it is a function of W, else by cofactors."""
    if kinds[0] in (UNIFORM, SPECTRAL):
        np.subtract(EIGENVALUES[:, None], rate, out=out)
        np.reciprocal(out, out=out)
    else:
        _adjugate(rate.shape[-1]).invert(rate, out)


@lru_cache(maxsize=4)
def _adjugate(lanes: int) -> "_Adjugate":
    return _Adjugate(lanes)


class _Adjugate:
    """Inverse by cofactors, with room for one number of lanes."""

    def __init__(self, lanes: int):
        pivot = np.empty((STAGES, 2 * STAGES - 1, lanes))  # columns repeat: every cofactor becomes a plain slice
        self._core, self._again, self._first = pivot[:, :STAGES], pivot[:, STAGES:], pivot[:, : STAGES - 1]
        pairs = ((1, 2), (2, 0), (0, 1))
        self._slices = [(pivot[a, 1:4], pivot[b, 2:5], pivot[a, 2:5], pivot[b, 1:4]) for a, b in pairs]
        self._product, self._determinant = np.empty((STAGES, lanes)), np.empty(lanes)

    def invert(self, rate: np.ndarray, out: np.ndarray) -> None:
        """Invert ``W - rate``, the rate diagonal or full."""
        core, product, determinant = self._core, self._product, self._determinant
        if rate.ndim == 3:
            np.subtract(INVERSE_WEIGHTS[:, :, None], rate, out=core)
        else:
            core[...] = INVERSE_WEIGHTS[:, :, None]
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


def stack_full(*blocks_and_kinds) -> None:
    """Stack blocks of any kinds as full ones: blocks, their kinds, the array to fill."""
    *parts, kinds, out = blocks_and_kinds
    for part, kind, place in zip(parts, kinds, out, strict=True):
        write_full(part, kind, place)


def stack_diagonal(*blocks_and_kinds) -> None:
    """Stack uniform and diagonal blocks as diagonal ones: blocks, their kinds, the array to fill."""
    *parts, _, out = blocks_and_kinds
    for part, place in zip(parts, out, strict=True):
        place[...] = part
