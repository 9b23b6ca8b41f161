"""Entries to clean values: one function a kind, and the rules on ranges, lengths and repetitions."""

import re
import warnings
from difflib import get_close_matches
from functools import lru_cache
from itertools import pairwise
from math import isclose, isfinite

from .errors import shortened
from .keys import KEY_AT, Kind, keys_under
from .spacing import intervals, spaced_wavenumbers

ROUNDING = 1e-12  # relative slack at the ends of a range, for values that were converted to another unit
LONGEST_UNIT = 60  # characters; no unit in use is longer

_QUANTITY = re.compile(r"\s*([-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)\s*(.*?)\s*", re.DOTALL)
_SECOND_NUMBER = re.compile(r"[-+.\d]")
_SWITCH = {"true": True, "false": False}
_ONE_OVER = re.compile(r"1\s*/")
_LITTLE_H = re.compile(r"(?<![A-Za-z])(?:little)?h(?![A-Za-z])|hMpc|Mpch")


def read_value(entry, key):
    """Read the value of a key.

    Parameters
    ----------
    entry : Entry
        What the scenario says.
    key : Key
        The row of the table.

    Returns
    -------
    str, float or tuple of float
        The clean value, in the unit of the key.

    Raises
    ------
    ScenarioError
        The entry breaks a rule of that row.
    """
    _refuse_nothing(entry, key.example)
    return _READERS[key.kind](entry, key)


def _read_text(entry, key):
    if not isinstance(entry.content, str):
        raise entry.error("must be text", f"write for example {key.example}")
    if not entry.content.strip():
        raise entry.error("is blank", f"write for example {key.example}")
    if not entry.content.isprintable():
        raise entry.error("must be one line of printable text", "remove line breaks and control characters")
    return entry.content


def _read_choice(entry, key):
    if entry.content not in key.choices:
        close = get_close_matches(str(entry.content), key.choices, n=1)
        remedy = f"did you mean {close[0]}?" if close else f"write for example {key.example}"
        raise entry.error(f"must be {' or '.join(key.choices)}", remedy)
    return entry.content


def _read_number(entry, key):
    text = _scalar(entry, key, "one number")
    if entry.quoted:
        raise entry.error("must be a number, not text in quotes", "remove the quotes")
    try:
        value = float(text)
    except ValueError:
        remedy = f"write for example {_one_example(key)}"
        raise entry.error("must be a plain number, without a unit", remedy) from None
    return _within_range(value, entry, key)


def _read_quantity(entry, key):
    text = _scalar(entry, key, "one number with a unit")
    example = f"give it in {key.unit} or an equivalent unit, for example {_one_example(key)}"
    match = _QUANTITY.fullmatch(text)
    if not match:
        raise entry.error("must be a number with a unit", example)
    number, unit = match.groups()
    if not unit:
        raise entry.error("needs a unit", example)
    if _SECOND_NUMBER.match(unit) and not _ONE_OVER.match(unit):
        raise entry.error("holds two numbers", example)
    factor = 1.0 if unit == key.unit else _conversion_factor(unit, key.unit)
    if factor is None:
        rule = f"has a unit that cannot be read or converted to {key.unit}, '{shortened(unit)}'"
        if _LITTLE_H.search(unit):
            example = f"h reads as hour, so multiply by the Hubble constant over 100 yourself and {example}"
        raise entry.error(rule, example)
    return _within_range(float(number) * factor, entry, key)


@lru_cache(maxsize=256)
def _conversion_factor(unit, expected):
    """Return what one `unit` is in `expected`, or None if it cannot be read or converted."""
    from astropy import units  # slow to import, and files that use our own units never need it

    if len(unit) > LONGEST_UNIT:
        return None
    try:
        with warnings.catch_warnings():
            # km/s/Mpc draws a warning about its two slashes but is read as everybody means it.
            warnings.simplefilter("ignore", units.UnitsWarning)
            read = units.Unit(unit)
        # Logarithmic units (dex, mag) are no multiples and cannot be scaled by a factor.
        return float(read.to(expected)) if isinstance(read, units.UnitBase) else None
    except (ValueError, TypeError, ArithmeticError):
        return None


def _read_numbers(entry, key):
    return _read_list(entry, key, _read_number)


def _read_quantities(entry, key):
    return _read_list(entry, key, _read_quantity)


def _read_switch(entry, key):
    if entry.content not in _SWITCH or entry.quoted:
        raise entry.error("must be true or false", f"write for example {key.example}")
    return _SWITCH[entry.content]


def _read_table(entry, key):
    """Return the columns by name, as they stand; `thermal.py` has the rules on the rows."""
    if isinstance(entry.content, str):
        rule = "can name a file only in a scenario that is a file: there is no directory to look in"
        raise entry.error(rule, "write the columns out, or read the scenario from a file")
    if not isinstance(entry.content, dict):
        raise entry.error("must be a file name or columns", f"write for example {key.example}")
    parts = keys_under(key.path)
    return {part.name: _read_column(entry.content[part.name], part) for part in parts}


def _read_column(entry, key):
    _refuse_nothing(entry, key.example)
    read_item = _read_quantity if key.kind is Kind.QUANTITIES else _read_number
    return _read_list(entry, key, read_item, repetition=True)


def _read_list(entry, key, read_item, repetition=False):
    if not isinstance(entry.content, tuple):
        raise entry.error("must be a list", f"write for example {key.example}")
    if len(entry.content) > key.longest:
        limit = f"at most {key.longest} entries" if key.longest else "the empty list"
        raise entry.error(f"must be {limit}: {key.longest_reason}", f"write for example {key.example}")
    if len(entry.content) < key.shortest:
        raise entry.error("must not be an empty list", f"write for example {key.example}")
    values = tuple(read_item(item, key) for item in entry.content)
    if not (repetition or key.repeats):
        _refuse_repetition(values, entry.content)
    return values


def _refuse_repetition(values, items):
    """Refuse two equal values, also if they are equal only after a conversion of units."""
    order = sorted(range(len(values)), key=lambda index: (values[index], index))
    for first, second in pairwise(order):
        if isclose(values[first], values[second], rel_tol=ROUNDING):
            item = items[max(first, second)]
            raise item.error("stands twice in the list", "keep one")


def _read_wavenumbers(entry, key):
    if isinstance(entry.content, str):
        return (_read_quantity(entry, key),)
    if isinstance(entry.content, tuple):
        return _read_list(entry, key, _read_quantity)
    part = {name: read_value(item, KEY_AT[item.key]) for name, item in entry.content.items()}
    low, high, per_decade = part["from"], part["to"], part["per_decade"]
    if not low < high:
        raise entry.content["from"].error(
            f"must be less than `to`, which is {high:g} {key.unit}",
            "swap them, or give a single wavenumber in place of the range",
        )
    if intervals(low, high, per_decade) + 1 > key.longest:
        rule = f"makes more than {key.longest} wavenumbers"
        raise entry.content["per_decade"].error(rule, "give fewer points or a shorter range")
    return spaced_wavenumbers(low, high, per_decade)


def _scalar(entry, key, wanted):
    _refuse_nothing(entry, _one_example(key))
    if not isinstance(entry.content, str):
        raise entry.error(f"must be {wanted}", f"write for example {_one_example(key)}")
    return entry.content


def _refuse_nothing(entry, example):
    if entry.content is None:
        raise entry.error("has no value", f"give one, for example {example}")


def _one_example(key):
    """Return the example, or its first item if the example is a list."""
    return key.example.strip("[]").split(",")[0]


def _within_range(value, entry, key):
    if not isfinite(value):
        raise entry.error("must be a finite number", f"write for example {_one_example(key)}")
    allowed = key.allowed
    low = allowed.low - ROUNDING * abs(allowed.low)
    high = allowed.high + ROUNDING * abs(allowed.high)
    inside = (value > allowed.low if allowed.low_open else value >= low) and (
        value < allowed.high if allowed.high_open else value <= high
    )
    if not inside:
        unit = f" {key.unit}" if key.unit else ""
        raise entry.error("is out of range", f"give a value {allowed}{unit}")
    return value


_READERS = {
    Kind.TEXT: _read_text,
    Kind.NUMBER: _read_number,
    Kind.QUANTITY: _read_quantity,
    Kind.NUMBERS: _read_numbers,
    Kind.QUANTITIES: _read_quantities,
    Kind.WAVENUMBERS: _read_wavenumbers,
    Kind.CHOICE: _read_choice,
    Kind.SWITCH: _read_switch,
    Kind.TABLE: _read_table,
}
