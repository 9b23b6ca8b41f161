"""How densely the clock of each mode has to tick, read off the universe at hand.

Three things ask for steps: the smooth course of the background, the rapid change of the scattering
rate while the plasma recombines, and the acoustic oscillation of the mode for as long as it
matters. Once it no longer does it is left unresolved and the method damps it. It matters while

* diffusion has not yet damped it, (k / k_D)^2 < `Stepping.diffusion_exponent`, and
* photons still push baryons, r kappa' > `Stepping.drag_ratio` times the expansion rate, and
* its gravity is felt, k tau < `Stepping.felt_phase` / (dark-matter fraction), or diffusion
  will not have damped it when the baryons are released, or at a later time that is asked for.
  Without dark matter there is no such bound.

Deep in the radiation era steps may be longer. The dark matter then grows with the logarithm of time only, and of an
oscillation that will be damped it feels less and less, as (k tau)^-2: it is followed the less finely for that.

Photons that push again once the gas is reionized start no such oscillation: they stream by then.

Where the gas is heated quickly, by a table or reionization, a fourth asks for steps. Pressure that rises at
once sets the gas swinging about its new balance, with the share of the dark-matter contrast at most that
the old pressure left it, (k_J/k)^2, which falls as a^(-3/2) as the wave spends itself and the dark matter grows.
The wave is followed for as long as that share exceeds `Stepping.gas_swing`, the less finely the smaller it is.

Dark matter with pressure oscillates too, below its own Jeans scale. Nothing damps that, and where the Jeans scale
shrinks the wave that is left is what grows in the end: it is resolved to the last, and the finer the more radians
there are for errors to add up over. Modes of too many radians are refused (`check_dark_waves`).
"""

from dataclasses import dataclass, replace

import numpy as np

from ..solver import Clock, lay_out
from ..universe import Conditions, Universe

NODES_PER_UNIT = 60  # nodes of the density per unit of log conformal time
HEATED_QUICKLY = 1.0  # d ln T/d ln a beyond which the gas cannot follow its pressure in balance
GAS_PHASE = 0.4  # of `Stepping.phase_step`, the phase of a gas wave in a step: nothing damps it (measured)
ORDER = 5  # of the method: a wave that is smaller by s bears steps longer by s^(-1/5)
ADIABATIC = 5.0 / 3.0  # sound speed squared over its isothermal value, at most
MIXTURES_OUTSIDE = 3.0  # shorter steps far outside the horizon for mixtures of initial modes (measured)
FULLY_FELT = 4.0  # k tau up to which an oscillation is followed finely in any case (measured)
DEEP = 4.0  # power of the radiation's share that tells how deep in the radiation era a time is (measured)
FAR_OUTSIDE = 0.3  # k tau up to which a mode counts as far outside the horizon
DARK_PHASE_SHARE = 0.5  # longest k c_s dtau of waves of the dark matter, over `Stepping.phase_step` (measured)
DARK_RADIANS = 100.0  # from so many on steps shorten as radians^(-1/5): the method is of order five
MOST_DARK_RADIANS = 1000.0  # that are followed; some thousand steps


@dataclass(frozen=True)
class Stepping:
    """Step settings.

    Attributes
    ----------
    outside_step, smooth_step, free_step : float
        Longest steps in ln a where nothing else asks for steps: far outside the horizon, inside it, and
        inside it once the gas is free of the photons; half of them where the gas is heated, which the rows of a
        table do with kinks [unitless].
    scattering_change : float
        Largest change of the logarithm of the scattering rate, beyond the a^-2 of dilution, in a step, and largest
        rise of that of the gas temperature where a table or reionization heats it [unitless].
    phase_step : float
        Largest k dtau while the oscillation matters [unitless].
    diffusion_exponent : float
        (k / k_D)^2 at which an oscillation counts as damped [unitless].
    felt_phase : float
        k tau up to which an oscillation that will be damped is resolved for its gravity, for dark
        matter alone [unitless].
    drag_ratio : float
        Photon drag on baryons over expansion rate below which the gas counts as free [unitless].
    gas_swing : float
        Swing of heated gas over the dark-matter contrast below which it is left unresolved [unitless].
    radiation_stretch : float
        How much longer, relative to `smooth_step`, steps may be deep in the radiation era [unitless].
    felt_fading : float
        Power of k tau with which steps lengthen there for an oscillation that will be damped [unitless].
    """

    outside_step: float
    smooth_step: float
    free_step: float
    scattering_change: float
    phase_step: float
    diffusion_exponent: float
    felt_phase: float
    drag_ratio: float = 1e-3
    gas_swing: float = 1e-2
    radiation_stretch: float = 0.0
    felt_fading: float = 0.0

    def for_mixtures(self) -> "Stepping":
        """Shorten the steps outside the horizon, as modes without curvature at the beginning need it.

        There their matter is moved by small differences, of neutrinos and photons say, whose own errors count.
        """
        return replace(self, outside_step=self.outside_step / MIXTURES_OUTSIDE)


def clock(
    universe: Universe, wavenumber: np.ndarray, start: np.ndarray, marks: np.ndarray, stepping: Stepping
) -> Clock:
    """Lay out the clock of every mode in log conformal time.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    start : array, shape (mode,)
        Conformal time of each start [Mpc].
    marks : array, shape (mark,)
        Increasing conformal times to be met exactly, the last one is the end [Mpc].
    stepping : Stepping

    Returns
    -------
    Clock
        Boundaries in log conformal time.
    """
    last = np.log(marks[-1])
    nodes = 2 + int(NODES_PER_UNIT * (last - np.log(start.min())))
    grid = last - np.arange(nodes)[::-1] / NODES_PER_UNIT  # hung up at its end: the same for every choice of modes
    time = np.exp(grid)
    time[-1] = marks[-1]
    density = step_density(universe, wavenumber, time, stepping, marks)
    return lay_out(grid, density, np.log(start), np.log(marks))


def step_density(
    universe: Universe, wavenumber: np.ndarray, time: np.ndarray, stepping: Stepping, asked: np.ndarray
) -> np.ndarray:
    """Give the steps wanted per unit of log conformal time.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    time : array, shape (node,)
        Increasing conformal times [Mpc].
    stepping : Stepping
    asked : array, shape (mark,)
        Conformal times asked for [Mpc].

    Returns
    -------
    array, shape (mode, node)
    """
    now = universe.conditions(time)
    per_expansion = now.hubble_rate * time  # d ln a / d ln tau
    log_scattering = np.log(now.scattering_rate * now.scale_factor**2)
    change = np.abs(np.gradient(log_scattering, np.log(time)))
    smooth_step = stepping.smooth_step * (1.0 + stepping.radiation_stretch * _depth(now))
    quiet = np.where(_pushed(now, stepping), smooth_step, stepping.free_step)
    smooth = per_expansion / quiet + change / stepping.scattering_change
    if universe.heated_from:
        a = np.minimum(now.scale_factor, 1.0)
        rise = np.maximum(universe.gas_temperature_slope(a), 0.0)
        smooth = smooth + per_expansion * (rise / stepping.scattering_change + (a > universe.heated_from) / quiet)
    matters, will_be_seen = oscillation_matters(universe, wavenumber, time, stepping, asked)
    # demands add up by their squares
    squares = _oscillation_squared(now, wavenumber, time, stepping, will_be_seen)
    squares *= matters
    squares += smooth**2
    if universe.heated_from:
        squares += _gas_waves(universe, now, wavenumber, time, stepping) ** 2
    if universe.has_dark_pressure:
        dark_phase = wavenumber[:, None] * time * universe.dark_sound_speed(now.scale_factor)
        squares += (dark_phase / _longest_dark_phase(universe, wavenumber, stepping)[:, None]) ** 2
    outside = wavenumber[:, None] < FAR_OUTSIDE / time
    return np.where(outside, per_expansion / stepping.outside_step, np.sqrt(squares, out=squares))


def _oscillation_squared(
    now: Conditions, wavenumber: np.ndarray, time: np.ndarray, stepping: Stepping, will_be_seen: np.ndarray
) -> np.ndarray:
    """Give the square of the steps per unit of log conformal time for an acoustic oscillation, shape (mode, node)."""
    fading = np.log(wavenumber / FULLY_FELT)[:, None] + np.log(time)
    np.maximum(fading, 0.0, out=fading)
    fading *= -2.0 * stepping.felt_fading * _depth(now)
    fading[will_be_seen] = 0.0
    density = np.multiply.outer((wavenumber / stepping.phase_step) ** 2, time**2)
    density *= np.exp(fading, out=fading)
    return density


def _gas_waves(
    universe: Universe, now: Conditions, wavenumber: np.ndarray, time: np.ndarray, stepping: Stepping
) -> np.ndarray:
    """Give the steps per unit of log conformal time for sound in gas that was heated quickly, shape (mode, node)."""
    a = np.minimum(now.scale_factor, 1.0)
    quickly = (a > universe.heated_from) & (universe.gas_temperature_slope(a) > HEATED_QUICKLY)
    if not quickly.any():
        return np.zeros((len(wavenumber), len(time)))
    first, last = np.flatnonzero(quickly)[[0, -1]]
    balance = np.sqrt(0.5 * (now.gravity_dark + now.gravity_baryon)[first]) / universe.gas_sound_speed(a[first])
    swing = np.minimum(1.0, (balance / wavenumber[:, None]) ** 2) * np.minimum(1.0, a[last] / a) ** 1.5
    phase = wavenumber[:, None] * time * np.sqrt(ADIABATIC * now.isothermal_sound_speed_squared)
    density = phase / (GAS_PHASE * stepping.phase_step * swing ** (-1.0 / ORDER))
    return np.where((np.arange(len(time)) >= first) & (swing > stepping.gas_swing), density, 0.0)


def check_dark_waves(universe: Universe, wavenumber: np.ndarray) -> None:
    """Refuse modes in which the dark matter oscillates more often than is followed.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].

    Raises
    ------
    ValueError
        If one goes through more than `MOST_DARK_RADIANS` by today.
    """
    if not universe.has_dark_pressure:
        return
    way, largest = float(universe.dark_sound_horizon(1.0)), np.max(wavenumber)
    if way * largest > MOST_DARK_RADIANS:
        raise ValueError(
            f"at k = {largest:.6g} 1/Mpc sound waves of the dark matter go through {way * largest:.3g} radians by "
            f"today, and {MOST_DARK_RADIANS:g} are followed at most: ask for wavenumbers up to "
            f"{MOST_DARK_RADIANS / way:.3g} 1/Mpc, or a lower cosmology.dark_matter.sound_speed"
        )


def _longest_dark_phase(universe: Universe, wavenumber: np.ndarray, stepping: Stepping) -> np.ndarray:
    """Longest k c_s dtau of waves of the dark matter, shape (mode,)."""
    radians = wavenumber * universe.dark_sound_horizon(1.0)
    return DARK_PHASE_SHARE * stepping.phase_step * np.minimum(1.0, DARK_RADIANS / radians) ** 0.2


def _depth(now: Conditions) -> np.ndarray:
    """Tell how deep in the radiation era a time is, from 0 to 1; all but baryons and dark matter count as radiation."""
    matter = (now.gravity_baryon + now.gravity_dark) / (3.0 * now.hubble_rate**2)
    return np.clip(1.0 - matter, 0.0, 1.0) ** DEEP


def _pushed(now: Conditions, stepping: Stepping) -> np.ndarray:
    """Whether photons still push the baryons."""
    return now.photon_baryon_ratio * now.scattering_rate > stepping.drag_ratio * now.hubble_rate


def oscillation_matters(
    universe: Universe, wavenumber: np.ndarray, time: np.ndarray, stepping: Stepping, asked: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Whether the acoustic oscillation of a mode still has to be resolved; see the module's text.

    Parameters
    ----------
    universe : Universe
    wavenumber : array, shape (mode,)
        Comoving wavenumbers [1/Mpc].
    time : array, shape (node,)
        Increasing conformal times [Mpc].
    stepping : Stepping
    asked : array, shape (mark,)
        Conformal times asked for [Mpc].

    Returns
    -------
    two arrays of bool, shape (mode, node)
        Whether it matters, and whether what it is then will be there when it is asked for or the baryons are released.
    """
    now = universe.conditions(time)
    pushed = _pushed(now, stepping)
    pushed = np.logical_and.accumulate(pushed)  # until the first release
    damped_from = np.sqrt(stepping.diffusion_exponent) * universe.diffusion_wavenumber(now.scale_factor)
    alive = pushed & (wavenumber[:, None] < damped_from)
    release = time[pushed][-1] if pushed.any() else time[0]
    looks = np.append(asked[asked < release], release)
    seen = alive[:, np.searchsorted(time, looks).clip(max=len(time) - 1)]
    will_be_seen = time <= np.max(np.where(seen, looks, 0.0), axis=1)[:, None]
    dark_fraction = now.gravity_dark[0] / (now.gravity_dark[0] + now.gravity_baryon[0])
    felt = wavenumber[:, None] * dark_fraction < stepping.felt_phase / time
    return alive & (felt | will_be_seen), will_be_seen
