"""The result of a run: amplitudes on (mode, redshift) axes, interpolation, saving and loading."""

from collections.abc import Sequence
from dataclasses import dataclass, field, fields
from pathlib import Path

import numpy as np

from .certificate import Certificate
from .files import replace_atomically
from .scenario import Scenario, scenario_from_mapping
from .universe import Universe

#: Quantities a history carries, in the order of their columns.
EVOLVED = ("delta_dark", "delta_baryon", "theta_baryon", "delta_gas_temperature")
#: Quantities it carries in addition: where the dark matter has pressure, and where neutrinos have mass.
ADDED = ("theta_dark", "delta_neutrino")
#: Contrasts put together from others, weighted by rest mass: what is in each.
TOGETHER = {"delta_cold": ("dark", "baryon"), "delta_matter": ("dark", "baryon", "neutrino")}

_FORMAT = 1  # raised whenever a saved history changes its layout


@dataclass(frozen=True)
class Trace:
    """Every step of every mode, on the mode's own clock.

    Attributes
    ----------
    log_scale_factor : array, shape (mode, step)
        ln a, non-decreasing; a mode with fewer steps than others repeats its end, a = 1 [unitless].
    delta_dark, delta_baryon, theta_baryon, delta_gas_temperature : array, shape (mode, step)
        As in `History`.
    delta_dark_slope, delta_baryon_slope, theta_baryon_slope, delta_gas_temperature_slope : array, shape (mode, step)
        Their derivatives by ln a, in the unit of the quantity.
    theta_dark, theta_dark_slope : array, shape (mode, step), or None
        The same, where the dark matter has pressure.
    delta_neutrino, delta_neutrino_slope : array, shape (mode, step), or None
        The same; None where no neutrino has mass.
    """

    log_scale_factor: np.ndarray
    delta_dark: np.ndarray
    delta_baryon: np.ndarray
    theta_baryon: np.ndarray
    delta_gas_temperature: np.ndarray
    delta_dark_slope: np.ndarray
    delta_baryon_slope: np.ndarray
    theta_baryon_slope: np.ndarray
    delta_gas_temperature_slope: np.ndarray
    theta_dark: np.ndarray | None = None
    theta_dark_slope: np.ndarray | None = None
    delta_neutrino: np.ndarray | None = None
    delta_neutrino_slope: np.ndarray | None = None


@dataclass(frozen=True)
class History:
    """What became of each mode.

    Synchronous frame at rest with the dark matter or, where that has pressure, with cold dust of no mass that
    started with it; unit primordial comoving curvature, with a mixture of initial modes in units of the square
    root of the primordial power; signs such that densities grow positive.

    Where a mixture has independent parts, amplitudes say what two random fields have in common: the dark matter (with
    none, the baryons) has its rms amplitude, and any other quantity X the amplitude <X delta_dark>/rms(delta_dark) of
    what goes along with it. The ratio of the contrasts is then the cross-power over the power of the dark
    matter. What an amplitude leaves out is in `parts`.

    Attributes
    ----------
    scenario : Scenario
        What was asked.
    universe : Universe
        The smooth universe of the scenario.
    wavenumber : array, shape (mode,)
        Comoving wavenumbers as asked [1/Mpc].
    redshift : array, shape (redshift,)
        Redshifts as asked [unitless].
    delta_dark, delta_baryon : array, shape (mode, redshift)
        Density contrasts [unitless]. Without dark matter, `delta_dark` is that of the massless dust
        that carries the frame.
    theta_baryon : array, shape (mode, redshift)
        Velocity divergence of the baryons relative to the frame, by conformal time [1/Mpc].
    delta_gas_temperature : array, shape (mode, redshift)
        Relative contrast of the gas temperature [unitless].
    trace : Trace
        Every step taken.
    constraint : array, shape (mode,)
        Drift of the Einstein energy constraint, summed over the run, relative to its largest term [unitless];
        NaN where the closure has no such constraint.
    counts : dict of str to int
        What the run cost: "steps" over all modes, "lanes" with padding, "factorizations", "rate_evaluations".
    warnings : tuple of str
        What the user has to know about this run.
    certificate : Certificate or None
        Estimated numerical error, once `twofluid.certify` has worked it out.
    theta_dark : array, shape (mode, redshift), or None
        Velocity divergence of the dark matter relative to the frame, where it has pressure [1/Mpc].
    delta_neutrino : array, shape (mode, redshift), or None
        Contrast of the rest mass of all neutrinos that have mass: of their number, weighted by mass. Of the energy
        density it is the contrast once they are slow, and 3/4 of that while they are fast [unitless].
    initial_modes : str
        The initial modes that follow one random field, joined by plus signs; of independent parts, by commas.
    independent_parts : tuple of History
        What became of each independent part of a mixture; empty if there is but one.
    """

    scenario: Scenario
    universe: Universe
    wavenumber: np.ndarray
    redshift: np.ndarray
    delta_dark: np.ndarray
    delta_baryon: np.ndarray
    theta_baryon: np.ndarray
    delta_gas_temperature: np.ndarray
    trace: Trace
    constraint: np.ndarray
    counts: dict[str, int]
    warnings: tuple[str, ...] = field(default=())
    certificate: Certificate | None = None
    theta_dark: np.ndarray | None = None
    delta_neutrino: np.ndarray | None = None
    initial_modes: str = "adiabatic"
    independent_parts: tuple["History", ...] = ()

    @property
    def evolved(self) -> tuple[str, ...]:
        """Names of the quantities this history carries."""
        return (*EVOLVED, *(name for name in ADDED if getattr(self, name) is not None))

    @property
    def parts(self) -> tuple["History", ...]:
        """Histories of definite amplitudes whose powers add up to that of this one; itself, if it is definite."""
        return self.independent_parts or (self,)

    @property
    def has_dark_matter(self) -> bool:
        """Whether there is any dark matter for baryons to lag."""
        return self.scenario.cosmology.dark_matter_density > 0.0

    @property
    def has_massive_neutrinos(self) -> bool:
        """Whether a neutrino has mass."""
        return self.delta_neutrino is not None

    @property
    def delta_cold(self) -> np.ndarray:
        """Contrast of dark matter and baryons together, shape (mode, redshift) [unitless]."""
        return self._together("delta_cold", lambda name: getattr(self, name))

    @property
    def delta_matter(self) -> np.ndarray:
        """Contrast of the rest mass of dark matter, baryons and neutrinos, shape (mode, redshift) [unitless]."""
        return self._together("delta_matter", lambda name: getattr(self, name))

    def _together(self, name, values):
        """Weighted sum of the contrasts that make up a contrast, given the function that finds each."""
        mass = {species.removeprefix("massive_"): mass for species, mass in self.universe.masses.items()}
        present = [species for species in TOGETHER[name] if f"delta_{species}" in self.evolved]
        total = sum(mass[species] for species in present)
        return sum(mass[species] / total * values(f"delta_{species}") for species in present)

    def at(self, name: str, redshift, wavenumber=None) -> np.ndarray:
        """Interpolate a quantity to other redshifts and wavenumbers.

        Cubic Hermite interpolation in ln a over the steps taken; cubic spline in ln k over the modes.

        Parameters
        ----------
        name : str
            One of `evolved`, "delta_cold" or "delta_matter".
        redshift : float or array, shape (redshift,)
            Redshifts [unitless].
        wavenumber : float or array, shape (mode,), optional
            Wavenumbers within the range of the run [1/Mpc]; the run's own if left out.

        Returns
        -------
        array, shape (mode, redshift)

        Raises
        ------
        ValueError
            If the name is unknown, or a redshift or wavenumber lies outside the run.
        """
        values, _ = self._between_steps(name, redshift)
        return values if wavenumber is None else self._at_wavenumber(values, wavenumber)

    def slope_at(self, name: str, redshift) -> np.ndarray:
        """Return the derivative by ln a of a quantity at other redshifts, that of the interpolation `at` makes.

        Parameters
        ----------
        name : str
            As in `at`.
        redshift : float or array, shape (redshift,)
            Redshifts [unitless].

        Returns
        -------
        array, shape (mode, redshift)
            In the unit of the quantity; at the redshifts of the run as the equations give it.

        Raises
        ------
        ValueError
            If the name is unknown, or a redshift lies outside the run.
        """
        return self._between_steps(name, redshift)[1]

    def _between_steps(self, name: str, redshift) -> tuple[np.ndarray, np.ndarray]:
        """Value and slope by ln a at any redshifts, each of shape (mode, redshift)."""
        if name in TOGETHER:
            return tuple(
                self._together(name, lambda part, which=which: self._between_steps(part, redshift)[which])
                for which in range(2)
            )
        if name not in self.evolved:
            raise ValueError(f"no quantity is named {name!r}: choose one of {', '.join((*self.evolved, *TOGETHER))}")
        log_a = -np.log1p(np.atleast_1d(np.asarray(redshift, dtype=float)))
        trace = self.trace
        return _hermite(trace.log_scale_factor, getattr(trace, name), getattr(trace, name + "_slope"), log_a)

    def _at_wavenumber(self, values: np.ndarray, wavenumber) -> np.ndarray:
        from scipy.interpolate import CubicSpline

        asked = np.atleast_1d(np.asarray(wavenumber, dtype=float))
        known, first = np.unique(self.wavenumber, return_index=True)
        if len(known) < 2:
            raise ValueError("interpolation in wavenumber needs a run of at least two wavenumbers")
        if not np.all((asked >= known[0]) & (asked <= known[-1])):
            raise ValueError(f"wavenumbers must lie within the run, {known[0]:g} to {known[-1]:g} 1/Mpc")
        return CubicSpline(np.log(known), values[first])(np.log(asked))

    def save(self, path) -> None:
        """Save everything without loss to a NumPy archive; an existing file is replaced in one move.

        Parameters
        ----------
        path : str or path
            File to write.
        """
        import yaml

        arrays = {name: getattr(self, name) for name in ("wavenumber", "redshift")}
        for number, part in enumerate((self, *self.independent_parts)):
            arrays |= part._own_arrays(_prefix(number))
        if self.certificate is not None:
            arrays |= {f"certificate_{part.name}": getattr(self.certificate, part.name) for part in fields(Certificate)}
        words = {
            "format": _FORMAT,
            "scenario": self.scenario.to_mapping(),
            "assumed": list(self.scenario.assumed),
            "counts": self.counts,
            "warnings": list(self.warnings),
            "initial_modes": [part.initial_modes for part in (self, *self.independent_parts)],
        }
        with replace_atomically(path) as stream:
            np.savez_compressed(stream, words=np.array(yaml.safe_dump(words)), **arrays)

    def _own_arrays(self, prefix: str) -> dict[str, np.ndarray]:
        """Return what a history does not share with its parts, by the names in an archive."""
        arrays = {f"{prefix}{name}": getattr(self, name) for name in (*self.evolved, "constraint")}
        arrays |= {f"{prefix}trace_{part.name}": getattr(self.trace, part.name) for part in fields(Trace)}
        return {name: array for name, array in arrays.items() if array is not None}


def load_history(path) -> History:
    """Load a history saved by `History.save`.

    Parameters
    ----------
    path : str or path

    Returns
    -------
    History

    Raises
    ------
    ValueError
        If the file is not a saved history of this version's layout.
    """
    from dataclasses import replace

    import yaml

    try:
        with np.load(Path(path), allow_pickle=False) as archive:
            arrays = {name: archive[name] for name in archive.files}
        words = yaml.safe_load(str(arrays.pop("words")))
    except (ValueError, KeyError) as problem:
        raise ValueError(f"{path} is not a saved history: {problem}") from None
    if words["format"] != _FORMAT:
        raise ValueError(f"{path} has layout {words['format']}, this version reads layout {_FORMAT}: run it again")
    scenario = replace(scenario_from_mapping(words["scenario"]), assumed=tuple(words["assumed"]))
    certificate = None
    if "certificate_promise" in arrays:
        certificate = Certificate(**{part.name: arrays.pop(f"certificate_{part.name}") for part in fields(Certificate)})
    common = {
        "scenario": scenario,
        "universe": Universe(scenario.cosmology),
        "wavenumber": arrays["wavenumber"],
        "redshift": arrays["redshift"],
        "counts": words["counts"],
        "warnings": tuple(words["warnings"]),
    }
    whole, *parts = (
        History(**common, **_own(arrays, _prefix(number)), initial_modes=modes)
        for number, modes in enumerate(words.get("initial_modes", ["adiabatic"]))
    )
    return replace(whole, certificate=certificate, independent_parts=tuple(parts))


def history_of_parts(parts: Sequence[History]) -> History:
    """Sum up the histories of independent random fields; see `History`.

    Parameters
    ----------
    parts : sequence of History
        Of definite amplitudes, at the same wavenumbers and redshifts and with the same steps.

    Returns
    -------
    History
        The only part itself, if there is but one.
    """
    from dataclasses import replace

    if len(parts) == 1:
        return parts[0]
    lead = "delta_dark" if parts[0].has_dark_matter else "delta_baryon"
    turning, turn = _directions(_gather(parts, lead), _gather(parts, lead, "_slope"))
    fixed, _ = _directions(np.stack([getattr(part, lead) for part in parts]))
    courses, amplitudes = {}, {}
    for name in parts[0].evolved:
        course, slope = _gather(parts, name), _gather(parts, name, "_slope")
        courses[name] = (course * turning).sum(axis=0)
        courses[name + "_slope"] = (slope * turning + course * turn).sum(axis=0)
        amplitudes[name] = (np.stack([getattr(part, name) for part in parts]) * fixed).sum(axis=0)
    return replace(
        parts[0],
        **amplitudes,
        trace=replace(parts[0].trace, **courses),
        constraint=np.max([part.constraint for part in parts], axis=0),
        initial_modes=", ".join(part.initial_modes for part in parts),
        independent_parts=tuple(parts),
    )


def _gather(parts: Sequence[History], name: str, suffix: str = "") -> np.ndarray:
    """Courses of a quantity in every part, shape (part, mode, step)."""
    return np.stack([getattr(part.trace, name + suffix) for part in parts])


def _directions(lead: np.ndarray, slope: np.ndarray | None = None) -> tuple[np.ndarray, np.ndarray | None]:
    """Return the unit vector along the leading quantity in the space of the parts, first axis, and its derivative."""
    rms = np.sqrt((lead**2).sum(axis=0))
    safe = np.where(rms > 0.0, rms, 1.0)
    unit = lead / safe
    return unit, None if slope is None else (slope - unit * (unit * slope).sum(axis=0)) / safe


def _prefix(number: int) -> str:
    """Return what the names of the arrays of a part begin with in an archive; number 0 is the whole."""
    return f"part{number}_" if number else ""


def _own(arrays: dict[str, np.ndarray], prefix: str) -> dict:
    """Take from an archive what a history does not share with its parts; see `History._own_arrays`."""
    trace = Trace(**{part.name: arrays.get(f"{prefix}trace_{part.name}") for part in fields(Trace)})
    names = (name for name in (*EVOLVED, *ADDED, "constraint") if prefix + name in arrays)
    return {"trace": trace, **{name: arrays[prefix + name] for name in names}}


def _hermite(
    log_a: np.ndarray, values: np.ndarray, slopes: np.ndarray, asked: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Cubic Hermite interpolation of every mode, and its derivative, at the same log scale factors (mode, asked)."""
    if not np.all((asked >= log_a[:, 0].max()) & (asked <= 0.0)):
        raise ValueError(f"redshifts must lie within the run, 0 to {np.expm1(-log_a[:, 0].max()):.6g}")
    steps = log_a.shape[1]
    right = np.stack([np.searchsorted(row, asked) for row in log_a]).clip(1, steps - 1)
    rows = np.arange(len(log_a))[:, None]
    left = right - 1
    width = log_a[rows, right] - log_a[rows, left]
    t = np.divide(asked - log_a[rows, left], width, out=np.zeros(width.shape), where=width > 0.0)
    rise = values[rows, right] - values[rows, left]
    start, end = slopes[rows, left] * width - rise, rise - slopes[rows, right] * width
    bend = (1.0 - t) * start + t * end
    value = values[rows, left] + t * rise + t * (1.0 - t) * bend
    rate = rise + (1.0 - 2.0 * t) * bend + t * (1.0 - t) * (end - start)
    return value, np.divide(rate, width, out=slopes[rows, left], where=width > 0.0)
