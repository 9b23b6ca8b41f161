"""Block elimination of the stage equations, for many steps and modes at once.

The stage equations of one step read ``(W - step A) Y = W 1 y`` with one 3 x 3 block for every
non-zero entry of the rate matrix A. Which entries are non-zero never changes, so the order of the
elimination, its fill-in and all block operations are worked out once (`Elimination`). The numbers do
not depend on the state, so they are worked out for a whole stretch of steps as long arrays
(`Elimination.factor`); only the substitution is sequential in time (`twofluid.solver.substitution`).

Tails come first (`twofluid.solver.tails`). Of the other unknowns those that no unknown before them touches are
leaves: their load is nothing but their old state, and all that is needed of them in the end is their last stage, so
that columns of numbers do for both where others need 3 x 3 blocks.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from . import blocks
from .blocks import DIAGONAL, FULL, Kind
from .collocation import LAST, WEIGHTS
from .program import Program, Symbol
from .substitution import Factors, Group, Leaves, State
from .system import Entry, StepRates, Tail
from .tails import Family, families


@dataclass(frozen=True)
class Pivot:
    """One elimination step.

    ``x = inverse (rhs + sum right x_column)`` with the columns eliminated later; each row still to be
    eliminated then gets ``below x``.

    Attributes
    ----------
    index : int
        The unknown.
    leaf : bool
        Whether no unknown eliminated before it touches it.
    rows, columns : tuple of int
        Unknowns that need it, and unknowns it needs, among those eliminated later.
    inverse : int
        Symbol of the inverse of its pivot block.
    below, right, response : tuple of int
        Symbols of the blocks below it and to its right, and of ``inverse right``.
    """

    index: int
    leaf: bool
    rows: tuple[int, ...]
    columns: tuple[int, ...]
    inverse: Symbol
    below: tuple[Symbol, ...]
    right: tuple[Symbol, ...]
    response: tuple[Symbol, ...]

    @property
    def blocks(self) -> tuple[tuple[Symbol, ...], ...]:
        """Symbols of what the substitution is made of."""
        return (self.inverse,), self.below, self.right

    def goes_with(self, other: "Pivot", kind: Callable[[Symbol], Kind]) -> bool:
        """Whether both are independent, serve different rows, and are made of the same kinds of block."""
        alike, others = ([[kind(symbol) for symbol in part] for part in pivot.blocks] for pivot in (self, other))
        touched = (*self.rows, *self.columns)
        return alike == others and other.index not in touched and not set(self.rows) & set(other.rows)


class Elimination:
    """The elimination of one pattern of couplings, in the order of the unknowns.

    Parameters
    ----------
    count : int
        Number of unknowns, those in tails left out.
    sample : StepRates
        Step times rate for any steps: the entries that are ever non-zero, their kinds of block (see
        `twofluid.solver.blocks`), and by being the same array, which are always equal.
    tails : sequence of Tail, optional
        Tails of the system.

    Raises
    ------
    ValueError
        If an entry belongs to a tail, a tail has no source, or its eigenvectors are too nearly parallel.

    Attributes
    ----------
    program : Program
        All block operations.
    pivots : list of Pivot
    families : list of Family
        The tails, those of one kind together.
    """

    def __init__(self, count: int, sample: StepRates, tails: Sequence[Tail] = ()):
        self._count = count
        self.program = program = Program()
        self._free = program.constant("free inverse", WEIGHTS[:, :, None])
        self.families = families(tails, sample.tails)
        if beyond := [entry for entry in sample.entries if max(entry) >= count]:
            raise ValueError(f"entries {beyond} belong to tails, whose rates are told by `Tail` and `TailRates`")
        if not all(tail.sources for tail in tails):
            raise ValueError("a tail without a source is no tail")
        work = {entry: program.input(entry, rate) for entry, rate in sample.entries.items()}
        self._touched: set[int] = set()
        for number, family in enumerate(self.families):
            self._attach(number, family, work)
        self.pivots = [self._eliminate(index, work) for index in range(count)]
        self._leaves = self._gather([pivot for pivot in self.pivots if pivot.leaf])
        self._groups = _groups([pivot for pivot in self.pivots if not pivot.leaf], program)
        program.close(symbol for part in (self._leaves, *self._groups) for symbol in part.symbols)
        self._factors: Factors | None = None

    def kind(self, symbol: Symbol) -> Kind:
        """Give the kind of block a symbol of a pivot stands for."""
        return self.program.kind(symbol)

    def _attach(self, number: int, family: Family, work: dict[Entry, Symbol]) -> None:
        """Add what the tails of one kind do to their sinks once they are eliminated."""
        program = self.program
        for tail, place in zip(family.tails, family.set_of, strict=True):
            block = program.input(("tail", number, place), family.factors.blocks[place])
            for source, weight in tail.sources.items():
                entry, weighted = (tail.sink, source), program.scaled(block, weight)
                work[entry] = program.sum(work[entry], weighted) if entry in work else weighted
            self._touched |= {tail.sink, *tail.sources}

    def _eliminate(self, index: int, work: dict[Entry, Symbol]) -> Pivot:
        """Take one unknown out of the remaining blocks, by symbol."""
        program, later = self.program, range(index + 1, self._count)
        own = work.pop((index, index), None)
        rows = tuple(row for row in later if (row, index) in work)
        columns = tuple(column for column in later if (index, column) in work)
        below = tuple(work.pop((row, index)) for row in rows)
        right = tuple(work.pop((index, column)) for column in columns)
        inverse = self._free if own is None else program.inverse(own)
        response = tuple(program.product(inverse, block) for block in right)
        for row, left in zip(rows, below, strict=True):
            for column, product in zip(columns, response, strict=True):
                fill = program.product(left, product)
                entry = row, column
                work[entry] = program.sum(work[entry], fill) if entry in work else fill
        leaf = index not in self._touched
        self._touched.update(rows, columns)
        return Pivot(index, leaf, rows, columns, inverse, below, right, response)

    def _gather(self, pivots: Sequence[Pivot]) -> Leaves:
        """Put the leaves together, coupling by coupling."""
        program = self.program
        full_weight = program.constant("quadrature", WEIGHTS[LAST][:, None])
        shares, feeds, alone = [], [], {}
        for pivot in pivots:
            free = pivot.inverse == self._free  # then a unit of old state stays what it is
            if not free:
                alone[pivot.index] = program.column(blocks.start_alone, pivot.inverse)
            last = full_weight if free else program.column(blocks.last_row, pivot.inverse)
            for row, block in zip(pivot.rows, pivot.below, strict=True):
                shares.append((row, pivot.index, block if free else program.product(block, alone[pivot.index])))
            for column, block in zip(pivot.columns, pivot.right, strict=True):
                feeds.append((pivot.index, column, program.product(block, last)))

        def stack(symbols: Sequence[Symbol]) -> Symbol | None:
            return program.stack(symbols, DIAGONAL) if symbols else None

        return Leaves(
            rows=[pivot.index for pivot in pivots],
            damped=list(alone),
            alone=stack(list(alone.values())),
            share_rows=[row for row, _, _ in shares],
            share_leaves=[leaf for _, leaf, _ in shares],
            share=stack([symbol for _, _, symbol in shares]),
            feed_leaves=[leaf for leaf, _, _ in feeds],
            feed_columns=[column for _, column, _ in feeds],
            feed=stack([symbol for _, _, symbol in feeds]),
        )

    def split(self, state: np.ndarray) -> State:
        """Part a state, shape (unknown, mode), into unknowns outside of tails and coordinates of the tails."""
        return [state[: self._count], *(family.coordinates(state) for family in self.families)]

    def read(self, state: State, rows: np.ndarray) -> np.ndarray:
        """Read unknowns off a parted state, shape (row, mode)."""
        core, *coordinates = state
        if np.all(rows < self._count):
            return core[rows]
        found = np.empty((len(rows), core.shape[1]))
        found[rows < self._count] = core[rows[rows < self._count]]
        for family, own in zip(self.families, coordinates, strict=True):
            for place, values in family.members(own, rows):
                found[place] = values
        return found

    def factor(self, rates: StepRates, lanes: int, steps: int, modes: int) -> Factors:
        """Eliminate all unknowns for every step and mode of a stretch.

        Parameters
        ----------
        rates : StepRates
            The lanes are steps times modes, the mode running fastest; any further lanes are left alone.
        lanes, steps, modes : int
            Number of lanes, and of steps and of modes among them.

        Returns
        -------
        Factors
            Valid until the next stretch is factored.
        """
        inputs = dict(rates.entries)
        for number, family in enumerate(self.families):
            family.factor(rates.tails, lanes)
            inputs |= {("tail", number, place): block for place, block in enumerate(family.factors.blocks)}
        bound = self.program.bind(lanes)
        bound.run(inputs)
        if self._factors is None or self._factors.shape != (lanes, steps, modes):
            self._factors = Factors(
                self._leaves, self._groups, self.families, bound.values, self._count, (lanes, steps, modes)
            )
        return self._factors


def _groups(pivots: Sequence[Pivot], program: Program) -> list[Group]:
    """Put neighbours together that can be substituted together."""
    members: list[list[Pivot]] = []
    for pivot in pivots:
        follows = members and members[-1][-1].index + 1 == pivot.index  # a group is one piece of the state
        if follows and all(member.goes_with(pivot, program.kind) for member in members[-1]):
            members[-1].append(pivot)
        else:
            members.append([pivot])
    groups = []
    for group in members:
        different = group[:1] if all(pivot.blocks == group[0].blocks for pivot in group) else group
        plain = all(program.kind(symbol) != FULL for symbol in group[0].right)
        right = [symbol for pivot in different for symbol in (pivot.right if plain else pivot.response)]
        below = [symbol for pivot in different for symbol in pivot.below]
        below_full = any(program.kind(symbol) == FULL for symbol in below)
        groups.append(
            Group(
                sets=len(different),
                own=[pivot.index for pivot in group],
                rows=[row for pivot in group for row in pivot.rows],
                columns=[column for pivot in group for column in pivot.columns],
                inverse=program.stack([pivot.inverse for pivot in different], FULL),
                below=program.stack(below, FULL if below_full else DIAGONAL) if below else None,
                beyond=program.stack(right, DIAGONAL if plain else FULL) if right else None,
                below_full=below_full,
                beyond_full=not plain,
            )
        )
    return groups
