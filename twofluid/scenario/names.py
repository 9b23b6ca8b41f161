"""Which names a section may hold, and what to tell someone who writes another one."""

from difflib import get_close_matches

from .keys import BASE, DEFAULT_PRODUCTS, KEY_AT, MIXTURE, SECTIONS, name_of, names_under, section_of, sections_under


def checked_names(section, entry):
    """Return the entries of a section by name, after a look at the names.

    Parameters
    ----------
    section : str
        Dotted path of the section, empty at the top.
    entry : Entry
        What the scenario says there.

    Returns
    -------
    dict of str to Entry
        The entries; none for a section without value.

    Raises
    ------
    ScenarioError
        The entry holds no names, or one that does not belong there.
    """
    if section == "products" and entry.content is None:  # neither none nor the default
        remedy = f"write {{}} for none, or leave the section out for {', '.join(DEFAULT_PRODUCTS)}"
        raise entry.error("has no value", remedy)
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
    homes = [section_of(path) or "the top" for path in (BASE.path, *KEY_AT, *SECTIONS) if name_of(path) == name]
    homes = [home for home in homes if home not in sections_under(MIXTURE)] or homes  # they all have the same
    if homes:
        return f"does not belong {place}", f"move it to {' or '.join(homes)}"
    close = get_close_matches(name, valid, n=1)
    if close:
        return "is an unknown key", f"did you mean {close[0]}?"
    if not valid:
        return "is an unknown key", f"`{section}` has no options"
    return "is an unknown key", f"known {place}: {', '.join(valid)}"
