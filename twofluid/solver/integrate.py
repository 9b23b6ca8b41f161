"""March a linear system over its clock, all modes in lockstep.

Modes are sorted by the length of their clocks, so that those still on their way are always the first ones: as others
arrive, fewer and fewer march.
"""

from collections.abc import Callable, Sequence
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
        Counters: "steps" summed over modes (padding excluded), "lanes" (padding included),
        "factorizations" and "rate_evaluations" of stretches.
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
        If a state is no longer finite; names mode and time.
    """
    sample = system.step_rates(np.zeros(1, int), np.full((STAGES, 1), times[0, 0]), np.zeros(1))
    count = len(system.unknowns) - sum(len(tail.rows) for tail in system.tails)
    elimination = Elimination(count, sample, system.tails)
    rows = np.array([system.unknowns.index(name) for name in observe])
    length = (np.diff(times, axis=0) > 0.0).sum(axis=0)
    order = np.argsort(-length, kind="stable")
    batches = [order[first : first + MODES_PER_BATCH] for first in range(0, len(order), MODES_PER_BATCH)]
    plans = [_stretches(length[modes]) for modes in batches]
    total = int(sum(steps * active for plan in plans for _, steps, active in plan))
    stretches = sum(len(plan) for plan in plans)
    counts = {"steps": int(length.sum()), "lanes": total, "factorizations": stretches, "rate_evaluations": stretches}
    observed, done = np.empty((len(rows), *times.shape)), 0
    for modes, plan in zip(batches, plans, strict=True):
        lanes = max((steps * active for _, steps, active in plan), default=0)
        state = elimination.split(start[:, modes])
        record = np.empty((len(times), len(rows), len(modes)))
        record[0] = elimination.read(state, rows)
        for first, steps, active in plan:
            boundaries = times[first : first + steps + 1, modes[:active]]
            state = [part[..., :active] for part in state]
            here = record[first + 1 : first + 1 + steps]
            here[:, :, active:] = record[first, :, active:]  # those that have arrived stay
            state = _march(system, elimination, modes[:active], boundaries, lanes, state, rows, here[:, :, :active])
            done += steps * active
            if progress is not None:
                progress(done, total)
        arrived = int(length[modes[0]])
        record[arrived + 1 :] = record[arrived]
        observed[:, :, modes] = record.transpose(1, 0, 2)
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


def _march(system, elimination, modes, boundaries, lanes, state, rows, record) -> State:
    """Advance modes over a stretch of steps; record the observed rows; return the new state."""
    step = np.diff(boundaries, axis=0)
    stage_times = boundaries[:-1] + NODES[:, None, None] * step
    steps, active = step.shape
    place = np.minimum(np.arange(lanes), step.size - 1)  # lanes beyond repeat the last one
    length = step.ravel()[place]
    rates = system.step_rates(np.tile(modes, steps)[place], stage_times.reshape(STAGES, -1)[:, place], length)
    factors = elimination.factor(rates, steps, active)
    for index in range(steps):
        state = factors.advance(state, index)
        record[index] = elimination.read(state, rows)
    finite = np.isfinite(record).all(axis=1)
    if not finite.all():
        failed, mode = np.argwhere(~finite)[0]
        raise SolverFailure(
            "the solution is no longer finite", mode=int(modes[mode]), time=float(boundaries[failed + 1, mode])
        )
    return state
