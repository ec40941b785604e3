"""Keys of soundings and of load cases as typed records."""

from __future__ import annotations

from typing import Annotated

from pydantic import AwareDatetime, Field

from tidescour.plan.kinds import Filled, Finite, Name, NotNegative, PlanModel, Positive, Side


class Sounding(PlanModel):
    """One sounding of a hole (`[[sounding]]`, or a row of `soundings.file`).

    One of `depth_m` and `bed_level_m` is given.
    """

    date: AwareDatetime
    """When it was sounded, with an offset from UTC."""
    opening: Filled
    """Opening behind which the hole lies."""
    side: Side
    """Side of the hole: basin (dug by the flood) or sea (dug by the ebb)."""
    depth_m: NotNegative | None = None
    """Deepest point below the original bed [m]."""
    bed_level_m: Finite | None = None
    """The same as a level [m above the datum]."""
    standard_error_m: Positive
    """Standard error of that depth [m]."""
    upper_slope_cot: Positive | None = None
    """Slope 1 in n of the hole's upper part towards the protection, over stop_slope_height_m."""


class Soundings(PlanModel):
    """How soundings are read and weighed."""

    file: Filled | None = None
    """Table of soundings, .csv or .xlsx, with the columns date, opening, side, depth_m or bed_level_m, and
    standard_error_m; beside or instead of [[sounding]]."""
    prior_scatter: Annotated[float, Field(gt=0, le=2, allow_inf_nan=False)] = 0.3
    """Standard deviation of the logarithm of the growth factor before any sounding."""
    growth_scatter: Annotated[float, Field(ge=0, le=2, allow_inf_nan=False)] = 0.1
    """Standard deviation of growth between two soundings around the law with its growth factor, over that growth."""


class LoadCase(PlanModel):
    """A storm that follows a stage (`[[load_case]]`), computed beside the programme and not part of it."""

    name: Name
    """Name. One line of up to 80 printable characters."""
    stage: Filled
    """Stage at whose end the storm comes, with the gap as it is then."""
    series: Filled
    """Series of the sea level in the storm; its clock is moved to begin where the stage ends."""
