"""Flow through the openings of a stage once the levels of both sides are known."""

from __future__ import annotations

import numpy as np

from tidescour.errors import DomainError
from tidescour.gap.layers import extent_at
from tidescour.gap.levels import LevelHistory, Waters, given_values
from tidescour.gap.openings import opening_rows, opening_section, opening_set
from tidescour.gap.records import OpeningFlow
from tidescour.gap.relations import NO_VALUE_REMEDY
from tidescour.plan.models import Opening
from tidescour.units import FloatArray, utc_text


def linear_in_time(start: float, end: float | None, count: int) -> FloatArray:
    """Return `count` even values from start to end, both included; constant where there is no end."""
    return np.linspace(start, start if end is None else end, count)


def opening_flow(
    opening: Opening, waters: Waters, time_s: FloatArray, sea: LevelHistory, basin_m: FloatArray, stage: str
) -> OpeningFlow:
    """Return what runs through one opening of a stage.

    Parameters
    ----------
    opening : Opening
        Geometry, and a relation or the name of a given series.
    waters : Waters
        Where given series are found.
    time_s : (n,) array
        Steps, even from the start to the end of the stage.
    sea : LevelHistory
        Sea level at the opening at these steps.
    basin_m : (n,) array
        Basin level [m above datum].
    stage : str
        Name of the stage, for messages.

    Raises
    ------
    DomainError
        If a given discharge runs over a dry crest, or a relation has no value for the levels.
    RecordError
        If a given series does not cover the stage.
    """
    crest = linear_in_time(opening.crest_level_m, opening.crest_level_end_m, time_s.size)
    where = f"stage {stage!r}, opening {opening.name!r}"
    velocity = discharge = None
    if opening.end_velocity_series is not None:
        velocity = given_values(waters.series[opening.end_velocity_series], time_s, stage)
        rows = np.full((3, time_s.size), np.nan)
    else:
        if opening.discharge_series is not None:
            discharge = given_values(waters.series[opening.discharge_series], time_s, stage)
        rows = opening_rows(opening_set([opening]), 0, sea.level_m, basin_m, discharge)
        _refuse_missing(rows, where, opening, time_s, sea.level_m, basin_m)
    if discharge is not None:
        _refuse_dry(rows, where, crest, time_s, sea.level_m, basin_m)
    with np.errstate(divide="ignore", invalid="ignore"):
        gap_velocity = np.where(rows[1] > 0.0, rows[0] / rows[1], 0.0 if velocity is None else np.nan)
    return OpeningFlow(
        name=opening.name,
        level_sea_m=sea.level_m,
        crest_level_m=crest,
        width_m=_crest_width(opening, crest),
        discharge_m3_s=rows[0],
        gap_velocity_m_s=gap_velocity,
        flow_width_m=rows[2],
        given_end_velocity_m_s=velocity,
        given=opening.relation is None,
    )


def _crest_width(opening: Opening, crest: FloatArray) -> FloatArray:
    if opening.width_m is not None:
        return linear_in_time(opening.width_m, opening.width_end_m, crest.size)
    layers = opening_section(opening).layers
    if crest[0] == crest[-1]:
        return np.full(crest.size, extent_at(float(crest[0]), layers))
    return np.array([extent_at(level, layers) for level in crest])


def _refuse_missing(
    rows: FloatArray, where: str, opening: Opening, time_s: FloatArray, sea: FloatArray, basin: FloatArray
) -> None:
    if np.all(np.isfinite(rows[0])):
        return
    at = int(np.argmax(~np.isfinite(rows[0])))
    raise DomainError(
        f"{where}: relation {opening.relation} has no value at {utc_text(time_s[at])} with the sea at {sea[at]:.3g} m "
        f"and the basin at {basin[at]:.3g} m; {NO_VALUE_REMEDY}"
    )


def _refuse_dry(
    rows: FloatArray, where: str, crest: FloatArray, time_s: FloatArray, sea: FloatArray, basin: FloatArray
) -> None:
    dry = (rows[0] != 0.0) & ~(rows[1] > 0.0)
    if np.any(dry):
        at = int(np.argmax(dry))
        raise DomainError(
            f"{where}: discharge_series gives {rows[0, at]:.4g} m3/s at {utc_text(time_s[at])} over a dry crest "
            f"({crest[at]:.3g} m, water at {sea[at]:.3g} and {basin[at]:.3g} m); correct the series or crest_level_m"
        )
