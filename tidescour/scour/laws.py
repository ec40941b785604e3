"""Growth laws: depth of a scour hole under a constant velocity."""

from __future__ import annotations

from dataclasses import dataclass


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
