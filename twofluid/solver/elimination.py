"""Block elimination of the stage equations, for many steps and modes at once.

The stage equations of one step read ``(W - step A) Y = W 1 y`` with one 3 x 3 block for every
non-zero entry of the rate matrix A. Which entries are non-zero never changes, so the order of the
elimination and its fill-in are worked out once (`Elimination`). The numbers do not depend on the
state, so they are worked out for a whole stretch of steps as long arrays (`Elimination.factor`);
only the substitution is sequential in time (`Factors.advance`).

Unknowns whose blocks are the very same arrays (moment chains with equal rates) are worked out once
and substituted together.
"""

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from . import blocks
from .collocation import STAGES, STATE_LOAD

Entry = tuple[int, int]


@dataclass(frozen=True)
class Pivot:
    """One elimination step: the unknown, who needs it, and whom it needs."""

    index: int
    rows: tuple[int, ...]
    columns: tuple[int, ...]


class Elimination:
    """The symbolic elimination: pivots in order, with fill-in.

    Parameters
    ----------
    count : int
        Number of unknowns, eliminated in the order of their index.
    couplings : iterable of (int, int)
        Non-zero entries (row, column) of the rate matrix.
    """

    def __init__(self, count: int, couplings: Iterable[Entry]):
        filled = set(couplings)
        self.pivots: list[Pivot] = []
        for index in range(count):
            rows = tuple(row for row in range(index + 1, count) if (row, index) in filled)
            columns = tuple(column for column in range(index + 1, count) if (index, column) in filled)
            filled.update((row, column) for row in rows for column in columns)
            self.pivots.append(Pivot(index, rows, columns))

    def factor(self, rates: Mapping[Entry, np.ndarray], steps: int) -> "Factors":
        """Eliminate all unknowns for every step and mode.

        Parameters
        ----------
        rates : mapping of (row, column) to array
            Step length times rate, shape (lane,) or (stage, lane) [unitless];
            the lanes are steps times modes, the mode running fastest.
        steps : int
            Number of steps among the lanes.

        Returns
        -------
        Factors
        """
        work = dict(rates)
        memory = _Memory(next(iter(rates.values())).shape[-1])
        return Factors([_eliminate(pivot, work, memory) for pivot in self.pivots], steps)


@dataclass(frozen=True)
class _Eliminated:
    """Blocks of one eliminated unknown: ``x = inverse rhs + sum beyond x_column``; rows get ``below x``."""

    pivot: Pivot
    inverse: np.ndarray
    below: list[np.ndarray]
    beyond: list[np.ndarray]

    def goes_with(self, other: "_Eliminated") -> bool:
        """Whether both are independent, serve different rows, and are made of the very same blocks."""
        mine, others = (self.inverse, *self.below, *self.beyond), (other.inverse, *other.below, *other.beyond)
        same = len(self.below) == len(other.below) and len(mine) == len(others)
        touched = (*self.pivot.rows, *self.pivot.columns)
        apart = other.pivot.index not in touched and not set(self.pivot.rows) & set(other.pivot.rows)
        return apart and same and all(a is b for a, b in zip(mine, others, strict=True))


class _Memory:
    """Remembers block operations by the identity of their operands, so that equal chains cost once."""

    def __init__(self, lanes: int):
        self._lanes = lanes
        self._known: dict[tuple, tuple] = {}

    def once(self, operation: Callable[..., np.ndarray], *operands) -> np.ndarray:
        key = (operation, *map(id, operands))
        if key not in self._known:
            self._known[key] = (operation(*operands), operands)  # operands stay alive: their identity is the key
        return self._known[key][0]

    def pivot_inverse(self, rate: np.ndarray | None) -> np.ndarray:
        """Invert ``W - rate``; `rate` None stands for zero."""
        return blocks.constant_inverse(self._lanes) if rate is None else blocks.inverse(blocks.pivot(rate))


def _eliminate(pivot: Pivot, work: dict[Entry, np.ndarray], memory: _Memory) -> _Eliminated:
    """Take one unknown out of the remaining blocks."""
    own = work.pop((pivot.index, pivot.index), None)
    below = [work.pop((row, pivot.index)) for row in pivot.rows]
    right = [work.pop((pivot.index, column)) for column in pivot.columns]
    inverse = memory.once(memory.pivot_inverse, own)
    beyond = [memory.once(blocks.multiply, inverse, block) for block in right]
    for row, left in zip(pivot.rows, below, strict=True):
        for column, response in zip(pivot.columns, beyond, strict=True):
            fill = memory.once(blocks.multiply, left, response)
            base = work.get((row, column))
            work[row, column] = fill if base is None else memory.once(blocks.add, base, fill)
    return _Eliminated(pivot, inverse, below, beyond)


class Factors:
    """The eliminated stage equations of a stretch of steps.

    Parameters
    ----------
    eliminated : sequence
        Eliminated unknowns in order.
    steps : int
        Steps of the stretch.
    """

    def __init__(self, eliminated: Sequence[_Eliminated], steps: int):
        groups: list[list[_Eliminated]] = []
        for one in eliminated:
            if groups and all(member.goes_with(one) for member in groups[-1]):
                groups[-1].append(one)
            else:
                groups.append([one])
        self._groups = [_Group(members, steps) for members in groups]

    @property
    def groups(self) -> int:
        """Number of separate substitutions a step takes in each direction."""
        return len(self._groups)

    def advance(self, state: np.ndarray, step: int) -> np.ndarray:
        """Carry the state over one step.

        Parameters
        ----------
        state : array, shape (unknown, mode)
            State at the beginning of the step.
        step : int
            Which step of the stretch.

        Returns
        -------
        array, shape (unknown, stage, mode)
            All stages of the step; the last stage is the new state.
        """
        stages = STATE_LOAD[:, None] * state[:, None]
        for group in self._groups:
            group.forward(stages, step)
        for group in reversed(self._groups):
            group.backward(stages, step)
        return stages


class _Group:
    """Unknowns substituted together because they share their blocks."""

    def __init__(self, members: Sequence[_Eliminated], steps: int):
        shared = members[0]
        self._size = len(members)
        self._own = _positions([member.pivot.index for member in members])
        self._rows = _positions([row for member in members for row in member.pivot.rows])
        self._columns = _positions([column for member in members for column in member.pivot.columns])
        self._inverse = _by_step(shared.inverse, steps)
        self._below = _by_step(_stack(shared.below), steps) if shared.below else None
        self._beyond = _by_step(_stack(shared.beyond), steps) if shared.beyond else None

    def forward(self, stages: np.ndarray, step: int) -> None:
        """Solve for these unknowns as if they needed no other; pass their share on to the rows below."""
        own = np.einsum("ijm,gjm->gim", self._inverse[..., step, :], stages[self._own])
        stages[self._own] = own
        if self._below is not None:
            block = self._below[..., step, :]
            if block.ndim == blocks.FULL:  # a stack of diagonal blocks
                share = block * own[:, None]
            else:
                share = np.einsum("rijm,gjm->grim", block, own)
            stages[self._rows] += share.reshape(-1, *share.shape[2:])

    def backward(self, stages: np.ndarray, step: int) -> None:
        """Add what these unknowns receive from those eliminated after them."""
        if self._beyond is not None:
            block = self._beyond[..., step, :]
            given = stages[self._columns].reshape(self._size, -1, *stages.shape[1:])
            stages[self._own] += np.einsum("cijm,gcjm->gim", block, given)


def _positions(indices: list[int]) -> slice | np.ndarray:
    """Index the state without a copy where the positions follow one another."""
    if indices and indices == list(range(indices[0], indices[0] + len(indices))):
        return slice(indices[0], indices[0] + len(indices))
    return np.array(indices, dtype=int)


def _stack(parts: Sequence[np.ndarray]) -> np.ndarray:
    """Stack blocks, shape (part, stage, lane) if all are diagonal or uniform, else (part, stage, stage, lane)."""
    if any(part.ndim == blocks.FULL for part in parts):
        return np.stack([blocks.as_full(part) for part in parts])
    return np.stack([np.broadcast_to(part, (STAGES, part.shape[-1])) for part in parts])


def _by_step(array: np.ndarray, steps: int) -> np.ndarray:
    """Separate steps from modes on the lane axis."""
    return array.reshape(*array.shape[:-1], steps, -1)
