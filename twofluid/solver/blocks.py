"""Algebra of many small stage matrices at once, the lanes on the last axis.

A block couples the three stages of one unknown to those of another. It comes in three kinds, told
apart by the number of axes, and every operation keeps to the cheapest kind that can hold its result:

====================  =====================  =========================================
shape                 kind                   meaning
====================  =====================  =========================================
(lane,)               uniform                the same number at the three stages
(stage, lane)         diagonal               one number a stage
(stage, stage, lane)  full                   stages mix
====================  =====================  =========================================
"""

import numpy as np

from .collocation import INVERSE_WEIGHTS, STAGES, WEIGHTS

UNIFORM, DIAGONAL, FULL = 1, 2, 3

_WRAP = np.array([0, 1, 2, 0, 1])  # periodic rows and columns: every cofactor becomes a plain slice


def as_full(block: np.ndarray) -> np.ndarray:
    """Write any block as a full one, shape (stage, stage, lane)."""
    if block.ndim == FULL:
        return block
    full = np.zeros((STAGES, STAGES, block.shape[-1]))
    full[np.arange(STAGES), np.arange(STAGES)] = block
    return full


def add(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Add two blocks of any kinds."""
    if first.ndim < second.ndim:
        first, second = second, first
    if first.ndim == FULL and second.ndim < FULL:
        total = first.copy()
        diagonal = np.einsum("iil->il", total)
        diagonal += second
        return total
    return first + second


def multiply(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Multiply two blocks of any kinds."""
    if left.ndim == FULL and right.ndim == FULL:
        return np.einsum("ikl,kjl->ijl", left, right)
    if left.ndim == DIAGONAL and right.ndim == FULL:
        return left[:, None] * right
    return left * right  # uniform anywhere, diagonal by diagonal, or full by diagonal (columns)


def pivot(rate: np.ndarray) -> np.ndarray:
    """Form the pivot ``W - rate``, shape (stage, stage, lane)."""
    if rate.ndim == FULL:
        return INVERSE_WEIGHTS[:, :, None] - rate
    block = np.repeat(INVERSE_WEIGHTS[:, :, None], rate.shape[-1], axis=2)
    diagonal = np.einsum("iil->il", block)
    diagonal -= rate
    return block


def inverse(block: np.ndarray) -> np.ndarray:
    """Invert full blocks by cofactors, shape (stage, stage, lane)."""
    wrapped = block[_WRAP][:, _WRAP]
    cofactors = wrapped[1:4, 1:4] * wrapped[2:5, 2:5]
    cofactors -= wrapped[1:4, 2:5] * wrapped[2:5, 1:4]
    determinant = np.einsum("jl,jl->l", block[0], cofactors[0])
    return cofactors.transpose(1, 0, 2) / determinant


def constant_inverse(lanes: int) -> np.ndarray:
    """Inverse of a pivot with no rate of its own: the Butcher matrix, shape (stage, stage, lane)."""
    return np.broadcast_to(WEIGHTS[:, :, None], (STAGES, STAGES, lanes))
