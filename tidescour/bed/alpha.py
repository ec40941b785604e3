"""How much harder disturbed flow digs than its mean velocity tells: alpha behind a sill and its protection."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import DomainError
from tidescour.units import GRAVITY_M_S2, FloatArray

REATTACHMENT: Final = 6.0
"""Length of the eddy behind a sill over the sill's height: the turbulence formula starts there."""

ROUGH_CHEZY_M05_S: Final = 40.0
"""Chezy coefficient up to which the roughness of the protection does not raise alpha (from memory)."""

HIGHEST_SILL: Final = 0.8
"""Sill height over depth up to which the formula is used; it diverges at 1 (common practice, no source)."""


def relative_turbulence(sill_height_m: FloatArray, depth_m: float, length_m: float, chezy_m05_s: float) -> FloatArray:
    """Depth-mean relative turbulence at the end of the protection behind a sill.

    Parameters
    ----------
    sill_height_m : (n,) array
        Height of the sill over the bed at the end of the protection [m], over 0 and at most 0.8 of the depth.
    depth_m : float
        Water depth at the end of the protection [m], positive.
    length_m : float
        Length of the protection [m], at least 6 sill heights. At 6 exactly the formula has its limit, where the
        search for the required length may end; a plan's own length must be longer (`outside_evidence`).
    chezy_m05_s : float
        Chezy coefficient of the protection [m^0.5/s], positive.

    Returns
    -------
    (n,) array
        Relative turbulence r0 [-]; NaN where the sill height is.

    Raises
    ------
    DomainError
        If a number is outside these ranges.

    References
    ----------
    Hoffmans & Booij 1993; Hoffmans & Verheij 1997, Scour Manual (from memory).
    """
    if not (depth_m > 0.0 and chezy_m05_s > 0.0):
        raise DomainError(f"depth {depth_m:g} m and Chezy coefficient {chezy_m05_s:g} m0.5/s must be positive")
    sill = np.asarray(sill_height_m, dtype=np.float64)
    if np.any(sill <= 0.0):
        raise DomainError(f"sill height {np.nanmin(sill):.4g} m must be over 0: the formula is for flow over a sill")
    if np.any(sill > HIGHEST_SILL * depth_m):
        raise DomainError(f"sill height {np.nanmax(sill):.4g} m is over {HIGHEST_SILL:g} of the depth {depth_m:.4g} m")
    if np.any(length_m < REATTACHMENT * sill):
        raise DomainError(f"length {length_m:.4g} m is under 6 times the sill height {np.nanmax(sill):.4g} m")
    return _turbulence(sill, depth_m, length_m, chezy_m05_s)


def roughness_factor(chezy_m05_s: float | None) -> float:
    """Factor f_C = max(1, C / 40): over a smoother protection the velocity near the bed is higher.

    1 where the Chezy coefficient is not known; `DomainError` where it is not positive. Hoffmans & Verheij 1997, Scour
    Manual (from memory).
    """
    if chezy_m05_s is None:
        return 1.0
    if not chezy_m05_s > 0.0:
        raise DomainError(f"Chezy coefficient {chezy_m05_s:g} m0.5/s must be positive")
    return max(1.0, chezy_m05_s / ROUGH_CHEZY_M05_S)


def implied_turbulence(alpha: FloatArray, chezy_m05_s: float | None) -> FloatArray:
    """Relative turbulence that goes with a disturbance factor, computed or given.

    Parameters
    ----------
    alpha : (n,) array
        Disturbance factor [-].
    chezy_m05_s : float or None
        Chezy coefficient of the protection [m^0.5/s], positive; where it is not known, 40 is taken, up to which f_C
        is 1.

    Returns
    -------
    (n,) array
        r0 = (alpha - 1.5) / (5 f_C) [-], not under the uniform flow's sqrt(1.45 g) / C; NaN where alpha is. A given
        alpha may hold more than turbulence, such as the local velocity at a dam head: then r0 is on the high side.

    Raises
    ------
    DomainError
        If the Chezy coefficient is not positive.

    References
    ----------
    The formula of `alpha_factor`, solved for r0.
    """
    above = (np.asarray(alpha) - 1.5) / (5.0 * roughness_factor(chezy_m05_s))
    uniform = np.sqrt(1.45 * GRAVITY_M_S2) / (ROUGH_CHEZY_M05_S if chezy_m05_s is None else chezy_m05_s)
    return np.asarray(np.maximum(above, uniform), dtype=np.float64)


def alpha_factor(sill_height_m: FloatArray, depth_m: float, length_m: float, chezy_m05_s: float) -> FloatArray:
    """Disturbance factor alpha = 1.5 + 5 r0 f_C behind a sill.

    Arguments, NaN and errors as `relative_turbulence`; it never falls under 1.5 + 18.9 / C.

    Returns
    -------
    (n,) array
        alpha [-].

    References
    ----------
    Hoffmans & Booij 1993; Hoffmans & Verheij 1997, Scour Manual (from memory).
    """
    return 1.5 + 5.0 * roughness_factor(chezy_m05_s) * relative_turbulence(
        sill_height_m, depth_m, length_m, chezy_m05_s
    )


def outside_evidence(
    sill_height_m: FloatArray, depth_m: float, length_m: float, *, at_limit: bool = False
) -> NDArray[np.bool_]:
    """Tell where the formula must not be used: D <= 0, L <= 6 D or D > 0.8 h0.

    `at_limit` lets L = 6 D pass, for the search for the required length; the rest is as in `relative_turbulence`.
    """
    sill = np.asarray(sill_height_m, dtype=np.float64)
    least = REATTACHMENT * sill
    too_short = length_m < least if at_limit else length_m <= least
    return (sill <= 0.0) | too_short | (sill > HIGHEST_SILL * depth_m)


def extrapolated_alpha(sill_height_m: float, depth_m: float, length_m: float, chezy_m05_s: float) -> float:
    """Alpha by the formula, evidence or not, to be told in a refusal; NaN or infinite where it has no value."""
    with np.errstate(divide="ignore", invalid="ignore"):
        turbulence = _turbulence(np.asarray(sill_height_m), depth_m, length_m, chezy_m05_s)
    return float(1.5 + 5.0 * roughness_factor(chezy_m05_s) * turbulence)


def _turbulence(sill: FloatArray, depth_m: float, length_m: float, chezy_m05_s: float) -> FloatArray:
    decay = np.power((length_m - REATTACHMENT * sill) / (6.67 * depth_m) + 1.0, -1.08)
    mixing_layer = 0.0225 * np.power(1.0 - sill / depth_m, -2.0) * decay
    return np.asarray(np.sqrt(mixing_layer + 1.45 * GRAVITY_M_S2 / chezy_m05_s**2), dtype=np.float64)
