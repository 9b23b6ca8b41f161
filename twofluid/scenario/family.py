"""A scenario that starts from another one: the entries of a base and the changes made to them.

Sections merge name by name, whatever their depth; a key of the table replaces what the base says under
it, whole, also where it holds a range. Two values have a meaning of their own: `null` takes back what
the base says under that name, and `{}` empties a section. Every entry keeps the file and line it stands
in, so that a wrong value is reported where it was written.
"""

import os.path
from dataclasses import replace

from .document import entry_from_text, text_of_file
from .keys import BASE, SECTIONS, path_in
from .names import checked_names
from .values import read_value

MOST_BASES = 8  # files a scenario may rest on; nobody can follow a longer chain by eye


def read_document(path, name, asked=None, above=()):
    """Read a scenario file and all it rests on.

    Parameters
    ----------
    path : path-like
        The file.
    name : str
        What messages call it.
    asked : Entry, optional
        The entry that names the file as its base.
    above : tuple of str
        Real paths of the files that rest on this one.

    Returns
    -------
    Entry
        The top of the tree, the changes made and no base left.

    Raises
    ------
    ScenarioError
        A file cannot be read or is no tree of entries, the chain of bases is too long or comes back to
        a file that is part of it, or a change does not fit its base.
    """
    top = entry_from_text(text_of_file(path, name, asked), name)
    chain = (*above, os.path.realpath(path))
    asked = checked_names("", top).get(BASE.name)
    top = _without(top, BASE.name)
    if asked is None:
        return top
    path = os.path.join(os.path.dirname(name), read_value(asked, BASE))
    _refuse_endless(asked, path, chain)
    base = read_document(path, path, asked, chain)
    # A title names one scenario, never its relatives.
    return merged("", _without(base, "title"), top)


def refuse_base(entry):
    """Refuse a base in a scenario that was not read from a file, and return the entry as it is."""
    names = checked_names("", entry)
    if BASE.name in names:
        rule = "can be given in a file only: there is no directory to look in"
        raise names[BASE.name].error(rule, "write the scenario out, or read it from a file")
    return entry


def merged(section, base, change):
    """Make the changes of one section to its base.

    Parameters
    ----------
    section : str
        Dotted path of the section, empty at the top.
    base, change : Entry
        What the base says there and what is said about it.

    Returns
    -------
    Entry
        The section with the changes made; it stands where the changes stand.

    Raises
    ------
    ScenarioError
        A name is unknown or cannot be taken back, since the base does not give it.
    """
    names = dict(checked_names(section, base))
    for name, entry in checked_names(section, change).items():
        path = path_in(section, name)
        if entry.cleared:
            if name not in names:
                raise entry.error("takes back what the base does not give", "remove the line")
            del names[name]
        elif path in SECTIONS and entry.content != {}:
            names[name] = merged(path, names.get(name, replace(entry, content={})), entry)
        else:
            names[name] = entry
    return replace(change, content=names)


def _refuse_endless(asked, path, chain):
    path = os.path.realpath(path)
    if path in chain:
        rule = "is this file itself" if path == chain[-1] else "rests on this file in turn"
        raise asked.error(rule, "let the last file of the chain stand without a base")
    if len(chain) > MOST_BASES:
        raise asked.error(f"makes a chain of more than {MOST_BASES} bases", "write one of them out")


def _without(entry, name):
    return replace(entry, content={key: item for key, item in entry.content.items() if key != name})
