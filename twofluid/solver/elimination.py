"""Block elimination of the stage equations, for many steps and modes at once.

The stage equations of one step read ``(W - step A) Y = W 1 y`` with one 3 x 3 block for every
non-zero entry of the rate matrix A. Which entries are non-zero never changes, so the order of the
elimination, its fill-in and all block operations are worked out once (`Elimination`). The numbers do
not depend on the state, so they are worked out for a whole stretch of steps as long arrays
(`Elimination.factor`); only the substitution is sequential in time (`Factors.advance`).
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from .blocks import DIAGONAL, FULL, UNIFORM, Kind
from .collocation import STAGES, STATE_LOAD
from .program import Program, Symbol

Entry = tuple[int, int]


@dataclass(frozen=True)
class Pivot:
    """One elimination step.

    ``x = inverse (rhs + sum right x_column)`` with the columns eliminated later; each row still to be
    eliminated then gets ``below x``.

    Attributes
    ----------
    index : int
        The unknown.
    rows, columns : tuple of int
        Unknowns that need it, and unknowns it needs, among those eliminated later.
    inverse : int
        Symbol of the inverse of its pivot block.
    below, right, response : tuple of int
        Symbols of the blocks below it and to its right, and of ``inverse right``.
    """

    index: int
    rows: tuple[int, ...]
    columns: tuple[int, ...]
    inverse: Symbol
    below: tuple[Symbol, ...]
    right: tuple[Symbol, ...]
    response: tuple[Symbol, ...]

    def goes_with(self, other: "Pivot") -> bool:
        """Whether both are independent, serve different rows, and are made of the very same blocks."""
        same = (self.inverse, self.below, self.right) == (other.inverse, other.below, other.right)
        touched = (*self.rows, *self.columns)
        return same and other.index not in touched and not set(self.rows) & set(other.rows)


class Elimination:
    """The elimination of one pattern of couplings, in the order of the unknowns.

    Parameters
    ----------
    count : int
        Number of unknowns.
    sample : mapping of (row, column) to array
        Step times rate for any steps: the entries that are ever non-zero, their kinds of block (see
        `twofluid.solver.blocks`), and by being the same array, which are always equal.
    """

    def __init__(self, count: int, sample: Mapping[Entry, np.ndarray]):
        self._count = count
        self._program = Program()
        work = {entry: self._program.input(entry, rate) for entry, rate in sample.items()}
        self.pivots = [self._eliminate(index, work) for index in range(count)]
        self._groups = _groups(self.pivots, self._program)
        self._program.close(symbol for group in self._groups for symbol in group.symbols)
        self._factors: dict[tuple[int, int], Factors] = {}

    def kind(self, symbol: Symbol) -> Kind:
        """Give the kind of block a symbol of a pivot stands for."""
        return self._program.kind(symbol)

    def _eliminate(self, index: int, work: dict[Entry, Symbol]) -> Pivot:
        """Take one unknown out of the remaining blocks, by symbol."""
        program, later = self._program, range(index + 1, self._count)
        own = work.pop((index, index), None)
        rows = tuple(row for row in later if (row, index) in work)
        columns = tuple(column for column in later if (index, column) in work)
        below = tuple(work.pop((row, index)) for row in rows)
        right = tuple(work.pop((index, column)) for column in columns)
        inverse = program.inverse(own)
        response = tuple(program.product(inverse, block) for block in right)
        for row, left in zip(rows, below, strict=True):
            for column, block, product in zip(columns, right, response, strict=True):
                fill = program.fill(left, block, inverse, product)
                entry = row, column
                work[entry] = program.sum(work[entry], fill) if entry in work else fill
        return Pivot(index, rows, columns, inverse, below, right, response)

    def factor(self, rates: Mapping[Entry, np.ndarray], steps: int) -> "Factors":
        """Eliminate all unknowns for every step and mode of a stretch.

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
            Valid until the next stretch is factored.
        """
        lanes = next(iter(rates.values())).shape[-1]
        bound = self._program.bind(lanes)
        bound.run(rates)
        key = lanes, steps
        if key not in self._factors:
            if len(self._factors) > 1:
                self._factors.clear()
            self._factors[key] = Factors(self._groups, bound.values, self._count, steps, lanes // steps)
        return self._factors[key]


@dataclass(frozen=True)
class _Group:
    """Pivots substituted together because they share their blocks.

    Attributes
    ----------
    own, rows, columns : list of int
        Where their unknowns, those below and those to the right stand in the state, pivot by pivot.
    inverse : int
        Symbol of the inverse, as a stack of one full block.
    below, beyond : int or None
        Symbols of the stacked blocks for the two passes, None if there are none.
    below_full, beyond_full : bool
        Whether those blocks are full. If none beyond is, the inverse is still to be applied to what comes from there.
    """

    own: list[int]
    rows: list[int]
    columns: list[int]
    inverse: Symbol
    below: Symbol | None
    beyond: Symbol | None
    below_full: bool
    beyond_full: bool

    @property
    def symbols(self) -> tuple[Symbol, ...]:
        """All results the substitution needs."""
        return tuple(symbol for symbol in (self.inverse, self.below, self.beyond) if symbol is not None)


def _groups(pivots: Sequence[Pivot], program: Program) -> list[_Group]:
    """Put neighbours together that can be substituted together."""
    members: list[list[Pivot]] = []
    for pivot in pivots:
        if members and all(member.goes_with(pivot) for member in members[-1]):
            members[-1].append(pivot)
        else:
            members.append([pivot])
    groups = []
    for group in members:
        shared = group[0]
        plain = all(program.kind(symbol) in (UNIFORM, DIAGONAL) for symbol in shared.right)
        below = program.stack(shared.below) if shared.below else None
        beyond = program.stack(shared.right if plain else shared.response) if shared.right else None
        groups.append(
            _Group(
                own=[pivot.index for pivot in group],
                rows=[row for pivot in group for row in pivot.rows],
                columns=[column for pivot in group for column in pivot.columns],
                inverse=program.stack([shared.inverse]),
                below=below,
                beyond=beyond,
                below_full=below is not None and program.kind(below) == FULL,
                beyond_full=not plain,
            )
        )
    return groups


class Factors:
    """The eliminated stage equations of a stretch of steps, and room for one step of all modes.

    Parameters
    ----------
    groups : sequence
        Groups of eliminated unknowns in order.
    values : sequence of array
        Results of the elimination's program by symbol.
    count, steps, modes : int
        Number of unknowns, of steps in the stretch, of modes.
    """

    def __init__(self, groups: Sequence[_Group], values: Sequence[np.ndarray], count: int, steps: int, modes: int):
        self._load = np.empty((count, STAGES, modes))
        self._stages = np.empty((count, STAGES, modes))
        self._substitutions = [_Substitution(group, values, steps, self._load, self._stages) for group in groups]
        self._backwards = [substitution for substitution in reversed(self._substitutions) if substitution.needs_others]

    @property
    def groups(self) -> int:
        """Number of separate substitutions a step takes."""
        return len(self._substitutions)

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
            All stages of the step, good until the next one; the last stage is the new state.
        """
        np.multiply(STATE_LOAD[:, None], state[:, None], out=self._load)
        for substitution in self._substitutions:
            substitution.forward(step)
        for substitution in self._backwards:
            substitution.backward(step)
        return self._stages


class _Substitution:
    """One group's share in the two passes, with views of everything it touches."""

    def __init__(self, group: _Group, values: Sequence[np.ndarray], steps: int, load: np.ndarray, stages: np.ndarray):
        size, modes = len(group.own), load.shape[-1]
        own = _positions(group.own)
        rows, columns = len(group.rows) // size, len(group.columns) // size
        self.needs_others = group.beyond is not None
        self._below_full, self._beyond_full = group.below_full, group.beyond_full
        self._inverse = _by_step(values[group.inverse], steps, (STAGES, STAGES))
        self._own_load, self._own = load[own], stages[own]
        self._own_alone = self._own[:, None]
        if group.below is not None:
            self._below = _by_step(values[group.below], steps, (rows, STAGES, STAGES)[: 2 + group.below_full])
        if group.beyond is not None:
            self._beyond = _by_step(values[group.beyond], steps, (columns, STAGES, STAGES)[: 2 + group.beyond_full])
        self._share = np.empty((size, rows, STAGES, modes))
        self._flat_share = self._share.reshape(-1, STAGES, modes)
        self._target = _View(load, group.rows)
        self._source, self._given = _View(stages, group.columns), (size, columns, STAGES, modes)
        self._received, self._change = np.empty((2, size, STAGES, modes))

    def forward(self, step: int) -> None:
        """Solve for these unknowns as if they needed no other; pass their share on to the rows below."""
        np.einsum("ijm,gjm->gim", self._inverse[step], self._own_load, out=self._own)
        if not self._share.size:
            return
        if self._below_full:
            np.einsum("rijm,gjm->grim", self._below[step], self._own, out=self._share)
        else:
            np.multiply(self._below[step], self._own_alone, out=self._share)
        self._target.add(self._flat_share)

    def backward(self, step: int) -> None:
        """Add what these unknowns receive from those eliminated after them."""
        block, change = self._beyond[step], self._change
        given = self._source.read().reshape(self._given)
        if self._beyond_full:
            np.einsum("cijm,gcjm->gim", block, given, out=change)
        else:
            received = self._received
            if len(block) == 1:
                np.multiply(block, given[:, 0], out=received)
            else:
                np.einsum("cim,gcim->gim", block, given, out=received)
            np.einsum("ijm,gjm->gim", self._inverse[step], received, out=change)
        np.add(self._own, change, out=self._own)


class _View:
    """Some unknowns of an array of stages: seen in place where they follow one another, else copied."""

    def __init__(self, array: np.ndarray, indices: list[int]):
        self._array, self._indices = array, _positions(indices)
        self._place = array[self._indices] if isinstance(self._indices, slice) else None

    def read(self) -> np.ndarray:
        """Give their values."""
        return self._array[self._indices] if self._place is None else self._place

    def add(self, change: np.ndarray) -> None:
        """Add to their values; the unknowns differ from one another."""
        if self._place is None:
            self._array[self._indices] += change
        else:
            np.add(self._place, change, out=self._place)


def _positions(indices: list[int]) -> slice | np.ndarray:
    """Index the state without a copy where the positions follow one another."""
    if indices and indices == list(range(indices[0], indices[0] + len(indices))):
        return slice(indices[0], indices[0] + len(indices))
    return np.array(indices, dtype=int)


def _by_step(array: np.ndarray, steps: int, shape: tuple[int, ...]) -> list[np.ndarray]:
    """Give views of every step, modes on the last axis behind the shape of the blocks."""
    return [array.reshape(*shape, steps, -1)[..., step, :] for step in range(steps)]
