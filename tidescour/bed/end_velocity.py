"""From the discharge of an opening to the flow at the end of the bed protection."""

from __future__ import annotations

import numpy as np

from tidescour.errors import DomainError
from tidescour.units import GRAVITY_M_S2, FloatArray


def end_velocity(
    discharge_m3_s: FloatArray, width_m: FloatArray, depth_m: FloatArray, local_velocity_factor: float
) -> FloatArray:
    """Depth-mean velocity at the end of the protection.

    Parameters
    ----------
    discharge_m3_s : (n,) array
        Discharge [m3/s], of any sign.
    width_m : (n,) array
        Width that carries it there [m] (see `spread_width`), positive where there is flow.
    depth_m : (n,) array
        Undisturbed depth there [m], positive where there is flow.
    local_velocity_factor : float
        Local over mean velocity.

    Returns
    -------
    (n,) array
        Velocity [m/s], not negative; 0 without discharge whatever width and depth, else NaN where one of them is.

    Raises
    ------
    DomainError
        If shapes differ, or a width or depth with flow is not positive.

    References
    ----------
    Continuity.
    """
    if not discharge_m3_s.shape == width_m.shape == depth_m.shape:
        raise DomainError("discharge, width and depth must have one shape")
    flow = discharge_m3_s != 0.0
    if np.any(width_m[flow] <= 0.0) or np.any(depth_m[flow] <= 0.0):
        raise DomainError("width and depth must be positive where there is flow")
    velocity = np.zeros_like(discharge_m3_s)
    velocity[flow] = local_velocity_factor * np.abs(discharge_m3_s[flow]) / (width_m[flow] * depth_m[flow])
    return velocity


def froude_number(velocity_m_s: FloatArray, depth_m: FloatArray) -> FloatArray:
    """Froude number u / sqrt(g h) [-] of velocities [m/s] at positive depths [m]; NaN where one is."""
    return np.asarray(velocity_m_s / np.sqrt(GRAVITY_M_S2 * depth_m), dtype=np.float64)


def conjugate_depth(unit_discharge_m2_s: FloatArray, energy_m: FloatArray) -> FloatArray:
    """Tailwater that holds a jump at the foot of a drop without loss.

    Parameters
    ----------
    unit_discharge_m2_s : (n,) array
        Discharge per metre of width [m2/s], positive.
    energy_m : (n,) array
        Energy head over the bed there [m].

    Returns
    -------
    (n,) array
        Depth conjugate to the supercritical depth of that energy [m]; the critical depth where the energy is too
        small for so much water; NaN where an argument is.

    References
    ----------
    Momentum over a jump (Belanger), y2 = y1 / 2 (sqrt(1 + 8 Fr1**2) - 1). The supercritical depth is the small
    positive root of y + q**2 / (2 g y**2) = H: with q_max**2 = 8 g H**3 / 27 and t = 2 arcsin(q / q_max) it is
    H / 3 (2 sin(t / 6)**2 + sqrt(3) sin(t / 3)).
    """
    head = np.maximum(energy_m, 0.0)
    most = np.sqrt(8.0 * GRAVITY_M_S2 * head**3 / 27.0)
    possible = ~(unit_discharge_m2_s >= most)
    angle = 2.0 * np.arcsin(np.where(possible, unit_discharge_m2_s, 0.0) / np.where(possible, most, 1.0))
    depth = head / 3.0 * (2.0 * np.sin(angle / 6.0) ** 2 + np.sqrt(3.0) * np.sin(angle / 3.0))
    critical = np.cbrt(unit_discharge_m2_s**2 / GRAVITY_M_S2)
    depth = np.where(possible, depth, critical)
    froude_squared = unit_discharge_m2_s**2 / (GRAVITY_M_S2 * depth**3)
    return np.asarray(0.5 * depth * (np.sqrt(1.0 + 8.0 * froude_squared) - 1.0), dtype=np.float64)
