"""Files, texts and mappings to scenarios."""

from dataclasses import replace
from os import fsdecode
from pathlib import Path

from .attached import with_tables
from .document import entry_from_plain, entry_from_text
from .errors import ScenarioError, printable
from .family import read_document, refuse_base
from .keys import (
    ADIABATIC,
    DEFAULT_PRODUCTS,
    GAS_SECTIONS,
    MIXTURE,
    OPTIONAL_SECTIONS,
    keys_under,
    name_of,
    sections_under,
)
from .mixture import Mixture, Share, check_mixture
from .names import checked_names
from .request import (
    Cosmology,
    DarkMatter,
    Method,
    Neutrinos,
    Primordial,
    Reionization,
    Sampling,
    Scenario,
    ThermalTable,
)
from .thermal import refuse_faults
from .values import read_value

UNTITLED = "untitled"  # title of a scenario that has neither a title nor a file


def read_scenario(path):
    """Read a scenario file.

    Parameters
    ----------
    path : str or path-like
        A YAML file, encoded in UTF-8; if it names a base, that is read too.

    Returns
    -------
    Scenario
        The request, its title the file's name without ending if the file gives none.

    Raises
    ------
    ScenarioError
        The file cannot be read or breaks a rule.
    """
    name = fsdecode(path)
    return _scenario(
        with_tables(read_document(path, name)), title=printable(Path(name).stem).strip() or UNTITLED, source=name
    )


def parse_scenario(text, *, name="<text>"):
    """Read a scenario from YAML text.

    Parameters
    ----------
    text : str
        YAML text.
    name : str
        What messages call it.

    Returns
    -------
    Scenario
        The request, with `source` None.

    Raises
    ------
    ScenarioError
        The text breaks a rule.
    """
    return _scenario(refuse_base(entry_from_text(text, name)), title=UNTITLED, source=None)


def scenario_from_mapping(mapping):
    """Read a scenario from a nested mapping, the inverse of `Scenario.to_mapping`.

    Parameters
    ----------
    mapping : dict
        What a scenario file would hold.

    Returns
    -------
    Scenario
        The request, with `source` None.

    Raises
    ------
    ScenarioError
        The mapping breaks a rule; without file and line.
    """
    return _scenario(refuse_base(entry_from_plain(mapping)), title=UNTITLED, source=None)


def _scenario(entry, title, source):
    values, assumed = {}, []
    entry = _with_products(entry)
    _read_section("", entry, values, assumed)
    if values["title"] is None:
        values["title"] = title
    scenario = Scenario(
        title=values["title"],
        cosmology=_cosmology(values),
        primordial=Primordial(**_pick(values, "primordial"), mixture=_mixture(values)),
        sampling=Sampling(**_pick(values, "sampling")),
        products={name: _pick(values, f"products.{name}") for name in entry.content["products"].content},
        assumed=tuple(assumed),
        source=source,
        method=Method(**_pick(values, "method")),
    )
    refuse_faults(entry, scenario)
    try:
        check_mixture(scenario)
    except ScenarioError as problem:
        raise entry.at(problem.key).error(problem.rule, problem.remedy) from None
    return scenario


def _cosmology(values):
    inner = {
        "neutrinos": Neutrinos(**_pick(values, "cosmology.neutrinos")),
        "dark_matter": DarkMatter(**_pick(values, "cosmology.dark_matter")),
    }
    if "thermal.table" in values:
        options = _pick(values, "thermal")
        inner["thermal"] = ThermalTable(**options.pop("table"), **options)
    if "reionization.redshift" in values:
        inner["reionization"] = Reionization(**_pick(values, "reionization"))
    return Cosmology(**_pick(values, "cosmology"), **inner)


def _mixture(values):
    """Make the mixture of initial modes, None where the file has none."""
    if f"{MIXTURE}.{ADIABATIC}" not in values:
        return None
    shares = {
        name_of(section): Share(**_pick(values, section))
        for section in sections_under(MIXTURE)
        if all(key.path in values for key in keys_under(section))
    }
    return Mixture(**_pick(values, MIXTURE), **shares)


def _with_products(entry):
    """Fill in the default products where nothing is said about them."""
    names = checked_names("", entry)
    products = names.get("products")
    if products is None:
        products = entry.child("products", {})
        products = replace(products, content={name: products.child(name, {}) for name in DEFAULT_PRODUCTS})
    return replace(entry, content={**names, "products": products})


def _pick(values, section):
    """Take the values that stand directly in a section."""
    return {key.name: values[key.path] for key in keys_under(section)}


def _read_section(section, entry, values, assumed):
    """Read the keys of a section and of those inside it; note the keys the file leaves out."""
    names = checked_names(section, entry)
    for key in keys_under(section):
        if key.name in names:
            values[key.path] = _read_key(key, names[key.name])
        elif key.required:
            raise _missing(entry, key)
        else:
            values[key.path] = key.default
            assumed.append(key.path)
    for inner in sections_under(section):
        name = name_of(inner)
        if inner in GAS_SECTIONS and (name not in names or names[name].cleared):
            assumed.append(inner)
        elif inner in GAS_SECTIONS and names[name].content == {}:
            continue  # none, as the file says
        elif name in names or inner not in OPTIONAL_SECTIONS:
            _read_section(inner, names.get(name) or entry.child(name, {}), values, assumed)


def _read_key(key, entry):
    """Read one value; the parts of a range are keys of their own."""
    parts = keys_under(key.path)
    if parts and isinstance(entry.content, dict):
        names = checked_names(key.path, entry)
        for part in parts:
            if part.name not in names:
                raise _missing(entry, part)
    return read_value(entry, key)


def _missing(entry, key):
    return entry.child(key.name, None).error("is required", f"add for example `{key.name}: {key.example}`")
