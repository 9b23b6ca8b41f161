"""Several universes side by side: dataclasses of numbers turned into dataclasses of arrays."""

import numpy as np


class SideBySide:
    """Numbers of several universes, to be picked as arrays.

    Parameters
    ----------
    *parts : sequence of dataclass
        Each a list of dataclasses of one kind that hold nothing but numbers, one a universe.
    """

    def __init__(self, *parts):
        self._kinds = [(type(items[0]), tuple(vars(items[0]))) for items in parts]
        self._values = np.array(
            [[vars(item)[name] for item in items] for items in parts for name in vars(items[0])]
        )

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
            vars(part).update((name, next(values)) for name in names)  # what it worked out comes along
            picked.append(part)
        return picked
