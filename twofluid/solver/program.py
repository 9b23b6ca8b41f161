"""A straight-line program of block operations, written once and run for every stretch of steps.

Which blocks an elimination multiplies, adds and inverts depends only on the pattern of the system.
The program records these operations by symbol; an operation on the same symbols is recorded once,
so that unknowns with the very same rates (moment chains) cost no more than one of them. Before it
runs, every operation is given the array for its result, and an array is given again as soon as
nothing needs its content: all of it stays in the processor's cache.
"""

from collections.abc import Callable, Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from . import blocks
from .blocks import DIAGONAL, FULL, SPECTRAL, UNIFORM, Kind

Symbol = int


@dataclass(frozen=True)
class _Operation:
    """One operation: what it computes from which results, and what it gives.

    Without a call it is an input, its only operand the key that finds it.
    """

    call: Callable | None
    operands: tuple
    kind: Kind
    parts: tuple[int, ...] = ()  # of a stack


class Program:
    """Block operations in order, their results known by symbol."""

    def __init__(self):
        self._operations: list[_Operation] = []
        self._known: dict[Hashable, Symbol] = {}
        self._wanted: frozenset[Symbol] = frozenset()
        self._needed: frozenset[Symbol] = frozenset()
        self._bound: dict[int, _Bound] = {}

    def kind(self, symbol: Symbol) -> Kind:
        """Give the kind of a result."""
        return self._operations[symbol].kind

    def input(self, key: Hashable, sample: np.ndarray) -> Symbol:
        """Take a block from outside: `key` finds it when the program runs; the same array is the same symbol."""
        return self._record(("input", id(sample)), None, (key,), blocks.kind_of(sample))

    def inverse(self, rate: Symbol | None) -> Symbol:
        """Invert the pivot ``W - rate``; without a rate of its own that is a constant."""
        if rate is None:
            return self._record("free inverse", blocks.write_free_inverse, (), FULL)
        kind = SPECTRAL if self.kind(rate) in (UNIFORM, SPECTRAL) else FULL
        return self._record(("inverse", rate), blocks.invert_pivot, (rate,), kind)

    def product(self, left: Symbol, right: Symbol) -> Symbol:
        """Multiply two blocks."""
        kind = blocks.combined(self.kind(left), self.kind(right))
        return self._record(("product", left, right), blocks.multiply, (left, right), kind)

    def sum(self, first: Symbol, second: Symbol) -> Symbol:
        """Add two blocks."""
        kind = blocks.combined(self.kind(first), self.kind(second))
        return self._record(("sum", first, second), blocks.add, (first, second), kind)

    def fill(self, left: Symbol, right: Symbol, inverse: Symbol, response: Symbol) -> Symbol:
        """Multiply ``left inverse right``, given the response ``inverse right``, the cheaper way round."""
        if self.kind(left) == self.kind(right) == UNIFORM:
            return self.product(self.product(left, right), inverse)
        return self.product(left, response)

    def stack(self, symbols: Sequence[Symbol]) -> Symbol:
        """Put blocks into one array, as diagonal ones if they can be, else as full ones."""
        if len(symbols) == 1 and self.kind(symbols[0]) == FULL:
            return symbols[0]
        plain = all(self.kind(symbol) in (UNIFORM, DIAGONAL) for symbol in symbols)
        call, kind = (blocks.stack_diagonal, DIAGONAL) if plain else (blocks.stack_full, FULL)
        return self._record(("stack", *symbols), call, tuple(symbols), kind, (len(symbols),))

    def _record(self, key: Hashable, call: Callable | None, operands: tuple, kind: Kind, parts=()) -> Symbol:
        if key not in self._known:
            self._known[key] = len(self._operations)
            self._operations.append(_Operation(call, operands, kind, parts))
        return self._known[key]

    def close(self, wanted: Iterable[Symbol]) -> None:
        """End the recording; only the results wanted outlive a run."""
        self._wanted = frozenset(wanted)
        needed = set(self._wanted)
        for symbol in reversed(range(len(self._operations))):
            if symbol in needed and self._operations[symbol].call is not None:
                needed.update(self._operations[symbol].operands)
        self._needed = frozenset(needed)

    def bind(self, lanes: int) -> "_Bound":
        """Give every operation its array, for one number of lanes; the last few numbers are remembered."""
        if lanes not in self._bound:
            if len(self._bound) > 1:  # a march knows two: whole stretches and the last one
                self._bound.clear()
            self._bound[lanes] = _Bound(self._operations, self._wanted, self._needed, lanes)
        return self._bound[lanes]


class _Bound:
    """A program with its arrays.

    Attributes
    ----------
    values : list of array
        Result of every operation by symbol; those wanted are good until the next run.
    """

    def __init__(self, operations: Sequence[_Operation], wanted: frozenset, needed: frozenset, lanes: int):
        self.values: list[np.ndarray | None] = [None] * len(operations)
        self._inputs = [(symbol, op.operands[0]) for symbol, op in enumerate(operations) if op.call is None]
        self._calls = []
        computed = [(s, op) for s, op in enumerate(operations) if s in needed and op.call is not None]
        last_use = {o: symbol for symbol, op in computed for o in op.operands}
        free: dict[tuple, list[np.ndarray]] = {}
        for symbol, op in computed:
            spent = [
                o
                for o in dict.fromkeys(op.operands)
                if last_use[o] == symbol and o not in wanted and operations[o].call is not None
            ]
            kinds = tuple(operations[o].kind for o in op.operands)
            in_place = [o for o in spent if op.call is blocks.add and operations[o].kind == op.kind]
            if in_place:
                out = self.values[in_place[0]]
                spent.remove(in_place[0])
            else:
                room = free.get((op.kind, op.parts))
                out = room.pop() if room else op.kind.empty(lanes, op.parts)
            for o in spent:
                free.setdefault((operations[o].kind, operations[o].parts), []).append(self.values[o])
            self.values[symbol] = out
            self._calls.append((op.call, op.operands, kinds, out))

    def run(self, inputs: Mapping[Hashable, np.ndarray]) -> None:
        """Work through the operations with blocks from outside."""
        values = self.values
        for symbol, key in self._inputs:
            values[symbol] = inputs[key]
        for call, operands, kinds, out in self._calls:
            call(*[values[operand] for operand in operands], kinds, out)
