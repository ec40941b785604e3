"""When sand begins to move: critical Shields parameter, and the depth-mean velocity that goes with it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np

from tidescour.errors import DomainError
from tidescour.table import Entry
from tidescour.units import GRAVITY_M_S2, FloatArray

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


SHIELDS: Final[dict[str, Entry[ShieldsCurve]]] = {
    "soulsby": Entry(
        name="soulsby",
        title="Critical Shields parameter, Soulsby",
        function=soulsby_shields,
        validity="dimensionless grain size over 0.1; sand without cohesion",
        source="Soulsby 1997, Dynamics of Marine Sands, equation 77",
        confidence="from memory",
    ),
    "van-rijn": Entry(
        name="van-rijn",
        title="Critical Shields parameter, van Rijn",
        function=van_rijn_shields,
        validity="dimensionless grain size of 1 and more; jumps of up to 5 % at 4, 20 and 150",
        source="van Rijn 1984, Journal of Hydraulic Engineering 110(10), part I",
        confidence="from memory",
    ),
    "brownlie": Entry(
        name="brownlie",
        title="Critical Shields parameter, Brownlie",
        function=brownlie_shields,
        validity="any grain without cohesion",
        source="Brownlie 1981, as given by Parker 2004, e-book, chapter 6",
        confidence="published",
    ),
}


def dimensionless_grain_size(
    grain_size_m: float, submerged_relative_density: float, kinematic_viscosity_m2_s: float
) -> float:
    """Dimensionless grain size D* = d50 (g Delta / nu2) ** (1/3), of positive d50 [m], Delta [-] and nu [m2/s].

    Raises
    ------
    DomainError
        If one of them is not positive.
    """
    if not (grain_size_m > 0.0 and submerged_relative_density > 0.0 and kinematic_viscosity_m2_s > 0.0):
        raise DomainError("grain size, submerged relative density and viscosity must be positive")
    return float(grain_size_m * np.cbrt(GRAVITY_M_S2 * submerged_relative_density / kinematic_viscosity_m2_s**2))


def critical_velocity(
    shields: str,
    grain_size_m: float,
    depth_m: float,
    submerged_relative_density: float,
    kinematic_viscosity_m2_s: float,
    roughness_d50: float,
) -> float:
    """Depth-mean velocity at which the bed begins to move.

    Parameters
    ----------
    shields : str
        Name in `SHIELDS`.
    grain_size_m : float
        d50 [m], positive.
    depth_m : float
        Water depth [m], over a twelfth of the roughness.
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    kinematic_viscosity_m2_s : float
        Of the water [m2/s], positive.
    roughness_d50 : float
        Roughness ks over d50, positive.

    Returns
    -------
    float
        Critical velocity [m/s].

    Raises
    ------
    DomainError
        If a number is not positive, the depth is not over ks / 12, or the grain is outside the range of the curve.

    References
    ----------
    u_c = (C / sqrt g) sqrt(theta_c g Delta d50) with C = 18 log10(12 h / ks): rough-bed Chezy, common practice.
    """
    grain_size = dimensionless_grain_size(grain_size_m, submerged_relative_density, kinematic_viscosity_m2_s)
    roughness_m = roughness_d50 * grain_size_m
    if not 12.0 * depth_m > roughness_m > 0.0:
        raise DomainError(
            f"the depth of {depth_m:.4g} m is not over a twelfth of the bed's roughness of {roughness_m:.4g} m: "
            "no critical velocity"
        )
    shear = SHIELDS[shields].function(np.asarray(grain_size)) * submerged_relative_density * grain_size_m
    return float(18.0 * np.log10(12.0 * depth_m / roughness_m) * np.sqrt(shear))


def closed_form_critical_velocity(grain_size_m: float, coarse_size_m: float, depth_m: float) -> float:
    """Critical velocity of quartz sand in fresh water of 15 C, to hold the computed one against.

    Parameters
    ----------
    grain_size_m, coarse_size_m : float
        d50, 0.1 to 2 mm, and d90 [m].
    depth_m : float
        Water depth [m], over a quarter of d90.

    Returns
    -------
    float
        Depth-mean critical velocity [m/s].

    Raises
    ------
    DomainError
        If d50 is outside 0.1 to 2 mm, or the depth not over a quarter of d90.

    References
    ----------
    van Rijn 1984, Journal of Hydraulic Engineering 110(10), part I (from memory).
    """
    if not 1e-4 <= grain_size_m <= 2e-3:
        raise DomainError(f"d50 = {1000.0 * grain_size_m:g} mm must lie in 0.1 to 2 mm for the closed form")
    if not 4.0 * depth_m > coarse_size_m > 0.0:
        raise DomainError(f"the depth of {depth_m:.4g} m must be over a quarter of d90 = {1000.0 * coarse_size_m:g} mm")
    factor, exponent = (0.19, 0.1) if grain_size_m <= 5e-4 else (8.5, 0.6)
    return float(factor * grain_size_m**exponent * np.log10(4.0 * depth_m / coarse_size_m))


def _check_grain_size(grain_size: FloatArray, *, low: float, low_included: bool) -> None:
    outside = np.less(grain_size, low) if low_included else np.less_equal(grain_size, low)
    if np.any(outside):
        limit = "must be at least" if low_included else "must be over"
        raise DomainError(f"the dimensionless grain size {np.min(grain_size):.4g} {limit} {low:g} for this curve")
