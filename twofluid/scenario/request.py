"""The request as the rest of the program sees it: frozen dataclasses, plain floats in fixed units."""

from collections.abc import Mapping
from dataclasses import dataclass, field

from .keys import DEFAULT_PRODUCTS, GAS_SECTIONS, KEY_AT, KEYS, MIXTURE, SECTIONS, Kind, default_of, keys_under
from .mixture import Mixture
from .spacing import range_of

_FIELD_SECTIONS = (  # read into dataclasses
    "cosmology",
    "cosmology.neutrinos",
    "cosmology.dark_matter",
    *GAS_SECTIONS,
    "primordial",
    *(path for path in SECTIONS if path.startswith(MIXTURE)),
    "sampling",
    "method",
)
TABLE_COLUMNS = tuple(key.name for key in keys_under("thermal.table"))


def _floats(values):
    return tuple(float(value) for value in values)


@dataclass(frozen=True)
class Neutrinos:
    """Neutrinos of the universe.

    Parameters
    ----------
    effective_number : float
        Effective number of species [unitless].
    masses : tuple of float
        Masses of up to three species, which share the effective number equally; those not named have none [eV].
    """

    effective_number: float = default_of("cosmology.neutrinos.effective_number")
    masses: tuple[float, ...] = default_of("cosmology.neutrinos.masses")

    def __post_init__(self):
        object.__setattr__(self, "masses", _floats(self.masses))


@dataclass(frozen=True)
class DarkMatter:
    """Pressure of the dark matter, as an effective sound speed.

    Parameters
    ----------
    sound_speed : float
        Sound speed at `at_redshift`; 0 is cold [km/s].
    at_redshift : float
        Redshift at which it is given [unitless].
    scaling : float
        Power of 1 + z with which it changes [unitless].
    """

    sound_speed: float = default_of("cosmology.dark_matter.sound_speed")
    at_redshift: float = default_of("cosmology.dark_matter.at_redshift")
    scaling: float = default_of("cosmology.dark_matter.scaling")


@dataclass(frozen=True)
class ThermalTable:
    """A history of the gas that takes the place of the computed one. Rows are kept in order of rising redshift.

    Parameters
    ----------
    redshift : tuple of float
        Rising or falling, shape (row,) [unitless].
    gas_temperature : tuple of float
        Temperature of the gas, shape (row,) [K].
    electron_fraction : tuple of float
        Free electrons per hydrogen nucleus, shape (row,) [unitless].
    below_redshift : float
        Redshift below which it is used [unitless].
    joining_width : float
        Stretch of ln(1 + z), down from there, over which one history passes into the other [unitless].
    """

    redshift: tuple[float, ...]
    gas_temperature: tuple[float, ...]
    electron_fraction: tuple[float, ...]
    below_redshift: float
    joining_width: float = default_of("thermal.joining_width")

    def __post_init__(self):
        falling = len(self.redshift) > 1 and self.redshift[0] > self.redshift[-1]
        for name in TABLE_COLUMNS:
            values = _floats(getattr(self, name))
            object.__setattr__(self, name, values[::-1] if falling else values)

    @property
    def table(self):
        """The columns by name, a dict of str to tuple of float."""
        return {name: getattr(self, name) for name in TABLE_COLUMNS}


@dataclass(frozen=True)
class Reionization:
    """A step from neutral to ionized gas: hydrogen and the first electron of helium.

    The ionized share is (1 + tanh((redshift - z)/width))/2.

    Parameters
    ----------
    redshift : float
        Where half of the hydrogen is ionized [unitless].
    width : float
        Of the step in redshift [unitless].
    gas_temperature : float or None
        Temperature of the ionized gas, from then on to this day [K]; None: ionizing brings no heat.
    """

    redshift: float
    width: float
    gas_temperature: float | None = None


@dataclass(frozen=True)
class Cosmology:
    """The smooth universe asked for.

    With neither fraction given the universe is flat and the cosmological constant fills the rest; with
    one of them given the other fills the rest.

    Parameters
    ----------
    hubble_constant : float
        Expansion rate today [km/(s Mpc)].
    baryon_density : float
        Physical density of baryons today, Omega_b h^2 [unitless].
    dark_matter_density : float
        Physical density of dark matter today, Omega_c h^2 [unitless].
    photon_temperature : float
        Temperature of the photon background today [K].
    helium_mass_fraction : float
        Helium's share of the baryon mass [unitless].
    neutrinos : Neutrinos
        Neutrinos.
    curvature_fraction : float or None
        Omega_k today, positive for an open universe [unitless].
    cosmological_constant_fraction : float or None
        Omega_Lambda today [unitless].
    dark_matter : DarkMatter
        Pressure of the dark matter; cold if left out.
    thermal : ThermalTable or None
        Late history of the gas from a table.
    reionization : Reionization or None
        Step from neutral to ionized gas; where there is a table too, it acts on what the table gives.
    """

    hubble_constant: float
    baryon_density: float
    dark_matter_density: float
    photon_temperature: float = default_of("cosmology.photon_temperature")
    helium_mass_fraction: float = default_of("cosmology.helium_mass_fraction")
    neutrinos: Neutrinos = Neutrinos()
    curvature_fraction: float | None = None
    cosmological_constant_fraction: float | None = None
    dark_matter: DarkMatter = DarkMatter()
    thermal: ThermalTable | None = None
    reionization: Reionization | None = None


@dataclass(frozen=True)
class Primordial:
    """Primordial curvature perturbations, a power law in wavenumber.

    Parameters
    ----------
    amplitude : float
        Power at the pivot [unitless].
    tilt : float
        Exponent n; 1 is equal power on all scales [unitless].
    pivot : float
        Wavenumber at which the amplitude is given [1/Mpc].
    mixture : Mixture or None
        Initial modes; None is the adiabatic one alone. Every amplitude of a mixture is relative to the square root
        of the power law.
    """

    amplitude: float = default_of("primordial.amplitude")
    tilt: float = default_of("primordial.tilt")
    pivot: float = default_of("primordial.pivot")
    mixture: Mixture | None = None

    def power(self, wavenumber):
        """Power of the curvature perturbations per unit ln k, A (k/pivot)^(n - 1).

        Parameters
        ----------
        wavenumber : float or array, any shape
            Comoving wavenumbers [1/Mpc].

        Returns
        -------
        float or array, same shape
            [unitless]
        """
        return self.amplitude * (wavenumber / self.pivot) ** (self.tilt - 1.0)


@dataclass(frozen=True)
class Sampling:
    """Where the answer is wanted. Any sequence of numbers is taken and kept as a tuple.

    Parameters
    ----------
    wavenumbers : tuple of float
        Comoving wavenumbers in the order asked for, shape (mode,) [1/Mpc].
    redshifts : tuple of float
        Redshifts in the order asked for, shape (redshift,) [unitless].
    """

    wavenumbers: tuple[float, ...]
    redshifts: tuple[float, ...]

    def __post_init__(self):
        object.__setattr__(self, "wavenumbers", _floats(self.wavenumbers))
        object.__setattr__(self, "redshifts", _floats(self.redshifts))


@dataclass(frozen=True)
class Method:
    """How the answer is computed.

    Parameters
    ----------
    closure : str
        Which equations are solved: "kinetic" or "sound-speed".
    accuracy : str
        How finely they are followed: "draft", "standard" or "reference".
    ionization_fluctuations : bool
        Whether recombination responds to the contrasts of density and temperature.
    """

    closure: str = default_of("method.closure")
    accuracy: str = default_of("method.accuracy")
    ionization_fluctuations: bool = default_of("method.ionization_fluctuations")


def default_products():
    """Return the products made when a scenario does not name any, with their default options."""
    return {
        product: {key.name: key.default for key in keys_under(f"products.{product}")}
        for product in DEFAULT_PRODUCTS
    }


@dataclass(frozen=True)
class Scenario:
    """A whole request. Two scenarios are equal if they ask for the same, however that was written.

    A scenario built here by hand is not checked; `scenario_from_mapping(scenario.to_mapping())` applies
    every rule a file has to obey.

    Parameters
    ----------
    title : str
        Name for tables and figures.
    cosmology : Cosmology
        The smooth universe.
    primordial : Primordial
        Primordial perturbations.
    sampling : Sampling
        Wavenumbers and redshifts.
    products : mapping of str to mapping
        Names of the products to make and their options.
    assumed : tuple of str
        Dotted keys, and optional sections, that the file left out.
    source : str or None
        File the scenario was read from.
    method : Method
        How the answer is computed.
    """

    title: str
    cosmology: Cosmology
    primordial: Primordial
    sampling: Sampling
    products: Mapping[str, Mapping] = field(default_factory=default_products, hash=False)
    assumed: tuple[str, ...] = field(default=(), compare=False)
    source: str | None = field(default=None, compare=False)
    method: Method = Method()

    @property
    def thermal(self):
        """The table of the cosmology, a `ThermalTable` or None; a section of its own in a file."""
        return self.cosmology.thermal

    @property
    def reionization(self):
        """The step of the cosmology, a `Reionization` or None; a section of its own in a file."""
        return self.cosmology.reionization

    def to_mapping(self):
        """Write the request as a nested mapping of plain values, quantities as text with their unit.

        Returns
        -------
        dict
            Written as YAML and read again it gives an equal scenario. Every value is spelled out,
            also those that were left to their defaults.
        """
        mapping = {"title": str(self.title)}
        for key in KEYS:
            if key.section not in _FIELD_SECTIONS:
                continue
            if key.section in GAS_SECTIONS and getattr(self, key.section) is None:
                mapping[key.section] = {}
                continue
            value = _said(self, key.path)
            if value is not None:
                _section_of(mapping, key)[key.name] = _plain(value, key)
        mapping["products"] = {}
        for product, options in self.products.items():
            known = {name: KEY_AT.get(f"products.{product}.{name}") for name in options}
            mapping["products"][product] = {
                name: _plain(value, known[name]) for name, value in options.items() if value is not None
            }
        return mapping

    def assumptions(self):
        """Say in words what the file left to its defaults.

        Returns
        -------
        tuple of str
            One ``key = value`` for each key in `assumed`.
        """
        mapping = self.to_mapping()
        return tuple(f"{path} = {_assumed_text(mapping, path)}" for path in self.assumed)


def _said(scenario, path):
    """Return what a scenario says under a dotted key, None where it lacks the section."""
    value = scenario
    for name in path.split("."):
        value = None if value is None else getattr(value, name)
    return value


def _plain(value, key):
    """Turn a clean value into what a file would say: plain numbers, and text where a unit is due."""
    if key is None:
        return list(value) if isinstance(value, tuple) else value
    if key.kind in _WRITTEN:
        return _WRITTEN[key.kind](value)
    if key.kind is Kind.WAVENUMBERS and (found := range_of(value)):
        low, high, per_decade = found
        return {"from": _with_unit(low, key), "to": _with_unit(high, key), "per_decade": per_decade}
    if key.kind in (Kind.WAVENUMBERS, Kind.QUANTITIES):
        return [_with_unit(item, key) for item in value]
    if key.kind is Kind.TABLE:
        return {part.name: _plain(value[part.name], part) for part in keys_under(key.path)}
    return _with_unit(value, key)


_WRITTEN = {
    Kind.NUMBER: float,
    Kind.NUMBERS: lambda value: [float(item) for item in value],
    Kind.CHOICE: str,
    Kind.SWITCH: bool,
}


def _with_unit(value, key):
    """Write a number with the unit of its key, with all its digits."""
    return f"{float(value)!r} {key.unit}"


def _section_of(mapping, key):
    for name in key.section.split("."):
        mapping = mapping.setdefault(name, {})
    return mapping


def _assumed_text(mapping, path):
    if path in GAS_SECTIONS:
        return GAS_SECTIONS[path]
    value = mapping
    for name in path.split("."):
        value = value.get(name)
        if value is None:
            return KEY_AT[path].unsaid
    return value
