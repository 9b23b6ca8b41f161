"""Tables that stand in files beside a scenario, read into its tree of entries with the lines they stand in.

From there on a table in a file and one written out in the scenario are the same.
"""

import os.path
import warnings
from dataclasses import replace

from .document import Entry, text_of_file
from .errors import ScenarioError, shortened
from .keys import KEY_AT, keys_under, section_of

FIRST_LINE = "# %ECSV"  # of every ECSV file; Astropy Proposal for Enhancement 6
_TABLE = KEY_AT["thermal.table"]
_REMEDY = "thin it out: smooth curves need a few dozen rows"


def with_tables(top):
    """Put the content of every table that a scenario names in the place of its name.

    Parameters
    ----------
    top : Entry
        The top of the tree; a file is looked for in the directory of the scenario file that names it.

    Returns
    -------
    Entry
        The top of the tree with columns for names.

    Raises
    ------
    ScenarioError
        A table cannot be read, is no ECSV table, or lacks a column or a unit.
    """
    section = section_of(_TABLE.path)
    outer = top.content.get(section)
    inner = outer.content if outer is not None else None
    asked = inner.get(_TABLE.name) if isinstance(inner, dict) else None
    if asked is None or not isinstance(asked.content, str):
        return top
    outer = replace(outer, content={**inner, _TABLE.name: _columns(asked)})
    return replace(top, content={**top.content, section: outer})


def _columns(asked):
    """Read the table that an entry names: an entry that holds its columns."""
    name = os.path.join(os.path.dirname(asked.file), asked.content)
    text = text_of_file(name, name, asked, _REMEDY)
    table = _ecsv(text, name)
    lines = [number for number, line in enumerate(text.splitlines(), 1) if line.strip() and line[0] != "#"]
    if len(lines) != len(table) + 1:  # a line of names, and one a row unless text in quotes runs over several
        lines = [None] * (len(table) + 1)
    columns = {}
    for part in keys_under(_TABLE.path):
        if part.name not in table.colnames:
            rule = f"has no column {part.name}"
            there = f"rename or add it; there is {', '.join(table.colnames)}"
            raise ScenarioError(rule, there, name, lines[0], _TABLE.path)
        columns[part.name] = _column(table[part.name], part, name, lines)
    return replace(asked, content=columns)


def _ecsv(text, name):
    """Let astropy read the text of an ECSV file."""
    if not text.startswith(FIRST_LINE):
        remedy = f"its first line must begin with {FIRST_LINE}; astropy.table.Table.write makes such files"
        raise ScenarioError("is not an ECSV table", remedy, name, 1)
    from astropy.table import Table  # slow to import, and most scenarios name no table

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # what matters is refused below
            return Table.read(text.splitlines(), format="ascii.ecsv")
    except Exception as error:  # whatever a reader of columns, numbers, YAML and units may raise
        reason = shortened(str(error).strip().partition("\n")[0])
        rule = f"is not an ECSV table that can be read ({reason})"
        raise ScenarioError(rule, "write it anew, for example by astropy.table.Table.write", name) from None


def _column(column, key, name, lines):
    """Make the entry of one column, every item with its unit and line."""
    if column.ndim != 1 or column.dtype.kind not in "iuf":
        raise ScenarioError("must be a column of plain numbers", "one number a row", name, lines[0], key.path)
    unit = str(column.unit or "")
    if not key.unit and unit and not _is_plain(column.unit):
        rule = f"must have no unit, but has {shortened(unit)}"
        raise ScenarioError(rule, "give plain numbers", name, lines[0], key.path)
    if key.unit and not unit:
        rule = "needs a unit"
        raise ScenarioError(rule, f"give it in {key.unit} or an equivalent unit", name, lines[0], key.path)
    suffix = f" {unit}" if key.unit else ""
    values = getattr(column, "filled", lambda _: column)(float("nan") if column.dtype.kind == "f" else 0)
    masked = getattr(column, "mask", [False] * len(column))
    items = tuple(
        Entry(None if hidden else f"{float(value)!r}{suffix}", key.path, name, line)
        for value, hidden, line in zip(values, masked, lines[1:], strict=True)
    )
    return Entry(items, key.path, name, lines[0])


def _is_plain(unit):
    """Whether a unit is one, so that its numbers are plain."""
    return unit.is_equivalent("") and float(unit.to("")) == 1.0
