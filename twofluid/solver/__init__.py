"""The numerics: step clocks, collocation and block elimination for any linear system."""

from .clock import Clock, lay_out
from .collocation import NODES, WEIGHTS
from .elimination import Elimination
from .integrate import Course, SolverFailure, integrate
from .system import LinearSystem, StepRates, Tail, TailRates, rate_matrix

__all__ = [
    "NODES",
    "WEIGHTS",
    "Clock",
    "Course",
    "Elimination",
    "LinearSystem",
    "SolverFailure",
    "StepRates",
    "Tail",
    "TailRates",
    "integrate",
    "lay_out",
    "rate_matrix",
]
