"""How the names of numbers tell their units: by their ending, or by standing in the list of bare numbers."""

from __future__ import annotations

from typing import Final

UNIT_ENDINGS: Final[dict[str, str]] = {
    "_m_s_h": "metres, metres per second and hours: a factor between them, whose power of each the exponents give",
    "_kg_m3": "kilograms per cubic metre",
    "_m2_s": "square metres per second",
    "_m_s2": "metres per second squared",
    "_m_s": "metres per second",
    "_percent": "percent",
    "_mm": "millimetres",
    "_m": "metres",
    "_h": "hours",
    "_cot": "cotangent of a slope: 1 in this",
}
"""Endings and units, the longer of two that fit first."""

BARE_NUMBERS: Final = (
    "submerged_relative_density",
    "velocity_exponent",
    "depth_exponent",
    "time_exponent",
    "integral_exponent",
    "time_over_t1",
    "depth_over_water_depth",
    "cycles",
    "alpha",
    "alpha_at_required",
    "alpha_for_same_depth",
    "turbulence",
    "growth_factor",
    "depth_margin_factor",
    "turbulence_factor",
    "stone_relative_density",
    "shields_parameter_shields",
    "shields_parameter_pilarczyk",
    "stability_factor",
    "slope_factor",
    "ratio",
    "limit",
    "other_limit",
)
"""Numbers of the hand-off that have no unit."""


def unit_of(name: str) -> str | None:
    """Return the unit of a number of the hand-off in words; None where its name tells none."""
    if name in BARE_NUMBERS:
        return "none: a bare number"
    return next((unit for ending, unit in UNIT_ENDINGS.items() if name.endswith(ending)), None)
