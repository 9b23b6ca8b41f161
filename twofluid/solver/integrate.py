"""March a linear system over its clock, all modes in lockstep."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np

from .collocation import NODES, STAGES
from .elimination import Elimination, Entry

LANES_PER_STRETCH = 1024  # steps times modes eliminated at once: long enough for arrays, short enough for the cache
MODES_PER_BATCH = 512  # at most so many modes march together
STEP_OVERHEAD = 100  # what a step costs whatever the number of modes, in lanes (measured)
BATCH_GRAIN = 16  # batches end at multiples of this many modes


class LinearSystem(Protocol):
    """What the integrator asks of a linear system ``dy/dt = A(t) y``, one system a mode.

    1. `unknowns` names the rows of y in the order in which they are to be eliminated: chains from
       their far end first, the most coupled unknowns last.
    2. `step_rates` gives step times rate for every entry of A that is ever non-zero.
    """

    unknowns: Sequence[str]

    def step_rates(self, modes: np.ndarray, time: np.ndarray, step: np.ndarray) -> dict[Entry, np.ndarray]:
        """Evaluate step times rate.

        Parameters
        ----------
        modes : array of int, shape (mode,)
            Which modes are asked for.
        time : array, shape (stage, step, mode)
            Stage times.
        step : array, shape (step, mode)
            Step lengths.

        Returns
        -------
        dict of (row, column) to array
            Shape (lane,) where the rate is the same at the three stages, else (stage, lane), with
            lane = step times mode [unitless]. Entries that are always equal may be one array: what
            follows from them is then computed once.
        """
        ...


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
    rows = np.array([system.unknowns.index(name) for name in observe])
    observed = np.empty((len(rows), *times.shape))
    sample = system.step_rates(np.arange(1), np.tile(times[0, 0], (STAGES, 1, 1)), np.zeros((1, 1)))
    elimination = Elimination(len(system.unknowns), sample)
    length = (np.diff(times, axis=0) > 0.0).sum(axis=0)
    batches = _batches(length)
    total = sum(len(modes) * length[modes].max() for modes in batches)
    counts = {"steps": int(length.sum()), "lanes": 0, "factorizations": 0, "rate_evaluations": 0}
    for modes in batches:
        steps = int(length[modes].max())
        state = start[:, modes]
        observed[:, 0, modes] = state[rows]
        stride = max(1, LANES_PER_STRETCH // len(modes))
        for first in range(0, steps, stride):
            stretch = times[first : min(first + stride, steps) + 1, modes]
            state = _march(system, elimination, modes, stretch, state, rows, observed[:, first + 1 :])
            counts["lanes"] += (len(stretch) - 1) * len(modes)
            counts["factorizations"] += 1
            counts["rate_evaluations"] += 1
            if progress is not None:
                progress(counts["lanes"], total)
        observed[:, steps + 1 :, modes] = state[rows][:, None]
    return Course(observed, counts)


def _batches(length: np.ndarray) -> list[np.ndarray]:
    """Group modes with clocks of similar length, the longest first, at the least cost in padding and overhead.

    A batch costs its longest clock times (modes + overhead); the best way to cut the sorted modes is found
    from the end backwards.
    """
    order = np.argsort(-length, kind="stable")
    cuts = [*range(0, len(order), BATCH_GRAIN), len(order)]
    cost, following = {len(order): 0.0}, {}
    for place in reversed(range(len(cuts) - 1)):
        first = cuts[place]
        ends = [end for end in cuts[place + 1 :] if end - first <= MODES_PER_BATCH]
        prices = [length[order[first]] * (end - first + STEP_OVERHEAD) + cost[end] for end in ends]
        best = int(np.argmin(prices))
        cost[first], following[first] = prices[best], ends[best]
    batches, first = [], 0
    while first < len(order):
        batches.append(order[first : following[first]])
        first = following[first]
    return batches


def _march(system, elimination, modes, stretch, state, rows, observed) -> np.ndarray:
    """Advance one batch over a stretch of steps; record the observed rows; return the new state."""
    step = np.diff(stretch, axis=0)
    stage_times = stretch[:-1] + NODES[:, None, None] * step
    factors = elimination.factor(system.step_rates(modes, stage_times, step), len(step))
    for index in range(len(step)):
        state = factors.advance(state, index)[:, STAGES - 1].copy()
        observed[:, index, modes] = state[rows]
    finite = np.isfinite(observed[:, : len(step)][..., modes]).all(axis=0)
    if not finite.all():
        failed, mode = np.argwhere(~finite)[0]
        raise SolverFailure(
            "the solution is no longer finite", mode=int(modes[mode]), time=float(stretch[failed + 1, mode])
        )
    return state
