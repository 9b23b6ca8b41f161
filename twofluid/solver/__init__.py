"""The numerics: step clocks, collocation and block elimination for any linear system."""

from .clock import Clock, lay_out
from .collocation import NODES, WEIGHTS
from .elimination import Elimination
from .integrate import Course, LinearSystem, SolverFailure, integrate

__all__ = [
    "NODES",
    "WEIGHTS",
    "Clock",
    "Course",
    "Elimination",
    "LinearSystem",
    "SolverFailure",
    "integrate",
    "lay_out",
]
