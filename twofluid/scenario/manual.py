"""What the manual says about scenario files: the commented template and the table of keys."""

from .keys import BASE, GAS_SECTIONS, KEYS, MIXTURE, SECTIONS, Kind, keys_under, name_of, sections_under

INDENT = "  "  # one level of the template
TABLE_SECTION = "thermal.table"  # another one
RANGE_SECTION = "sampling.wavenumbers"  # the key whose value may be a mapping; the template shows that form
_REQUIRED_IN = {RANGE_SECTION: "required in a range", TABLE_SECTION: "required among columns"}
_REQUIRED_IN |= dict.fromkeys(GAS_SECTIONS, "required if the section is there")

_HEADING = """\
# A scenario: the whole request in one file. Quantities carry units, in any notation astropy.units reads.
# Where it says "default" the key may be left out. The values of the required keys are invented.

"""
_FAMILY = f"""\
# {BASE.meaning}
#   path relative to this file. Sections merge; a key replaces the one of the base, a range as a whole.
#   `null` takes back what the base says (a key, a product), {{}} empties a section; a title is not inherited.
#   Another filling: curvature_fraction: null beside a new cosmological_constant_fraction, or the reverse.
# {BASE.name}: {BASE.example}

"""


def scenario_template():
    """Write a scenario with every key, its meaning, unit, allowed values and default.

    Returns
    -------
    str
        Valid YAML; all keys with a fixed default stand at that default.
    """
    return _HEADING + _FAMILY + "\n".join(_section_lines("", 0)) + "\n"


def key_table_markdown():
    """Write the table of keys for the manual.

    Returns
    -------
    str
        A Markdown table, one row a key.
    """
    rows = ["| key | value | allowed | default | meaning |", "| --- | --- | --- | --- | --- |"]
    for key in (BASE, *KEYS):
        cells = (f"`{key.path}`", _value_text(key), _allowed_text(key), _default_cell(key), key.meaning)
        rows.append("| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |")
    return "\n".join(rows) + "\n"


def _section_lines(section, depth):
    lines = []
    for key in keys_under(section):
        lines += _key_lines(key, depth)
    for inner in sections_under(section):
        margin, optional, switch = INDENT * depth, inner in GAS_SECTIONS, _switch(inner)
        lines += ["", f"{margin}# {SECTIONS[inner]}"]
        lines += [f"{margin}#   without this section: {GAS_SECTIONS[inner]}"] if optional else []
        section = [f"{margin}{switch}{name_of(inner)}:", *_section_lines(inner, depth + 1)]
        lines += map(_commented, section) if optional else section
    return lines


def _commented(line):
    """Make a line of the template a comment, at its own margin."""
    text = line.lstrip()
    return line if text.startswith("#") or not text else line.removesuffix(text) + "# " + text


def _key_lines(key, depth):
    """Write one key: two lines of comment, and the key with its default or example."""
    margin = INDENT * depth
    facts = [_value_text(key), _allowed_text(key), _default_text(key)]
    comments = [f"{margin}# {key.meaning}", f"{margin}#   {'; '.join(fact for fact in facts if fact)}"]
    if key.path == RANGE_SECTION:
        parts = [line for part in keys_under(key.path) for line in _key_lines(part, depth + 1)]
        alternative = f"{margin}#   one by one: {key.name}: {key.example}; as a range:"
        return [*comments, alternative, f"{margin}{key.name}:", *parts]
    if key.path == TABLE_SECTION:
        parts = [line for part in keys_under(key.path) for line in _key_lines(part, depth + 1)]
        alternative = f"{margin}#   as a file: {key.name}: {key.example}; as columns:"
        return [*comments, alternative, f"{margin}{key.name}:", *parts]
    # A key whose default is not its example is shown commented out: the value would change the meaning.
    open_default = (key.default is None or key.unsaid) and not key.required and key.kind is not Kind.TEXT
    switch = "# " if open_default else _switch(key.section)
    return [*comments, f"{margin}{switch}{key.name}: {key.example}"]


def _switch(section):
    """Return what comments out a section that changes the meaning by being there."""
    return "# " if section.startswith(MIXTURE) else ""


def _value_text(key):
    return f"{key.kind.value} [{key.unit}]" if key.unit else key.kind.value


def _allowed_text(key):
    parts = [str(key.allowed)] if key.allowed else []
    if key.choices:
        parts.append(" or ".join(key.choices))
    if key.kind in (Kind.NUMBERS, Kind.QUANTITIES, Kind.WAVENUMBERS, Kind.TABLE):
        parts.append(f"at most {key.longest} entries" if key.longest else "only []")
    return ", ".join(parts)


def _default_text(key):
    if key.required:
        return "required"
    return "default: " + (key.unsaid or key.example)


def _default_cell(key):
    if key.section in _REQUIRED_IN and key.required:
        return _REQUIRED_IN[key.section]
    return _default_text(key).removeprefix("default: ")
