"""The one place that knows how numeric kernels are compiled.

Why compiled: one step of the basin depends on the one before, so arrays over time do not help, and plain Python takes
over a hundred times longer (DEVELOPERS.md has the measurement).
"""

from __future__ import annotations

import warnings
from collections.abc import Callable
from typing import Any, TypeVar, cast

import numba
from numba.core.errors import NumbaExperimentalFeatureWarning

F = TypeVar("F", bound=Callable[..., Any])

# Tables of kernels are handed to the router as tuples of functions with one signature: a part of the compiler that
# still carries this label.
warnings.filterwarnings("ignore", category=NumbaExperimentalFeatureWarning)


def compiled(function: F) -> F:
    """Compile a numeric function when it is first called, and keep the result on disk where there is a place for it."""
    return cast(F, _kept(function))


def _kept(function: Callable[..., Any], signature: Any = None) -> Any:
    try:
        return numba.njit(signature, cache=True, error_model="numpy")(function)
    except RuntimeError:
        # Neither the package's folder nor the user's cache can be written: compile anew in every run.
        return numba.njit(signature, error_model="numpy")(function)


def compiled_relation(function: F) -> F:
    """Compile a discharge relation with the one signature of their table, so that all can stand in one tuple.

    Four floats and a read-only row of numbers in, two floats out.
    """
    numbers = numba.types.Array(numba.float64, 1, "C", readonly=True)
    scalar = numba.float64
    pair = numba.types.Tuple((scalar, scalar))
    signature = pair(scalar, scalar, scalar, scalar, numbers)
    return cast(F, _kept(function, signature))
