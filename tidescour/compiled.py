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
    """Compile a numeric function when it is first called, and keep the result on disk where there is a place for it.

    It may make no array: what it fills in comes as an argument. Arrays need not be counted then each time they are
    handed on, which takes half of a routing's time.
    """
    return cast(F, _kept(function))


def _kept(function: Callable[..., Any], signature: Any = None) -> Any:
    options: dict[str, Any] = {"error_model": "numpy", "_nrt": False, "nogil": True}
    try:
        return numba.njit(signature, cache=True, **options)(function)
    except RuntimeError:
        # Neither the package's folder nor the user's cache can be written: compile anew in every run.
        return numba.njit(signature, **options)(function)


def compiled_relation(function: F) -> F:
    """Compile a discharge relation with the one signature of their table, so that all can stand in one tuple.

    Three levels, the section's layers and the relation's numbers in; discharge, area and width out.
    """
    scalar = numba.float64
    layers = numba.types.Array(scalar, 2, "C", readonly=True)
    numbers = numba.types.Array(scalar, 1, "C", readonly=True)
    signature = numba.types.Tuple((scalar, scalar, scalar))(scalar, scalar, scalar, layers, numbers)
    return cast(F, _kept(function, signature))
