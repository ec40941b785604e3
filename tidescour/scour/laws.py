"""Growth laws: depth of a scour hole under a constant velocity."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.errors import DomainError
from tidescour.table import Entry
from tidescour.units import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PowerLaw:
    """h = coefficient * E**velocity_exponent * h0**depth_exponent * t**time_exponent; t in hours, E in m/s, h in m.

    The exponent of the excess under the time integral is always that of the same law, `integral_exponent`.
    """

    name: str
    text: str
    coefficient: float
    velocity_exponent: float
    depth_exponent: float
    time_exponent: float

    @property
    def integral_exponent(self) -> float:
        """Exponent p = q / gamma of the excess in the effective duration."""
        return self.velocity_exponent / self.time_exponent


def explicit_law(submerged_relative_density: float) -> PowerLaw:
    """Explicit growth law of the closures in the Dutch delta.

    Parameters
    ----------
    submerged_relative_density : float
        rho_s / rho - 1, positive.

    Returns
    -------
    PowerLaw
        h = E**1.7 h0**0.2 t**0.4 / (10 Delta**0.7).

    Raises
    ------
    DomainError
        If the density is not positive.

    References
    ----------
    Breusers 1966 and 1967, Delft Hydraulics (from memory).
    """
    _check_density(submerged_relative_density)
    return PowerLaw(
        name="explicit",
        text="h = (alpha u - u_c)^1.7 h0^0.2 t^0.4 / (10 Delta^0.7), t in hours",
        coefficient=0.1 * submerged_relative_density**-0.7,
        velocity_exponent=1.7,
        depth_exponent=0.2,
        time_exponent=0.4,
    )


def time_scale_law(submerged_relative_density: float) -> PowerLaw:
    """Growth law by the time in which a hole becomes as deep as the water.

    Parameters
    ----------
    submerged_relative_density : float
        rho_s / rho - 1, positive.

    Returns
    -------
    PowerLaw
        h = h0 (t / t1)**0.4 with t1 = 330 h0**2 Delta**1.7 / E**4.3.

    Raises
    ------
    DomainError
        If the density is not positive.

    References
    ----------
    Breusers 1966 and 1967, Delft Hydraulics: K = 330 h m^2.3 s^-4.3; time exponent 0.34 to 0.40 (from memory).
    """
    _check_density(submerged_relative_density)
    gamma = 0.4
    return PowerLaw(
        name="time-scale",
        text="h = h0 (t / t1)^0.4, t1 = 330 h0^2 Delta^1.7 / (alpha u - u_c)^4.3, t in hours",
        coefficient=330.0**-gamma * submerged_relative_density ** (-1.7 * gamma),
        velocity_exponent=4.3 * gamma,
        depth_exponent=1.0 - 2.0 * gamma,
        time_exponent=gamma,
    )


LAWS: Final[dict[str, Entry[Callable[[float], PowerLaw]]]] = {
    "explicit": Entry(
        name="explicit",
        title="Explicit growth law",
        function=explicit_law,
        validity="sand of 0.1 to 2 mm without cohesion, clear water, depth up to 1 to 1.5 times the water depth",
        source="Breusers 1966 and 1967, Delft Hydraulics",
        confidence="from memory",
    ),
    "time-scale": Entry(
        name="time-scale",
        title="Growth law by time scale, exponent 0.4",
        function=time_scale_law,
        validity="sand of 0.1 to 2 mm without cohesion, clear water, depth 0.1 to 1.5 times the water depth",
        source="Breusers 1966 and 1967, Delft Hydraulics",
        confidence="from memory",
    ),
}


def growth_rate(law: PowerLaw, excess_m_s: FloatArray | float, depth_m: FloatArray | float) -> FloatArray:
    """Growth of h**(1 / gamma) per hour, the one quantity that adds up over time and stages.

    Parameters
    ----------
    law : PowerLaw
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


def depth_after(
    law: PowerLaw, excess_m_s: FloatArray | float, depth_m: FloatArray | float, hours: FloatArray | float
) -> FloatArray:
    """Depth of a hole that starts from a flat bed and grows under constant flow.

    Parameters
    ----------
    law, excess_m_s, depth_m
        As in `growth_rate`.
    hours : (n,) array or float
        Time [h], not negative.

    Returns
    -------
    (n,) array
        Depth below the original bed [m]; NaN where an argument is.

    Raises
    ------
    DomainError
        If an argument is negative.
    """
    if np.any(np.less(hours, 0.0)):
        raise DomainError("time must not be negative")
    return np.asarray(np.power(growth_rate(law, excess_m_s, depth_m) * hours, law.time_exponent), dtype=np.float64)


def _check_density(submerged_relative_density: float) -> None:
    if not submerged_relative_density > 0.0:
        raise DomainError(f"submerged relative density {submerged_relative_density:g} must be positive")
