"""The critical Shields parameter, by the size of the grain."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np

from tidescour.errors import DomainError
from tidescour.table import Entry, symbols
from tidescour.units import FloatArray

ShieldsCurve = Callable[[FloatArray], FloatArray]


def soulsby_shields(grain_size: FloatArray) -> FloatArray:
    """Critical Shields parameter after Soulsby.

    Parameters
    ----------
    grain_size : (n,) array
        Dimensionless grain size D* [-], over 0.1.

    Returns
    -------
    (n,) array
        Critical Shields parameter [-]; NaN where the grain size is.

    Raises
    ------
    DomainError
        If a grain size is 0.1 or less.

    References
    ----------
    Soulsby 1997, Dynamics of Marine Sands, equation 77 (from memory).
    """
    _check_grain_size(grain_size, low=0.1, low_included=False)
    return 0.30 / (1.0 + 1.2 * grain_size) + 0.055 * -np.expm1(-0.020 * grain_size)


def van_rijn_shields(grain_size: FloatArray) -> FloatArray:
    """Critical Shields parameter after van Rijn: five pieces that do not quite meet.

    Parameters
    ----------
    grain_size : (n,) array
        Dimensionless grain size D* [-], 1 or more.

    Returns
    -------
    (n,) array
        Critical Shields parameter [-], with jumps of -4, +5 and -1 % at 4, 20 and 150; NaN where the grain size is.

    Raises
    ------
    DomainError
        If a grain size is under 1.

    References
    ----------
    Van Rijn 1984, Journal of Hydraulic Engineering 110(10), part I (from memory).
    """
    _check_grain_size(grain_size, low=1.0, low_included=True)
    d = np.asarray(grain_size, dtype=np.float64)
    pieces = [0.24 / d, 0.14 * d**-0.64, 0.04 * d**-0.10, 0.013 * d**0.29, np.full_like(d, 0.055)]
    where = [d <= 4.0, d <= 10.0, d <= 20.0, d <= 150.0, d > 150.0]
    return np.asarray(np.select(where, pieces, default=np.nan), dtype=np.float64)


def brownlie_shields(grain_size: FloatArray) -> FloatArray:
    """Critical Shields parameter after Brownlie.

    Parameters
    ----------
    grain_size : (n,) array
        Dimensionless grain size D* [-], positive; the grain Reynolds number is its power 1.5.

    Returns
    -------
    (n,) array
        Critical Shields parameter [-]; NaN where the grain size is.

    Raises
    ------
    DomainError
        If a grain size is not positive.

    References
    ----------
    Brownlie 1981, as given by Parker 2004, e-book on sediment transport morphodynamics, chapter 6.
    """
    _check_grain_size(grain_size, low=0.0, low_included=False)
    power = np.power(grain_size, -0.9)
    return np.asarray(0.22 * power + 0.06 * np.power(10.0, -7.7 * power), dtype=np.float64)


_SYMBOLS: Final = symbols(
    ("theta_c", "-", "critical Shields parameter"),
    ("D*", "-", "dimensionless grain size"),
    ("d50", "m", "median grain size"),
    ("Delta", "-", "density of the grains over that of the water, less 1"),
    ("nu", "m2/s", "kinematic viscosity of the water"),
    ("g", "m/s2", "9.81"),
)

SHIELDS: Final[dict[str, Entry[ShieldsCurve]]] = {
    "soulsby": Entry(
        name="soulsby",
        title="Critical Shields parameter, Soulsby",
        function=soulsby_shields,
        says="theta_c = 0.30 / (1 + 1.2 D*) + 0.055 (1 - exp(-0.020 D*)), D* = d50 (g Delta / nu^2)^(1/3)",
        symbols=_SYMBOLS,
        validity="dimensionless grain size over 0.1; sand without cohesion",
        source="Soulsby 1997, Dynamics of Marine Sands, equation 77",
        confidence="from memory",
    ),
    "van-rijn": Entry(
        name="van-rijn",
        title="Critical Shields parameter, van Rijn",
        function=van_rijn_shields,
        says="theta_c = 0.24 / D* up to D* = 4, 0.14 D*^-0.64 up to 10, 0.04 D*^-0.10 up to 20, 0.013 D*^0.29 up to "
        "150, then 0.055; D* = d50 (g Delta / nu^2)^(1/3)",
        symbols=_SYMBOLS,
        validity="dimensionless grain size of 1 and more; jumps of up to 5 % at 4, 20 and 150",
        source="van Rijn 1984, Journal of Hydraulic Engineering 110(10), part I",
        confidence="from memory",
    ),
    "brownlie": Entry(
        name="brownlie",
        title="Critical Shields parameter, Brownlie",
        function=brownlie_shields,
        says="theta_c = 0.22 R^-0.6 + 0.06 10^(-7.7 R^-0.6), R = D*^1.5, D* = d50 (g Delta / nu^2)^(1/3)",
        symbols=(*_SYMBOLS, *symbols(("R", "-", "Reynolds number of the grain"))),
        validity="any grain without cohesion",
        source="Brownlie 1981, as given by Parker 2004, e-book, chapter 6",
        confidence="published",
    ),
}


def _check_grain_size(grain_size: FloatArray, *, low: float, low_included: bool) -> None:
    outside = np.less(grain_size, low) if low_included else np.less_equal(grain_size, low)
    if np.any(outside):
        limit = "must be at least" if low_included else "must be over"
        raise DomainError(f"the dimensionless grain size {np.min(grain_size):.4g} {limit} {low:g} for this curve")
