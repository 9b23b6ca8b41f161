"""Growth in patches with a given streaming velocity, and its average over directions and patches."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..fluids import PatchSystem
from ..history import History
from ..solver import SolverFailure, integrate
from .quadrature import LARGEST_COMPONENT, component_grid, direction_weights, patch_weights

# Intervals of the grid of velocity components, by the wavenumber times the way of the fastest wind in an expansion
# time up to which they do (measured: errors of 1e-5 to 1e-3 at the upper end of each, and falling fast below).
INTERVALS = ((6.0, 16), (36.0, 32), (120.0, 64), (np.inf, 128))
SMOOTH_STEP, PHASE_STEP = 0.1, 0.7  # longest step in ln a, longest phase in a step
COARSER = 2  # factor of the solution that the error is estimated with: steps longer, components fewer
LARGEST_ERROR = 0.05  # of a power ratio that is told


@dataclass(frozen=True)
class Patches:
    """Power in patches where gas streams, over that where it does not.

    Attributes
    ----------
    velocity : array, shape (velocity,)
        Streaming velocity in units of the rms; the last one, NaN, stands for the average over all patches [unitless].
    dark, baryon, matter : array, shape (mode, redshift, velocity)
        Power of dark matter, baryons and both together, averaged over directions, over that at velocity zero; NaN
        before the patches start and where the error is larger than `LARGEST_ERROR` [unitless].
    error : array, shape (mode, redshift, velocity)
        Largest change of the three in a solution with steps twice as long and half the velocity components; NaN before
        the patches start [unitless].
    counts : dict of str to int
        What it cost, as `twofluid.solver.Course`.
    """

    velocity: np.ndarray
    dark: np.ndarray
    baryon: np.ndarray
    matter: np.ndarray
    error: np.ndarray
    counts: dict[str, int]


def follow_patches(
    run: History,
    redshift,
    velocities,
    rms_velocity: Callable[[np.ndarray], np.ndarray],
    *,
    finer: int = 1,
) -> Patches:
    """Follow every mode of a run on in patches with streaming gas.

    Parameters
    ----------
    run : History
        Where the patches start from: the first of its redshifts.
    redshift : array, shape (redshift,)
        Redshifts to report [unitless].
    velocities : array, shape (velocity,)
        Streaming velocities in units of the rms [unitless].
    rms_velocity : callable
        Function of the scale factor: rms streaming velocity [c].
    finer : int
        Steps shorter and components more by this factor [unitless].

    Returns
    -------
    Patches

    Raises
    ------
    SolverFailure
        If the solution is no longer finite; names wavenumber and redshift.
    """
    redshift, velocities = (np.asarray(values, dtype=float) for values in (redshift, velocities))
    start, modes = run.redshift[0], len(run.wavenumber)
    later = np.flatnonzero(redshift < start)
    largest = max(LARGEST_COMPONENT, velocities.max())
    told = np.full((4, modes, len(redshift), len(velocities) + 1), np.nan)
    told[:, :, redshift == start] = np.array([1.0, 1.0, 1.0, 0.0])[:, None, None, None]
    counts: dict[str, int] = {}
    intervals = _intervals(run, largest * float(rms_velocity(1.0 / (1.0 + start))))
    for number in np.unique(intervals) if len(later) else ():
        some = np.flatnonzero(intervals == number)
        patches = [_Patch(part, some, redshift[later], rms_velocity) for part in run.parts]
        grid = component_grid(finer * number, largest)
        fine, coarse = (
            _averages(
                [patch.solve(grid[::coarser], coarser / finer, counts) for patch in patches],
                grid[::coarser], velocities, patches[0].weights,
            )
            for coarser in (1, COARSER)
        )  # fmt: skip
        told[:, some[:, None], later] = [*fine, np.abs(fine - coarse).max(axis=0)]
    *ratios, error = told
    with np.errstate(invalid="ignore"):
        ratios = np.where(error > LARGEST_ERROR, np.nan, ratios)
    return Patches(np.append(velocities, np.nan), *ratios, error, counts)


def _intervals(run, velocity):
    """Intervals of the grid of velocity components that each mode needs, shape (mode,)."""
    reach = run.wavenumber * velocity / float(run.universe.conformal_hubble_rate(1.0 / (1.0 + run.redshift[0])))
    limits, numbers = zip(*INTERVALS, strict=True)
    return np.array(numbers)[np.searchsorted(limits, reach)]


def _averages(parts, grid, velocities, shares):
    """Power over that without wind, shape (fluid, mode, redshift, velocity), of amplitudes on a grid, part by part."""
    power = sum(np.abs([*amplitudes, np.tensordot(shares, amplitudes, axes=1)]) ** 2 for amplitudes in parts)
    weights = np.vstack([direction_weights(grid, velocities), patch_weights(grid)])
    return np.einsum("fmzc,vc->fmzv", power, weights) / power[..., :1]


class _Patch:
    """Some modes of a run at several velocity components, and where they start."""

    def __init__(self, run, modes, redshift, rms_velocity):
        self.modes, self.wavenumber, self.rms_velocity = modes, run.wavenumber[modes], rms_velocity
        self.universe = run.universe
        self.start = float(self.universe.conformal_time(1.0 / (1.0 + run.redshift[0])))
        scale_factors, self._asked = np.unique(1.0 / (1.0 + redshift), return_inverse=True)
        self.marks = self.universe.conformal_time(scale_factors)
        self.first = {name: values[modes] for name, values in _first(run).items()}
        densities = np.array([float(self.universe.gravity(species, 1.0)) for species in ("dark", "baryon")])
        self.weights = densities / densities.sum()  # of dark matter and baryons in all matter

    def solve(self, grid, step, counts):
        """Amplitudes of dark matter and baryons, complex, shape (fluid, mode, redshift, component)."""
        modes = len(self.wavenumber)
        lanes = np.repeat(np.arange(modes), len(grid))
        system = PatchSystem(self.universe, self.wavenumber[lanes], np.tile(grid, modes), self.rms_velocity, self.start)
        clock = system.clock(self.marks, step * SMOOTH_STEP, step * PHASE_STEP)
        first = system.first_state(**{name: values[lanes] for name, values in self.first.items()})
        times = np.clip(np.exp(clock.boundaries), self.start, self.marks[-1])
        try:
            course = integrate(system, times, first, system.observed)
        except SolverFailure as failure:
            raise self._explain(failure, lanes, grid) from failure
        for name, count in course.counts.items():
            counts[name] = counts.get(name, 0) + count
        told = course.observed[:, clock.mark_index[self._asked], np.arange(len(lanes))]
        told = told.reshape(2, 2, len(self._asked), modes, len(grid))  # (fluid, part, redshift, mode, component)
        return np.moveaxis(told[:, 0] + 1j * told[:, 1], 1, 2)

    def _explain(self, failure, lanes, grid):
        """Say which wavenumber failed, in which wind, and at which redshift."""
        redshift = 1.0 / float(self.universe.scale_factor(failure.time)) - 1.0
        mode = lanes[failure.mode]
        return SolverFailure(
            f"streaming: the integration failed at k = {self.wavenumber[mode]:.6g} 1/Mpc, z = {redshift:.6g}, "
            f"velocity component {grid[failure.mode % len(grid)]:.3g} rms: {failure}",
            mode=int(self.modes[mode]),
            time=failure.time,
        )


def _first(run):
    """Contrasts and velocity divergences of every mode at the first redshift of a run.

    Relative to the uniform expansion theta = -delta', of both fluids.
    """
    start = run.redshift[:1]
    rate = float(run.universe.conformal_hubble_rate(1.0 / (1.0 + start[0])))
    return {
        "delta_dark": run.delta_dark[:, 0],
        "delta_baryon": run.delta_baryon[:, 0],
        "delta_gas_temperature": run.delta_gas_temperature[:, 0],
        "theta_dark": -rate * run.slope_at("delta_dark", start)[:, 0],
        "theta_baryon": -rate * run.slope_at("delta_baryon", start)[:, 0],
    }
