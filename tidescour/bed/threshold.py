"""When sand begins to move: the shear velocity, and the depth-mean velocity that goes with it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np

from tidescour.bed.shields import SHIELDS
from tidescour.errors import DomainError
from tidescour.table import Entry, symbols
from tidescour.units import GRAVITY_M_S2

VelocityProfile = Callable[[float, float], float]

VON_KARMAN: Final = 0.40


def chezy_profile(depth_m: float, roughness_m: float) -> float:
    """Depth-mean velocity over shear velocity, by the Chezy coefficient of a rough bed.

    Parameters
    ----------
    depth_m : float
        Water depth h [m], over a twelfth of the roughness.
    roughness_m : float
        Roughness ks [m], positive.

    Returns
    -------
    float
        C / sqrt(g) [-], positive.

    Raises
    ------
    DomainError
        If the roughness is not positive or the depth not over a twelfth of it.

    References
    ----------
    C = 18 log10(12 h / ks): common practice.
    """
    _check_depth(depth_m, roughness_m)
    return float(18.0 * np.log10(12.0 * depth_m / roughness_m) / np.sqrt(GRAVITY_M_S2))


def log_law_profile(depth_m: float, roughness_m: float) -> float:
    """Depth-mean velocity over shear velocity, by the logarithmic law over a rough bed.

    Arguments, result and errors as `chezy_profile`; the two agree within 0.75 % where h / ks is over 1000.

    References
    ----------
    u = (u* / 0.40) ln(30 z / ks) from z = ks / 30, where it is 0, to h: its mean over the depth.
    """
    _check_depth(depth_m, roughness_m)
    relative = 30.0 * depth_m / roughness_m
    return float((np.log(relative) - 1.0 + 1.0 / relative) / VON_KARMAN)


PROFILES: Final[dict[str, Entry[VelocityProfile]]] = {
    "chezy": Entry(
        name="chezy",
        title="Depth-mean over shear velocity by the Chezy coefficient",
        function=chezy_profile,
        says="u / u* = C / sqrt(g), C = 18 log10(12 h / ks)",
        symbols=symbols(
            ("u", "m/s", "mean velocity over the depth"),
            ("u*", "m/s", "shear velocity"),
            ("h", "m", "water depth"),
            ("ks", "m", "roughness of the bed"),
            ("C", "m^0.5/s", "Chezy coefficient of the bed"),
            ("g", "m/s2", "9.81"),
        ),
        validity="rough bed, h over ks / 12",
        source="rough-bed logarithmic law, as in Soulsby (1997), Dynamics of Marine Sands (from memory)",
        confidence="from memory",
    ),
    "log-law": Entry(
        name="log-law",
        title="Depth-mean over shear velocity by the mean of the logarithmic law",
        function=log_law_profile,
        says="u / u* = (ln(30 h / ks) - 1 + ks / (30 h)) / 0.40",
        symbols=symbols(
            ("u", "m/s", "mean velocity over the depth"),
            ("u*", "m/s", "shear velocity"),
            ("h", "m", "water depth"),
            ("ks", "m", "roughness of the bed"),
        ),
        validity="rough bed, h over ks / 12; within 0.75 % of chezy where h / ks is over 1000",
        source="the logarithmic law over a rough bed, integrated over the depth",
        confidence="derived",
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


def critical_shear_velocity(
    shields: str, grain_size_m: float, submerged_relative_density: float, kinematic_viscosity_m2_s: float
) -> float:
    """Shear velocity at which the bed begins to move.

    Parameters
    ----------
    shields : str
        Name in `SHIELDS`.
    grain_size_m : float
        d50 [m], positive.
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    kinematic_viscosity_m2_s : float
        Of the water [m2/s], positive.

    Returns
    -------
    float
        u*_c = sqrt(theta_c g Delta d50) [m/s].

    Raises
    ------
    DomainError
        If a number is not positive, or the grain is outside the range of the curve.

    References
    ----------
    Definition of the Shields parameter.
    """
    grain_size = dimensionless_grain_size(grain_size_m, submerged_relative_density, kinematic_viscosity_m2_s)
    parameter = SHIELDS[shields].function(np.asarray(grain_size))
    return float(np.sqrt(parameter * GRAVITY_M_S2 * submerged_relative_density * grain_size_m))


def critical_velocity(
    shields: str,
    profile: str,
    grain_size_m: float,
    depth_m: float,
    submerged_relative_density: float,
    kinematic_viscosity_m2_s: float,
    roughness_d50: float,
) -> float:
    """Depth-mean velocity at which the bed begins to move.

    Parameters
    ----------
    shields, profile : str
        Names in `SHIELDS` and `PROFILES`.
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
    `critical_shear_velocity` times the profile's ratio.
    """
    shear_velocity = critical_shear_velocity(
        shields, grain_size_m, submerged_relative_density, kinematic_viscosity_m2_s
    )
    return PROFILES[profile].function(depth_m, roughness_d50 * grain_size_m) * shear_velocity


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


def _check_depth(depth_m: float, roughness_m: float) -> None:
    if not 12.0 * depth_m > roughness_m > 0.0:
        raise DomainError(
            f"the depth of {depth_m:.4g} m is not over a twelfth of the bed's roughness of {roughness_m:.4g} m: "
            "no critical velocity"
        )
