"""The table of keys: everything a scenario file may say, in one place.

Reading, error messages, defaults of the dataclasses, the commented template and the key table of the
manual all come from here. A new key is one row in `KEYS` and one field of a dataclass; a new product
option is one row; a product without options is one row in `SECTIONS`.
"""

from dataclasses import dataclass
from enum import Enum
from typing import Any

WAVENUMBER_UNIT = "1/Mpc"
MOST_WAVENUMBERS = 100_000  # longest list of modes; keeps a slip of the pen from filling the memory
MOST_REDSHIFTS = 1_000  # longest list of redshifts; the same reason
MOST_FRACTIONS = 100  # longest list of fractions of one product; the same reason
MOST_SPHERES = 100  # longest list of radii or masses of one product; the same reason
MOST_VELOCITIES = 20  # longest list of streaming velocities; the same reason
MOST_TABLE_ROWS = 5_000  # of a thermal history: smooth curves need a few dozen, and all of it goes into every header


def section_of(path):
    """Return the dotted path of the section that holds a key, empty at the top."""
    return path.rpartition(".")[0]


def name_of(path):
    """Return the last name of a dotted path, as it is written in a file."""
    return path.rpartition(".")[2]


def path_in(section, name):
    """Return the dotted path of a name in a section."""
    return f"{section}.{name}" if section else name


class Kind(Enum):
    """What sort of value a key takes; the text is what a reader of the manual sees."""

    TEXT = "text"
    NUMBER = "number"
    QUANTITY = "number with unit"
    NUMBERS = "list of numbers"
    QUANTITIES = "list of numbers with unit"
    WAVENUMBERS = "range, or list of numbers with unit"
    CHOICE = "one word of a few"
    SWITCH = "true or false"
    TABLE = "file name, or columns"


@dataclass(frozen=True)
class Allowed:
    """An interval of allowed values, in the unit of its key."""

    low: float
    high: float
    low_open: bool = False
    high_open: bool = False

    def __str__(self):
        if not (self.low_open or self.high_open):
            return f"from {self.low:g} to {self.high:g}"
        low = "above" if self.low_open else "at least"
        high = "below" if self.high_open else "at most"
        return f"{low} {self.low:g} and {high} {self.high:g}"


@dataclass(frozen=True)
class Key:
    """One row of the table.

    Parameters
    ----------
    path : str
        Dotted key.
    kind : Kind
        What sort of value it takes.
    meaning : str
        One line for the manual.
    unit : str
        Unit of the value and of `allowed`, as astropy.units reads it; empty for a plain number.
    allowed : Allowed or None
        Interval of allowed values; for a list, of each of them. None for text and for a list that must be
        empty.
    default : object
        Value where the file says nothing.
    required : bool
        Whether the file has to say something.
    unsaid : str
        In words, what is done where the file says nothing and there is no fixed default, or the example is not it.
    example : str
        A valid value as it is written in a file.
    shortest, longest : int
        Allowed number of list entries.
    longest_reason : str
        Why the list may not be longer, for the message.
    repeats : bool
        Whether equal entries may stand in a list.
    choices : tuple of str
        The words a choice allows.
    """

    path: str
    kind: Kind
    meaning: str
    unit: str = ""
    allowed: Allowed | None = None
    default: Any = None
    required: bool = False
    unsaid: str = ""
    example: str = ""
    shortest: int = 1
    longest: int = 1
    longest_reason: str = ""
    repeats: bool = False
    choices: tuple[str, ...] = ()

    @property
    def section(self):
        """Dotted path of the section that holds the key, empty at the top."""
        return section_of(self.path)

    @property
    def name(self):
        """The key as it is written in its section."""
        return name_of(self.path)


ADIABATIC = "adiabatic"  # the initial mode that is there if nothing is said
INITIAL_MODES = {  # the others, and what is one at the beginning where the amplitude is one
    "baryon": "baryon density isocurvature; unit delta_b - 3/4 delta_gamma",
    "dark_matter": "dark-matter density isocurvature; unit delta_c - 3/4 delta_gamma",
    "compensated": "baryons denser where dark matter is thinner, matter uniform; unit delta_b - 3/4 delta_gamma",
    "neutrino_density": "neutrinos denser where photons are thinner; unit 3/4 (delta_nu - delta_gamma)",
    "neutrino_velocity": "neutrinos stream through the plasma; unit (theta_nu - theta_gamma)/k",
}
MIXTURE = "primordial.mixture"

SECTIONS = {
    "cosmology": "the smooth universe",
    "cosmology.neutrinos": "neutrinos",
    "cosmology.dark_matter": "pressure of the dark matter: c_s(z) = sound_speed ((1 + z)/(1 + at_redshift))^scaling",
    "thermal": "gas temperature and electrons of a table in place of the computed ones, late in the history",
    "reionization": "a simple step from neutral to ionized gas: hydrogen and the first electron of helium",
    "primordial": "primordial curvature perturbations, a power law in wavenumber",
    MIXTURE: "initial modes; without this section the adiabatic one alone",
    **{f"{MIXTURE}.{mode}": meaning for mode, meaning in INITIAL_MODES.items()},
    "sampling": "where the answer is wanted",
    "method": "how the answer is computed",
    "products": "which products to make: {} for none, lag if the section is left out",
    "products.lag": "how far the baryons lag the dark matter",
    "products.scales": "horizon, sound, Jeans, filtering and diffusion scales, and what each mode is doing",
    "products.growth": "growth of dark matter, baryons and matter since an epoch, and growth rates",
    "products.spheres": "rms contrast in spheres",
    "products.shortfall": "contrast at decoupling against what order unity by a target redshift takes",
    "products.streaming": "velocity of baryons relative to dark matter, and what it does to growth on small scales",
}

# Sections on the late gas that ask for something only by being there, and what is done without them.
GAS_SECTIONS = {
    "thermal": "none, the gas is heated by Compton scattering alone",
    "reionization": "none, the gas stays neutral but for what recombination leaves",
}

#: Sections whose keys are not filled in where the file does not have them.
OPTIONAL_SECTIONS = tuple(path for path in SECTIONS if path.startswith(("products.", MIXTURE)))

DEFAULT_PRODUCTS = ("lag",)  # made when the file has no section `products`

_WAVENUMBER_LIMITS = Allowed(1e-4, 1e5)  # beyond the horizon to far below the Jeans length of the gas
_RADIUS_LIMITS = Allowed(1e-5, 1e4)  # [Mpc]; one over the wavenumbers
_MASS_LIMITS = Allowed(1e-4, 1e23)  # [solMass]; what such spheres hold in a universe like ours
_REDSHIFT_LIMITS = Allowed(0, 1e6)  # what a run tabulates
_TOO_MANY_SPHERES = "more spheres are not tabulated in one run"


def _mode_keys(mode):
    """Return the rows of one initial mode beside the adiabatic one."""
    return (
        Key(f"{MIXTURE}.{mode}.ratio", Kind.NUMBER,
            "rms amplitude at the pivot over the square root of primordial.amplitude; 0 leaves the mode out",
            allowed=Allowed(0, 1e6), required=True, example="0.1"),
        Key(f"{MIXTURE}.{mode}.correlation", Kind.NUMBER,
            "with the random field of the adiabatic mode; positive where denser places have an excess",
            allowed=Allowed(-1, 1), default=0.0, example="0"),
        Key(f"{MIXTURE}.{mode}.tilt", Kind.NUMBER, "exponent n of its power",
            allowed=Allowed(-3, 5), unsaid="that of primordial.tilt", example="0.965"),
    )  # fmt: skip


KEYS = (
    Key("title", Kind.TEXT, "name of the scenario, for tables and figures",
        unsaid="the file's name without its ending", example="Saltmarsh S, baseline"),
    Key("cosmology.hubble_constant", Kind.QUANTITY, "expansion rate today",
        unit="km/(s Mpc)", allowed=Allowed(1, 500), required=True, example="67.5 km/(s Mpc)"),
    Key("cosmology.baryon_density", Kind.NUMBER, "physical density of baryons today, Omega_b h^2",
        allowed=Allowed(1e-6, 10), required=True, example="0.0223"),
    Key("cosmology.dark_matter_density", Kind.NUMBER, "physical density of dark matter today, Omega_c h^2",
        allowed=Allowed(0, 10), required=True, example="0.1195"),
    # COBE/FIRAS temperature, Fixsen 2009 (ApJ 707, 916); from memory.
    Key("cosmology.photon_temperature", Kind.QUANTITY, "temperature of the photon background today",
        unit="K", allowed=Allowed(0.1, 30), default=2.7255, example="2.7255 K"),
    # Primordial nucleosynthesis with Planck's baryon density (Planck 2018 VI); from memory.
    Key("cosmology.helium_mass_fraction", Kind.NUMBER, "helium's share of the baryon mass",
        allowed=Allowed(0, 1, high_open=True), default=0.2454, example="0.2454"),
    Key("cosmology.curvature_fraction", Kind.NUMBER,
        "curvature's share of the critical density today, Omega_k; positive is open",
        allowed=Allowed(-1, 1), example="0.01",
        unsaid="0 (flat), unless the cosmological constant is given: then what the densities leave open"),
    Key("cosmology.cosmological_constant_fraction", Kind.NUMBER,
        "the cosmological constant's share of the critical density today, Omega_Lambda",
        allowed=Allowed(-2, 2), example="0.69", unsaid="what the densities and the curvature leave open"),
    # Three neutrinos slightly heated by electron annihilation, the value Planck 2018 I, Fig. 16 uses.
    Key("cosmology.neutrinos.effective_number", Kind.NUMBER, "effective number of neutrino species",
        allowed=Allowed(0, 20), default=3.046, example="3.046"),
    Key("cosmology.neutrinos.masses", Kind.QUANTITIES,
        "masses of up to three neutrinos, which share the effective number equally; those not named have none",
        unit="eV", allowed=Allowed(0, 10), default=(), unsaid="[]", example="[0.06 eV]",
        shortest=0, longest=3, repeats=True, longest_reason="three species share the effective number"),
    Key("cosmology.dark_matter.sound_speed", Kind.QUANTITY, "effective sound speed of the dark matter; 0 is cold",
        unit="km/s", allowed=Allowed(0, 29979), default=0.0, example="0 km/s"),  # up to a tenth of c: still matter
    Key("cosmology.dark_matter.at_redshift", Kind.NUMBER, "redshift at which that sound speed is given",
        allowed=Allowed(0, 1e6), default=0.0, example="0"),
    # Momenta of free particles fall as 1 + z; sound speeds at the photons' temperature as its root.
    Key("cosmology.dark_matter.scaling", Kind.NUMBER,
        "power of 1 + z with which it changes: 1 for free particles, 0.5 for those heated by photons",
        allowed=Allowed(0, 1), default=1.0, example="1"),
    Key("thermal.table", Kind.TABLE,
        "ECSV file beside this one with the columns below, or these columns; from z = 0, no gap of 0.5 in ln(1 + z)",
        required=True, longest=MOST_TABLE_ROWS, example="heating.ecsv"),
    Key("thermal.table.redshift", Kind.NUMBERS, "redshift of each row, rising or falling",
        allowed=Allowed(0, 1000), required=True, longest=MOST_TABLE_ROWS,
        example="[0, 0.6, 1.5, 3, 5.5, 9, 14, 21, 33]"),
    Key("thermal.table.gas_temperature", Kind.QUANTITIES, "temperature of the gas, its logarithm interpolated",
        unit="K", allowed=Allowed(0, 1e9, low_open=True), required=True, longest=MOST_TABLE_ROWS,
        example="[8000 K, 9000 K, 11000 K, 12000 K, 9500 K, 500 K, 60 K, 15 K, 22 K]"),
    Key("thermal.table.electron_fraction", Kind.NUMBERS, "free electrons per hydrogen nucleus, helium's included",
        allowed=Allowed(0, 10, low_open=True), required=True, longest=MOST_TABLE_ROWS,
        example="[1.08, 1.07, 1.06, 1.05, 0.9, 0.1, 0.01, 5e-4, 2e-4]"),
    Key("thermal.below_redshift", Kind.NUMBER, "redshift below which the table is used",
        allowed=Allowed(1, 600), required=True, example="30"),
    Key("thermal.joining_width", Kind.NUMBER,
        "stretch of ln(1 + z), down from that redshift, over which the computed history passes into the table",
        allowed=Allowed(0.02, 1), default=0.1, example="0.1"),
    Key("reionization.redshift", Kind.NUMBER, "redshift at which half of the hydrogen is ionized",
        allowed=Allowed(2, 100), required=True, example="7.7"),
    Key("reionization.width", Kind.NUMBER,
        "w of the step (1 + tanh((z_re - z)/w))/2 in redshift; at least 0.02 (1 + z_re), at most z_re/4",
        allowed=Allowed(0.06, 25), required=True, example="0.5"),
    Key("reionization.gas_temperature", Kind.QUANTITY, "temperature the step brings the gas to, and keeps it at",
        unit="K", allowed=Allowed(1, 1e6), example="1e4 K",
        unsaid="no heat from ionizing light: Compton heating and expansion, or the table"),
    Key("primordial.amplitude", Kind.NUMBER, "power of the curvature perturbations at the pivot",
        allowed=Allowed(0, 1, low_open=True), default=2.1e-9, example="2.1e-9"),
    Key("primordial.tilt", Kind.NUMBER, "exponent n of the power law, 1 for equal power on all scales",
        allowed=Allowed(-3, 5), default=0.965, example="0.965"),
    Key("primordial.pivot", Kind.QUANTITY, "wavenumber at which the amplitude is given",
        unit=WAVENUMBER_UNIT, allowed=Allowed(1e-6, 1e6), default=0.05, example="0.05 1/Mpc"),
    Key(f"{MIXTURE}.{ADIABATIC}", Kind.NUMBER,
        "rms amplitude of the adiabatic mode over the square root of the primordial power; 0 leaves it out",
        allowed=Allowed(0, 1e6), default=1.0, example="1"),
    *(key for mode in INITIAL_MODES for key in _mode_keys(mode)),
    Key("sampling.wavenumbers", Kind.WAVENUMBERS, "comoving wavenumbers, as a range or one by one",
        unit=WAVENUMBER_UNIT, allowed=_WAVENUMBER_LIMITS, required=True, longest=MOST_WAVENUMBERS,
        longest_reason="more modes are not solved in one run", example="[0.1 1/Mpc, 1 1/Mpc]"),
    Key("sampling.wavenumbers.from", Kind.QUANTITY, "smallest wavenumber of the range, included",
        unit=WAVENUMBER_UNIT, allowed=_WAVENUMBER_LIMITS, required=True, example="0.001 1/Mpc"),
    Key("sampling.wavenumbers.to", Kind.QUANTITY, "largest wavenumber of the range, included",
        unit=WAVENUMBER_UNIT, allowed=_WAVENUMBER_LIMITS, required=True, example="1000 1/Mpc"),
    Key("sampling.wavenumbers.per_decade", Kind.NUMBER,
        "points a factor of ten, equally spaced in the logarithm; the number of intervals is rounded",
        allowed=Allowed(0, MOST_WAVENUMBERS, low_open=True), required=True, example="20"),
    Key("sampling.redshifts", Kind.NUMBERS, "redshifts, kept in this order",
        allowed=Allowed(0, 1e6), required=True, longest=MOST_REDSHIFTS,
        longest_reason="more redshifts are not tabulated in one run",
        example="[1000, 500, 200, 100, 50, 20, 10]"),
    Key("method.closure", Kind.CHOICE,
        "equations: photons and neutrinos by their full chains of moments, or a plasma with an effective sound speed",
        choices=("kinetic", "sound-speed"), default="kinetic", example="kinetic"),
    Key("method.accuracy", Kind.CHOICE,
        "step and chain settings: numerical error of the contrasts below 3e-3, 3e-4 or 5e-5",
        choices=("draft", "standard", "reference"), default="standard", example="standard"),
    Key("method.ionization_fluctuations", Kind.SWITCH,
        "recombination responds to density and temperature: electron fraction contrasts (kinetic closure)",
        default=False, example="false"),
    Key("products.lag.fractions", Kind.NUMBERS,
        "ratios of baryon to dark-matter amplitude whose redshift is wanted",
        allowed=Allowed(0, 1, low_open=True, high_open=True), default=(0.5, 0.9, 0.95, 0.99),
        longest=MOST_FRACTIONS, longest_reason="more fractions are not tabulated in one run",
        example="[0.5, 0.9, 0.95, 0.99]"),
    Key("products.scales.mass_radius", Kind.NUMBER,
        "radius of the sphere whose mass is told, in wavelengths: 0.5, or 1 for eight times the mass",
        allowed=Allowed(0.1, 1), default=0.5, example="0.5"),
    Key("products.scales.together", Kind.NUMBER,
        "ratio of baryon to dark-matter amplitude from which on a mode no longer falls in but grows",
        allowed=Allowed(0, 1, low_open=True, high_open=True), default=0.9, example="0.9"),
    Key("products.scales.map_from", Kind.NUMBER, "redshift at which the map of verdicts starts; it ends at 0",
        allowed=Allowed(1, 1e6), default=1e4, example="1e4"),
    Key("products.growth.reference_redshift", Kind.NUMBER, "redshift at which the growth factors are 1",
        allowed=_REDSHIFT_LIMITS, default=1000.0, example="1000"),
    Key("products.spheres.radii", Kind.QUANTITIES, "comoving radii of the spheres",
        unit="Mpc", allowed=_RADIUS_LIMITS, example="[1 Mpc, 8 Mpc]", longest=MOST_SPHERES,
        longest_reason=_TOO_MANY_SPHERES,
        unsaid="8 Mpc/h, none beside masses"),
    Key("products.spheres.masses", Kind.QUANTITIES, "mean masses of matter in further spheres",
        unit="solMass", allowed=_MASS_LIMITS, example="[1e6 solMass, 1e8 solMass]", longest=MOST_SPHERES,
        longest_reason=_TOO_MANY_SPHERES, unsaid="none"),
    Key("products.shortfall.target_redshift", Kind.NUMBER,
        "redshift by which order unity is wanted, after the drag epoch",
        allowed=_REDSHIFT_LIMITS, default=7.5, example="7.5"),
    Key("products.shortfall.radii", Kind.QUANTITIES, "comoving radii of spheres to follow beside the waves",
        unit="Mpc", allowed=_RADIUS_LIMITS, example="[1 Mpc, 8 Mpc]", longest=MOST_SPHERES,
        longest_reason=_TOO_MANY_SPHERES, unsaid="none"),
    Key("products.shortfall.masses", Kind.QUANTITIES, "mean masses of spheres to follow beside the waves",
        unit="solMass", allowed=_MASS_LIMITS, example="[1e6 solMass, 1e8 solMass]", longest=MOST_SPHERES,
        longest_reason=_TOO_MANY_SPHERES, unsaid="none"),
    Key("products.streaming.from_redshift", Kind.NUMBER, "redshift at which patches of uniform streaming start",
        allowed=Allowed(10, 2000), default=1000.0, example="1000"),
    Key("products.streaming.velocities", Kind.NUMBERS, "streaming velocities of patches, in units of the rms",
        allowed=Allowed(0, 5), default=(0.0, 1.0, 2.0), longest=MOST_VELOCITIES,
        longest_reason="more velocities are not tabulated in one run", example="[0, 1, 2]"),
)  # fmt: skip

KEY_AT = {key.path: key for key in KEYS}

# Not part of the request: it is gone once the file is read.
BASE = Key("base", Kind.TEXT, "another scenario file to start from; everything else here is a change to it",
           unsaid="none, the file stands alone", example="saltmarsh-baseline.yaml")  # fmt: skip


def default_of(path):
    """Return the default of the key at a dotted path."""
    return KEY_AT[path].default


def keys_under(section):
    """Return the rows that stand directly in a section."""
    return [key for key in KEYS if key.section == section]


def sections_under(section):
    """Return the dotted paths of the sections that stand directly in a section."""
    return [path for path in SECTIONS if section_of(path) == section]


def names_under(section):
    """Return every name a section may hold, keys first."""
    top = [BASE.name] if section == BASE.section else []
    return top + [key.name for key in keys_under(section)] + [name_of(path) for path in sections_under(section)]
