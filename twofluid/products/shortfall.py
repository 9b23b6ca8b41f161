"""What contrast there was at decoupling, what order unity by some epoch would have taken, and what came of it.

Decoupling is the drag epoch, when the photons let the baryons go. The contrast of a wave is its rms per unit
ln k, sqrt(P) |delta|; that of a sphere is the rms inside. What was needed is one number for a universe: a cold
fluid that holds all its matter grows by some factor from decoupling to the target (see `cold_growth`), and
one over it is the contrast from which it gets to unity. Rms is meant throughout; rare peaks are ahead of it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from twofluid.products.cold_growth import cold_growth
from twofluid.products.crossing import first_rise
from twofluid.products.matter import FLUIDS, contrast_courses, contrasts_at, contrasts_of, exists
from twofluid.products.sphere_filter import SphereFilter
from twofluid.products.spheres import COVERAGE, NOT_COVERED, sphere_mass, sphere_radii
from twofluid.products.table import column, make_table, sample_columns, words_column

TARGET_REDSHIFT = 7.5  # if the caller names none; by then the first galaxies had lit up
UNITY = 1.0  # where linear growth ends
COLLAPSE = 3.0 / 20.0 * (12.0 * np.pi) ** (2.0 / 3.0)  # 1.686, linear contrast of a sphere that collapses
MYR_PER_GYR = 1000.0
SPHERE_START = 1.0e6  # redshift from which the rms in spheres is followed
SPHERE_STEP = 0.04  # steps of that in ln a; cubic between


@dataclass(frozen=True)
class _Scales:
    """Waves or spheres of one fluid on their way.

    Attributes
    ----------
    log_a, rms, slope : array, shape (scale, step)
        ln a, rms contrast (for a wave with the sign of its contrast) and its derivative by ln a [unitless].
    landmarks : array, shape (scale, 2)
        Rms contrast at decoupling and at the target redshift [unitless].
    """

    log_a: np.ndarray
    rms: np.ndarray
    slope: np.ndarray
    landmarks: np.ndarray


def contrast_table(history):
    """Return the rms contrast per unit ln k at every asked wavenumber and redshift.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    astropy.table.Table
        One row per mode and redshift, redshift (in the order asked) running fastest: wavenumber [1/Mpc],
        redshift [unitless], rms_dark, rms_baryon and rms_matter [unitless]. Without dark matter rms_dark is
        empty.
    """
    root = _root_power(history)
    columns = sample_columns(history)
    for fluid, contrast in contrasts_of(history).items():
        missing = np.full(contrast.size, not exists(history, fluid))
        columns.append(column(f"rms_{fluid}", (root * abs(contrast)).ravel(), masked=missing))
    return make_table(history, columns)


def shortfall_table(history, target_redshift=TARGET_REDSHIFT, radii=None, masses=None):
    """Return, for every scale and fluid, the contrast at decoupling, the one needed, and what came of it.

    Parameters
    ----------
    history : History
        The run.
    target_redshift : float
        Redshift by which order unity is wanted, after decoupling [unitless].
    radii : sequence of float, optional
        Comoving radii of spheres to follow beside the waves [Mpc].
    masses : sequence of float, optional
        Mean masses of further spheres [solMass].

    Returns
    -------
    astropy.table.Table
        One row per scale (waves, then spheres) and fluid (dark, baryon, matter, running fastest): wavenumber
        [1/Mpc], empty for a sphere; sphere_radius [Mpc] and sphere_mass [solMass], empty for a wave; fluid;
        rms_at_decoupling, rms_needed and shortfall, needed over there [unitless]; rms_at_target [unitless];
        unity_redshift [unitless] and unity_age [Gyr] at which the rms first reaches 1, collapse_redshift and
        collapse_age the same for 1.686, empty: never by today; greatest_rms and greatest_redshift [unitless],
        the largest rms by today and when (0: it grows to this day); matter_era_age [Gyr] at which the
        contrast at decoupling would be 1 if it grew as t^(2/3). Dark matter is empty without dark matter,
        a sphere where the run does not cover it; the header entry `not_covered` says so.

    Raises
    ------
    ValueError
        If the target redshift is not after decoupling or a radius or mass is not positive.
    """
    check_target(history.universe, target_redshift)
    universe, radius = history.universe, sphere_radii(history.universe, radii, masses)
    decoupling = universe.landmarks.drag_redshift
    growth, _ = cold_growth(universe, (decoupling, target_redshift))
    needed = float(UNITY * growth[0] / growth[1])
    spheres, reason = _spheres(history, radius)

    waves = np.append(history.wavenumber, np.full(len(radius), np.nan))
    mass = sphere_mass(universe, radius)
    radius, mass = (np.append(np.full(len(history.wavenumber), np.nan), array) for array in (radius, mass))
    rows = {"wavenumber": waves, "sphere_radius": radius, "sphere_mass": mass}
    rows = {name: np.repeat(array, len(FLUIDS)) for name, array in rows.items()}
    found = _follow(history, (decoupling, target_redshift), spheres, np.isfinite(radius).sum())
    outcomes = {fluid: _outcome(universe, scales, needed) for fluid, scales in found.items()}
    for name in outcomes["matter"]:
        values = np.stack([outcomes[fluid][name] for fluid in FLUIDS], axis=1)
        values[:, [not exists(history, fluid) for fluid in FLUIDS]] = np.nan
        rows[name] = values.ravel()

    columns = [column(name, values, masked=np.isnan(values)) for name, values in rows.items()]
    columns.insert(3, words_column("fluid", list(FLUIDS) * len(waves)))
    uncovered = reason and np.isnan(outcomes["matter"]["rms_at_decoupling"]).any()
    return make_table(
        history,
        columns,
        target_redshift=float(target_redshift),
        decoupling_redshift=float(f"{decoupling:.6g}"),
        growth_needed=float(f"{1.0 / needed:.6g}"),
        **({"not_covered": reason} if uncovered else {}),
    )


def check_target(universe, target_redshift):
    """Refuse a target that is not after decoupling.

    Parameters
    ----------
    universe : Universe
        The smooth universe.
    target_redshift : float
        The target [unitless].

    Raises
    ------
    ValueError
        If it is not after the drag epoch of this universe, or lies in the future.
    """
    decoupling = universe.landmarks.drag_redshift
    if not 0.0 <= target_redshift < decoupling:
        raise ValueError(
            f"target_redshift = {target_redshift:g} must lie between today, 0, and the drag epoch of this "
            f"universe, {decoupling:.6g}: growth is counted from there"
        )


def _root_power(history):
    """Square root of the primordial power, shape (mode, 1) [unitless]."""
    return np.sqrt(history.scenario.primordial.power(history.wavenumber))[:, None]


def _spheres(history, radius):
    """Return the filter for spheres, None if none are asked or possible, and why some may be empty."""
    if not len(radius):
        return None, ""
    try:
        return SphereFilter(history.wavenumber, history.scenario.primordial, radius), NOT_COVERED
    except ValueError as problem:
        return None, str(problem)


def _follow(history, redshifts, spheres, count):
    """Return the waves and spheres of each fluid on their way, {fluid: tuple of _Scales}."""
    trace, root = history.trace, _root_power(history)
    values, slopes = contrast_courses(history)
    marks, _ = contrasts_at(history, redshifts)
    found = {
        fluid: [_Scales(trace.log_scale_factor, root * values[fluid], root * slopes[fluid], root * abs(marks[fluid]))]
        for fluid in FLUIDS
    }
    if count:
        steps = int(np.ceil(np.log1p(SPHERE_START) / SPHERE_STEP))
        log_a = np.linspace(-np.log1p(SPHERE_START), 0.0, steps + 1)
        log_a[0] = max(log_a[0], trace.log_scale_factor[:, 0].max())  # a universe whose run starts later
        log_a = np.unique(log_a.clip(log_a[0], 0.0))
        courses = contrasts_at(history, np.expm1(-log_a))
        for fluid in FLUIDS:
            scales = _sphere_scales(spheres, log_a, [course[fluid] for course in courses], marks[fluid], count)
            found[fluid].append(scales)
    return found


def _sphere_scales(spheres, log_a, course, marks, count):
    """Return spheres on their way; NaN throughout for one that the run does not cover at each landmark."""
    if spheres is None:
        nothing = np.full((count, len(log_a)), np.nan)
        return _Scales(np.tile(log_a, (count, 1)), nothing, nothing, np.full((count, marks.shape[1]), np.nan))
    found = spheres.rms(marks)
    covered = np.all(found.beyond <= COVERAGE * found.value, axis=1, keepdims=True)
    rms, slope = (np.where(covered, array, np.nan) for array in spheres.rms_and_slope(*course))
    return _Scales(np.tile(log_a, (count, 1)), rms, slope, np.where(covered, found.value, np.nan))


def _outcome(universe, scales, needed):
    """Return the columns of one fluid, waves then spheres, {name: array of shape (scale,)}; NaN is empty."""
    parts = [_outcome_of(universe, part, needed) for part in scales]
    return {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}


def _outcome_of(universe, scales, needed):
    there, target = scales.landmarks.T
    drag_age = universe.age(1.0 / (1.0 + universe.landmarks.drag_redshift)) / MYR_PER_GYR
    outcome = {"rms_at_decoupling": there, "rms_needed": np.where(np.isnan(there), np.nan, needed)}
    with np.errstate(divide="ignore"):  # nothing there at all: infinitely short
        outcome |= {"shortfall": needed / there, "rms_at_target": target}
        matter_era_age = drag_age * (UNITY / there) ** 1.5
    for name, threshold in (("unity", UNITY), ("collapse", COLLAPSE)):
        log_a = _reaches(scales, threshold)
        outcome[f"{name}_redshift"] = np.expm1(-log_a)
        outcome[f"{name}_age"] = np.full(log_a.shape, np.nan)
        reached = np.isfinite(log_a)
        outcome[f"{name}_age"][reached] = universe.age(np.exp(log_a[reached])) / MYR_PER_GYR
    outcome["greatest_rms"], outcome["greatest_redshift"] = _greatest(scales)
    return outcome | {"matter_era_age": matter_era_age}


def _reaches(scales, threshold):
    """Return ln a where |rms| first reaches the threshold, shape (scale,); NaN: never, -inf: before the start."""
    log_a = first_rise(
        scales.log_a, (scales.rms - threshold, scales.slope), (scales.rms + threshold, scales.slope)
    )
    return np.where(np.abs(scales.rms[:, 0]) >= threshold, -np.inf, log_a)


def _greatest(scales):
    """Return the largest |rms| and its redshift, each of shape (scale,), from the parabola at the largest step."""
    rows = np.arange(len(scales.rms))
    size = np.nan_to_num(np.abs(scales.rms))
    step = size.argmax(axis=1)
    value, sign = scales.rms[rows, step], np.sign(scales.rms[rows, step])
    beside = np.clip(step + np.where(sign * scales.slope[rows, step] > 0.0, 1, -1), 0, size.shape[1] - 1)
    slope, other = scales.slope[rows, step], scales.slope[rows, beside]
    way = scales.log_a[rows, beside] - scales.log_a[rows, step]
    share = np.divide(slope, slope - other, out=np.zeros_like(slope), where=(slope * other < 0.0) & (way != 0.0))
    growing = (scales.log_a[rows, step] >= scales.log_a[:, -1]) & (sign * slope > 0.0)
    redshift = np.where(growing, 0.0, np.expm1(-(scales.log_a[rows, step] + share * way)))
    return np.abs(value) + 0.5 * share * way * slope * sign, np.where(np.isnan(value), np.nan, redshift)
