"""What a mode is doing at a redshift: the verdict, from the behaviour of the run.

Six verdicts, the first that applies:

larger than the horizon
    k is less than the conformal expansion rate a H.
oscillates with the plasma
    Up to the drag epoch: delta_baryon turned round within the last acoustic period 2 pi/(k c_s), and its last swing,
    the way from one turn to the next, is at least 1/e of its widest, and so were all before. After the drag epoch:
    the gas, though not held up by pressure, still moves against the pull of gravity, on the last swing of the plasma.
damped
    Up to the drag epoch: it did turn round once, but no longer does, or its swing has shrunk below 1/e of the widest.
held up by pressure
    After the drag epoch: the push k^2 c_T^2 |delta_baryon + delta_gas_temperature| of the gas's pressure is at least
    half as strong as the pull |4 pi G a^2 sum rho delta| of baryons and dark matter. (For little gas that has come to
    rest in the pull of dark matter growing as a, with c_s^2 ~ 1/a, that is k > k_J. Where gas is all there is its own
    sound waves pass through moments without push, and at one of those the verdict is another.)
falls in
    After the drag epoch: the gas moves with the pull and delta_baryon is less than a fraction (0.9 unless the caller
    says otherwise) of delta_dark. There is no such verdict without dark matter.
grows
    All others: before its first turn, or after the gas has caught up.

In the plasma a wave can die in nature or only in the run, where its steps are too long to follow it. Where the run
takes less than four steps a period, a mode that has turned is damped if photon diffusion has damped it, k > k_D;
else the run cannot tell and the verdict is empty.

The Jeans criterion knows nothing of the run: from k > k_J on pressure (of the plasma, then of the gas) wins. It
agrees if a mode that oscillates, is damped or held up has k > k_J and one that grows, falls in or is larger than
the horizon has not.
"""

from __future__ import annotations

import numpy as np

from twofluid.products.jeans import in_plasma, jeans_wavenumber
from twofluid.products.table import column, make_table

LARGER, OSCILLATES, DAMPED, HELD, FALLS, GROWS = range(6)
VERDICTS = (
    "larger than the horizon",
    "oscillates with the plasma",
    "damped",
    "held up by pressure",
    "falls in",
    "grows",
)
WITHSTANDING = (OSCILLATES, DAMPED, HELD)  # those that do not give in to gravity
UNTOLD = -1

TOGETHER = 0.9  # delta_baryon/delta_dark from which on baryons count as caught up, if the caller says nothing
LIVING_SWING = np.exp(-1.0)  # of the widest swing; diffusion has taken that much at k = k_D
HELD_SHARE = 0.5  # push of pressure over pull of gravity
STEPS_PER_PERIOD = 4.0  # least, to follow a wave
LOOK_BACK = 0.01  # in ln a, over which the motion of the gas is seen


def verdict_table(history, redshift=None, together=TOGETHER):
    """Return the verdict on every wavenumber at every redshift.

    Parameters
    ----------
    history : History
        The run.
    redshift : array, shape (redshift,), optional
        Redshifts within the run [unitless]; those asked of the run if left out.
    together : float
        Ratio of baryon to dark-matter contrast from which on baryons count as caught up [unitless].

    Returns
    -------
    astropy.table.Table
        One row per mode and redshift, redshift running fastest: wavenumber [1/Mpc], redshift [unitless],
        verdict, agrees_with_jeans [unitless].
    """
    redshift = history.redshift if redshift is None else np.asarray(redshift, dtype=float)
    verdict = verdicts(history, redshift, together)
    withstands = np.isin(verdict, WITHSTANDING)
    above = history.wavenumber[:, None] > jeans_wavenumber(history.universe, redshift)
    untold = (verdict == UNTOLD).ravel()
    columns = [
        column("wavenumber", np.repeat(history.wavenumber, len(redshift))),
        column("redshift", np.tile(redshift, len(history.wavenumber))),
        column("verdict", np.array([*VERDICTS, ""])[verdict].ravel(), masked=untold),
        column("agrees_with_jeans", (withstands == above).ravel(), masked=untold),
    ]
    return make_table(history, columns, together=together)


def verdicts(history, redshift, together=TOGETHER):
    """Judge every mode at every redshift.

    Parameters
    ----------
    history : History
        The run.
    redshift : array, shape (redshift,)
        Redshifts within the run [unitless].
    together : float
        As in `verdict_table`.

    Returns
    -------
    array of int, shape (mode, redshift)
        Index into `VERDICTS`; `UNTOLD` where the run cannot tell [unitless].
    """
    universe = history.universe
    redshift = np.asarray(redshift, dtype=float)
    plasma = in_plasma(universe, redshift)
    verdict = np.full((len(history.wavenumber), len(redshift)), GROWS)
    verdict[:, plasma] = _in_plasma(history, redshift[plasma])
    verdict[:, ~plasma] = _released(history, redshift[~plasma], together)
    rate = universe.conformal_hubble_rate(1.0 / (1.0 + redshift))
    return np.where(history.wavenumber[:, None] < rate, LARGER, verdict)


def _in_plasma(history, redshift):
    """Verdicts up to the drag epoch."""
    universe, wavenumber = history.universe, history.wavenumber[:, None]
    a = 1.0 / (1.0 + redshift)
    time, speed = universe.conformal_time(a), universe.plasma_sound_speed(a)
    last_turn, swing = _last_turn(history, time)
    turned = np.isfinite(last_turn)
    period = 2.0 * np.pi / (wavenumber * speed)
    alive = turned & (time - last_turn < period) & (swing >= LIVING_SWING)
    verdict = np.where(alive, OSCILLATES, np.where(turned, DAMPED, GROWS))
    followed = STEPS_PER_PERIOD * _step(history, time) < period
    diffused = wavenumber > universe.diffusion_wavenumber(a)
    return np.where(followed | ~turned, verdict, np.where(diffused, DAMPED, UNTOLD))


def _released(history, redshift, together):
    """Verdicts after the drag epoch."""
    universe = history.universe
    a = 1.0 / (1.0 + redshift)
    dark, baryon, warmth = (
        history.at(name, redshift) for name in ("delta_dark", "delta_baryon", "delta_gas_temperature")
    )
    before = history.at("delta_baryon", np.expm1(np.log1p(redshift) + LOOK_BACK))
    pull = 0.5 * (universe.gravity("dark", a) * dark + universe.gravity("baryon", a) * baryon)
    push = (history.wavenumber[:, None] * universe.isothermal_sound_speed(a)) ** 2 * (baryon + warmth)
    held = np.abs(push) >= HELD_SHARE * np.abs(pull)
    follows = (baryon - before) * pull > 0.0
    behind = baryon * np.sign(dark) < together * np.abs(dark)
    falling = behind & history.has_dark_matter
    return np.select([held, ~follows, falling], [HELD, OSCILLATES, FALLS], GROWS)


def _last_turn(history, time):
    """Conformal time of the last turn of delta_baryon before each time, and the least swing over the widest till then.

    Both have shape (mode, time); -inf and 0 before the first turn.
    """
    trace, universe = history.trace, history.universe
    last = np.full((len(history.wavenumber), len(time)), -np.inf)
    swing = np.zeros(last.shape)
    for mode, (slope, value) in enumerate(zip(trace.delta_baryon_slope, trace.delta_baryon, strict=True)):
        before = np.flatnonzero(slope[1:] * slope[:-1] < 0.0)
        if not len(before):
            continue
        turns = universe.conformal_time(np.exp(trace.log_scale_factor[mode, before + 1]))
        widths = np.abs(np.diff(value[before + 1], prepend=0.0))
        number = np.searchsorted(turns, time) - 1
        turned = number >= 0
        last[mode, turned] = turns[number[turned]]
        left = np.minimum.accumulate(widths / np.maximum.accumulate(widths))
        swing[mode, turned] = left[number[turned]]
    return last, swing


def _step(history, time):
    """Length of the step of each mode's clock around each time [Mpc], shape (mode, time)."""
    step = np.empty((len(history.wavenumber), len(time)))
    for mode, log_a in enumerate(history.trace.log_scale_factor):
        boundaries = history.universe.conformal_time(np.exp(log_a))
        right = np.clip(np.searchsorted(boundaries, time), 1, len(boundaries) - 1)
        step[mode] = boundaries[right] - boundaries[right - 1]
    return step
