"""From scenarios to their histories: universe, linear system, clock, integration."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from .fluids import (
    CLOSURES,
    MIXTURE_CLOSURES,
    Resolution,
    check_closure,
    check_dark_waves,
    clock,
    resolution_for,
    start_time,
)
from .history import ADDED, EVOLVED, History, Trace, history_of_parts
from .scenario import Part, Scenario, check_mixture, parts
from .solver import Clock, SolverFailure, integrate
from .universe import Universe, UniverseStack, build_universes

SMALLEST_WAVENUMBER, LARGEST_WAVENUMBER = 1e-4, 1e5  # [1/Mpc]: what the numerics were measured for
HIGHEST_REDSHIFT = 1e6  # every mode has started long before
CURVATURE_MARGIN = 100.0  # k times the curvature radius below which curvature could show in the modes
ELECTRON_MASS_TEMPERATURE = 5.93e9  # electron mass over Boltzmann's constant [K]: pairs annihilate below
CONSTRAINT_LIMIT = 0.03  # a larger drift of the energy constraint means the run went wrong
EARLIEST_SCALE_FACTOR = 1e-14  # before it nothing has started
SAME_MARK = 1e-6  # relative difference of conformal times that one step boundary can stand for
MODES_TOGETHER = 4096  # of scenarios solved in one sweep: bounds the memory

Progress = Callable[[int, int], None]


def evolve(
    scenario: Scenario,
    *,
    wavenumbers=None,
    redshifts=None,
    universe: Universe | None = None,
    resolution: Resolution | None = None,
    progress: Progress | None = None,
) -> History:
    """Follow every mode of a scenario from deep in the radiation era to today.

    Parameters
    ----------
    scenario : Scenario
    wavenumbers : array or Quantity, shape (mode,), optional
        Comoving wavenumbers [1/Mpc], 1e-4 to 1e5; those of the scenario if left out.
    redshifts : array, shape (redshift,), optional
        Redshifts to report [unitless], 0 to 1e6; those of the scenario if left out.
    universe : Universe, optional
        The smooth universe of the scenario, if it is there already.
    resolution : Resolution, optional
        Step settings and chain lengths; those of the scenario's accuracy for the universe at hand if left out.
    progress : callable, optional
        Called with (done, total) as the integration advances.

    Returns
    -------
    History

    Raises
    ------
    ValueError
        If a wavenumber or redshift is out of range, sound waves of the dark matter are too many to follow, or the
        scenario cannot serve its mixture of initial modes.
    UniverseError
        If the smooth universe of the scenario cannot be.
    SolverFailure
        If the solution is no longer finite or breaks the Einstein constraint; names wavenumber and redshift.
    """
    universe = universe or Universe(scenario.cosmology)
    (history,) = _follow([_request(scenario, universe, wavenumbers, redshifts, resolution)], progress)
    return history


def evolve_many(
    scenarios: Sequence[Scenario],
    *,
    wavenumbers=None,
    redshifts=None,
    universes: Sequence[Universe] | None = None,
    resolution: Resolution | None = None,
    progress: Progress | None = None,
) -> list[History]:
    """Follow the modes of several scenarios in one sweep; each history is what `evolve` gives alone.

    Parameters
    ----------
    scenarios : sequence of Scenario
    universes : sequence of Universe, optional
        Their smooth universes, if they are there already.
    wavenumbers, redshifts, resolution, progress
        As in `evolve`, for all scenarios alike.

    Returns
    -------
    list of History
        In the order of the scenarios.

    Raises
    ------
    ValueError, UniverseError, SolverFailure
        As `evolve`; ValueError also if there is not one universe for each scenario.
    """
    if universes is None:
        universes = build_universes([scenario.cosmology for scenario in scenarios])
    elif len(universes) != len(scenarios):
        raise ValueError(f"{len(scenarios)} scenarios need as many universes, got {len(universes)}")
    requests = [
        _request(scenario, universe, wavenumbers, redshifts, resolution, named=len(scenarios) > 1)
        for scenario, universe in zip(scenarios, universes, strict=True)
    ]
    return _follow(requests, progress)


def _follow(requests: Sequence["_Request"], progress: Progress | None) -> list[History]:
    """Solve all requests in as few sweeps as they allow."""
    histories: dict[int, History] = {}
    done, total = 0, sum(request.lanes for request in requests)
    for places in _sweeps(requests):
        together = [requests[place] for place in places]
        modes = sum(request.lanes for request in together)
        histories |= zip(places, _sweep(together, _portion(progress, done, modes, total)), strict=True)
        done += modes
    return [histories[place] for place in range(len(requests))]


@dataclass(frozen=True)
class _Request:
    """One scenario made ready: what to solve, and how.

    Attributes
    ----------
    stops : array, shape (stop,)
        Conformal times met exactly by every clock: asked redshifts, changes of the equations, today [Mpc].
    asked : array of int, shape (redshift,)
        Which stop each asked redshift is.
    parts : tuple of Part
        Independent parts of the initial conditions; every wavenumber is solved once for each.
    start : array, shape (mode,)
        Conformal time at which each mode starts, in every part [Mpc].
    plan : Clock
        Its clock, in log conformal time.
    named : bool
        Whether a failure has to name the scenario.
    """

    scenario: Scenario
    universe: Universe
    wavenumber: np.ndarray
    redshift: np.ndarray
    resolution: Resolution
    system: object
    asked: np.ndarray
    parts: tuple[Part, ...]
    start: np.ndarray
    plan: Clock
    named: bool

    @property
    def lanes(self) -> int:
        """Number of waves: all wavenumbers of the first part, then all of the next."""
        return len(self.wavenumber) * len(self.parts)

    def boundaries(self) -> np.ndarray:
        """Step boundaries of every wave, shape (boundary, lane)."""
        return np.tile(self.plan.boundaries, len(self.parts))

    def first_state(self) -> np.ndarray:
        """State of every wave at its start, shape (unknown, lane)."""
        names = dict.fromkeys(name for part in self.parts for name in part.weights)
        nothing = np.zeros(len(self.wavenumber))
        weights = {name: np.concatenate([part.weights.get(name, nothing) for part in self.parts]) for name in names}
        return self.system.first_state(np.tile(self.start, len(self.parts)), weights)


def _request(scenario: Scenario, universe: Universe, wavenumbers, redshifts, resolution, named=False) -> _Request:
    """Check sampling and initial modes, choose the resolution and lay out the clock."""
    check_mixture(scenario)
    k = _wavenumbers(scenario.sampling.wavenumbers if wavenumbers is None else wavenumbers)
    z = _redshifts(scenario.sampling.redshifts if redshifts is None else redshifts)
    check_dark_waves(universe, k)
    check_closure(scenario)
    if wavenumbers is not None or redshifts is not None:  # the history tells what was done, not what the file said
        sampling = replace(scenario.sampling, wavenumbers=tuple(k), redshifts=tuple(z))
        scenario = replace(scenario, sampling=sampling, source=None)
    resolution = resolution or resolution_for(universe, scenario.method.accuracy)
    initial = parts(scenario.primordial, k)
    system = _system(scenario, universe, np.tile(k, len(initial)), resolution)
    stepping = resolution.stepping.for_mixtures() if _is_mixture(scenario) else resolution.stepping

    scale_factors = np.unique(np.append(1.0 / (1.0 + z), 1.0))  # the marks: ascending, today included
    marks = universe.conformal_time(scale_factors)
    stops = _with_switches(np.unique(marks), system.switches)
    asked = np.searchsorted(stops, marks)[np.searchsorted(scale_factors, 1.0 / (1.0 + z))]
    start = start_time(universe, k)
    plan = clock(universe, k, start, stops, stepping)
    return _Request(scenario, universe, k, z, resolution, system, asked, initial, start, plan, named)


def _is_mixture(scenario: Scenario) -> bool:
    """Whether there is any initial mode beside the adiabatic one."""
    return scenario.primordial.mixture is not None and bool(scenario.primordial.mixture.shares)


def _system(scenario: Scenario, universe: Universe | UniverseStack, wavenumber: np.ndarray, resolution: Resolution):
    """Set up the equations of a scenario."""
    method = scenario.method
    closures = MIXTURE_CLOSURES if _is_mixture(scenario) else CLOSURES
    if method.ionization_fluctuations and method.closure != "kinetic":
        raise ValueError(f"ionization_fluctuations needs the closure kinetic, got {method.closure}")
    options = {"ionization_fluctuations": True} if method.ionization_fluctuations else {}
    return closures[method.closure](universe, wavenumber, resolution.chains, **options)


def _sweeps(requests: Sequence[_Request]) -> Iterator[list[int]]:
    """Put requests together that one sweep can solve: same equations, same unknowns, not too many modes."""
    groups: dict[tuple, list[int]] = {}
    for place, request in enumerate(requests):
        key = type(request.system), request.resolution.chains, request.system.unknowns
        groups.setdefault(key if request.system.stackable else (place,), []).append(place)
    for places in groups.values():
        sweep, modes = [], 0
        for place in places:
            if sweep and modes + requests[place].lanes > MODES_TOGETHER:
                yield sweep
                sweep, modes = [], 0
            sweep.append(place)
            modes += requests[place].lanes
        yield sweep


def _sweep(requests: Sequence[_Request], progress: Progress | None) -> list[History]:
    """Integrate the modes of all requests in lockstep and part them again."""
    sizes = [request.lanes for request in requests]
    if len(requests) == 1:
        system = requests[0].system
    else:
        stack = UniverseStack([request.universe for request in requests], np.repeat(np.arange(len(sizes)), sizes))
        wavenumber = np.concatenate([request.system.wavenumber for request in requests])
        system = _system(requests[0].scenario, stack, wavenumber, requests[0].resolution)
    times = np.exp(_side_by_side([request.boundaries() for request in requests]))
    first = np.concatenate([request.first_state() for request in requests], axis=1)
    ends = np.cumsum(sizes)
    try:
        course = integrate(system, times, first, system.observed, progress)
    except SolverFailure as failure:
        owner = int(np.searchsorted(ends, failure.mode, side="right"))
        raise _explain(failure, requests[owner], failure.mode - (ends[owner] - sizes[owner])) from failure
    histories = []
    for request, end, size in zip(requests, ends, sizes, strict=True):
        modes = slice(end - size, end)
        boundaries = len(request.plan.boundaries)
        counts = course.counts if len(requests) == 1 else {"steps": int(request.plan.steps.sum()) * len(request.parts)}
        histories.append(_history(request, times[:boundaries, modes], course.observed[:, :boundaries, modes], counts))
    return histories


def _side_by_side(boundaries: Sequence[np.ndarray]) -> np.ndarray:
    """Put clocks of shape (boundary, mode) beside each other, the short ones padded with their end."""
    longest = max(len(one) for one in boundaries)
    padded = [np.pad(one, ((0, longest - len(one)), (0, 0)), mode="edge") for one in boundaries]
    return np.concatenate(padded, axis=1)


def _history(request: _Request, times: np.ndarray, observed: np.ndarray, counts: dict[str, int]) -> History:
    """Read the quantities off and put the history together, part by part."""
    reading = request.system.read_off(times, observed)
    drift = _check_constraint(reading.constraint_drift, request, times)
    warnings = _range_warnings(request.universe, request.wavenumber) + request.system.cautions
    asked = request.plan.mark_index[request.asked].T  # boundary of each (mode, redshift)
    modes = len(request.wavenumber)
    rows = np.arange(modes)[:, None]
    histories = []
    for number, part in enumerate(request.parts):
        lanes = slice(number * modes, (number + 1) * modes)
        trace = Trace(**{name: np.ascontiguousarray(array[:, lanes].T) for name, array in reading.quantities.items()})
        evolved = [name for name in (*EVOLVED, *ADDED) if getattr(trace, name) is not None]
        history = History(
            scenario=request.scenario,
            universe=request.universe,
            wavenumber=request.wavenumber,
            redshift=request.redshift,
            **{name: getattr(trace, name)[rows, asked] for name in evolved},
            trace=trace,
            constraint=drift[lanes],
            counts=counts,
            warnings=warnings,
            initial_modes=part.name,
        )
        histories.append(history)
    return history_of_parts(histories)


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


def _portion(progress: Progress | None, done: int, modes: int, total: int) -> Progress | None:
    """Report one sweep as its portion of all modes, in thousandths of the whole."""
    if progress is None:
        return None
    return lambda part, whole: progress(round(1000 * (done + modes * part / whole) / total), 1000)


def _check_constraint(drift: np.ndarray, request: _Request, times: np.ndarray) -> np.ndarray:
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
        raise _explain(failure, request, mode)
    return total


def _explain(failure: SolverFailure, request: _Request, mode: int) -> SolverFailure:
    """Say which wavenumber failed, and at which redshift."""
    redshift = 1.0 / float(request.universe.scale_factor(failure.time)) - 1.0
    scenario = f"{request.scenario.title}: " if request.named else ""
    wavenumber = request.system.wavenumber[mode]
    return SolverFailure(
        f"{scenario}the integration failed at k = {wavenumber:.6g} 1/Mpc, z = {redshift:.6g}: {failure}",
        mode=mode,
        time=failure.time,
    )


def _dark_warnings(universe: Universe, k: np.ndarray) -> tuple[str, ...]:
    """Say where the dark matter is not the matter that the equations take it for."""
    asked = universe.cosmology.dark_matter.sound_speed > 0.0
    if asked and not universe.has_dark_pressure:
        return ("a sound speed of the dark matter was given, but there is no dark matter to have it",)
    slow_from = max(universe.dark_sound.slow_from, EARLIEST_SCALE_FACTOR)
    fast = np.count_nonzero(k * float(universe.conformal_time(slow_from)) > 1.0)
    if not universe.has_dark_pressure or fast == 0:
        return ()
    return (
        f"{fast} of {len(k)} wavenumbers were inside the horizon before redshift {1.0 / slow_from - 1.0:.3g}, while "
        "the sound speed of the dark matter was above 0.1 c: it is followed as slow matter also there",
    )


def _range_warnings(universe: Universe, k: np.ndarray) -> tuple[str, ...]:
    """Say which modes lie at or beyond the range in which the equations hold."""
    warnings = []
    largest = CURVATURE_MARGIN * float(np.sqrt(abs(universe.gravity("curvature", 1.0)) / 3.0))
    if (touched := np.count_nonzero(k < largest)) > 0:
        warnings.append(
            f"{touched} of {len(k)} wavenumbers are below {largest:.3g} 1/Mpc, not well inside the curvature radius: "
            "curvature enters the expansion here, not the modes"
        )
    pairs = universe.cosmology.photon_temperature / ELECTRON_MASS_TEMPERATURE  # scale factor at which pairs annihilate
    smallest = 1.0 / float(universe.conformal_time(pairs))
    if (early := np.count_nonzero(k > smallest)) > 0:
        warnings.append(
            f"{early} of {len(k)} wavenumbers are above {smallest:.3g} 1/Mpc and entered the horizon before electrons "
            "and positrons annihilated, which is not followed here"
        )
    return (*warnings, *_dark_warnings(universe, k))
