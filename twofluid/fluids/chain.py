"""Chains of moments beyond the quadrupole: they stream, scatter alike, and are absorbed at the far end.

The hierarchy has no end, so the last moments are absorbed at a rate that grows towards the end of the chain as
``strength (l / last)^steepness``, in units of the streaming: a sharp end would send the stream back.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from ..solver import Tail

QUADRUPOLE = 2  # it and the moments below stay as published


@dataclass(frozen=True)
class Chain:
    """One chain.

    Attributes
    ----------
    name : str
        What its moments are named after: NAME_MOMENT.
    last : int
        Highest moment followed [unitless].
    layer : tuple of float
        Strength and steepness of the absorbing layer.
    sources : mapping of str to float, optional
        What the third moment is fed by, beside the quadrupole, and its weight.
    """

    name: str
    last: int
    layer: tuple[float, float]
    sources: Mapping[str, float] = field(default_factory=dict)

    @property
    def members(self) -> tuple[str, ...]:
        """Names of the moments beyond the quadrupole."""
        return tuple(f"{self.name}_{moment}" for moment in range(QUADRUPOLE + 1, self.last + 1))

    def tail(self, row: Mapping[str, int]) -> Tail:
        """Write the chain down for the solver (Ma & Bertschinger 1995, eqs 49, 51, 58, 63 and 64, high moments).

        Parameters
        ----------
        row : mapping of str to int
            Where every unknown stands.
        """
        moments = np.arange(QUADRUPOLE + 1, self.last + 1)
        strength, steepness = self.layer
        down, up = moments / (2 * moments + 1), -(moments + 1) / (2 * moments + 1)
        matrix = np.diag(-strength * (moments / self.last) ** steepness) + np.diag(down[1:], -1) + np.diag(up[:-1], 1)
        first = (moments == moments[0]).astype(float)
        quadrupole = f"{self.name}_{QUADRUPOLE}"
        return Tail(
            rows=tuple(row[name] for name in self.members),
            matrix=matrix,
            entrance=down[0] * first,
            exit=-(QUADRUPOLE + 1) / (2 * QUADRUPOLE + 1) * first,
            sources={row[name]: weight for name, weight in ({quadrupole: 1.0} | dict(self.sources)).items()},
            sink=row[quadrupole],
        )
