"""The curve that a growth law has under constant flow: its rate, its scale, depths and states on it."""

from __future__ import annotations

import numpy as np

from tidescour.errors import DomainError
from tidescour.plan.models_bed import Equilibrium
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.shapes import MODEL_CURVE, SATURATING, depths_of_states, states_of_depths
from tidescour.units import FloatArray


def growth_rate(law: GrowthLaw, excess_m_s: FloatArray | float, depth_m: FloatArray | float) -> FloatArray:
    """Growth of h**(1 / gamma) per hour of the law's power part, the quantity that adds up over time and stages.

    Parameters
    ----------
    law : GrowthLaw
        Growth law.
    excess_m_s : (n,) array or float
        alpha u - u_c [m/s], not negative.
    depth_m : (n,) array or float
        Water depth h0 [m], not negative.

    Returns
    -------
    (n,) array
        (c E**q h0**r) ** (1 / gamma) [m**(1 / gamma) per hour]; NaN where an argument is.

    Raises
    ------
    DomainError
        If an argument is negative.
    """
    if np.any(np.less(excess_m_s, 0.0)) or np.any(np.less(depth_m, 0.0)):
        raise DomainError("excess velocity and depth must not be negative")
    strength = law.coefficient * np.power(excess_m_s, law.velocity_exponent) * np.power(depth_m, law.depth_exponent)
    return np.asarray(np.power(strength, 1.0 / law.time_exponent), dtype=np.float64)


def bending_factor(equilibrium_ratio: FloatArray | float) -> FloatArray:
    """How much faster the saturating law starts than the power law, so that it still passes through h0 at t1.

    Parameters
    ----------
    equilibrium_ratio : (n,) array or float
        Equilibrium depth over water depth, h_e / h0.

    Returns
    -------
    (n,) array
        -(h_e / h0) ln(1 - h0 / h_e) where h_e > h0, else 1; NaN where the ratio is.
    """
    ratio = np.asarray(equilibrium_ratio, dtype=np.float64)
    over = ratio > 1.0
    inside = np.where(over, ratio, 2.0)
    factor = np.where(over, -inside * np.log1p(-1.0 / inside), 1.0)
    return np.asarray(np.where(np.isnan(ratio), np.nan, factor), dtype=np.float64)


def equilibrium_ratio(
    equilibrium: Equilibrium,
    attack_m_s: FloatArray | float,
    velocity_m_s: FloatArray | float,
    turbulence: FloatArray | float,
    critical_velocity_m_s: float,
) -> FloatArray:
    """Equilibrium depth of a hole over the water depth.

    Parameters
    ----------
    equilibrium : {"half-alpha", "turbulence"}
        Which published form.
    attack_m_s, velocity_m_s, turbulence : (n,) array or float
        alpha u and u [m/s], and relative turbulence r0 [-].
    critical_velocity_m_s : float
        Of the bed [m/s], positive.

    Returns
    -------
    (n,) array
        (0.5 alpha u - u_c) / u_c or ((1 + 3 r0) u - u_c) / u_c, negative where the bed does not move; NaN where an
        argument of that form is.

    References
    ----------
    Textbook form, and Hoffmans after Dietz 1969 (both from memory).
    """
    if equilibrium == "half-alpha":
        driving = 0.5 * np.asarray(attack_m_s, dtype=np.float64)
    else:
        driving = (1.0 + 3.0 * np.asarray(turbulence, dtype=np.float64)) * np.asarray(velocity_m_s, dtype=np.float64)
    return np.asarray((driving - critical_velocity_m_s) / critical_velocity_m_s, dtype=np.float64)


def depth_at(law: GrowthLaw, state: FloatArray | float, scale_m: float) -> FloatArray:
    """Depth on a curve of the law [m], from its state (rate times hours) and its scale [m]; NaN where the state is."""
    states = np.array(state, dtype=np.float64)
    depths = np.empty_like(states)
    depths_of_states(law.shape, law.curve, law.time_exponent, states.reshape(-1), scale_m, depths.reshape(-1))
    return np.where(np.isnan(states), np.nan, depths)


def state_at(law: GrowthLaw, depth_m: FloatArray | float, scale_m: float) -> FloatArray:
    """State at which a curve of the law has a depth; infinite where it never has, NaN where the depth is."""
    depths = np.array(depth_m, dtype=np.float64)
    states = np.empty_like(depths)
    states_of_depths(law.shape, law.curve, law.time_exponent, depths.reshape(-1), scale_m, states.reshape(-1))
    return np.where(np.isnan(depths), np.nan, states)


def depth_after(
    law: GrowthLaw,
    excess_m_s: FloatArray | float,
    depth_m: FloatArray | float,
    hours: FloatArray | float,
    equilibrium: float = np.inf,
) -> FloatArray:
    """Depth of a hole that starts from a flat bed and grows under constant flow.

    Parameters
    ----------
    law, excess_m_s, depth_m
        As in `growth_rate`.
    hours : (n,) array or float
        Time [h], not negative.
    equilibrium : float
        For a saturating law: equilibrium depth over water depth.

    Returns
    -------
    (n,) array
        Depth below the original bed [m]; NaN where an argument is.

    Raises
    ------
    DomainError
        If an argument is negative, or a saturating law has no equilibrium.
    """
    if np.any(np.less(hours, 0.0)):
        raise DomainError("time must not be negative")
    if law.shape == SATURATING and not np.isfinite(equilibrium):
        raise DomainError("a saturating law needs the equilibrium depth over the water depth")
    rate, scale = curve_of(law, growth_rate(law, excess_m_s, depth_m), depth_m, equilibrium)
    rates, scales, times = np.broadcast_arrays(rate, scale, hours)
    depths = [depth_at(law, k * t, float(s)) for k, s, t in zip(rates.flat, scales.flat, times.flat, strict=True)]
    return np.reshape(np.array(depths, dtype=np.float64), rates.shape)


def curve_of(
    law: GrowthLaw,
    power_rate: FloatArray | float,
    water_depth_m: FloatArray | float,
    equilibrium: FloatArray | float,
    mean_depth_m: FloatArray | float | None = None,
) -> tuple[FloatArray, FloatArray]:
    """Rate and scale of the law's curve for given flow.

    Parameters
    ----------
    law : GrowthLaw
        Growth law.
    power_rate : (n,) array or float
        From `growth_rate`.
    water_depth_m : (n,) array or float
        Water depth h0 [m].
    equilibrium : (n,) array or float
        From `equilibrium_ratio`; only a saturating law looks at it.
    mean_depth_m : (n,) array or float, optional
        Water depth that the equilibrium depth belongs to [m]; left out, `water_depth_m`.

    Returns
    -------
    rate, scale : (n,) arrays
        Rate [m**(1 / gamma) per hour] and scale [m]; 0 and 0 where a saturating law has no equilibrium depth.
    """
    rate = np.asarray(power_rate, dtype=np.float64)
    if law.shape == SATURATING:
        ratio = np.asarray(equilibrium, dtype=np.float64)
        scale = np.maximum(ratio, 0.0) * (water_depth_m if mean_depth_m is None else mean_depth_m)
        bent = rate * bending_factor(ratio) ** (1.0 / law.time_exponent)
        return np.where(ratio <= 0.0, 0.0, bent), scale
    if law.shape == MODEL_CURVE:
        return rate, np.broadcast_to(np.asarray(water_depth_m, dtype=np.float64), rate.shape)
    return rate, np.full(rate.shape, np.inf)
