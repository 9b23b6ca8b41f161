"""From a scenario to its history: universe, linear system, clock, integration."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from .fluids import CLOSURES, Resolution, clock, resolution_for, start_time
from .history import History, Trace
from .scenario import Scenario
from .solver import SolverFailure, integrate
from .universe import Universe

SMALLEST_WAVENUMBER, LARGEST_WAVENUMBER = 1e-4, 1e5  # [1/Mpc]: what the numerics were measured for
HIGHEST_REDSHIFT = 1e6  # every mode has started long before
CURVATURE_MARGIN = 100.0  # k times the curvature radius below which curvature could show in the modes
CONSTRAINT_LIMIT = 0.03  # a larger drift of the energy constraint means the run went wrong
SAME_MARK = 1e-6  # relative difference of conformal times that one step boundary can stand for


def evolve(
    scenario: Scenario,
    *,
    wavenumbers=None,
    redshifts=None,
    resolution: Resolution | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> History:
    """Follow every mode of a scenario from deep in the radiation era to today.

    Parameters
    ----------
    scenario : Scenario
    wavenumbers : array or Quantity, shape (mode,), optional
        Comoving wavenumbers [1/Mpc], 1e-4 to 1e5; those of the scenario if left out.
    redshifts : array, shape (redshift,), optional
        Redshifts to report [unitless], 0 to 1e6; those of the scenario if left out.
    resolution : Resolution, optional
        Step settings and chain lengths; chosen for the universe at hand if left out.
    progress : callable, optional
        Called with (done, total) as the integration advances.

    Returns
    -------
    History

    Raises
    ------
    ValueError
        If a wavenumber or redshift is out of range.
    UniverseError
        If the smooth universe of the scenario cannot be.
    SolverFailure
        If the solution is no longer finite or breaks the Einstein constraint; names wavenumber and redshift.
    """
    k = _wavenumbers(scenario.sampling.wavenumbers if wavenumbers is None else wavenumbers)
    z = _redshifts(scenario.sampling.redshifts if redshifts is None else redshifts)
    if wavenumbers is not None or redshifts is not None:  # the history tells what was done, not what the file said
        sampling = replace(scenario.sampling, wavenumbers=tuple(k), redshifts=tuple(z))
        scenario = replace(scenario, sampling=sampling, source=None)
    universe = Universe(scenario.cosmology)

    scale_factors = np.unique(np.append(1.0 / (1.0 + z), 1.0))  # the marks: ascending, today included
    marks = universe.conformal_time(scale_factors)
    resolution = resolution or resolution_for(universe)
    system = CLOSURES[scenario.method.closure](universe, k, resolution.chains)
    start = start_time(universe, k)
    stops = _with_switches(marks, system.switches)
    plan = clock(universe, k, start, stops, resolution.stepping)
    times = np.exp(plan.boundaries)
    try:
        course = integrate(system, times, system.first_state(start), system.observed, progress)
    except SolverFailure as failure:
        raise _explain(failure, universe, k) from failure
    reading = system.read_off(times, course.observed)
    trace = Trace(**{name: np.ascontiguousarray(array.T) for name, array in reading.quantities.items()})

    place = np.searchsorted(stops, marks)[np.searchsorted(scale_factors, 1.0 / (1.0 + z))]
    asked = plan.mark_index[place].T  # boundary of each (mode, redshift)
    rows = np.arange(len(k))[:, None]
    return History(
        scenario=scenario,
        universe=universe,
        wavenumber=k,
        redshift=z,
        delta_dark=trace.delta_dark[rows, asked],
        delta_baryon=trace.delta_baryon[rows, asked],
        theta_baryon=trace.theta_baryon[rows, asked],
        delta_gas_temperature=trace.delta_gas_temperature[rows, asked],
        trace=trace,
        constraint=_check_constraint(reading.constraint_drift, universe, k, times),
        counts=course.counts,
        warnings=_curvature_warning(universe, k) + system.cautions,
    )


def _wavenumbers(values) -> np.ndarray:
    """Clean wavenumbers [1/Mpc]; a Quantity, or a table column with a unit, is converted."""
    if getattr(values, "unit", None) is not None:
        values = getattr(values, "quantity", values).to_value("1/Mpc")
    k = np.atleast_1d(np.array(values, dtype=float))
    if k.ndim != 1 or k.size == 0 or not np.all((k >= SMALLEST_WAVENUMBER) & (k <= LARGEST_WAVENUMBER)):
        raise ValueError(
            f"wavenumbers must be one or more numbers from {SMALLEST_WAVENUMBER:g} to {LARGEST_WAVENUMBER:g} 1/Mpc, "
            f"got {values}"
        )
    return k


def _redshifts(values) -> np.ndarray:
    z = np.atleast_1d(np.array(values, dtype=float))
    if z.ndim != 1 or z.size == 0 or not np.all((z >= 0.0) & (z <= HIGHEST_REDSHIFT)):
        raise ValueError(f"redshifts must be one or more numbers from 0 to {HIGHEST_REDSHIFT:g}, got {values}")
    return z


def _with_switches(marks: np.ndarray, switches: tuple[float, ...]) -> np.ndarray:
    """Add the times at which a closure changes its equations, unless a mark stands there already."""
    apart = [time for time in switches if np.abs(marks / time - 1.0).min() > SAME_MARK]
    return np.sort(np.append(marks, apart))


def _check_constraint(drift: np.ndarray, universe: Universe, k: np.ndarray, times: np.ndarray) -> np.ndarray:
    """Sum the drift over the steps, shape (mode,), and refuse a run in which it is too large."""
    total = drift.sum(axis=0)
    broken = np.flatnonzero(total > CONSTRAINT_LIMIT)
    if len(broken):
        mode = int(broken[0])
        step = int(drift[:, mode].argmax()) + 1
        failure = SolverFailure(
            f"the Einstein constraint drifts by {total[mode]:.1g}, most of all here",
            mode=mode,
            time=float(times[step, mode]),
        )
        raise _explain(failure, universe, k)
    return total


def _explain(failure: SolverFailure, universe: Universe, k: np.ndarray) -> SolverFailure:
    """Say which wavenumber failed, and at which redshift."""
    redshift = 1.0 / float(universe.scale_factor(failure.time)) - 1.0
    return SolverFailure(
        f"the integration failed at k = {k[failure.mode]:.6g} 1/Mpc, z = {redshift:.6g}: {failure}",
        mode=failure.mode,
        time=failure.time,
    )


def _curvature_warning(universe: Universe, k: np.ndarray) -> tuple[str, ...]:
    limit = CURVATURE_MARGIN * float(np.sqrt(abs(universe.gravity("curvature", 1.0)) / 3.0))
    touched = np.count_nonzero(k < limit)
    if not touched:
        return ()
    return (
        f"{touched} of {len(k)} wavenumbers are below {limit:.3g} 1/Mpc, not well inside the curvature radius: "
        "curvature enters the expansion here, not the modes",
    )
