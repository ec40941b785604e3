"""Rolling several quality flags of a sample up into one."""

from __future__ import annotations

from typing import Final

import numpy as np

from tidescour.errors import DomainError
from tidescour.gauge.records import FAIL, MISSING, NOT_EVALUATED, PASS, SUSPECT
from tidescour.units import FlagArray

MILD_TO_WORST: Final = (NOT_EVALUATED, PASS, SUSPECT, FAIL, MISSING)


def rolled_up(first: FlagArray, second: FlagArray) -> FlagArray:
    """Worse of two flags for each sample, where "not evaluated" hides nothing.

    Parameters
    ----------
    first, second : (n,) array of int8
        Flags 1, 2, 3, 4 or 9.

    Returns
    -------
    (n,) array of int8
        9 if either is, else 4 before 3 before 1; 2 only where both are.

    Raises
    ------
    DomainError
        If the shapes differ or a flag is none of the five.

    References
    ----------
    QARTOD manual for water level, version 2.1 (2021); flags of UNESCO/IOC (2013), Manuals and Guides 54.
    """
    if first.shape != second.shape:
        raise DomainError(f"flags of {first.shape} and {second.shape} samples cannot be rolled up")
    if not (np.isin(first, MILD_TO_WORST).all() and np.isin(second, MILD_TO_WORST).all()):
        raise DomainError("flags must be 1, 2, 3, 4 or 9")
    rank = np.zeros(10, dtype=np.int8)
    rank[list(MILD_TO_WORST)] = np.arange(len(MILD_TO_WORST))
    worst = np.maximum(rank[first], rank[second])
    return np.array(MILD_TO_WORST, dtype=np.int8)[worst]
