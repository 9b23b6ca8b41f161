"""Files, texts and mappings to scenarios."""

from dataclasses import replace
from difflib import get_close_matches
from os import fsdecode
from pathlib import Path

from .document import LARGEST_SIZE, entry_from_plain, entry_from_text, too_large
from .errors import ScenarioError, printable
from .keys import (
    DEFAULT_PRODUCTS,
    KEY_AT,
    SECTIONS,
    keys_under,
    name_of,
    names_under,
    section_of,
    sections_under,
)
from .request import Cosmology, Method, Neutrinos, Primordial, Sampling, Scenario
from .values import read_value

UNTITLED = "untitled"  # title of a scenario that has neither a title nor a file


def read_scenario(path):
    """Read a scenario file.

    Parameters
    ----------
    path : str or path-like
        A YAML file, encoded in UTF-8.

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
    try:
        with open(path, "rb") as file:
            data = file.read(LARGEST_SIZE + 1)
    except FileNotFoundError:
        raise ScenarioError("does not exist", "check the name and the directory", name) from None
    except IsADirectoryError:
        raise ScenarioError("is a directory", "name a file in it", name) from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise ScenarioError(f"cannot be read ({reason})", "check name and permissions", name) from None
    if len(data) > LARGEST_SIZE:
        raise too_large(name)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise ScenarioError("is not UTF-8 text", "save it as UTF-8", name, line) from None
    return _scenario(
        entry_from_text(text, name), title=printable(Path(name).stem).strip() or UNTITLED, source=name
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
    return _scenario(entry_from_text(text, name), title=UNTITLED, source=None)


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
    return _scenario(entry_from_plain(mapping), title=UNTITLED, source=None)


def _scenario(entry, title, source):
    values, assumed = {}, []
    entry = _with_products(entry)
    _read_section("", entry, values, assumed)
    if values["title"] is None:
        values["title"] = title
    neutrinos = Neutrinos(**_pick(values, "cosmology.neutrinos"))
    return Scenario(
        title=values["title"],
        cosmology=Cosmology(**_pick(values, "cosmology"), neutrinos=neutrinos),
        primordial=Primordial(**_pick(values, "primordial")),
        sampling=Sampling(**_pick(values, "sampling")),
        products={name: _pick(values, f"products.{name}") for name in entry.content["products"].content},
        assumed=tuple(assumed),
        source=source,
        method=Method(**_pick(values, "method")),
    )


def _with_products(entry):
    """Fill in the default products where nothing is said about them."""
    names = _checked_names("", entry)
    products = names.get("products")
    if products is None:
        products = entry.child("products", {})
        products = replace(products, content={name: products.child(name, {}) for name in DEFAULT_PRODUCTS})
    elif products.content is None:
        remedy = f"write {{}} for none, or leave the section out for {', '.join(DEFAULT_PRODUCTS)}"
        raise products.error("has no value", remedy)
    return replace(entry, content={**names, "products": products})


def _pick(values, section):
    """Take the values that stand directly in a section."""
    return {key.name: values[key.path] for key in keys_under(section)}


def _read_section(section, entry, values, assumed):
    """Read the keys of a section and of those inside it; note the keys the file leaves out."""
    names = _checked_names(section, entry)
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
        if name in names or section != "products":
            _read_section(inner, names.get(name) or entry.child(name, {}), values, assumed)


def _read_key(key, entry):
    """Read one value; the parts of a range are keys of their own."""
    parts = keys_under(key.path)
    if parts and isinstance(entry.content, dict):
        names = _checked_names(key.path, entry)
        for part in parts:
            if part.name not in names:
                raise _missing(entry, part)
    return read_value(entry, key)


def _checked_names(section, entry):
    """Return the entries of a section by name, after a look at the names; an empty section has none."""
    names = {} if entry.content is None else entry.content
    if not isinstance(names, dict):
        raise entry.error("must hold keys", f"write them as `key: value`: {', '.join(names_under(section))}")
    for name, item in names.items():
        if name not in names_under(section):
            raise item.error(*_unknown(section, name))
    return names


def _unknown(section, name):
    """Put in words that a name is unknown, and which one may be meant."""
    valid = names_under(section)
    place = f"in `{section}`" if section else "at the top"
    homes = [section_of(path) or "the top" for path in (*KEY_AT, *SECTIONS) if name_of(path) == name]
    if homes:
        return f"does not belong {place}", f"move it to {' or '.join(homes)}"
    close = get_close_matches(name, valid, n=1)
    if close:
        return "is an unknown key", f"did you mean {close[0]}?"
    if not valid:
        return "is an unknown key", f"`{section}` has no options"
    return "is an unknown key", f"known {place}: {', '.join(valid)}"


def _missing(entry, key):
    return entry.child(key.name, None).error("is required", f"add for example `{key.name}: {key.example}`")
