"""Rules on the late history of the gas that tie several keys together."""

from dataclasses import dataclass
from itertools import pairwise
from math import log1p

FEWEST_ROWS = 5  # fewer do not tell a history
WIDEST_GAP = 0.5  # in ln(1 + z): what a curve does in between would be guessed
HYDROGEN_OVER_HELIUM = 0.251793  # masses of the atoms; standard atomic mass table, from memory
SLACK = 1e-3  # relative, of full ionization: tables are rounded
SHARPEST_STEP = 0.02  # width of reionization over 1 + z: five nodes of the tables of the universe
COMPLETE_STEP = 4.0  # redshift of reionization over its width: all but 3e-4 is ionized today


@dataclass(frozen=True)
class Fault:
    """A rule that is broken.

    Attributes
    ----------
    key : str
        Dotted key.
    row : int or None
        Which entry of a column.
    value : float
        What stands there.
    rule, remedy : str
        What is wrong and what to do about it.
    """

    key: str
    row: int | None
    value: float
    rule: str
    remedy: str

    def sentence(self):
        """Say it in one line, for a cosmology that was not read from a file."""
        place = self.key if self.row is None else f"{self.key}[{self.row}]"
        return f"{place} = {self.value:g}: {self.rule}; {self.remedy}"


def full_ionization(helium_mass_fraction):
    """Electrons per hydrogen nucleus when none is bound [unitless]."""
    return 1.0 + 2.0 * helium_mass_fraction / (1.0 - helium_mass_fraction) * HYDROGEN_OVER_HELIUM


def thermal_fault(cosmology):
    """Find the first rule on tables and reionization that a cosmology breaks.

    Parameters
    ----------
    cosmology : Cosmology

    Returns
    -------
    Fault or None
        Rows are counted in the order of rising redshift.
    """
    fault = None
    if cosmology.thermal is not None:  # each rule counts on those before it
        fault = _order(cosmology.thermal) or _cover(cosmology.thermal) or _values(cosmology)
    if cosmology.reionization is not None:
        fault = fault or _step(cosmology.reionization)
    return fault


def _order(table):
    z = table.redshift
    lengths = [len(values) for values in table.table.values()]
    if len(set(lengths)) > 1:
        names = ", ".join(f"{name} {length}" for name, length in zip(table.table, lengths, strict=True))
        rule = f"the columns differ in length: {names}"
        return Fault("thermal.table.redshift", None, len(z), rule, "give one value of each a row")
    if len(z) < FEWEST_ROWS:
        rule = f"has too few rows, {len(z)}"
        return Fault("thermal.table.redshift", None, len(z), rule, f"give at least {FEWEST_ROWS}")
    for row, (low, high) in enumerate(pairwise(z), 1):
        if not low < high:
            return Fault("thermal.table.redshift", row, high, "redshifts must rise, or fall, from row to row",
                         "sort the rows, and keep one of those at the same redshift")  # fmt: skip
    return None


def _cover(table):
    z = table.redshift
    if z[0] != 0.0:
        rule = "the table must reach redshift 0, where runs end"
        return Fault("thermal.table.redshift", 0, z[0], rule, "add a row at redshift 0")
    if z[-1] < table.below_redshift:
        rule = f"the table ends below below_redshift, which is {table.below_redshift:g}"
        return Fault("thermal.table.redshift", len(z) - 1, z[-1], rule, "add rows, or lower below_redshift")
    for row, (low, high) in enumerate(pairwise(z), 1):
        if log1p(high) - log1p(low) > WIDEST_GAP:
            rule = f"leaves a gap of more than {WIDEST_GAP:g} in ln(1 + z) down to {low:g}"
            return Fault("thermal.table.redshift", row, high, rule, "add rows in between")
    if table.joining_width > log1p(table.below_redshift):
        rule = "the joining would not be over by redshift 0"
        return Fault("thermal.joining_width", None, table.joining_width, rule, "make it narrower")
    return None


def _values(cosmology):
    most = full_ionization(cosmology.helium_mass_fraction)
    for row, (temperature, electrons) in enumerate(
        zip(cosmology.thermal.gas_temperature, cosmology.thermal.electron_fraction, strict=True)
    ):
        if not 0.0 < temperature < float("inf"):
            return Fault("thermal.table.gas_temperature", row, temperature, "must be above 0", "give it in kelvin")
        if not 0.0 < electrons <= most * (1.0 + SLACK):
            rule = f"must be above 0 and at most {most:.4g}, full ionization with this helium"
            return Fault("thermal.table.electron_fraction", row, electrons, rule, "count them per hydrogen nucleus")
    return None


def _step(step):
    narrowest, widest = SHARPEST_STEP * (1.0 + step.redshift), step.redshift / COMPLETE_STEP
    if not narrowest <= step.width <= widest:
        rule = f"must be from {narrowest:.4g} to {widest:.4g} for a step at redshift {step.redshift:g}"
        return Fault("reionization.width", None, step.width, rule, "sharper is not resolved, wider not over by today")
    if step.gas_temperature is not None and not 0.0 < step.gas_temperature < float("inf"):
        return Fault("reionization.gas_temperature", None, step.gas_temperature, "must be above 0", "give kelvin")
    return None


def refuse_faults(top, scenario):
    """Raise the error for the first such rule that a scenario breaks, at the entry to blame.

    Parameters
    ----------
    top : Entry
        The top of the tree it was read from.
    scenario : Scenario

    Raises
    ------
    ScenarioError
    """
    if scenario.method.ionization_fluctuations and scenario.method.closure != "kinetic":
        entry = top.at("method.ionization_fluctuations")
        raise entry.error("needs the closure kinetic", "set method.closure to kinetic, or leave this out")
    fault = thermal_fault(scenario.cosmology)
    if fault is None:
        return
    entry = top.at(fault.key)
    if fault.row is not None:
        redshifts = top.at("thermal.table.redshift").content
        falling = float(redshifts[0].content) > float(redshifts[-1].content)
        entry = entry.content[-1 - fault.row if falling else fault.row]
    raise entry.error(fault.rule, fault.remedy)


def thermal_sentence(cosmology):
    """Say in one line what heats or ionizes the gas beside recombination and Compton scattering.

    Parameters
    ----------
    cosmology : Cosmology

    Returns
    -------
    str
        Empty if nothing does.
    """
    parts = []
    table, step = cosmology.thermal, cosmology.reionization
    if table is not None:
        parts.append(
            f"gas temperature and electrons from a table of {len(table.redshift)} rows below redshift "
            f"{table.below_redshift:g}, joined over {table.joining_width:g} in ln(1 + z)"
        )
    if step is not None:
        warmth = "no heat brought" if step.gas_temperature is None else f"gas kept at {step.gas_temperature:g} K"
        parts.append(f"reionization at redshift {step.redshift:g}, width {step.width:g}, {warmth}")
    if not parts:
        return ""
    return "; ".join([*parts, "landmarks are those of the gas without"])
