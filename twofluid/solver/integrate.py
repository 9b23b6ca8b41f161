"""March a linear system over its clock, all modes in lockstep.

Modes are sorted by the length of their clocks, so that those still on their way are always the first ones: as others
arrive, fewer and fewer march.
"""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from .collocation import NODES, STAGES
from .elimination import Elimination
from .substitution import State
from .system import LinearSystem

LANES_PER_STRETCH = 1024  # steps times modes eliminated at once: long enough for arrays, short enough for the cache
MODES_PER_BATCH = 512  # at most so many modes march together
GRAIN = 16  # modes leave the march in groups of so many


class SolverFailure(RuntimeError):
    """The integration broke down.

    Attributes
    ----------
    mode : int or None
        Index of the mode that failed.
    time : float or None
        Time at the end of the failing step, in the system's unit.
    """

    def __init__(self, sentence: str, *, mode: int | None = None, time: float | None = None):
        super().__init__(sentence)
        self.mode, self.time = mode, time


@dataclass(frozen=True)
class Course:
    """What the integration leaves behind.

    Attributes
    ----------
    observed : array, shape (unknown, boundary, mode)
        Observed unknowns at every step boundary, in the order asked for.
    counts : dict
        Counters: "steps" of non-zero length summed over modes, "lanes" that were substituted (steps of no length
        included), "factorizations" and "rate_evaluations" of stretches.
    """

    observed: np.ndarray
    counts: dict[str, int] = field(default_factory=dict)


def integrate(
    system: LinearSystem,
    times: np.ndarray,
    start: np.ndarray,
    observe: Sequence[str],
    progress: Callable[[int, int], None] | None = None,
) -> Course:
    """Integrate every mode from its first step boundary to its last.

    Parameters
    ----------
    system : LinearSystem
    times : array, shape (boundary, mode)
        Step boundaries, non-decreasing; equal neighbours are padding and leave the mode as it is.
    start : array, shape (unknown, mode)
        State at the first boundary.
    observe : sequence of str
        Unknowns to record at every boundary.
    progress : callable, optional
        Called with (lanes done, lanes in all) after each stretch of steps.

    Returns
    -------
    Course

    Raises
    ------
    SolverFailure
        If an observed unknown is no longer finite; names mode and time.
    """
    sample = system.step_rates(np.zeros(1, int), np.full((STAGES, 1), times[0, 0]), np.zeros(1))
    count = len(system.unknowns) - sum(len(tail.rows) for tail in system.tails)
    elimination = Elimination(count, sample, system.tails)
    rows = np.array([system.unknowns.index(name) for name in observe], dtype=int)
    moves = np.diff(times, axis=0) > 0.0
    length = (moves * np.arange(1, len(times))[:, None]).max(axis=0, initial=0)  # up to the last one that moves
    order = np.argsort(-length, kind="stable")
    batches = [order[first : first + MODES_PER_BATCH] for first in range(0, len(order), MODES_PER_BATCH)]
    plans = [_stretches(length[modes]) for modes in batches]
    total = int(sum(steps * active for plan in plans for _, steps, active in plan))
    stretches = sum(len(plan) for plan in plans)
    counts = {"steps": int(moves.sum()), "lanes": total, "factorizations": stretches, "rate_evaluations": stretches}
    observed, done = np.empty((len(rows), *times.shape)), 0
    for modes, plan in zip(batches, plans, strict=True):
        march = _March(system, elimination, modes, plan, rows)
        for lanes in march.follow(times[:, modes], start[:, modes]):
            done += lanes
            if progress is not None:
                progress(done, total)
        observed[:, :, modes] = march.record.transpose(1, 0, 2)
    return Course(observed, counts)


def _stretches(length: np.ndarray) -> list[tuple[int, int, int]]:
    """Cut the march of modes sorted by length into stretches: first step, steps, and modes that are on their way."""
    plan, first = [], 0
    lanes = max(LANES_PER_STRETCH, len(length))
    while first < length[0]:
        going = np.count_nonzero(length > first)
        active = min(-(-going // GRAIN) * GRAIN, len(length))
        steps = min(lanes // active, int(length[0]) - first)
        plan.append((first, steps, active))
        first += steps
    return plan


class _March:
    """The march of one batch of modes.

    Attributes
    ----------
    record : array, shape (boundary, row, mode)
        Observed unknowns.
    """

    def __init__(self, system: LinearSystem, elimination: Elimination, modes: np.ndarray, plan: list, rows: np.ndarray):
        self._system, self._elimination, self._rows = system, elimination, rows
        self._modes, self._plan = modes, plan
        self._lanes = max((steps * active for _, steps, active in plan), default=0)

    def follow(self, times: np.ndarray, start: np.ndarray) -> Iterator[int]:
        """March from the first boundary to the last; tell the lanes of every stretch."""
        state = self._elimination.split(start)
        self.record = record = np.empty((len(times), len(self._rows), len(self._modes)))
        record[0] = self._elimination.read(state, self._rows)
        arrived = 0
        for first, steps, active in self._plan:
            arrived = first + steps
            here = record[first + 1 : arrived + 1]
            here[:, :, active:] = record[first, :, active:]  # those that have arrived stay
            state = [part[..., :active] for part in state]
            state = self._stretch(times[first : arrived + 1, :active], state, here[:, :, :active])
            yield steps * active
        record[arrived + 1 :] = record[arrived]

    def _stretch(self, boundaries: np.ndarray, state: State, record: np.ndarray) -> State:
        """Advance modes over a stretch of steps; record the observed rows; return the new state."""
        step = np.diff(boundaries, axis=0)
        stage_times = boundaries[:-1] + NODES[:, None, None] * step
        steps, active = step.shape
        modes = self._modes[:active]
        place = np.minimum(np.arange(self._lanes), step.size - 1)  # lanes beyond repeat the last one
        rates = self._system.step_rates(
            np.tile(modes, steps)[place], stage_times.reshape(STAGES, -1)[:, place], step.ravel()[place]
        )
        factors = self._elimination.factor(rates, self._lanes, steps, active)
        for index in range(steps):
            state = factors.advance(state, index)
            record[index] = self._elimination.read(state, self._rows)
        finite = np.isfinite(record).all(axis=1)
        if not finite.all():
            failed, mode = np.argwhere(~finite)[0]
            raise SolverFailure(
                "the solution is no longer finite", mode=int(modes[mode]), time=float(boundaries[failed + 1, mode])
            )
        return state
