"""The table of discharge relations: from the levels on both sides of an opening to its discharge.

Every kernel has one signature: depth over the crest on the sea side and on the basin side [m, not negative], width at
the crest [m], side slope, and the entry's own parameters in their order; it returns the discharge [m3/s, positive from
sea to basin] and the depth in the control section [m]. A new relation is one kernel and one entry.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

import numpy as np

from tidescour.compiled import compiled_relation
from tidescour.errors import DomainError
from tidescour.gap.section import control_depth, section_area
from tidescour.table import Entry, Parameter
from tidescour.units import GRAVITY_M_S2, FloatArray, read_only

Kernel = Callable[[float, float, float, float, FloatArray], tuple[float, float]]


@compiled_relation
def broad_crest(
    sea_depth_m: float, basin_depth_m: float, width_m: float, side_slope: float, parameters: FloatArray
) -> tuple[float, float]:
    """Flow over a broad crest, free or drowned, without approach velocity.

    Q = m A(y) sqrt(2 g (h1 - y)) with y the larger of the downstream depth and the critical depth for the energy h1.
    Free flow is the maximum of that expression over y, so the discharge and its slope are continuous where the
    opening drowns and no blending is needed.

    References
    ----------
    Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44: discharge at the depth that makes it largest.
    """
    upstream = max(sea_depth_m, basin_depth_m)
    depth = control_depth(upstream, min(sea_depth_m, basin_depth_m), width_m, side_slope)
    drop = max(upstream - depth, 0.0)
    size = parameters[0] * section_area(depth, width_m, side_slope) * math.sqrt(2.0 * GRAVITY_M_S2 * drop)
    return (size if sea_depth_m >= basin_depth_m else -size), depth


RELATIONS: Mapping[str, Entry[Kernel]] = {
    entry.name: entry
    for entry in (
        Entry(
            name="broad-crest",
            title="Broad crest, free or drowned",
            function=broad_crest,
            parameters=(
                Parameter(
                    name="coefficient",
                    unit="-",
                    low=0.0,
                    high=3.0,
                    meaning="discharge coefficient m; 0.80 to 1.10 is common for rubble sills, above 1 is physical "
                    "early in a closure, when the gauges stand beyond the zone where the jet's head is won back",
                ),
            ),
            validity="crest longer than about half the head over it; parallel streamlines over the crest; level water "
            "on both sides, approach velocity small (gap area below about half of the channel's)",
            source="Energy equation at the control section; Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, "
            "section 44; trapezoid by the same rule of the largest discharge",
            confidence="published",
        ),
    )
}

KERNELS: tuple[Kernel, ...] = tuple(entry.function for entry in RELATIONS.values())
CODES: Mapping[str, int] = {name: code for code, name in enumerate(RELATIONS)}
PARAMETERS_AT_MOST = max(len(entry.parameters) for entry in RELATIONS.values())


def relation_parameters(name: str, values: Mapping[str, float]) -> FloatArray:
    """Return a relation's numbers in the order of its table entry, as its kernel wants them.

    Raises
    ------
    DomainError
        If the relation is not in the table, or a number is missing or outside its range.
    """
    if name not in RELATIONS:
        raise DomainError(f"relation {name!r} is not in the table; it has {', '.join(RELATIONS)}")
    numbers = np.zeros(PARAMETERS_AT_MOST)
    for position, parameter in enumerate(RELATIONS[name].parameters):
        value = values.get(parameter.name, np.nan)
        if not parameter.low < value <= parameter.high:
            raise DomainError(
                f"relation {name}: {parameter.name} = {value:g} must be over {parameter.low:g} and at most "
                f"{parameter.high:g}"
            )
        numbers[position] = value
    return read_only(numbers)


def opening_discharge(
    relation: str,
    values: Mapping[str, float],
    sea_depth_m: FloatArray,
    basin_depth_m: FloatArray,
    width_m: float,
    side_slope: float = 0.0,
) -> FloatArray:
    """Return the discharge of an opening by one relation of the table.

    Parameters
    ----------
    relation : str
        Name in the table.
    values : mapping of str to float
        The relation's own numbers, such as ``coefficient``.
    sea_depth_m, basin_depth_m : (n,) array
        Depth over the crest on either side [m], not negative.
    width_m : float
        Width at the crest [m].
    side_slope : float
        Horizontal per vertical, both sides.

    Returns
    -------
    (n,) array
        Discharge [m3/s], positive from sea to basin; 0 where the crest is dry; NaN where a depth is NaN.

    Raises
    ------
    DomainError
        If shapes differ, a depth or the slope is negative, or the width is not positive.
    """
    if sea_depth_m.shape != basin_depth_m.shape or sea_depth_m.ndim != 1:
        raise DomainError("sea_depth_m and basin_depth_m must be two rows of one length")
    if np.any(sea_depth_m < 0.0) or np.any(basin_depth_m < 0.0):
        raise DomainError("a depth over the crest is negative; give 0 where the crest stands above the water")
    if not width_m > 0.0 or not side_slope >= 0.0:
        raise DomainError(f"width {width_m:g} m must be positive and side slope {side_slope:g} not negative")
    numbers = relation_parameters(relation, values)
    kernel = RELATIONS[relation].function
    discharge = np.full(sea_depth_m.shape, np.nan)
    known = np.isfinite(sea_depth_m) & np.isfinite(basin_depth_m)
    discharge[known] = [
        kernel(sea, basin, width_m, side_slope, numbers)[0]
        for sea, basin in zip(sea_depth_m[known], basin_depth_m[known], strict=True)
    ]
    return discharge
