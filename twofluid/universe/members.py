"""Several universes side by side: dataclasses of numbers turned into one of arrays, and back."""

from dataclasses import fields

import numpy as np


def side_by_side(items):
    """Make one dataclass of arrays, shape (universe,), of dataclasses of numbers, one a universe."""
    names = [field.name for field in fields(items[0])]
    return type(items[0])(**{name: np.array([getattr(item, name) for item in items]) for name in names})


def pick(arrays, index):
    """Take `array[index]` of every array of a dataclass from `side_by_side`."""
    return type(arrays)(**{field.name: getattr(arrays, field.name)[index] for field in fields(arrays)})
