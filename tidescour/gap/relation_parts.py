"""What the entries of the table of discharge relations have in common: the kernels' signature, numbers and symbols."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

from tidescour.table import Parameter
from tidescour.units import FloatArray

Kernel = Callable[[float, float, float, FloatArray, FloatArray], tuple[float, float, float]]

GRAVITY: Final = ("g", "m/s2", "9.81")
BOTH_LEVELS: Final = (
    ("Q", "m3/s", "discharge, towards the lower side"),
    ("z1", "m", "upstream level above the datum"),
    ("z2", "m", "downstream level above the datum"),
    GRAVITY,
)
"""Rows of `symbols` that most relations begin with."""


def coefficient(meaning: str, high: float = 3.0, default: float | None = None) -> Parameter:
    """Return the number that multiplies a discharge."""
    return Parameter(name="coefficient", unit="-", low=0.0, high=high, meaning=meaning, default=default)
