"""The three-stage Radau IIA collocation method: nodes, weights and their inverse.

The method has order five, is L-stable and stiffly accurate (the last stage is the new state),
so a component that decays much faster than the step is damped instead of amplified.

References
----------
Hairer, E. & Wanner, G. 1996, Solving Ordinary Differential Equations II, 2nd ed., section IV.5,
table 5.6 (from memory; the tests verify nodes, weights and order on their own).
"""

import numpy as np

STAGES = 3
LAST = STAGES - 1  # the stage that is the new state

_ROOT6 = np.sqrt(6.0)

#: Stage times within a step, shape (stage,) [unitless]; the zeros of the shifted Radau polynomial.
NODES = np.array([(4.0 - _ROOT6) / 10.0, (4.0 + _ROOT6) / 10.0, 1.0])


def _butcher_matrix() -> np.ndarray:
    """Integrate the Lagrange polynomials of the nodes: ``A[i, j] = int_0^{c_i} L_j``."""
    powers = np.arange(STAGES)
    vandermonde = NODES[:, None] ** powers
    integrals = NODES[:, None] ** (powers + 1) / (powers + 1)
    return integrals @ np.linalg.inv(vandermonde)


#: Butcher matrix, shape (stage, stage) [unitless].
WEIGHTS = _butcher_matrix()

#: Its inverse: the stage equations read ``(W - step * rate) Y = W 1 y``.
INVERSE_WEIGHTS = np.linalg.inv(WEIGHTS)

#: ``W 1``, what one unit of the old state contributes to each stage equation, shape (stage,).
STATE_LOAD = INVERSE_WEIGHTS.sum(axis=1)
