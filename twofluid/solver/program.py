"""A straight-line program of block operations, written once and run for every stretch of steps.

Which blocks an elimination multiplies, adds and inverts depends only on the pattern of the system.
The program records these operations by symbol; an operation on the same symbols is recorded once,
so that unknowns with the very same rates cost no more than one of them. Before it runs, every
operation is given the array for its result, and an array is given again as soon as nothing needs
its content: all of it stays in the processor's cache. Blocks that end up in one stack are written there at once.
"""

from collections.abc import Callable, Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from . import blocks
from .blocks import DIAGONAL, FULL, Kind

Symbol = int


@dataclass(frozen=True)
class _Operation:
    """One operation: what it computes from which results, and what it gives.

    Without a call it is an input or a constant, its only operand the key that finds it, or the array.
    """

    call: Callable | None
    operands: tuple
    kind: Kind
    parts: tuple[int, ...] = ()  # of a stack

    @property
    def is_stack(self) -> bool:
        """Whether it puts other results into one array."""
        return bool(self.parts)


class Program:
    """Block operations in order, their results known by symbol."""

    def __init__(self):
        self._operations: list[_Operation] = []
        self._known: dict[Hashable, Symbol] = {}
        self._wanted: frozenset[Symbol] = frozenset()
        self._bound: _Bound | None = None

    def kind(self, symbol: Symbol) -> Kind:
        """Give the kind of a result."""
        return self._operations[symbol].kind

    def input(self, key: Hashable, sample: np.ndarray) -> Symbol:
        """Take a block from outside: `key` finds it when the program runs; the same array is the same symbol."""
        return self._record(("input", id(sample)), None, (key,), blocks.kind_of(sample))

    def constant(self, name: str, block: np.ndarray) -> Symbol:
        """Take a block that is always the same, with one lane."""
        return self._record(("constant", name), None, (block,), blocks.kind_of(block))

    def inverse(self, rate: Symbol) -> Symbol:
        """Invert the pivot ``W - rate``."""
        return self._record(("inverse", rate), blocks.PivotInverse, (rate,), FULL)

    def product(self, left: Symbol, right: Symbol) -> Symbol:
        """Multiply two blocks."""
        kind = blocks.combined(self.kind(left), self.kind(right))
        return self._record(("product", left, right), blocks.multiply, (left, right), kind)

    def sum(self, first: Symbol, second: Symbol) -> Symbol:
        """Add two blocks."""
        kind = blocks.combined(self.kind(first), self.kind(second))
        return self._record(("sum", first, second), blocks.add, (first, second), kind)

    def scaled(self, block: Symbol, factor: float) -> Symbol:
        """Multiply a block by a number."""
        call = partial(blocks.scale, factor=factor)
        return block if factor == 1.0 else self._record(("scaled", block, factor), call, (block,), self.kind(block))

    def column(self, call: Callable, block: Symbol) -> Symbol:
        """Take a column of numbers, one a stage, from a block."""
        return self._record((call.__name__, block), call, (block,), DIAGONAL)

    def stack(self, symbols: Sequence[Symbol], kind: Kind) -> Symbol:
        """Put blocks into one array, as blocks of a kind that holds them all."""
        return self._record(("stack", *symbols, kind), blocks.write, tuple(symbols), kind, (len(symbols),))

    def _record(self, key: Hashable, call: Callable | None, operands: tuple, kind: Kind, parts=()) -> Symbol:
        if key not in self._known:
            self._known[key] = len(self._operations)
            self._operations.append(_Operation(call, operands, kind, parts))
        return self._known[key]

    def close(self, wanted: Iterable[Symbol]) -> None:
        """End the recording; only the results wanted outlive a run."""
        self._wanted = frozenset(wanted)

    def bind(self, lanes: int) -> "_Bound":
        """Give every operation its array, for one number of lanes; the last number is remembered."""
        if self._bound is None or self._bound.lanes != lanes:
            self._bound = _Bound(self._operations, self._wanted, lanes)
        return self._bound


class _Bound:
    """A program with its arrays.

    Attributes
    ----------
    lanes : int
    values : list of array
        Result of every operation by symbol; those wanted are good until the next run.
    calls : list of tuple
        What a run works through: function, symbols of the operands, their kinds, array of the result.
    """

    def __init__(self, operations: Sequence[_Operation], wanted: frozenset[Symbol], lanes: int):
        self.lanes = lanes
        self.values: list[np.ndarray | None] = [None] * len(operations)
        self.calls, self._inputs = [], []
        self._operations, self._wanted = operations, wanted
        self._invert = blocks.PivotInverse(lanes)
        needed = _needed(operations, wanted)
        computed = [symbol for symbol in needed if operations[symbol].call is not None]
        self._last_use = {operand: symbol for symbol in computed for operand in operations[symbol].operands}
        self._places = self._stacks(computed)
        self._free: dict[Kind, list[np.ndarray]] = {}
        for symbol in needed:
            op = operations[symbol]
            if op.call is None:
                self._take(symbol, *op.operands)
            elif op.is_stack:
                self._fill(symbol)
            else:
                self._compute(symbol)

    def _compute(self, symbol: Symbol) -> None:
        """Find the array for a result; note the call."""
        op = self._operations[symbol]
        spent = [o for o in dict.fromkeys(op.operands) if self._last_use[o] == symbol and self._gives_way(o)]
        in_place = [o for o in spent if op.call is blocks.add and self._operations[o].kind == op.kind]
        if symbol in self._places:
            stack, number = self._places[symbol]
            out = self.values[stack][number]
        elif in_place:
            out = self.values[in_place[0]]
            spent.remove(in_place[0])
        else:
            room = self._free.get(op.kind)
            out = room.pop() if room else op.kind.empty(self.lanes)
        for o in spent:
            self._free.setdefault(self._operations[o].kind, []).append(self.values[o])
        self.values[symbol] = out
        call = self._invert if op.call is blocks.PivotInverse else op.call
        self.calls.append((call, op.operands, tuple(self._operations[o].kind for o in op.operands), out))

    def _stacks(self, computed: Sequence[Symbol]) -> dict[Symbol, tuple[Symbol, int]]:
        """Make room for all stacks; say which results are computed right there: in which stack, and where."""
        places: dict[Symbol, tuple[Symbol, int]] = {}
        for symbol in computed:
            op = self._operations[symbol]
            if op.is_stack:
                self.values[symbol] = op.kind.empty(self.lanes, op.parts)
                for number, part in enumerate(op.operands):
                    producer = self._operations[part]
                    if producer.call is not None and producer.kind == op.kind:
                        places.setdefault(part, (symbol, number))
        return places

    def _take(self, symbol: Symbol, source) -> None:
        """Note an input, or set a constant."""
        if isinstance(source, np.ndarray):
            self.values[symbol] = source
        else:
            self._inputs.append((symbol, source))

    def _fill(self, symbol: Symbol) -> None:
        """Copy what a stack lacks."""
        for number, part in enumerate(self._operations[symbol].operands):
            if self._places.get(part) != (symbol, number):
                kinds = (self._operations[part].kind,)
                self.calls.append((blocks.write, (part,), kinds, self.values[symbol][number]))

    def _gives_way(self, symbol: Symbol) -> bool:
        """Whether an array may be used again once its content is not needed, whatever the order of operations."""
        op = self._operations[symbol]
        kept = op.is_stack or symbol in self._places or symbol in self._wanted
        return op.call is not None and not kept

    def run(self, inputs: Mapping[Hashable, np.ndarray]) -> None:
        """Work through the operations with blocks from outside."""
        values = self.values
        for symbol, key in self._inputs:
            values[symbol] = inputs[key]
        for call, operands, kinds, out in self.calls:
            call(*[values[operand] for operand in operands], kinds, out)


def _needed(operations: Sequence[_Operation], wanted: frozenset[Symbol]) -> list[Symbol]:
    """Find the operations that the results wanted rest on, in order."""
    needed = set(wanted)
    for symbol in reversed(range(len(operations))):
        if symbol in needed and operations[symbol].call is not None:
            needed.update(operations[symbol].operands)
    return sorted(needed)
