"""How many digits of a run are right: the run's own modes solved again, finer.

A spread of modes is solved a second time with halved steps, longer chains and oscillations followed
longer. With a method of order five the finer run is so much better that the difference is the error
of the first. The spread is chosen to cost a fixed share of the run.
"""

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from .certificate import Certificate
from .evolution import evolve
from .fluids import ACCURACIES, resolution_for
from .history import History

BUDGET = 0.25  # of the cost of a run that its certificate may take
FIXED_COST = 350_000  # what a run costs beside its steps (universe, tables, figures), in steps of one mode (measured)
STEP_OVERHEAD = 30  # what a step of all modes costs whatever their number, in steps of one mode (measured)
REFINED_COST = 3.0  # steps and chains of the finer run over those of the first (measured)
FEWEST_MODES = 3
SMALL_CONTRAST = 0.1  # of its largest so far, below which a contrast that passes through zero is not its own measure


def certify(history: History, modes=None, progress: Callable[[int, int], None] | None = None) -> History:
    """Estimate the numerical error of a run.

    Parameters
    ----------
    history : History
        A run of a scenario at the resolution of its accuracy.
    modes : array of int, optional
        Which modes to solve again; a spread within the budget if left out.
    progress : callable, optional
        Called with (done, total).

    Returns
    -------
    History
        The same with its certificate.
    """
    modes = np.arange(len(history.wavenumber))[_spread(history) if modes is None else np.asarray(modes)]
    accuracy = history.scenario.method.accuracy
    finer = evolve(
        history.scenario,
        wavenumbers=history.wavenumber[modes],
        redshifts=history.redshift,
        universe=history.universe,
        resolution=resolution_for(history.universe, accuracy).refined(),
        progress=progress,
    )
    return replace(history, certificate=_compare(history, modes, finer, ACCURACIES[accuracy].promise))


def _spread(history: History) -> np.ndarray:
    """Choose modes spread evenly in their order of wavenumber, dear ones left out, within the budget."""
    steps = (np.diff(history.trace.log_scale_factor, axis=1) > 0.0).sum(axis=1)
    order = np.argsort(history.wavenumber, kind="stable")
    budget = BUDGET * (FIXED_COST + steps.sum() + STEP_OVERHEAD * steps.max())
    affordable = order[REFINED_COST * steps[order] * (STEP_OVERHEAD + FEWEST_MODES) <= budget]
    if len(affordable) < FEWEST_MODES:
        affordable = order[np.argsort(steps[order], kind="stable")[:FEWEST_MODES]]
    room = int(budget / (REFINED_COST * steps[affordable].max()) - STEP_OVERHEAD)
    count = min(len(affordable), max(FEWEST_MODES, room))
    return np.sort(affordable[np.unique(np.linspace(0, len(affordable) - 1, count).round().astype(int))])


def _compare(history: History, modes: np.ndarray, finer: History, promise: float) -> Certificate:
    dark_error, ratio_error = contrast_errors(history, finer, modes)
    baryon_size = np.abs(finer.delta_baryon)
    warmth = history.delta_gas_temperature[modes]
    warmth_size = np.maximum(np.abs(finer.delta_gas_temperature), baryon_size)
    return Certificate(
        wavenumber=history.wavenumber[modes],
        redshift=history.redshift,
        dark_error=dark_error,
        ratio_error=ratio_error,
        temperature_error=np.abs(warmth - finer.delta_gas_temperature) / warmth_size,
        constraint=float(np.max(history.constraint)),
        promise=promise,
    )


def contrast_errors(history: History, finer: History, modes=slice(None)) -> tuple[np.ndarray, np.ndarray]:
    """Errors of dark-matter contrast and ratio, as a much finer run shows them.

    Parameters
    ----------
    history, finer : History
        The finer one has the modes asked for only.
    modes : index of the modes, optional

    Returns
    -------
    two arrays, shape (mode, redshift)
        Of the contrast, relative; of the ratio, absolute, and relative where the baryons' contrast is the larger one
        [unitless]. Where the dark matter passes through zero its size is a share `SMALL_CONTRAST` of its largest so
        far, in both. Without dark matter to compare with the second is that of the baryons' contrast.
    """
    dark, baryon = history.delta_dark[modes], history.delta_baryon[modes]
    size = np.abs(finer.delta_dark)
    size = np.maximum(size, SMALL_CONTRAST * _largest_so_far(size, history.redshift))
    larger = np.maximum(size, np.abs(finer.delta_baryon))
    dark_change, baryon_change = dark - finer.delta_dark, baryon - finer.delta_baryon
    if history.has_dark_matter and history.theta_dark is None:
        ratio = finer.delta_baryon / np.copysign(size, finer.delta_dark)
        baryon_change = baryon_change - dark_change * ratio
    return np.abs(dark_change) / size, np.abs(baryon_change) / larger


def _largest_so_far(size: np.ndarray, redshift: np.ndarray) -> np.ndarray:
    """Largest value at this or an earlier epoch, shape (mode, redshift)."""
    order = np.argsort(-redshift, kind="stable")
    largest = np.empty_like(size)
    largest[:, order] = np.maximum.accumulate(size[:, order], axis=1)
    return largest
