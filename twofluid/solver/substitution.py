"""Substitution: what carries the state over one step, once the stage equations are eliminated.

Forward, every unknown is solved as if it needed no other, and what it does to those below is added to their
loads; backward, it receives what it needs of them. Leaves and tails take part with their old state in the forward
pass and get their new one after the backward pass.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from .collocation import LAST, STAGES, STATE_LOAD
from .program import Symbol
from .tails import Family

State = list[np.ndarray]  # the unknowns outside of tails, then the coordinates of every family of tails


@dataclass(frozen=True)
class Group:
    """Pivots substituted together because their blocks are the same, or of the same kinds.

    Attributes
    ----------
    sets : int
        Different sets of blocks: one for all pivots, or one for each.
    own, rows, columns : list of int
        Where their unknowns, those below and those to the right stand in the state, pivot by pivot.
    inverse : int
        Symbol of the stacked inverses, as full blocks, set by set.
    below, beyond : int or None
        Symbols of the stacked blocks for the two passes, set by set, None if there are none.
    below_full, beyond_full : bool
        Whether those blocks are full. If none beyond is, the inverse is still to be applied to what comes from there.
    """

    sets: int
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


@dataclass(frozen=True)
class Leaves:
    """Unknowns that nothing eliminated before them touches.

    Attributes
    ----------
    rows, damped : list of int
        All of them, and those with a rate of their own.
    alone : int or None
        Symbol of the stacked columns of stages that a unit of old state makes of the damped ones by itself.
    share_rows, share_leaves : list of int
        What each of them adds to which load.
    share : int or None
        Symbol of the stacked columns for it.
    feed_leaves, feed_columns : list of int
        What each of them receives from which unknown.
    feed : int or None
        Symbol of the stacked columns for it.
    """

    rows: list[int]
    damped: list[int]
    alone: Symbol | None
    share_rows: list[int]
    share_leaves: list[int]
    share: Symbol | None
    feed_leaves: list[int]
    feed_columns: list[int]
    feed: Symbol | None

    @property
    def symbols(self) -> tuple[Symbol, ...]:
        """All results the substitution needs."""
        return tuple(symbol for symbol in (self.alone, self.share, self.feed) if symbol is not None)


class Factors:
    """The eliminated stage equations of a stretch of steps, and room for one step of all modes.

    Parameters
    ----------
    leaves : Leaves
    groups : sequence of Group
        The other unknowns in order.
    families : sequence of Family
        Tails.
    values : sequence of array
        Results of the elimination's program by symbol.
    count : int
        Number of unknowns outside of tails.
    shape : tuple of int
        Number of lanes, of steps in the stretch, and of modes.
    """

    def __init__(
        self,
        leaves: Leaves,
        groups: Sequence[Group],
        families: Sequence[Family],
        values: Sequence[np.ndarray],
        count: int,
        shape: tuple[int, int, int],
    ):
        self.shape = shape
        self._load, self._stages = np.empty((2, count, STAGES, shape[-1]))
        parts = values, shape, self._load, self._stages
        self._leaves = _LeafSubstitution(leaves, *parts)
        self._tails = [_TailSubstitution(family, *parts[1:]) for family in families]
        self._substitutions = [_Substitution(group, *parts) for group in groups]
        self._backwards = [substitution for substitution in reversed(self._substitutions) if substitution.needs_others]

    @property
    def groups(self) -> int:
        """Number of separate substitutions a step takes, leaves and tails left out."""
        return len(self._substitutions)

    def advance(self, state: State, step: int) -> State:
        """Carry the state over one step.

        Parameters
        ----------
        state : list of array, shapes (unknown, mode), and (tail, coordinate, mode) of every family of tails
            State at the beginning of the step.
        step : int
            Which step of the stretch.

        Returns
        -------
        list of array
            State at its end.
        """
        core, *coordinates = state
        np.multiply(STATE_LOAD[:, None], core[:, None], out=self._load)
        self._leaves.forward(core, step)
        for tails, own in zip(self._tails, coordinates, strict=True):
            tails.forward(own, step)
        for substitution in self._substitutions:
            substitution.forward(step)
        for substitution in self._backwards:
            substitution.backward(step)
        end = self._stages[:, LAST].copy()
        self._leaves.backward(core, end, step)
        return [end, *(tails.backward(own, step) for tails, own in zip(self._tails, coordinates, strict=True))]


class _Substitution:
    """One group's share in the two passes, with views of everything it touches."""

    def __init__(self, group: Group, values: Sequence[np.ndarray], shape: tuple, load: np.ndarray, stages: np.ndarray):
        size, modes = len(group.own), load.shape[-1]
        own = _positions(group.own)
        rows, columns = len(group.rows) // size, len(group.columns) // size
        self.needs_others = group.beyond is not None
        self._below_full, self._beyond_full = group.below_full, group.beyond_full
        self._inverse = _by_step(values[group.inverse], shape, (group.sets, STAGES, STAGES))
        self._own_load, self._own = load[own], stages[own]
        self._own_alone = self._own[:, None]
        if group.below is not None:
            below = (group.sets, rows, STAGES, STAGES)[: 3 + group.below_full]
            self._below = _by_step(values[group.below], shape, below)
        if group.beyond is not None:
            beyond = (group.sets, columns, STAGES, STAGES)[: 3 + group.beyond_full]
            self._beyond = _by_step(values[group.beyond], shape, beyond)
        self._share = np.empty((size, rows, STAGES, modes))
        self._flat_share = self._share.reshape(-1, STAGES, modes)
        self._target = _View(load, group.rows)
        self._source, self._given = _View(stages, group.columns), (size, columns, STAGES, modes)
        self._received, self._change = np.empty((2, size, STAGES, modes))

    def forward(self, step: int) -> None:
        """Solve for these unknowns as if they needed no other; pass their share on to the rows below."""
        np.einsum("gijm,gjm->gim", self._inverse[step], self._own_load, out=self._own)  # one set stretches over all
        if not self._share.size:
            return
        if self._below_full:
            np.einsum("grijm,gjm->grim", self._below[step], self._own, out=self._share)
        else:
            np.multiply(self._below[step], self._own_alone, out=self._share)
        self._target.add(self._flat_share)

    def backward(self, step: int) -> None:
        """Add what these unknowns receive from those eliminated after them."""
        block, change = self._beyond[step], self._change
        given = self._source.read().reshape(self._given)
        if self._beyond_full:
            np.einsum("gcijm,gcjm->gim", block, given, out=change)
        else:
            received = self._received
            if block.shape[1] == 1:
                np.multiply(block[:, 0], given[:, 0], out=received)
            else:
                np.einsum("gcim,gcim->gim", block, given, out=received)
            np.einsum("gijm,gjm->gim", self._inverse[step], received, out=change)
        np.add(self._own, change, out=self._own)


class _LeafSubstitution:
    """The leaves' share in the two passes: columns times old state, and stages times rows."""

    def __init__(
        self, leaves: Leaves, values: Sequence[np.ndarray], shape: tuple, load: np.ndarray, stages: np.ndarray
    ):
        modes = shape[-1]
        self._rows, self._damped = leaves.rows, leaves.damped
        self._keeping = [row for row in leaves.rows if row not in leaves.damped]
        self._stages = stages
        self._shares, self._feeds = len(leaves.share_rows), len(leaves.feed_leaves)
        if leaves.damped:
            self._turn = _by_step(values[leaves.alone][:, LAST], shape, (len(leaves.damped),))
        if self._shares:
            self._share = _by_step(values[leaves.share], shape, (self._shares, STAGES))
            self._givers = np.array(leaves.share_leaves)
            first, last = min(leaves.share_rows), max(leaves.share_rows) + 1
            self._collect = (np.arange(first, last)[:, None] == leaves.share_rows).astype(float)
            self._target = load[first:last]
            self._given = np.empty((self._shares, STAGES, modes))
        if self._feeds:
            self._feed = _by_step(values[leaves.feed], shape, (self._feeds, STAGES))
            self._columns = np.array(leaves.feed_columns)
            self._sum = (np.array(leaves.rows)[:, None] == leaves.feed_leaves).astype(float)

    def forward(self, core: np.ndarray, step: int) -> None:
        """Add what the old state of the leaves does to the loads of others."""
        if not self._shares:
            return
        np.multiply(self._share[step], core.take(self._givers, axis=0)[:, None], out=self._given)
        change = self._collect @ self._given.reshape(self._shares, -1)
        np.add(self._target, change.reshape(self._target.shape), out=self._target)

    def backward(self, core: np.ndarray, end: np.ndarray, step: int) -> None:
        """Write their new state."""
        end[self._keeping] = core[self._keeping]
        if self._damped:
            end[self._damped] = self._turn[step] * core[self._damped]
        if self._feeds:
            given = self._stages.take(self._columns, axis=0)
            end[self._rows] += self._sum @ np.einsum("pjm,pjm->pm", self._feed[step], given)


class _TailSubstitution:
    """One family of tails in the two passes."""

    def __init__(self, family: Family, shape: tuple, load: np.ndarray, stages: np.ndarray):
        factors, size = family.factors, family.kind.size
        sets = len(factors.blocks)
        self._share = _by_step(factors.share, shape, (sets, 2 * size, STAGES))
        self._feed = _by_step(factors.feed, shape, (sets, 2 * size, STAGES))
        self._turn = _by_step(factors.turn, shape, (sets, 2, 2, size))
        self._coordinates = (len(family.tails), 2, size, shape[-1])
        self._target = _View(load, [tail.sink for tail in family.tails])
        sources = zip(*(tail.sources.items() for tail in family.tails), strict=True)
        self._sources = [
            (_View(stages, [row for row, _ in source]), np.array([weight for _, weight in source])[:, None, None])
            for source in sources
        ]
        self._plain = len(self._sources) == 1 and np.all(self._sources[0][1] == 1.0)

    def forward(self, own: np.ndarray, step: int) -> None:
        """Add what the old state of the tails does to the loads of their sinks."""
        self._target.add(np.einsum("tpim,tpm->tim", self._share[step], own))

    def backward(self, own: np.ndarray, step: int) -> np.ndarray:
        """Give their new state."""
        if self._plain:
            driver = self._sources[0][0].read()
        else:
            driver = sum(weight * view.read() for view, weight in self._sources)
        turned = np.einsum("tcbqm,tbqm->tcqm", self._turn[step], own.reshape(self._coordinates))
        return turned.reshape(own.shape) + np.einsum("tpjm,tjm->tpm", self._feed[step], driver)


class _View:
    """Some unknowns of an array of stages: seen in place where they follow one another, else copied."""

    def __init__(self, array: np.ndarray, indices: list[int]):
        self._array, self._indices = array, _positions(indices)
        self._place = array[self._indices] if isinstance(self._indices, slice) else None

    def read(self) -> np.ndarray:
        """Give their values."""
        return self._array.take(self._indices, axis=0) if self._place is None else self._place

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


def _by_step(array: np.ndarray, shape: tuple[int, int, int], blocks: tuple[int, ...]) -> list[np.ndarray]:
    """Give views of every step, modes on the last axis behind the shape of the blocks."""
    lanes, steps, modes = shape
    used = array.reshape(*blocks, lanes)[..., : steps * modes].reshape(*blocks, steps, modes)
    return [used[..., step, :] for step in range(steps)]
