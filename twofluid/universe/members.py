"""Several universes side by side: dataclasses of numbers turned into dataclasses of arrays."""

import numpy as np


class SideBySide:
    """Numbers of several universes, to be picked as arrays.

    Parameters
    ----------
    *parts : sequence of dataclass
        Each a list of dataclasses of one kind that hold nothing but numbers and tuples of them, one a universe.
        Where a tuple is longer in another universe, zeros are added.
    """

    def __init__(self, *parts):
        self._kinds, values = [], []
        for items in parts:
            names = {name: _longest(items, name) for name in vars(items[0])}
            self._kinds.append((type(items[0]), names))
            for name, length in names.items():
                rows = [vars(item)[name] for item in items]
                if length is None:
                    values.append(rows)
                else:
                    values += [[row[n] if n < len(row) else 0.0 for row in rows] for n in range(length)]
        self._values = np.array(values)

    def pick(self, owner):
        """Arrays of the universes named.

        Parameters
        ----------
        owner : array of int, any shape

        Returns
        -------
        list of dataclass
            One for each of the parts; it holds arrays shaped as `owner`.
        """
        picked, values = [], iter(self._values.take(owner, axis=1))
        for kind, names in self._kinds:
            part = object.__new__(kind)
            vars(part).update(  # what it worked out comes along
                (name, next(values) if length is None else tuple(next(values) for _ in range(length)))
                for name, length in names.items()
            )
            picked.append(part)
        return picked


def _longest(items, name):
    """Length of the longest of the tuples under a name, None if they are numbers."""
    if not isinstance(vars(items[0])[name], tuple):
        return None
    return max(len(vars(item)[name]) for item in items)
