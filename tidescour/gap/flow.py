"""Flow through the openings of a stage once the levels of both sides are known."""

from __future__ import annotations

import numpy as np

from tidescour.compiled import compiled
from tidescour.errors import DomainError
from tidescour.gap.levels import Waters, given_values
from tidescour.gap.records import OpeningFlow
from tidescour.gap.relations import CODES, KERNELS, Kernel, relation_parameters
from tidescour.gap.section import control_depth, section_area
from tidescour.plan.models import Opening
from tidescour.units import FloatArray, utc_text


@compiled
def _relation_flow(
    kernels: tuple[Kernel, ...],
    code: int,
    parameters: FloatArray,
    crest: FloatArray,
    width: FloatArray,
    slope: float,
    sea: FloatArray,
    basin: FloatArray,
) -> FloatArray:
    """Return rows of discharge, velocity in the control section and its mean width."""
    rows = np.empty((3, sea.size))
    for i in range(sea.size):
        discharge, depth = kernels[code](
            max(sea[i] - crest[i], 0.0), max(basin[i] - crest[i], 0.0), width[i], slope, parameters
        )
        rows[0, i] = discharge
        area = section_area(depth, width[i], slope)
        rows[1, i] = discharge / area if area > 0.0 else 0.0
        rows[2, i] = area / depth if depth > 0.0 else np.nan
    return rows


@compiled
def _given_flow(
    discharge: FloatArray, crest: FloatArray, width: FloatArray, slope: float, sea: FloatArray, basin: FloatArray
) -> FloatArray:
    """Return rows of discharge, velocity and mean width of the control section; NaN width where it is dry."""
    rows = np.empty((3, sea.size))
    for i in range(sea.size):
        sea_depth, basin_depth = max(sea[i] - crest[i], 0.0), max(basin[i] - crest[i], 0.0)
        if discharge[i] >= 0.0:
            depth = control_depth(sea_depth, basin_depth, width[i], slope)
        else:
            depth = control_depth(basin_depth, sea_depth, width[i], slope)
        area = section_area(depth, width[i], slope)
        rows[0, i] = discharge[i]
        rows[1, i] = discharge[i] / area if area > 0.0 else 0.0
        rows[2, i] = area / depth if depth > 0.0 else np.nan
    return rows


def linear_in_time(start: float, end: float | None, count: int) -> FloatArray:
    """Return `count` even values from start to end, both included; constant where there is no end."""
    return np.linspace(start, start if end is None else end, count)


def opening_flow(
    opening: Opening, waters: Waters, time_s: FloatArray, sea_m: FloatArray, basin_m: FloatArray, stage: str
) -> OpeningFlow:
    """Return what runs through one opening of a stage.

    Parameters
    ----------
    opening : Opening
        Geometry, and a relation or the name of a given series.
    waters : Waters
        Where given series are found.
    time_s, sea_m, basin_m : (n,) array
        Steps, even from the start to the end of the stage, and the levels on both sides [m above datum].
    stage : str
        Name of the stage, for messages.

    Raises
    ------
    DomainError
        If a given discharge runs over a dry crest.
    RecordError
        If a given series does not cover the stage.
    """
    crest = linear_in_time(opening.crest_level_m, opening.crest_level_end_m, time_s.size)
    width = linear_in_time(opening.width_m, opening.width_end_m, time_s.size)
    velocity = None
    if opening.relation is not None:
        numbers = relation_parameters(opening.relation, opening.parameters)
        rows = _relation_flow(
            KERNELS, CODES[opening.relation], numbers, crest, width, opening.side_slope, sea_m, basin_m
        )
    elif opening.discharge_series is not None:
        discharge = given_values(waters.series[opening.discharge_series], time_s, stage)
        rows = _given_flow(discharge, crest, width, opening.side_slope, sea_m, basin_m)
        dry = (discharge != 0.0) & np.isnan(rows[2])
        if dry.any():
            at = int(np.argmax(dry))
            raise DomainError(
                f"stage {stage!r}, opening {opening.name!r}: discharge_series gives {discharge[at]:.4g} m3/s at "
                f"{utc_text(time_s[at])} over a dry crest ({crest[at]:.3g} m, water at {sea_m[at]:.3g} and "
                f"{basin_m[at]:.3g} m); correct the series or crest_level_m"
            )
    else:
        velocity = given_values(waters.series[str(opening.end_velocity_series)], time_s, stage)
        rows = np.full((3, time_s.size), np.nan)
    return OpeningFlow(
        name=opening.name,
        crest_level_m=crest,
        width_m=width,
        discharge_m3_s=rows[0],
        gap_velocity_m_s=rows[1],
        flow_width_m=rows[2],
        given_end_velocity_m_s=velocity,
        given=opening.relation is None,
    )
