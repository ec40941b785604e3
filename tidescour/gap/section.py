"""Geometry of a trapezoidal opening: area, mean width and critical depth, as scalar kernels."""

from __future__ import annotations

import math

from tidescour.compiled import compiled


@compiled
def section_area(depth_m: float, width_m: float, side_slope: float) -> float:
    """Return the wet area [m2] at a depth over the crest [m].

    `width_m` is measured at the crest, `side_slope` is horizontal per vertical on both sides.
    """
    return depth_m * (width_m + side_slope * depth_m)


@compiled
def critical_depth(energy_m: float, width_m: float, side_slope: float) -> float:
    """Return the critical depth [m] of a trapezoid for an energy head over the crest [m].

    From H = y + A / (2 T) with A the area and T the width of the surface, a quadratic in y: two thirds of the energy
    for a rectangle, four fifths for a triangle.

    References
    ----------
    Energy at minimum, as in any open-channel text (Chow 1959, Open-Channel Hydraulics, ch. 3 and 4, from memory).
    """
    linear = 3.0 * width_m - 4.0 * side_slope * energy_m
    root = math.sqrt(linear * linear + 40.0 * side_slope * width_m * energy_m)
    if linear >= 0.0:
        total = linear + root
        return 4.0 * width_m * energy_m / total if total > 0.0 else 0.0
    return (root - linear) / (10.0 * side_slope)


@compiled
def control_depth(upstream_depth_m: float, downstream_depth_m: float, width_m: float, side_slope: float) -> float:
    """Return the depth in the control section [m]: critical where the flow is free, else the downstream depth."""
    return max(downstream_depth_m, critical_depth(upstream_depth_m, width_m, side_slope))
