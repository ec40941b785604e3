"""Slopes of the hole: upstream while it grows, and after a slide."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.bed.alpha import roughness_factor
from tidescour.errors import DomainError
from tidescour.table import Confidence
from tidescour.units import GRAVITY_M_S2, FloatArray

NATURAL_ANGLE_DEG: Final = 35.0
"""Steepest slope at which sand lies, the upper end of 30 to 35 degrees (common practice, from memory)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class CommonSlope:
    """A slope 1 in `least_cot` to 1 in `most_cot` that is common after a slide in one kind of sand."""

    sand: str
    least_cot: float
    most_cot: float
    source: str
    confidence: Confidence


COMMON_SLOPES: Final[tuple[CommonSlope, ...]] = (
    CommonSlope(
        sand="normally packed",
        least_cot=6.0,
        most_cot=6.0,
        source="closure practice, no source (from memory)",
        confidence="common practice",
    ),
    CommonSlope(
        sand="loose",
        least_cot=15.0,
        most_cot=20.0,
        source="closure practice, no source (from memory)",
        confidence="common practice",
    ),
    CommonSlope(
        sand="very loose, after a flow slide: flattest seen",
        least_cot=20.0,
        most_cot=100.0,
        source="single slides, no source (from memory)",
        confidence="from memory",
    ),
)
"""Slopes after a slide, from the deepest point to the edge. Which one holds is for soil investigation to say."""


def upstream_slope_cot(
    velocity_m_s: FloatArray,
    turbulence: FloatArray,
    grain_size_m: float,
    submerged_relative_density: float,
    chezy_m05_s: float | None,
) -> FloatArray:
    """Slope of the hole towards the protection while it grows.

    Parameters
    ----------
    velocity_m_s : (n,) array
        Depth-mean velocity at the end of the protection [m/s], not negative.
    turbulence : (n,) array
        Relative turbulence r0 there [-], not negative.
    grain_size_m : float
        d50 [m], positive.
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    chezy_m05_s : float or None
        Chezy coefficient of the protection [m^0.5/s], positive; None where it is not known, for which f_C is 1.

    Returns
    -------
    (n,) array
        cot beta, 1.43 to 9.1; NaN where the formula leaves its range, with a slope over the natural one of 35
        degrees or a sine of 1 and more, and where an argument is NaN.

    Raises
    ------
    DomainError
        If a number is outside these ranges.

    References
    ----------
    beta = arcsin(3e-4 u**2 / (Delta g d50) + (0.11 + 0.75 r0) f_C): Hoffmans & Pilarczyk 1995, Journal of Hydraulic
    Engineering 121(4) (from memory).
    """
    if not (grain_size_m > 0.0 and submerged_relative_density > 0.0):
        raise DomainError("grain size and submerged relative density must be positive")
    if np.any(np.less(velocity_m_s, 0.0)) or np.any(np.less(turbulence, 0.0)):
        raise DomainError("velocity and relative turbulence must not be negative")
    loading = 3e-4 * np.square(velocity_m_s) / (submerged_relative_density * GRAVITY_M_S2 * grain_size_m)
    sine = loading + (0.11 + 0.75 * np.asarray(turbulence)) * roughness_factor(chezy_m05_s)
    inside = sine <= np.sin(np.radians(NATURAL_ANGLE_DEG))
    return np.asarray(np.sqrt(1.0 / np.where(inside, sine, np.nan) ** 2 - 1.0), dtype=np.float64)


def slide_retreat(height_m: float, cot_before: float, cot_after: float) -> float:
    """Retreat of the upper edge in a single slide that keeps its area.

    Parameters
    ----------
    height_m : float
        Height y of the slope [m], not negative.
    cot_before, cot_after : float
        Slope 1 in n before, positive, and after the slide, not steeper.

    Returns
    -------
    float
        Retreat y (cot_after - cot_before) / 2 [m], not negative. Slides that follow each other add up.

    Raises
    ------
    DomainError
        If a number is outside these ranges.

    References
    ----------
    Equal areas of cut and fill on a straight slope.
    """
    if not height_m >= 0.0:
        raise DomainError(f"the height of {height_m:g} m must not be negative")
    if not cot_after >= cot_before > 0.0:
        raise DomainError(
            f"a slide from 1 in {cot_before:g} to 1 in {cot_after:g}: both must be positive, and the slope after it "
            "not steeper than before"
        )
    return 0.5 * height_m * (cot_after - cot_before)
